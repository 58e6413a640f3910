package model

import (
	"math/big"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// partial is one entry of a sparse gradient; variables are the states, then the inputs.
type partial struct {
	variable int
	slope    amount
}

// dual is a node's value with its gradient at one point: forward differentiation
// (Wengert 1964) over rationals where the data and the functions allow it.
type dual struct {
	value    amount
	gradient []partial // ascending variables, zeros left out
	taken    int8      // of a choice: 1 for b, 2 for c, 3 for a; 0 where all operands count
	remark   string    // where the node has a corner or a jump at the point
	err      *diag.Error
}

// point is where the graph is evaluated, all in declared units.
type point struct {
	parameters, states, inputs []value.Number
}

// evaluation holds the duals of all nodes that the roots need.
type evaluation struct {
	g      *graph
	point  point
	slopes bool // with gradients
	duals  []dual
	seeds  int // number of states, where the variables of inputs begin
}

// evaluate computes the roots. Errors stay with their nodes, so that the branch of an if
// that is not taken does no harm.
func (g *graph) evaluate(p point, slopes bool, roots ...id) *evaluation {
	e := &evaluation{g: g, point: p, slopes: slopes, duals: make([]dual, len(g.nodes)), seeds: len(p.states)}
	for k, needed := range g.reach(roots...) {
		if needed {
			e.duals[k] = e.node(&g.nodes[k])
		}
	}
	return e
}

// at gives a root, or the error that it met.
func (e *evaluation) at(x id) (dual, *diag.Error) {
	d := e.duals[x]
	return d, d.err
}

// remarks lists the switches that the roots stand on, of branches that are taken.
func (e *evaluation) remarks(roots ...id) []id {
	active := make([]bool, len(e.g.nodes))
	for _, r := range roots {
		active[r] = true
	}
	var out []id
	for k := len(active) - 1; k >= 0; k-- {
		if !active[k] {
			continue
		}
		if e.duals[k].remark != "" {
			out = append(out, id(k))
		}
		n := &e.g.nodes[k]
		for i, o := range n.operands() {
			if t := e.duals[k].taken; t == 0 || n.operation == opSelect && i == 0 || int(t)%3 == i {
				active[o] = true
			}
		}
	}
	return out
}

func (e *evaluation) node(n *node) dual {
	var operands [3]*dual
	for k, o := range n.operands() {
		operands[k] = &e.duals[o]
	}
	if n.operation == opSelect {
		return choose(operands)
	}
	for _, d := range operands {
		if d != nil && d.err != nil {
			return dual{err: d.err}
		}
	}
	out, err := e.compute(n, operands[0], operands[1], operands[2])
	if err != nil {
		located := asError(err)
		if located.Message == errNotReal.Message && n.at.source != nil {
			located = diag.New(diag.Numerical, "%s is not a real number at this point", excerpt(n.at.source, n.at.span))
		}
		if divisor := n.b; n.operation == opDivide && operands[1].value.isZero() && e.g.nodes[divisor].at.source != nil {
			from := e.g.nodes[divisor].at
			located.WithHelp("%s is zero there", excerpt(from.source, from.span))
		}
		out.err = located.At(n.at.span)
		if n.at.source != nil {
			out.err = out.err.In(n.at.source)
		}
	}
	return out
}

// choose takes the branch of an if.
func choose(o [3]*dual) dual {
	if o[0].err != nil {
		return dual{err: o[0].err}
	}
	taken, which := o[1], int8(1)
	if o[0].value.isZero() {
		taken, which = o[2], 2
	}
	return dual{value: taken.value, gradient: taken.gradient, err: taken.err, taken: which}
}

func (e *evaluation) compute(n *node, a, b, c *dual) (dual, error) {
	switch n.operation {
	case opConstant:
		return dual{value: n.amount}, nil
	case opParameter:
		return dual{value: amount{n: e.point.parameters[n.index]}}, nil
	case opState:
		return e.seed(e.point.states[n.index], n.index), nil
	case opInput:
		return e.seed(e.point.inputs[n.index], e.seeds+n.index), nil
	case opAdd, opSubtract, opMultiply, opDivide, opNegate:
		return e.arithmetic(n.operation, a, b)
	case opPower:
		return powerDual(a, n.exponent)
	case opPowerOf:
		return powerOfDual(a, b)
	case opSqrt:
		return powerDual(a, half)
	case opAtan2:
		return atan2Dual(a, b)
	case opAbs, opSign:
		return cornerDual(n.operation, a)
	case opMin, opMax:
		return extremeDual(n.operation, a, b)
	case opLimit:
		return limitDual(a, b, c)
	case opInterpolate:
		y, slope, where, err := e.g.tables[n.index].exactAt(a.value)
		if err != nil {
			return dual{}, err
		}
		out, err := a.chain(y, slope)
		if where != "" {
			out.remark = "the table is read " + where
		}
		return out, err
	case opLess, opAtMost, opEqual, opUnequal, opAnd, opOr, opNot:
		return truthDual(n.operation, a, b)
	}
	return functionDual(n.operation, a)
}

func (e *evaluation) seed(n value.Number, variable int) dual {
	d := dual{value: amount{n: n}}
	if e.slopes {
		d.gradient = []partial{{variable, oneAmount}}
	}
	return d
}

// chain gives f(a) with the slope f′(a).
func (d *dual) chain(y, slope amount) (dual, error) {
	out := dual{value: y}
	if slope.isZero() && slope.isExact() {
		return out, nil
	}
	var err error
	out.gradient, err = scaleGradient(d.gradient, slope)
	return out, err
}

func scaleGradient(g []partial, by amount) ([]partial, error) {
	out := make([]partial, 0, len(g))
	for _, p := range g {
		slope, err := p.slope.multiply(by)
		if err != nil {
			return nil, err
		}
		if !slope.isExact() || !slope.isZero() {
			out = append(out, partial{p.variable, slope})
		}
	}
	return out, nil
}

// addGradients merges two sparse gradients.
func addGradients(g, h []partial) ([]partial, error) {
	if len(g) == 0 {
		return h, nil
	}
	if len(h) == 0 {
		return g, nil
	}
	out := make([]partial, 0, len(g)+len(h))
	i, j := 0, 0
	for i < len(g) || j < len(h) {
		switch {
		case j == len(h) || i < len(g) && g[i].variable < h[j].variable:
			out = append(out, g[i])
			i++
		case i == len(g) || h[j].variable < g[i].variable:
			out = append(out, h[j])
			j++
		default:
			slope, err := g[i].slope.add(h[j].slope)
			if err != nil {
				return nil, err
			}
			if !slope.isExact() || !slope.isZero() {
				out = append(out, partial{g[i].variable, slope})
			}
			i++
			j++
		}
	}
	return out, nil
}

// combine gives the value y with the gradient α·∇a + β·∇b.
func combine(y amount, a *dual, alpha amount, b *dual, beta amount) (dual, error) {
	g, err := scaleGradient(a.gradient, alpha)
	if err != nil {
		return dual{}, err
	}
	h, err := scaleGradient(b.gradient, beta)
	if err != nil {
		return dual{}, err
	}
	sum, err := addGradients(g, h)
	return dual{value: y, gradient: sum}, err
}

func (e *evaluation) arithmetic(o operation, a, b *dual) (dual, error) {
	minusOne := oneAmount.negate()
	switch o {
	case opNegate:
		return a.chain(a.value.negate(), minusOne)
	case opAdd:
		y, err := a.value.add(b.value)
		if err != nil {
			return dual{}, err
		}
		sum, err := addGradients(a.gradient, b.gradient)
		return dual{value: y, gradient: sum}, err
	case opSubtract:
		y, err := a.value.subtract(b.value)
		if err != nil {
			return dual{}, err
		}
		return combine(y, a, oneAmount, b, minusOne)
	case opMultiply:
		y, err := a.value.multiply(b.value)
		if err != nil {
			return dual{}, err
		}
		return combine(y, a, b.value, b, a.value)
	}
	if b.value.isZero() {
		return dual{}, diag.New(diag.Numerical, "division by zero at this point")
	}
	y, err := a.value.divide(b.value)
	if err != nil {
		return dual{}, err
	}
	inverse, err := oneAmount.divide(b.value)
	if err != nil {
		return dual{}, err
	}
	beta, err := y.negate().multiply(inverse)
	if err != nil {
		return dual{}, err
	}
	return combine(y, a, inverse, b, beta)
}

// powerDual is aᵉ for a constant e.
func powerDual(a *dual, e *big.Rat) (dual, error) {
	if e.Sign() == 0 {
		return dual{value: oneAmount}, nil
	}
	if a.value.isZero() && e.Sign() < 0 {
		return dual{}, diag.New(diag.Numerical, "division by zero at this point")
	}
	y, err := a.value.power(e)
	if err != nil || len(a.gradient) == 0 {
		return dual{value: y}, err
	}
	rest := new(big.Rat).Sub(e, ratOne)
	if a.value.isZero() && rest.Sign() < 0 {
		return dual{}, diag.New(diag.Numerical, "the slope is infinite at this point: a root of zero").
			WithHelp("choose another operating point")
	}
	slope := oneAmount
	if rest.Sign() != 0 {
		if slope, err = a.value.power(rest); err != nil {
			return dual{}, err
		}
	}
	if slope, err = slope.multiply(exactly(e)); err != nil {
		return dual{}, err
	}
	return a.chain(y, slope)
}

var ratOne = big.NewRat(1, 1)

// truthDual is 1 or 0; a comparison of what is equal within rounding is a switch.
func truthDual(o operation, a, b *dual) (dual, error) {
	is := func(t bool) dual {
		if t {
			return dual{value: oneAmount}
		}
		return dual{value: zeroAmount}
	}
	switch o {
	case opNot:
		return is(a.value.isZero()), nil
	case opAnd:
		return is(!a.value.isZero() && !b.value.isZero()), nil
	case opOr:
		return is(!a.value.isZero() || !b.value.isZero()), nil
	}
	sign, tied, err := a.value.compare(b.value)
	if err != nil {
		return dual{}, err
	}
	var out dual
	switch o {
	case opLess:
		out = is(sign < 0)
	case opAtMost:
		out = is(sign <= 0)
	case opEqual:
		out = is(sign == 0)
	default:
		out = is(sign != 0)
	}
	if tied && (len(a.gradient) > 0 || len(b.gradient) > 0) {
		out.remark = "both sides of the condition are equal"
	}
	return out, nil
}
