package model

import (
	"math"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// operating is the operating point with what was found out about it.
type operating struct {
	point   point
	outputs []value.Number
	rates   []value.Number // of a sampled model next − x
	atRest  bool
	solved  []int  // the variables that were solved for
	free    string // directions left free, in words; "" when there are none or nobody asked
	a, b    [][]value.Number
	c, d    [][]value.Number
}

// solve finds the operating point and linearises there.
func (b *builder) solve() {
	b.program = b.compile()
	p := b.start()
	a := &b.around
	switch {
	case len(a.find) > 0:
		p = b.findListed(p)
	case a.rest:
		p = b.findRest(p)
	}
	b.linearise(p)
	if b.program != nil {
		b.program.x0, b.program.u0 = floats(b.operating.point.states), floats(b.operating.point.inputs)
	}
}

func floats(numbers []value.Number) []float64 {
	out := make([]float64, len(numbers))
	for k, n := range numbers {
		out[k] = n.Float64()
	}
	return out
}

// start is the point given, 0 where nothing is.
func (b *builder) start() point {
	p := point{parameters: make([]value.Number, len(b.Givens))}
	for k, g := range b.Givens {
		p.parameters[k] = g.Nominal
	}
	all := make([]value.Number, len(b.around.pinned))
	for k, pinned := range b.around.pinned {
		all[k] = value.Int(0)
		if pinned != nil {
			all[k] = *pinned
		}
	}
	p.states, p.inputs = all[:len(b.States)], all[len(b.States):]
	return p
}

// residuals evaluates the rates, for a sampled model next − x.
func (m *Model) residuals(e *evaluation, p point) ([]value.Number, *diag.Error) {
	out := make([]value.Number, len(m.rates))
	for i, root := range m.rates {
		d, err := e.at(root)
		if err != nil {
			return nil, err
		}
		v := d.value
		var problem error
		if m.Every != nil {
			v, problem = v.subtract(amount{n: p.states[i]})
		}
		if problem == nil {
			out[i], problem = v.number()
		}
		if problem != nil {
			return nil, asError(problem).At(m.States[i].expr).In(m.source)
		}
	}
	return out, nil
}

// vanishes tells whether a residual is zero within its own rounding.
func vanishes(n value.Number) bool {
	if n.IsExact() {
		return n.IsZero()
	}
	return math.Abs(n.F) <= 4*n.Err
}

// rests evaluates without derivatives; nil for an error.
func (m *Model) rests(p point, equations []int) (bool, *diag.Error) {
	r, err := m.residuals(m.g.evaluate(p, false, m.rates...), p)
	if err != nil {
		return false, err
	}
	for _, i := range equations {
		if !vanishes(r[i]) {
			return false, nil
		}
	}
	return true, nil
}

func upTo(n int) []int {
	out := make([]int, n)
	for k := range out {
		out[k] = k
	}
	return out
}

// newtonFrom solves in float64 from several starts, then looks for the exact point.
func (b *builder) newtonFrom(p point, set, equations []int) (point, bool) {
	if q, ok := b.exactStep(p, set, equations); ok {
		return q, true
	}
	if b.program == nil {
		failWith(b.around.at, diag.New(diag.Limit, "the equations are too large to be solved for a rest: their derivatives need more than %d operations", mostDerivatives))
	}
	b.setPlan([][]int{set}, equations)
	for _, start := range b.starts(p, set) {
		e := b.program.Evaluator()
		copy(e.x, start[:len(b.States)])
		copy(e.u, start[len(b.States):])
		if !e.solver.find(e) {
			continue
		}
		q, ok := b.settle(p, e, set, equations)
		if ok {
			return q, true
		}
	}
	return p, false
}

// starts lists where Newton's iteration begins: the start itself, then points spread over
// the ranges in a fixed pattern (a Halton sequence, 1960).
func (b *builder) starts(p point, set []int) [][]float64 {
	count := 24
	if len(set) > 40 {
		count = 3
	}
	first := append(floats(p.states), floats(p.inputs)...)
	out := [][]float64{first}
	for k := 1; k < count; k++ {
		next := append([]float64{}, first...)
		for j, v := range set {
			next[v] += (1 - 2*radicalInverse(k, primes[j%len(primes)])) * b.scale(v)
		}
		out = append(out, next)
	}
	return out
}

var primes = [...]int{2, 3, 5, 7, 11, 13, 17, 19, 23, 29, 31, 37, 41, 43, 47, 53}

func radicalInverse(k, base int) float64 {
	x, part := 0.0, 1/float64(base)
	for ; k > 0; k /= base {
		x += float64(k%base) * part
		part /= float64(base)
	}
	return x
}

func (p point) clone() point {
	return point{p.parameters, append([]value.Number{}, p.states...), append([]value.Number{}, p.inputs...)}
}
