package model

import (
	"math"
	"math/big"

	"gainwright/lang/exact"
	"gainwright/lang/value"
)

// settle turns Newton's floating point into the point of the model: an exact one near it
// where the rates vanish exactly, else the floating one with its error.
func (b *builder) settle(p point, e *Evaluator, set, equations []int) (point, bool) {
	exactly, rounded := p.clone(), p.clone()
	for _, v := range set {
		x := e.variable(v)
		*exactly.variable(v) = value.Rat(simplest(x, 1e-9*(math.Abs(x)+1e-3*b.scale(v))))
		*rounded.variable(v) = value.Float(x)
	}
	if ok, _ := b.rests(exactly, equations); ok && b.isExactlyAtRest(exactly, equations) {
		return exactly, true
	}
	spreads := b.spread(rounded, e, set, equations)
	certain := b.determined(exactly, set, equations)
	for j, v := range set {
		n := rounded.variable(v)
		if certain[v] {
			*n = *exactly.variable(v)
			continue
		}
		*n = value.FloatErr(n.F, spreads[j])
	}
	ok, _ := b.rests(rounded, equations)
	return rounded, ok
}

// determined lists the variables whose exact values satisfy an equation exactly that uses
// no others of the set: a velocity that must be zero is zero.
func (b *builder) determined(p point, set, equations []int) map[int]bool {
	out := map[int]bool{}
	r, err := b.residuals(b.g.evaluate(p, false, b.rates...), p)
	if err != nil {
		return out
	}
	for _, i := range equations {
		if !r[i].IsExact() || !r[i].IsZero() {
			continue
		}
		var users []int
		for _, v := range set {
			if b.dependsOn(b.rates[i], []int{v}) || b.Every != nil && v == i {
				users = append(users, v)
			}
		}
		if len(users) == 1 {
			out[users[0]] = true
		}
	}
	return out
}

func (b *builder) isExactlyAtRest(p point, equations []int) bool {
	r, err := b.residuals(b.g.evaluate(p, false, b.rates...), p)
	if err != nil {
		return false
	}
	for _, i := range equations {
		if !r[i].IsExact() {
			return false
		}
	}
	return true
}

// spread estimates how far the point may be off: what the rounding of the rates moves it
// by, under four patterns of signs.
func (b *builder) spread(p point, e *Evaluator, set, equations []int) []float64 {
	out := make([]float64, len(set))
	r, err := b.residuals(b.g.evaluate(p, false, b.rates...), p)
	if err != nil {
		return out
	}
	s := e.solver
	s.misses(e)
	for pattern := range 4 {
		for k, i := range equations {
			size := math.Abs(r[i].Float64()) + r[i].ErrorEstimate()
			if (k>>(pattern%3))&1 == 1 || pattern == 3 && k%2 == 0 {
				size = -size
			}
			s.residual[k] = size
		}
		s.direction(e, 0)
		for j, v := range set {
			out[j] = math.Max(out[j], 2*math.Abs(s.step[j])*b.scale(v))
		}
	}
	for j, v := range set {
		out[j] += math.Abs(e.variable(v)) * 0x1p-51
	}
	return out
}

// variable reads a state or an input of the evaluator's point.
func (e *Evaluator) variable(v int) float64 {
	if v < len(e.x) {
		return e.x[v]
	}
	return e.u[v-len(e.x)]
}

func (p point) variable(v int) *value.Number {
	if v < len(p.states) {
		return &p.states[v]
	}
	return &p.inputs[v-len(p.states)]
}

// simplest is the fraction of least denominator within tol of x (continued fractions).
func simplest(x, tol float64) *big.Rat {
	target := new(big.Rat)
	if target.SetFloat64(x) == nil {
		return target
	}
	p0, q0, p1, q1 := big.NewInt(0), big.NewInt(1), big.NewInt(1), big.NewInt(0)
	rest := new(big.Rat).Set(target)
	for range 64 {
		whole := new(big.Int).Div(rest.Num(), rest.Denom())
		p0, p1 = p1, new(big.Int).Add(new(big.Int).Mul(whole, p1), p0)
		q0, q1 = q1, new(big.Int).Add(new(big.Int).Mul(whole, q1), q0)
		guess := new(big.Rat).SetFrac(p1, q1)
		if d, _ := new(big.Rat).Sub(guess, target).Float64(); math.Abs(d) <= tol {
			return guess
		}
		rest.Sub(rest, new(big.Rat).SetInt(whole))
		if rest.Sign() == 0 {
			return guess
		}
		rest.Inv(rest)
	}
	return target
}

// exactStep makes one Newton step over the rationals, which solves equations that are
// linear in the variables.
func (b *builder) exactStep(p point, set, equations []int) (point, bool) {
	const most = 30
	if len(set) > most || len(equations) > most || len(set) == 0 {
		return p, false
	}
	e := b.g.evaluate(p, true, b.rates...)
	r, err := b.residuals(e, p)
	if err != nil {
		return p, false
	}
	column := map[int]int{}
	for j, v := range set {
		column[v] = j
	}
	j, right := exact.NewMatrix(len(equations), len(set)), exact.NewMatrix(len(equations), 1)
	for k, i := range equations {
		if !r[i].IsExact() {
			return p, false
		}
		right.Set(k, 0, new(big.Rat).Neg(r[i].Exact))
		for _, part := range b.rateGradient(e, i) {
			at, ok := column[part.variable]
			if !ok {
				continue
			}
			n, err := part.slope.number()
			if err != nil || !n.IsExact() {
				return p, false
			}
			j.Set(k, at, n.Exact)
		}
	}
	if j.Rank() < len(set) {
		return p, false // free directions: the step of least norm is Newton's to find
	}
	step, problem := j.Solve(right)
	if problem != nil {
		return p, false
	}
	q := p.clone()
	for k, v := range set {
		n := q.variable(v)
		if !n.IsExact() {
			return p, false
		}
		*n = value.Rat(new(big.Rat).Add(n.Exact, step.At(k, 0)))
	}
	ok, _ := b.rests(q, equations)
	return q, ok && b.isExactlyAtRest(q, equations)
}

// rateGradient is the gradient of a rate, for a sampled model of next − x.
func (m *Model) rateGradient(e *evaluation, i int) []partial {
	g := e.duals[m.rates[i]].gradient
	if m.Every == nil {
		return g
	}
	sum, err := addGradients(g, []partial{{i, oneAmount.negate()}})
	if err != nil {
		return g
	}
	return sum
}
