package model

import (
	"fmt"
	"math"
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

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
