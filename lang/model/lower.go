package model

import (
	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// term is a lowered expression: its node in SI, its dimension and how it was written.
type term struct {
	node    id
	dim     dimension
	truth   bool // a condition, not a number
	isZero  bool // a zero without a unit: it fits any
	celsius bool // a number written in degC: a point on a scale
	at      place
}

// scope is the text an expression stands in. Inside a function the names of the model
// are not seen.
type scope struct {
	source  *diag.Source
	params  map[string]term // of the function being written out; nil in the model itself
	library bool
	depth   int
}

func (s *scope) inFunction() bool { return s.params != nil }

func (s *scope) at(span diag.Span) place { return place{s.source, span} }

// failure carries an error out of the recursion; Build recovers it.
type failure struct{ err *diag.Error }

func fail(at place, kind diag.Kind, format string, args ...any) {
	failWith(at, diag.New(kind, format, args...))
}

func failWith(at place, err *diag.Error) {
	err = err.At(at.span)
	if at.source != nil {
		err = err.In(at.source)
	}
	panic(failure{err})
}

// number lowers an expression that must be a number.
func (b *builder) number(s *scope, e syntax.Expr) term {
	t := b.lower(s, e)
	if t.truth {
		fail(t.at, diag.Type, "a condition stands where a number is needed")
	}
	return t
}

// condition lowers an expression that must be true or false.
func (b *builder) condition(s *scope, e syntax.Expr) term {
	t := b.lower(s, e)
	if !t.truth {
		failWith(t.at, diag.New(diag.Type, "a number stands where a condition is needed").WithHelp("a condition is written like v > 0 m/s"))
	}
	return t
}

func (b *builder) lower(s *scope, e syntax.Expr) term {
	if len(b.g.nodes) > mostNodes {
		fail(s.at(e.Extent()), diag.Limit, "the equations of the model are too large: more than %d operations", mostNodes)
	}
	at := s.at(e.Extent())
	switch e := e.(type) {
	case *syntax.Number:
		return b.literal(e, at)
	case *syntax.Name:
		return b.name(s, e)
	case *syntax.Boolean:
		n := 0
		if e.Value {
			n = 1
		}
		return term{node: b.g.whole(n), truth: true, at: at}
	case *syntax.Unary:
		return b.unary(s, e)
	case *syntax.Binary:
		return b.binary(s, e)
	case *syntax.If:
		return b.choice(s, e)
	case *syntax.Call:
		return b.call(s, e)
	}
	return b.outside(s, e)
}

func (b *builder) literal(e *syntax.Number, at place) term {
	if e.Imaginary {
		fail(at, diag.Type, "an imaginary number has no place in an equation of a model")
	}
	if e.Unit == nil {
		return term{node: b.g.constant(exactly(e.Value), at), isZero: e.Value.Sign() == 0, at: at}
	}
	unit, err := resolveUnit(e.Unit)
	if err != nil {
		failWith(at, err)
	}
	return b.quantity(value.Quantity{Magnitude: value.Rat(e.Value), Unit: unit}, at)
}

// quantity lowers a number with a unit.
func (b *builder) quantity(q value.Quantity, at place) term {
	a, err := toSI(q.Magnitude, q.Unit)
	if err != nil {
		failWith(at, asError(err))
	}
	return term{node: b.g.constant(a, at), dim: dimensionOf(q.Unit.Dim), celsius: q.Unit.Offset != nil, at: at}
}

// name lowers the use of a name: of the function's parameter, of the model, of what is outside.
func (b *builder) name(s *scope, e *syntax.Name) term {
	at := s.at(e.Span)
	if s.inFunction() {
		if t, ok := s.params[e.Name]; ok {
			t.at = at
			return t
		}
		return b.outside(s, e)
	}
	d, ok := b.names[e.Name]
	if !ok {
		return b.outside(s, e)
	}
	t := b.declared(d, at)
	t.at, t.isZero = at, false
	return t
}

// outside evaluates what uses no name of the model and takes it as a constant.
func (b *builder) outside(s *scope, e syntax.Expr) term {
	at := s.at(e.Extent())
	if name, ok := e.(*syntax.Name); ok && name.Name == "pi" && !b.isRebound("pi", s) {
		return term{node: b.g.constant(amount{n: value.Int(1), pi: 1}, at), at: at}
	}
	b.refuseModelNames(s, e)
	v, err := b.outer.Evaluate(s.source, e, s.library)
	if err != nil {
		b.explainUnknown(s, e, err)
		failWith(at, err)
	}
	switch v := value.Force(v).(type) {
	case value.Number:
		return term{node: b.g.constant(amount{n: v}, at), isZero: v.IsExact() && v.IsZero(), at: at}
	case value.Quantity:
		if v.Unit.IsHertz() {
			fail(at, diag.Unit, "%s does not say whether 2π belongs to it in a model", v.Unit.Text)
		}
		return b.quantity(v, at)
	case value.Boolean:
		n := 0
		if v {
			n = 1
		}
		return term{node: b.g.whole(n), truth: true, at: at}
	case *value.Polynomial:
		failWith(at, diag.New(diag.Type, "%s is a polynomial here, and an equation needs a number", excerpt(s.source, at.span)).
			WithHelp("inside a model the name is free: declare it as a state, an input, a given or a let"))
	case *value.Matrix:
		failWith(at, diag.New(diag.Type, "%s is %s, and an equation needs a number", excerpt(s.source, at.span), value.Describe(v)).
			WithHelp("an entry is written A[1, 2]; a table of two columns is used by interpolate(table, x)"))
	default:
		fail(at, diag.Type, "%s is %s, and an equation needs a number", excerpt(s.source, at.span), value.Describe(v))
	}
	return term{}
}

// isRebound tells whether pi stands for something else than the built-in.
func (b *builder) isRebound(name string, s *scope) bool {
	v, err := b.outer.Evaluate(s.source, &syntax.Name{Name: name}, s.library)
	if err != nil {
		return true
	}
	n, ok := value.Force(v).(value.Number)
	return !ok || n.IsExact() || n.F != value.Pi().F
}

// explainUnknown names the nearest name of model and surroundings for an unknown one.
func (b *builder) explainUnknown(s *scope, e syntax.Expr, err *diag.Error) {
	name, ok := e.(*syntax.Name)
	if !ok || err.Kind != diag.Name || s.inFunction() {
		return
	}
	candidates := make([]string, 0, len(b.names))
	for n := range b.names {
		candidates = append(candidates, n)
	}
	if near := nearestOf(name.Name, candidates); near != "" {
		err.Help = "is " + near + " meant?"
	}
}

func (b *builder) unary(s *scope, e *syntax.Unary) term {
	at := s.at(e.Span)
	switch e.Op {
	case "not":
		x := b.condition(s, e.X)
		return term{node: b.g.apply(opNot, at, x.node), truth: true, at: at}
	case "ᵀ":
		fail(s.at(e.At), diag.Type, "ᵀ has no place in an equation of a model: its signals are numbers")
	}
	x := b.number(s, e.X)
	if x.celsius {
		b.refuseCelsius(x, "negated: -5 degC is written with its sign, and here it is computed")
	}
	x.node, x.at = b.g.apply(opNegate, at, x.node), at
	return x
}

func (b *builder) binary(s *scope, e *syntax.Binary) term {
	at := s.at(e.Span)
	switch e.Op {
	case "and", "or":
		l, r := b.condition(s, e.L), b.condition(s, e.R)
		o := opAnd
		if e.Op == "or" {
			o = opOr
		}
		return term{node: b.g.apply(o, at, l.node, r.node), truth: true, at: at}
	case "±":
		failWith(s.at(e.At), diag.New(diag.Syntax, "± has no place in an equation").WithHelp("a tolerance belongs to given: given m = 3 kg ± 5%%"))
	case "^":
		return b.power(s, e)
	}
	l, r := b.number(s, e.L), b.number(s, e.R)
	switch e.Op {
	case "+", "-":
		return b.sum(s, e, l, r)
	case "*":
		b.refuseCelsius(l, "multiplied")
		b.refuseCelsius(r, "multiplied")
		return b.bounded(term{node: b.g.apply(opMultiply, at, l.node, r.node), dim: l.dim.times(r.dim, 1), isZero: l.isZero || r.isZero, at: at})
	case "/":
		b.refuseCelsius(l, "divided")
		b.refuseCelsius(r, "divided by")
		if r.isZero {
			fail(r.at, diag.Numerical, "division by zero")
		}
		return b.bounded(term{node: b.g.apply(opDivide, at, l.node, r.node), dim: l.dim.times(r.dim, -1), isZero: l.isZero, at: at})
	}
	return b.comparison(s, e, l, r)
}

func (b *builder) bounded(t term) term {
	if !t.dim.bounded() {
		fail(t.at, diag.Unit, "the exponents of this unit are too large")
	}
	return t
}

// refuseCelsius: a number written in degC is a point on a scale, not an amount.
func (b *builder) refuseCelsius(t term, how string) {
	if t.celsius {
		failWith(t.at, diag.New(diag.Unit, "a temperature in degC is a point on a scale and is not %s", how).WithHelp("write differences, and temperatures that are factors, in K"))
	}
}

func (b *builder) sum(s *scope, e *syntax.Binary, l, r term) term {
	o, what := opAdd, "adding"
	if e.Op == "-" {
		o, what = opSubtract, "subtracting"
	}
	dim := b.agree(what+" quantities of different kinds", l, r)
	if o == opAdd {
		// 5 degC added to a temperature would add 278.15 K.
		b.refuseCelsius(l, "added")
		b.refuseCelsius(r, "added")
	}
	at := s.at(e.Span)
	return term{node: b.g.apply(o, at, l.node, r.node), dim: dim, isZero: l.isZero && r.isZero, at: at}
}

// agree checks that two terms have one dimension; the caret stands under the right one.
func (b *builder) agree(what string, l, r term) dimension {
	switch {
	case l.isZero:
		return r.dim
	case r.isZero:
		return l.dim
	case l.dim.fits(r.dim):
		return l.dim.either(r.dim)
	}
	side := func(t term) string {
		if t.dim.isPlain() {
			return excerpt(t.at.source, t.at.span) + " has no unit"
		}
		return excerpt(t.at.source, t.at.span) + " is in " + t.dim.String()
	}
	e := diag.New(diag.Unit, "%s: %s, %s", what, side(l), side(r))
	switch {
	case r.dim.isPlain():
		e.WithHelp("a plain number is added to nothing but plain numbers; write it with its unit, in %s", l.dim)
	case l.dim.isPlain():
		e.WithHelp("a plain number is added to nothing but plain numbers; write it with its unit, in %s", r.dim)
	default:
		if ratio := l.dim.times(r.dim, -1); !ratio.isPlain() {
			e.WithHelp("they differ by a factor in %s", ratio)
		}
	}
	failWith(r.at, e)
	return plain
}

var comparisons = map[string]operation{"<": opLess, "<=": opAtMost, "==": opEqual, "!=": opUnequal, ">": opLess, ">=": opAtMost}

func (b *builder) comparison(s *scope, e *syntax.Binary, l, r term) term {
	o, ok := comparisons[e.Op]
	if !ok {
		fail(s.at(e.At), diag.Syntax, "%s has no place in an equation of a model", e.Op)
	}
	b.agree("comparing quantities of different kinds", l, r)
	if e.Op == ">" || e.Op == ">=" {
		l, r = r, l
	}
	at := s.at(e.Span)
	return term{node: b.g.apply(o, at, l.node, r.node), truth: true, at: at}
}

func (b *builder) power(s *scope, e *syntax.Binary) term {
	base, exponent := b.number(s, e.L), b.number(s, e.R)
	at := s.at(e.Span)
	b.refuseCelsius(base, "raised to a power")
	if !exponent.dim.isPlain() && !exponent.dim.open {
		fail(exponent.at, diag.Unit, "an exponent has no unit; this one is in %s", exponent.dim)
	}
	if a, ok := b.g.isConstant(exponent.node); ok && a.isExact() && a.pi == 0 {
		e := a.n.Exact
		if !e.IsInt() && !e.Denom().IsInt64() || e.Num().BitLen() > 40 || e.Denom().BitLen() > 40 {
			fail(exponent.at, diag.Limit, "the exponent is too large")
		}
		dim, ok := base.dim.power(e.Num().Int64(), e.Denom().Int64())
		if !ok {
			fail(exponent.at, diag.Unit, "the power %s of %s has no unit", e.RatString(), base.dim)
		}
		if e.Sign() == 0 {
			dim = plain
		}
		return term{node: b.g.power(base.node, e, at), dim: dim, at: at}
	}
	if !base.dim.isPlain() && !base.dim.open {
		failWith(base.at, diag.New(diag.Unit, "%s is in %s and has a power that is not fixed, so the result has no unit", excerpt(base.at.source, base.at.span), base.dim).
			WithHelp("divide it by a reference value first, as in (p/p0)^n"))
	}
	return term{node: b.g.apply(opPowerOf, at, base.node, exponent.node), dim: base.dim, at: at}
}

func (b *builder) choice(s *scope, e *syntax.If) term {
	c := b.condition(s, e.Cond)
	x, y := b.lower(s, e.Then), b.lower(s, e.Else)
	at := s.at(e.Span)
	if x.truth != y.truth {
		fail(y.at, diag.Type, "one branch of the if is a number and the other is a condition")
	}
	out := term{truth: x.truth, isZero: x.isZero && y.isZero, at: at}
	if !x.truth {
		out.dim = b.agree("the branches of the if are of different kinds", x, y)
	}
	out.node = b.g.apply(opSelect, at, c.node, x.node, y.node)
	return out
}
