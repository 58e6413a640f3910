package model

import (
	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// The bounds of a diagram.
const (
	mostDiagramStates  = 400
	mostDiagramSignals = 2000
)

// wire is a signal expression: for each component a sum of base quantities with constant
// factors. Base quantities are the diagram's inputs, the outputs of its systems and its
// named signals.
type wire []component

type component struct {
	name  string // of the component in a signal with several; "" for the signal's own
	unit  value.Unit
	terms map[int]amount // factor by base quantity, in the units of both
}

// named is a signal that a line of the diagram defines.
type named struct {
	name  syntax.Ident
	expr  syntax.Expr // nil for an input
	shape wire        // without terms: how many components, their names and units
	first int         // base quantity of the first component
	used  bool
}

// block is one use of a system.
type block struct {
	plant *value.Plant
	label string // what its states are called after where their names clash
	input wire
	first int // base quantity of its first output
	state int // of its first state in the whole
	at    place
}

// wiring builds a plant from a diagram.
type wiring struct {
	outer   Outer
	source  *diag.Source
	name    string
	signals map[string]*named
	order   []*named
	inputs  []value.Signal
	outputs []diagramOutput
	factors map[syntax.Expr][]*system // of each product's factor, applied from the last to the first
	systems []*system                 // all of them, as they stand in the text
	every   *value.Number
	blocks  []*block
	bases   int
	target  string // the signal whose line is being read
	loops   []string
	notes   []string
}

type diagramOutput struct {
	signal syntax.Signal
	wire   wire
}

// system is a constant or a system that multiplies a signal.
type system struct {
	value value.Value  // as evaluated
	plant *value.Plant // nil for a number or a quantity
	at    place
}

// BuildDiagram wires the systems of a diagram into one plant. Signals are deviations from
// the operating points of the systems. Notes of the plant say which algebraic loops were
// solved.
func BuildDiagram(source *diag.Source, statement *syntax.Diagram, outer Outer) (p *value.Plant, err *diag.Error) {
	w := &wiring{outer: outer, source: source, name: statement.Name.Name, signals: map[string]*named{}, factors: map[syntax.Expr][]*system{}}
	defer recoverFailure(&p, &err)
	w.declare(statement)
	w.collectSystems()
	w.shapes()
	w.number()
	w.connect()
	return w.assemble(statement), nil
}

func (w *wiring) here(span diag.Span) place { return place{w.source, span} }

func (w *wiring) declare(statement *syntax.Diagram) {
	for _, item := range statement.Items {
		switch item := item.(type) {
		case *syntax.Signals:
			if item.Role == "output" {
				continue
			}
			for _, entry := range item.Entries {
				s := w.signal(entry)
				w.add(&named{name: entry.Name, shape: wire{{unit: s.Unit}}})
				w.inputs = append(w.inputs, s)
			}
		case *syntax.Let:
			w.add(&named{name: item.Name, expr: item.Expr})
		}
	}
	for _, item := range statement.Items {
		if item, ok := item.(*syntax.Signals); ok && item.Role == "output" {
			for _, entry := range item.Entries {
				w.output(entry)
			}
		}
	}
	if len(w.outputs) == 0 {
		failWith(w.here(statement.Name.Span), diag.New(diag.Name, "the diagram %s has no output", w.name).WithHelp("output y"))
	}
}

func (w *wiring) add(n *named) {
	if first, ok := w.signals[n.name.Name]; ok {
		line, _ := w.source.Position(first.name.Span.Start)
		failWith(w.here(n.name.Span), diag.New(diag.Name, "the signal %s is defined twice", n.name.Name).WithHelp("first in line %d", line))
	}
	if len(w.order) == mostDiagramSignals {
		fail(w.here(n.name.Span), diag.Limit, "a diagram has at most %d signals", mostDiagramSignals)
	}
	w.signals[n.name.Name] = n
	w.order = append(w.order, n)
}

// signal reads the unit and range of an entry.
func (w *wiring) signal(entry syntax.Signal) value.Signal {
	b := &builder{Model: &Model{source: w.source}, outer: w.outer, scope: &scope{source: w.source}}
	return b.signal(entry).Signal
}

func (w *wiring) output(entry syntax.Signal) {
	if entry.Expr == nil {
		if _, ok := w.signals[entry.Name.Name]; !ok {
			w.failUnknown(entry.Name)
		}
	} else if first, ok := w.signals[entry.Name.Name]; ok {
		line, _ := w.source.Position(first.name.Span.Start)
		failWith(w.here(entry.Name.Span), diag.New(diag.Name, "the signal %s is defined twice", entry.Name.Name).WithHelp("first in line %d", line))
	}
	for _, other := range w.outputs {
		if other.signal.Name.Name == entry.Name.Name {
			fail(w.here(entry.Name.Span), diag.Name, "the output %s is listed twice", entry.Name.Name)
		}
	}
	w.outputs = append(w.outputs, diagramOutput{signal: entry})
}

func (w *wiring) failUnknown(name syntax.Ident) {
	e := diag.New(diag.Name, "there is no signal %s in the diagram", name.Name)
	var candidates []string
	for _, n := range w.order {
		candidates = append(candidates, n.name.Name)
	}
	if near := nearestOf(name.Name, candidates); near != "" {
		e.WithHelp("is %s meant?", near)
	} else {
		e.WithHelp("its signals are %s", listed(candidates))
	}
	failWith(w.here(name.Span), e)
}

// usesSignals tells whether an expression uses a signal of the diagram.
func (w *wiring) usesSignals(e syntax.Expr) bool {
	found := false
	walk(e, func(n *syntax.Name) {
		if _, ok := w.signals[n.Name]; ok {
			found = true
		}
	})
	return found
}

// collectSystems evaluates every factor without signals, and agrees on the sample time.
func (w *wiring) collectSystems() {
	visit := func(e syntax.Expr) {
		if e != nil {
			w.collect(e)
		}
	}
	for _, n := range w.order {
		visit(n.expr)
	}
	for _, o := range w.outputs {
		visit(o.signal.Expr)
	}
	w.agreeOnTime()
	for _, s := range w.systems {
		w.realise(s)
	}
}

// collect finds the factors of one signal expression and refuses what is no sum of
// systems times signals.
func (w *wiring) collect(e syntax.Expr) {
	at := w.here(e.Extent())
	if !w.usesSignals(e) {
		if n, ok := e.(*syntax.Number); ok && n.Value.Sign() == 0 {
			return
		}
		problem := diag.New(diag.Type, "%s is no signal", excerpt(w.source, at.span)).WithHelp("a diagram adds signals and multiplies them by systems: u = H * e")
		v, err := w.outer.Evaluate(w.source, e, false)
		switch {
		case err != nil:
			problem = err
			if name, ok := e.(*syntax.Name); ok && err.Kind == diag.Name {
				w.failUnknown(syntax.Ident{Name: name.Name, Span: name.Span})
			}
		case isConstantValue(v):
			problem = diag.New(diag.Type, "%s is a constant, and the signals of a diagram are deviations", excerpt(w.source, at.span)).WithHelp("a disturbance is an input: input d")
		}
		failWith(at, problem)
	}
	switch e := e.(type) {
	case *syntax.Name:
	case *syntax.Unary:
		if e.Op != "-" {
			fail(w.here(e.At), diag.Type, "%s has no place among the signals of a diagram", e.Op)
		}
		w.collect(e.X)
	case *syntax.List:
		for _, x := range e.Elements {
			w.collect(x)
		}
	case *syntax.Index:
		w.collect(e.X)
	case *syntax.Binary:
		w.collectBinary(e)
	default:
		failWith(at, diag.New(diag.Type, "a diagram adds signals and multiplies them by systems; %s is neither", excerpt(w.source, at.span)).
			WithHelp("what is not linear belongs into a model"))
	}
}

func isConstantValue(v value.Value) bool {
	k := value.Force(v).Kind()
	return k == value.KNumber || k == value.KQuantity
}

func (w *wiring) collectBinary(e *syntax.Binary) {
	left, right := w.usesSignals(e.L), w.usesSignals(e.R)
	switch e.Op {
	case "+", "-":
		w.collect(e.L)
		w.collect(e.R)
		return
	case "*":
		switch {
		case left && right:
			failWith(w.here(e.At), diag.New(diag.Type, "two signals are multiplied, and a diagram is linear").WithHelp("what is not linear belongs into a model"))
		case right:
			w.factor(e.L)
			w.collect(e.R)
		default:
			if !w.isConstantFactor(e.R) {
				failWith(w.here(e.R.Extent()), diag.New(diag.Type, "a system multiplies a signal from the left").
					WithHelp("write %s * %s", excerpt(w.source, e.R.Extent()), excerpt(w.source, e.L.Extent())))
			}
			w.collect(e.L)
		}
		return
	case "/":
		if !right {
			if !w.isConstantFactor(e.R) {
				failWith(w.here(e.R.Extent()), diag.New(diag.Type, "a signal is divided by numbers only").WithHelp("multiply by the inverse system from the left"))
			}
			w.collect(e.L)
			return
		}
		failWith(w.here(e.At), diag.New(diag.Type, "a division by a signal is not linear").WithHelp("what is not linear belongs into a model"))
	}
	failWith(w.here(e.At), diag.New(diag.Type, "%s has no place among the signals of a diagram", e.Op).WithHelp("what is not linear belongs into a model"))
}
