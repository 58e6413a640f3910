package model

import (
	"math/big"
	"sort"

	"gainwright/lang/value"
)

// derivative is a node's derivative by one variable: states first, then inputs.
type derivative struct {
	variable int
	node     id
}

// differentiator writes derivatives out as further nodes of the graph, one for each
// variable that a node depends on.
type differentiator struct {
	g      *graph
	states int
	of     [][]derivative
}

// mostDerivatives bounds the size of the written-out program.
const mostDerivatives = 2_000_000

// differentiate gives the derivatives of the roots; false when the program would be too large.
func (g *graph) differentiate(states int, roots []id) ([][]derivative, bool) {
	d := &differentiator{g: g, states: states, of: make([][]derivative, len(g.nodes))}
	for k, needed := range g.reach(roots...) {
		if !needed {
			continue
		}
		if d.of[k] = d.node(id(k)); len(g.nodes) > mostDerivatives {
			return nil, false
		}
	}
	out := make([][]derivative, len(roots))
	for i, r := range roots {
		out[i] = d.of[r]
	}
	return out, true
}

// node differentiates one node, whose operands have been differentiated.
func (d *differentiator) node(x id) []derivative {
	n := d.g.nodes[x]
	switch n.operation {
	case opState:
		return []derivative{{n.index, d.g.whole(1)}}
	case opInput:
		return []derivative{{d.states + n.index, d.g.whole(1)}}
	case opConstant, opParameter, opSign, opLess, opAtMost, opEqual, opUnequal, opAnd, opOr, opNot:
		return nil
	}
	variables := map[int]bool{}
	for _, o := range n.operands() {
		for _, p := range d.of[o] {
			variables[p.variable] = true
		}
	}
	if len(variables) == 0 {
		return nil
	}
	order := make([]int, 0, len(variables))
	for v := range variables {
		order = append(order, v)
	}
	sort.Ints(order)
	rule := d.rule(x, &n)
	var out []derivative
	for _, v := range order {
		if slope := rule(d.by(n.a, v), d.by(n.b, v), d.by(n.c, v)); slope != none {
			out = append(out, derivative{v, slope})
		}
	}
	return out
}

// by is the derivative of a node by a variable; none for zero.
func (d *differentiator) by(x id, variable int) id {
	if x == none {
		return none
	}
	for _, p := range d.of[x] {
		if p.variable == variable {
			return p.node
		}
	}
	return none
}

// rule gives the derivative of a node from those of its operands, none standing for zero.
func (d *differentiator) rule(x id, n *node) func(a, b, c id) id {
	g := d.g
	outer := func(slope id) func(a, b, c id) id {
		return func(a, _, _ id) id { return d.times(slope, a) }
	}
	switch n.operation {
	case opAdd:
		return func(a, b, _ id) id { return d.plus(a, b) }
	case opSubtract:
		return func(a, b, _ id) id { return d.plus(a, d.minus(b)) }
	case opNegate:
		return func(a, _, _ id) id { return d.minus(a) }
	case opMultiply:
		return func(a, b, _ id) id { return d.plus(d.times(a, n.b), d.times(n.a, b)) }
	case opDivide:
		return func(a, b, _ id) id { return d.over(d.plus(a, d.minus(d.times(x, b))), n.b) }
	case opPower:
		rest := new(big.Rat).Sub(n.exponent, ratOne)
		slope := g.scaled(d.power(n.a, rest), exactly(n.exponent), n.at)
		return outer(slope)
	case opPowerOf:
		return d.powerOfRule(x, n)
	case opMin, opMax, opLimit, opSelect:
		return d.switchRule(n)
	case opAtan2:
		squares := d.plus(d.times(n.a, n.a), d.times(n.b, n.b))
		return func(a, b, _ id) id { return d.over(d.plus(d.times(n.b, a), d.minus(d.times(n.a, b))), squares) }
	}
	return outer(d.slope(x, n))
}

// slope is f′(a) of a function of one number.
func (d *differentiator) slope(x id, n *node) id {
	g := d.g
	one := g.whole(1)
	inverse := func(y id) id { return g.apply(opDivide, n.at, one, y) }
	square := g.power(n.a, big.NewRat(2, 1), n.at)
	switch n.operation {
	case opSqrt:
		return g.apply(opDivide, n.at, g.constant(exactly(half), n.at), x)
	case opExp:
		return x
	case opLog:
		return inverse(n.a)
	case opLog10:
		ln10, _ := real(value.Log(value.Int(10)))
		return inverse(g.apply(opMultiply, n.at, n.a, g.constant(ln10, n.at)))
	case opSin:
		return g.apply(opCos, n.at, n.a)
	case opCos:
		return d.minus(g.apply(opSin, n.at, n.a))
	case opTan:
		return g.apply(opAdd, n.at, one, g.power(x, big.NewRat(2, 1), n.at))
	case opAsin:
		return inverse(g.apply(opSqrt, n.at, g.apply(opSubtract, n.at, one, square)))
	case opAcos:
		return d.minus(inverse(g.apply(opSqrt, n.at, g.apply(opSubtract, n.at, one, square))))
	case opAtan:
		return inverse(g.apply(opAdd, n.at, one, square))
	case opAbs:
		return g.apply(opSign, n.at, n.a)
	case opInterpolate:
		return g.lookup(opSlope, n.index, n.a, n.at)
	}
	return none
}

// powerOfRule is (a^b)′ = b·a^(b−1)·a′ + a^b·ln a·b′.
func (d *differentiator) powerOfRule(x id, n *node) func(a, b, c id) id {
	g := d.g
	lower := g.apply(opPowerOf, n.at, n.a, g.apply(opSubtract, n.at, n.b, g.whole(1)))
	alpha := g.apply(opMultiply, n.at, n.b, lower)
	return func(a, b, _ id) id {
		sum := d.times(alpha, a)
		if b != none {
			sum = d.plus(sum, d.times(g.apply(opMultiply, n.at, x, g.apply(opLog, n.at, n.a)), b))
		}
		return sum
	}
}

// switchRule takes the slope of the operand that counts, as the exact evaluation does.
func (d *differentiator) switchRule(n *node) func(a, b, c id) id {
	g := d.g
	pick := func(condition, yes, no id) id {
		if yes == no {
			return yes
		}
		return g.apply(opSelect, n.at, condition, d.orZero(yes), d.orZero(no))
	}
	switch n.operation {
	case opMin:
		first := g.apply(opAtMost, n.at, n.a, n.b)
		return func(a, b, _ id) id { return pick(first, a, b) }
	case opMax:
		first := g.apply(opAtMost, n.at, n.b, n.a)
		return func(a, b, _ id) id { return pick(first, a, b) }
	case opLimit:
		low, high := g.apply(opLess, n.at, n.a, n.b), g.apply(opLess, n.at, n.c, n.a)
		return func(a, b, c id) id { return pick(low, b, pick(high, c, a)) }
	}
	return func(_, b, c id) id { return pick(n.a, b, c) }
}

func (d *differentiator) orZero(x id) id {
	if x == none {
		return d.g.whole(0)
	}
	return x
}

func (d *differentiator) plus(a, b id) id {
	switch {
	case a == none:
		return b
	case b == none:
		return a
	}
	return d.g.apply(opAdd, place{}, a, b)
}

func (d *differentiator) minus(a id) id {
	if a == none {
		return none
	}
	return d.g.apply(opNegate, place{}, a)
}

func (d *differentiator) times(a, b id) id {
	if a == none || b == none {
		return none
	}
	for _, pair := range [...][2]id{{a, b}, {b, a}} {
		if c, ok := d.g.isConstant(pair[0]); ok && c.isExact() {
			switch {
			case c.isZero():
				return none
			case c.isOne():
				return pair[1]
			case c.negate().isOne():
				return d.minus(pair[1])
			}
		}
	}
	return d.g.apply(opMultiply, place{}, a, b)
}

func (d *differentiator) over(a, b id) id {
	if a == none {
		return none
	}
	return d.g.apply(opDivide, place{}, a, b)
}

func (d *differentiator) power(a id, e *big.Rat) id {
	if e.Sign() == 0 {
		return d.g.whole(1)
	}
	return d.g.power(a, e, d.g.nodes[a].at)
}
