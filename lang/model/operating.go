package model

import (
	"fmt"
	"math"
	"math/big"
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
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

// findRest is around rest: the start exactly, then Newton with the states free, then with
// the inputs free too.
func (b *builder) findRest(p point) point {
	all := upTo(len(b.States))
	var states, both []int
	for v, pinned := range b.around.pinned {
		if pinned == nil {
			both = append(both, v)
			if v < len(b.States) {
				states = append(states, v)
			}
		}
	}
	sets := nonEmpty(states, both)
	resting, startError := b.rests(p, all)
	if resting {
		b.operating.solved = states
		b.setPlan(sets, all)
		return p
	}
	for k, set := range sets {
		if q, ok := b.newtonFrom(p, set, all); ok {
			b.operating.solved = set
			b.setPlan(sets[k:], all)
			if k == 1 || len(states) == 0 {
				b.Notes = append(b.Notes, "no rest with the inputs as they are: "+b.variableNames(inputsOf(set, len(b.States)))+" solved for as well")
			}
			b.otherRests(p, q, set, all)
			return q
		}
	}
	b.failRest(p, sets, all, startError)
	return p
}

func inputsOf(set []int, states int) []int {
	var out []int
	for _, v := range set {
		if v >= states {
			out = append(out, v)
		}
	}
	return out
}

func nonEmpty(states, both []int) [][]int {
	var sets [][]int
	if len(states) > 0 {
		sets = append(sets, states)
	}
	if len(both) > len(states) {
		sets = append(sets, both)
	}
	return sets
}

// findListed solves for the variables named after find. Of an around without rest only
// those rates are made to vanish that depend on them.
func (b *builder) findListed(p point) point {
	set := b.around.find
	var equations []int
	for i, root := range b.rates {
		if b.around.rest || b.dependsOn(root, set) {
			equations = append(equations, i)
		}
	}
	if len(equations) == 0 {
		failWith(b.around.at, diag.New(diag.Numerical, "no rate depends on %s, so there is nothing to find", b.variableNames(set)))
	}
	resting, startError := b.rests(p, equations)
	b.setPlan([][]int{set}, equations)
	b.operating.solved = set
	if resting {
		return p
	}
	if q, ok := b.newtonFrom(p, set, equations); ok {
		b.otherRests(p, q, set, equations)
		return q
	}
	b.failRest(p, [][]int{set}, equations, startError)
	return p
}

// dependsOn tells whether a root uses one of the variables.
func (m *Model) dependsOn(root id, variables []int) bool {
	wanted := map[int]bool{}
	for _, v := range variables {
		wanted[v] = true
	}
	for k, needed := range m.g.reach(root) {
		if n := &m.g.nodes[k]; needed {
			if n.operation == opState && wanted[n.index] || n.operation == opInput && wanted[len(m.States)+n.index] {
				return true
			}
		}
	}
	return false
}

func (b *builder) setPlan(sets [][]int, equations []int) {
	if b.program == nil {
		return
	}
	scales := make([]float64, len(b.States)+len(b.Inputs))
	for v := range scales {
		scales[v] = b.scale(v)
	}
	b.program.plan = plan{free: sets, equations: equations, scales: scales}
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

func (p point) clone() point {
	return point{p.parameters, append([]value.Number{}, p.states...), append([]value.Number{}, p.inputs...)}
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

// failRest says that there is no rest, with the smallest rates that were reached.
func (b *builder) failRest(p point, sets [][]int, equations []int, startError *diag.Error) {
	best, where := b.bestMiss(p, sets, equations)
	if best == nil {
		if startError != nil {
			startError.Help = strings.TrimPrefix(startError.Help+"; around rest, x = … starts the search elsewhere", "; ")
			failWith(b.around.at, startError)
		}
		failWith(b.around.at, diag.New(diag.Numerical, "no point of rest was found for %s", b.Name))
	}
	var parts []string
	var stuck []string
	all := append([]int{}, b.around.find...)
	for _, set := range sets {
		all = append(all, set...)
	}
	for _, i := range equations {
		if f := best[i]; !vanishes(value.FloatErr(f, 1e-12)) {
			parts = append(parts, fmt.Sprintf("%s %s = %s", rateWord(b.Every != nil), b.States[i].Name, shortWith(b.missed(f, where, i), b.rateUnit(i))))
			if !b.dependsOn(b.rates[i], all) && b.Every == nil {
				stuck = append(stuck, b.States[i].Name)
			}
		}
	}
	at := make([]string, 0, len(where))
	for v, x := range where {
		at = append(at, b.signalOf(v).Name+" = "+shortWith(x, b.signalOf(v).Unit.Text))
	}
	e := diag.New(diag.Numerical, "%s has no point of rest that could be found; nearest to rest are %s at %s", b.Name, abridged(parts), abridged(at))
	switch {
	case len(stuck) > 0:
		e.WithHelp("the rate of %s depends on nothing that may be chosen; around …, find … leaves such a rate as it is", listed(stuck))
	default:
		e.WithHelp("around rest, x = … starts elsewhere or holds a value; around x = …, v = … find u solves for what is named")
	}
	failWith(b.around.at, e)
}

func (b *builder) missed(f float64, where []float64, i int) float64 {
	if b.Every != nil {
		return f + where[i]
	}
	return f
}

func abridged(parts []string) string {
	if len(parts) > 6 {
		return strings.Join(parts[:6], ", ") + ", …"
	}
	return strings.Join(parts, ", ")
}

func shortWith(x float64, unit string) string {
	return strings.TrimSpace(fmt.Sprintf("%.5g %s", x, unit))
}

// rateUnit is the unit of a state's equation.
func (m *Model) rateUnit(i int) string {
	u := m.States[i].Unit
	if m.Every != nil {
		return u.Text
	}
	return u.PerSecond().Text
}

// bestMiss repeats the search and keeps the point nearest to rest; nil when the equations
// had no value anywhere.
func (b *builder) bestMiss(p point, sets [][]int, equations []int) (rates, where []float64) {
	least := math.Inf(1)
	if len(sets) == 0 {
		sets = [][]int{nil}
	}
	for _, set := range sets {
		b.setPlan([][]int{set}, equations)
		for _, start := range b.starts(p, set) {
			e := b.program.Evaluator()
			copy(e.x, start[:len(b.States)])
			copy(e.u, start[len(b.States):])
			e.solver.newton(e, 0)
			if miss := e.solver.misses(e); miss < least {
				least = miss
				rates = make([]float64, len(b.States))
				for k, i := range equations {
					rates[i] = e.solver.residual[k]
				}
				where = append(append([]float64{}, e.x...), e.u...)
			}
		}
	}
	return rates, where
}
