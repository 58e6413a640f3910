package model

import (
	"fmt"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// Model is a model statement that was understood: its signals, its equations as one
// expression graph, and how its operating point is found.
type Model struct {
	Name    string
	Every   *value.Number // the sample time in seconds; nil when continuous
	Givens  []Given
	States  []Signal
	Inputs  []Signal
	Outputs []Signal
	Notes   []string

	source    *diag.Source
	statement *syntax.Model
	g         *graph
	rates     []id // of each state, in its declared unit (per second)
	outputs   []id // in the declared units
	around    around
	program   *Program
	operating operating
}

// Given is a parameter: its nominal value and tolerance in the unit it was written in.
type Given struct {
	Name      string
	Unit      value.Unit
	Nominal   value.Number
	Tolerance *value.Number // absolute, in Unit; nil when none
	Percent   bool          // the tolerance was written in per cent of the nominal value
	At        diag.Span
}

// Low is the lower end of the tolerance, the nominal value when there is none.
func (g Given) Low() value.Number { return g.end(-1) }

// High is the upper end of the tolerance.
func (g Given) High() value.Number { return g.end(1) }

func (g Given) end(sign int) value.Number {
	if g.Tolerance == nil {
		return g.Nominal
	}
	step, err := amount{n: *g.Tolerance}.multiply(amount{n: value.Int(sign)})
	if err != nil {
		return g.Nominal
	}
	out, err := amount{n: g.Nominal}.add(step)
	if err != nil {
		return g.Nominal
	}
	return out.n
}

// Signal is an input, a state or an output.
type Signal struct {
	value.Signal
	At   diag.Span // of the name
	Text string    // the equation as written: of a state its rate, of an output what it is; "" for none
	expr diag.Span // of the equation
}

// The bounds of a model.
const (
	MostStates     = 400
	MostSignals    = 400 // inputs, and outputs
	MostParameters = 1000
	mostLets       = 10_000
)

// lets lists the lets as written: name and right side.
func (m *Model) lets() [][2]string {
	var out [][2]string
	for _, item := range m.statement.Items {
		if item, ok := item.(*syntax.Let); ok {
			out = append(out, [2]string{item.Name.Name, sliceOf(m.source, item.Expr.Extent())})
		}
	}
	return out
}

// kind of a name that a model declares.
type kind int

const (
	isGiven kind = iota
	isState
	isInput
	isOutput
	isLet
)

// declaration is a name of the model.
type declaration struct {
	kind  kind
	index int
	name  syntax.Ident
	expr  syntax.Expr // of a let and of an output with an equation
	term  *term       // once lowered
	used  bool
}

func (d *declaration) kindName() string {
	return [...]string{"a given", "a state", "an input", "an output", "a let"}[d.kind]
}

type builder struct {
	*Model
	outer        Outer
	names        map[string]*declaration
	order        []*declaration
	tableIndexes map[value.Value]int
	scope        *scope
	visiting     []*declaration // lets being lowered, outermost first
	outs         []*declaration // of the outputs, in order
}

// Build understands a model statement, finds its operating point and linearises it.
// The errors carry their places. Value gives the result as a value of the language.
func Build(source *diag.Source, statement *syntax.Model, outer Outer) (m *Model, err *diag.Error) {
	b := &builder{
		Model: &Model{Name: statement.Name.Name, source: source, statement: statement, g: newGraph()},
		outer: outer, names: map[string]*declaration{}, tableIndexes: map[value.Value]int{},
		scope: &scope{source: source},
	}
	defer recoverFailure(&m, &err)
	b.declareAll()
	b.equations()
	b.readAround()
	b.remarkUnused()
	b.solve()
	return b.Model, nil
}

// recoverFailure turns the failure of the recursion into its result.
func recoverFailure[T any](out **T, err **diag.Error) {
	switch p := recover().(type) {
	case nil:
	case failure:
		*out, *err = nil, p.err
	default:
		panic(p)
	}
}

// readGiven reads the nominal value and the tolerance.
func (b *builder) readGiven(i int) {
	g := &b.Givens[i]
	d := b.names[g.Name]
	var item *syntax.Given
	for _, x := range b.statement.Items {
		if x, ok := x.(*syntax.Given); ok && x.Name.Name == g.Name {
			item = x
		}
	}
	if n := b.modelName(b.scope, d.expr); n != nil {
		failWith(b.here(n.Span), diag.New(diag.Name, "the value of a given is fixed and does not follow %s", n.Name).
			WithHelp("write let %s = …: a let follows what it is made of, tolerances included", g.Name))
	}
	at := b.here(d.expr.Extent())
	v, problem := b.outer.Evaluate(b.source, d.expr, false)
	if problem != nil {
		failWith(at, problem)
	}
	q, err := quantityOf(v)
	if err != nil {
		failWith(at, diag.New(diag.Type, "a given is a number, with or without a unit; this is %s", value.Describe(v)))
	}
	if q.Unit.IsHertz() {
		failWith(at, diag.New(diag.Unit, "%s does not say whether 2π belongs to it in a model", q.Unit.Text).
			WithHelp("write rad/s for an angular frequency (2π for each cycle), or 1/s for a rate"))
	}
	g.Nominal, g.Unit = q.Magnitude, q.Unit
	if item.Tolerance != nil {
		b.readTolerance(g, item.Tolerance)
	}
}

func quantityOf(v value.Value) (value.Quantity, error) {
	switch v := value.Force(v).(type) {
	case value.Number:
		return value.Quantity{Magnitude: v, Unit: value.None()}, nil
	case value.Quantity:
		return v, nil
	}
	return value.Quantity{}, errNotReal
}

func (b *builder) readTolerance(g *Given, e syntax.Expr) {
	at := b.here(e.Extent())
	var tolerance value.Number
	if n, ok := e.(*syntax.Number); ok && n.Percent {
		g.Percent = true
		if g.Unit.Offset != nil {
			failWith(at, diag.New(diag.Unit, "a per cent of a temperature in degC has no meaning: its zero is arbitrary").WithHelp("write the tolerance in K, as in ± 2 K"))
		}
		if g.Nominal.IsZero() {
			failWith(at, diag.New(diag.Numerical, "the tolerance of %s is in per cent of its nominal value, and that is zero", g.Name).
				WithHelp("write it as an amount, as in ± 0.1%s", spaced(g.Unit.Text)))
		}
		part, err := amount{n: g.Nominal}.multiply(exactly(n.Value))
		if err != nil {
			failWith(at, asError(err))
		}
		tolerance = part.n
		if tolerance.Sign() < 0 {
			tolerance = part.negate().n
		}
	} else {
		unit := g.Unit
		if unit.Offset != nil {
			unit.Offset, unit.Text = nil, "K"
		}
		tolerance = b.inDeclaredUnit(e, unit, "the value of "+g.Name, false)
	}
	if tolerance.Sign() < 0 {
		fail(at, diag.Type, "a tolerance is not negative")
	}
	g.Tolerance = &tolerance
}

func spaced(unit string) string {
	if unit == "" {
		return ""
	}
	return " " + unit
}

func countOf(n int, noun string) string {
	if n == 1 {
		return "1 " + noun
	}
	return fmt.Sprintf("%d %ss", n, noun)
}

// nearestOf finds the candidate a misspelt name is meant to be.
func nearestOf(name string, candidates []string) string {
	for _, c := range candidates {
		if len(c) < 2 || len(name) < 2 {
			continue
		}
		if near := value.Nearest(name, candidates); near != "" {
			return near
		}
	}
	return ""
}
