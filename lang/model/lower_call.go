package model

import (
	"sort"
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// functions of one plain number
var plainFunctions = map[string]operation{
	"exp": opExp, "log": opLog, "log10": opLog10, "sin": opSin, "cos": opCos, "tan": opTan,
	"asin": opAsin, "acos": opAcos, "atan": opAtan,
}

// FunctionWords lists the functions that equations know, sorted.
func FunctionWords() []string {
	out := []string{"sqrt", "abs", "sign", "min", "max", "atan2", "limit", "interpolate"}
	for name := range plainFunctions {
		out = append(out, name)
	}
	sort.Strings(out)
	return out
}

func isEquationFunction(name string) bool {
	for _, n := range FunctionWords() {
		if n == name {
			return true
		}
	}
	return false
}

func (b *builder) call(s *scope, e *syntax.Call) term {
	name, ok := e.Function.(*syntax.Name)
	if !ok {
		return b.outside(s, e)
	}
	if !s.inFunction() {
		if d, ok := b.names[name.Name]; ok {
			failWith(s.at(name.Span), diag.New(diag.Type, "%s is %s of the model and cannot be called", name.Name, d.kindName()).
				WithHelp("a product is written %s*(…)", name.Name))
		}
	}
	if fn, ok := b.outer.Function(name.Name, s.library); ok {
		if b.usesModel(s, e) {
			return b.inline(s, e, name, fn)
		}
		return b.outside(s, e)
	}
	if !isEquationFunction(name.Name) {
		if b.usesModel(s, e) {
			b.unknownFunction(s, name)
		}
		return b.outside(s, e)
	}
	for _, a := range e.Args {
		if a.Name != nil {
			fail(s.at(a.Name.Span), diag.Name, "%s takes its arguments in order, without names", name.Name)
		}
	}
	return b.equationFunction(s, e, name.Name)
}

func (b *builder) unknownFunction(s *scope, name *syntax.Name) {
	e := diag.New(diag.Name, "%s is no function that an equation of a model can use", name.Name)
	if near := nearestOf(name.Name, FunctionWords()); near != "" {
		e.WithHelp("is %s meant?", near)
	} else {
		e.WithHelp("equations know %s, and functions made by define", strings.Join(FunctionWords(), ", "))
	}
	failWith(s.at(name.Span), e)
}

func (b *builder) equationFunction(s *scope, e *syntax.Call, name string) term {
	if name == "interpolate" {
		return b.interpolate(s, e)
	}
	args := make([]term, len(e.Args))
	for i, a := range e.Args {
		args[i] = b.number(s, a.Value)
	}
	at := s.at(e.Span)
	need := func(n int, form string) {
		if len(args) != n {
			failWith(at, diag.New(diag.Type, "%s takes %s, and %d are given", name, countOf(n, "argument"), len(args)).WithHelp("it is written %s", form))
		}
	}
	if o, ok := plainFunctions[name]; ok {
		need(1, name+"(x)")
		x := args[0]
		if !x.dim.isPlain() && !x.dim.open && !x.isZero {
			what := "a plain number"
			if o == opSin || o == opCos || o == opTan {
				what = "an angle or a plain number"
			}
			fail(x.at, diag.Unit, "%s takes %s; %s is in %s", name, what, excerpt(x.at.source, x.at.span), x.dim)
		}
		return term{node: b.g.apply(o, at, x.node), at: at}
	}
	switch name {
	case "sqrt":
		need(1, "sqrt(x)")
		dim, ok := args[0].dim.power(1, 2)
		if !ok {
			fail(args[0].at, diag.Unit, "the root of %s has no unit", args[0].dim)
		}
		return term{node: b.g.apply(opSqrt, at, args[0].node), dim: dim, at: at}
	case "abs":
		need(1, "abs(x)")
		return term{node: b.g.apply(opAbs, at, args[0].node), dim: args[0].dim, at: at}
	case "sign":
		need(1, "sign(x)")
		return term{node: b.g.apply(opSign, at, args[0].node), at: at}
	case "atan2":
		need(2, "atan2(y, x)")
		b.agree("the arguments of atan2 are of different kinds", args[0], args[1])
		return term{node: b.g.apply(opAtan2, at, args[0].node, args[1].node), at: at}
	case "limit":
		need(3, "limit(u, low, high)")
		dim := b.agree("the arguments of limit are of different kinds", args[0], args[1])
		dim = b.agree("the arguments of limit are of different kinds", term{dim: dim, isZero: args[0].isZero && args[1].isZero, at: args[0].at}, args[2])
		return term{node: b.g.apply(opLimit, at, args[0].node, args[1].node, args[2].node), dim: dim, at: at}
	}
	return b.extreme(name, args, at)
}

// extreme lowers min and max of any number of arguments.
func (b *builder) extreme(name string, args []term, at place) term {
	if len(args) == 0 {
		fail(at, diag.Type, "%s of nothing has no value", name)
	}
	o := opMin
	if name == "max" {
		o = opMax
	}
	out := args[0]
	for _, x := range args[1:] {
		dim := b.agree("the arguments of "+name+" are of different kinds", out, x)
		out = term{node: b.g.apply(o, at, out.node, x.node), dim: dim, isZero: out.isZero && x.isZero, at: out.at}
	}
	out.at = at
	return out
}

// interpolate lowers interpolate(TABLE, X).
func (b *builder) interpolate(s *scope, e *syntax.Call) term {
	at := s.at(e.Span)
	if len(e.Args) != 2 {
		failWith(at, diag.New(diag.Type, "interpolate takes 2 arguments, and %d are given", len(e.Args)).WithHelp("it is written interpolate(table, x)"))
	}
	source := e.Args[0].Value
	b.refuseModelNames(s, source)
	v, problem := b.outer.Evaluate(s.source, source, s.library)
	if problem != nil {
		failWith(s.at(source.Extent()), problem)
	}
	t, err := tableOf(v)
	if err != nil {
		failWith(s.at(source.Extent()), asError(err))
	}
	x := b.number(s, e.Args[1].Value)
	want := dimensionOf(t.xUnit.Dim)
	if !x.isZero && !x.dim.fits(want) {
		e := diag.New(diag.Unit, "the table's first column is in %s; %s is in %s", want, excerpt(x.at.source, x.at.span), x.dim)
		if want.isPlain() {
			e = diag.New(diag.Unit, "the table's first column has no unit; %s is in %s", excerpt(x.at.source, x.at.span), x.dim).
				WithHelp("divide by the table's unit, as in interpolate(valve, p/1 bar) * 1 L/min")
		}
		failWith(x.at, e)
	}
	index := b.tableIndex(v, t)
	return term{node: b.g.lookup(opInterpolate, index, x.node, at), dim: dimensionOf(t.yUnit.Dim), at: at}
}

// tableIndex keeps one copy of a table that stands in several equations.
func (b *builder) tableIndex(v value.Value, t *table) int {
	if i, ok := b.tableIndexes[v]; ok {
		return i
	}
	b.g.tables = append(b.g.tables, t)
	if v.Kind() == value.KMatrix || v.Kind() == value.KReport { // pointers: they can be keys
		b.tableIndexes[v] = len(b.g.tables) - 1
	}
	return len(b.g.tables) - 1
}

// deepest nesting of functions that are written out
const mostInlined = 60

// inline writes a function out with its arguments.
func (b *builder) inline(s *scope, e *syntax.Call, name *syntax.Name, fn Function) term {
	at := s.at(e.Span)
	if s.depth >= mostInlined {
		failWith(s.at(name.Span), diag.New(diag.Limit, "%s calls itself, or calls too many functions inside one another, to be written out in an equation", name.Name))
	}
	inner := &scope{source: fn.Source, params: map[string]term{}, library: fn.Library, depth: s.depth + 1}
	next := 0
	for _, a := range e.Args {
		param := ""
		switch {
		case a.Name != nil:
			param = a.Name.Name
			if !contains(fn.Params, param) {
				failWith(s.at(a.Name.Span), diag.New(diag.Name, "%s has no argument %s", name.Name, param).WithHelp("it takes %s", strings.Join(fn.Params, ", ")))
			}
		case next < len(fn.Params):
			param = fn.Params[next]
			next++
		default:
			fail(s.at(a.Value.Extent()), diag.Type, "%s takes %s, and %d are given", name.Name, countOf(len(fn.Params), "argument"), len(e.Args))
		}
		if _, twice := inner.params[param]; twice {
			fail(s.at(a.Value.Extent()), diag.Name, "%s is given twice", param)
		}
		inner.params[param] = b.lower(s, a.Value)
	}
	for _, p := range fn.Params {
		if _, ok := inner.params[p]; !ok {
			fail(at, diag.Type, "%s needs %s", name.Name, p)
		}
	}
	defer explainCall(s, at, name.Name, fn)
	t := b.lower(inner, fn.Body)
	return term{node: t.node, dim: t.dim, truth: t.truth, isZero: t.isZero, at: at}
}

// explainCall adds where a function was called to an error in its text. The library's text
// is not the user's: there the place moves to the call.
func explainCall(s *scope, at place, name string, fn Function) {
	switch p := recover().(type) {
	case nil:
	case failure:
		if p.err.Source == fn.Source && !s.inFunction() {
			line, _ := at.source.Position(at.span.Start)
			if fn.Library {
				p.err.Source, p.err.Span = at.source, at.span
			}
			if p.err.Help == "" {
				p.err.WithHelp("this arose in %s, called in line %d", name, line)
			}
		}
		panic(p)
	default:
		panic(p)
	}
}

func contains(list []string, name string) bool {
	for _, x := range list {
		if x == name {
			return true
		}
	}
	return false
}

// usesModel tells whether an expression uses a name of the model or a parameter that
// stands for one.
func (b *builder) usesModel(s *scope, e syntax.Expr) bool { return b.modelName(s, e) != nil }

func (b *builder) refuseModelNames(s *scope, e syntax.Expr) {
	if n := b.modelName(s, e); n != nil {
		failWith(s.at(n.Span), diag.New(diag.Type, "%s belongs to the model and cannot stand here: this part is worked out before the equations", n.Name).
			WithHelp("equations know + - * / ^, if, comparisons, %s, and functions made by define", strings.Join(FunctionWords(), ", ")))
	}
}

// modelName finds the first name of the model in an expression.
func (b *builder) modelName(s *scope, e syntax.Expr) *syntax.Name {
	var found *syntax.Name
	walk(e, func(n *syntax.Name) {
		if found != nil {
			return
		}
		if s.inFunction() {
			if _, ok := s.params[n.Name]; ok {
				found = n
			}
		} else if _, ok := b.names[n.Name]; ok {
			found = n
		}
	})
	return found
}

// walk visits the names of an expression; those of functions that are called and of
// variables that run through a list are left out.
func walk(e syntax.Expr, visit func(*syntax.Name)) {
	switch e := e.(type) {
	case *syntax.Name:
		visit(e)
	case *syntax.Unary:
		walk(e.X, visit)
	case *syntax.Binary:
		walk(e.L, visit)
		walk(e.R, visit)
	case *syntax.Call:
		if _, ok := e.Function.(*syntax.Name); !ok {
			walk(e.Function, visit)
		}
		for _, a := range e.Args {
			walk(a.Value, visit)
		}
	case *syntax.Index:
		walk(e.X, visit)
		for _, s := range e.Subscripts {
			walk(s.Low, visit)
			if s.High != nil {
				walk(s.High, visit)
			}
		}
	case *syntax.Field:
		walk(e.X, visit)
	case *syntax.List:
		for _, x := range e.Elements {
			walk(x, visit)
		}
	case *syntax.ForEach:
		inner := func(n *syntax.Name) {
			if n.Name != e.Variable.Name {
				visit(n)
			}
		}
		walk(e.In, visit)
		walk(e.Body, inner)
		if e.Where != nil {
			walk(e.Where, inner)
		}
	case *syntax.If:
		walk(e.Cond, visit)
		walk(e.Then, visit)
		walk(e.Else, visit)
	}
}
