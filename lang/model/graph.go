package model

import (
	"fmt"
	"math/big"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// operation is what a node of the expression graph does with its operands a, b, c.
type operation uint8

const (
	opConstant operation = iota
	opParameter
	opState
	opInput
	opAdd
	opSubtract
	opMultiply
	opDivide
	opNegate
	opPower // with the constant exponent in node.exponent
	opPowerOf
	opSqrt
	opExp
	opLog
	opLog10
	opSin
	opCos
	opTan
	opAsin
	opAcos
	opAtan
	opAtan2
	opAbs
	opSign
	opMin
	opMax
	opLimit       // a held between b and c
	opInterpolate // table node.index at a
	opSlope       // the slope of table node.index at a: in derivatives only
	opLess
	opAtMost
	opEqual
	opUnequal
	opAnd
	opOr
	opNot
	opSelect // b where a holds, else c
)

// id is a node of a graph.
type id int32

const none id = -1

// place is where in which text something stands.
type place struct {
	source *diag.Source
	span   diag.Span
}

type node struct {
	operation operation
	a, b, c   id
	index     int      // of the parameter, state, input or table
	amount    amount   // of a constant
	exponent  *big.Rat // of opPower
	at        place    // where it first stands, for errors and notes
}

// nodeKey is equal for nodes that compute the same.
type nodeKey struct {
	operation operation
	a, b, c   id
	index     int
	text      string
}

// graph holds every expression of a model once; operands come before what uses them.
type graph struct {
	nodes  []node
	known  map[nodeKey]id
	tables []*table
}

func newGraph() *graph { return &graph{known: map[nodeKey]id{}} }

// mostNodes bounds the size of a model's equations, functions inlined.
const mostNodes = 200_000

func (g *graph) intern(n node, text string) id {
	key := nodeKey{n.operation, n.a, n.b, n.c, n.index, text}
	if found, ok := g.known[key]; ok {
		return found
	}
	out := id(len(g.nodes))
	g.nodes = append(g.nodes, n)
	g.known[key] = out
	return out
}

func (g *graph) constant(a amount, at place) id {
	text := ""
	if a.isExact() {
		text = fmt.Sprintf("%sπ%d", a.n.Exact.RatString(), a.pi)
	} else {
		text = fmt.Sprintf("%b %b", a.n.F, a.n.Err)
	}
	return g.intern(node{operation: opConstant, a: none, b: none, c: none, amount: a, at: at}, text)
}

func (g *graph) whole(n int) id { return g.constant(amount{n: value.Int(n)}, place{}) }

func (g *graph) leaf(o operation, index int, at place) id {
	return g.intern(node{operation: o, a: none, b: none, c: none, index: index, at: at}, "")
}

// apply makes a node; exact constants are folded where that cannot fail.
func (g *graph) apply(o operation, at place, operands ...id) id {
	n := node{operation: o, a: none, b: none, c: none, at: at}
	for k, operand := range operands {
		*[...]*id{&n.a, &n.b, &n.c}[k] = operand
	}
	if folded, ok := g.fold(n); ok {
		return g.constant(folded, at)
	}
	return g.intern(n, "")
}

// power makes aᵉ.
func (g *graph) power(a id, e *big.Rat, at place) id {
	if e.IsInt() && e.Num().IsInt64() {
		switch e.Num().Int64() {
		case 1:
			return a
		}
	}
	n := node{operation: opPower, a: a, b: none, c: none, exponent: e, at: at}
	if x := g.nodes[a]; x.operation == opConstant && x.amount.isExact() && e.IsInt() && !(x.amount.isZero() && e.Sign() <= 0) {
		if folded, err := x.amount.power(e); err == nil {
			return g.constant(folded, at)
		}
	}
	return g.intern(n, e.RatString())
}

func (g *graph) lookup(o operation, tableIndex int, a id, at place) id {
	return g.intern(node{operation: o, a: a, b: none, c: none, index: tableIndex, at: at}, "")
}

// fold computes a node of exact constants.
func (g *graph) fold(n node) (amount, bool) {
	exactConstant := func(x id) (amount, bool) {
		if x == none {
			return amount{}, false
		}
		c := g.nodes[x]
		return c.amount, c.operation == opConstant && c.amount.isExact()
	}
	a, ok := exactConstant(n.a)
	if !ok {
		return amount{}, false
	}
	if n.operation == opNegate {
		return a.negate(), true
	}
	b, ok := exactConstant(n.b)
	if !ok {
		return amount{}, false
	}
	var out amount
	var err error
	switch {
	case n.operation == opMultiply:
		out, err = a.multiply(b)
	case n.operation == opAdd && (a.pi == b.pi || a.isZero() || b.isZero()):
		out, err = a.add(b)
	case n.operation == opSubtract && (a.pi == b.pi || a.isZero() || b.isZero()):
		out, err = a.subtract(b)
	case n.operation == opDivide && !b.isZero():
		out, err = a.divide(b)
	default:
		return amount{}, false
	}
	return out, err == nil
}

// isConstant gives the amount of a constant node.
func (g *graph) isConstant(x id) (amount, bool) {
	n := g.nodes[x]
	return n.amount, n.operation == opConstant
}

// scaled multiplies by a constant, and leaves out a factor of one.
func (g *graph) scaled(x id, factor amount, at place) id {
	if factor.isOne() {
		return x
	}
	return g.apply(opMultiply, at, g.constant(factor, at), x)
}

// shifted adds a constant, and leaves out a zero.
func (g *graph) shifted(x id, by amount, at place) id {
	if by.isZero() {
		return x
	}
	return g.apply(opAdd, at, x, g.constant(by, at))
}

// operands lists the operands of a node.
func (n *node) operands() []id {
	switch {
	case n.a == none:
		return nil
	case n.b == none:
		return []id{n.a}
	case n.c == none:
		return []id{n.a, n.b}
	}
	return []id{n.a, n.b, n.c}
}

// reach marks what the roots are computed from.
func (g *graph) reach(roots ...id) []bool {
	marked := make([]bool, len(g.nodes))
	for _, r := range roots {
		marked[r] = true
	}
	for k := len(g.nodes) - 1; k >= 0; k-- {
		if marked[k] {
			for _, o := range g.nodes[k].operands() {
				marked[o] = true
			}
		}
	}
	return marked
}
