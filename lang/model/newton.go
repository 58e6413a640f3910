package model

import "math"

// plan says what is solved for: which variables (states, then inputs) may move, and which
// rates must vanish. A program tries the sets in order.
type plan struct {
	free      [][]int // sets of variables; none when nothing is solved for
	equations []int
	scales    []float64 // of every variable: its range, else 1
}

// solver finds a point of rest by Newton's iteration with least-norm steps and a line
// search. It keeps its workspace, so that a sample allocates nothing.
type solver struct {
	p        *Program
	sets     []*leastNorm
	column   [][]int // of each variable in each set; −1 when it does not move
	residual []float64
	size     []float64 // of each equation: what a displacement of the variables' scales changes
	step     []float64
	x, u     []float64
	entries  [2][]slopePlace // the derivatives of the equations by states and by inputs
}

// slopePlace is a derivative's place in the equations.
type slopePlace struct{ equation, variable, register int32 }

const (
	mostNewtonSteps = 60
	mostHalvings    = 40
	// a residual that a displacement of this part of the ranges explains is rounding
	restTolerance = 1e-11
)

func newSolver(p *Program) *solver {
	s := &solver{p: p, x: make([]float64, p.states), u: make([]float64, p.inputs)}
	q := p.plan
	s.residual, s.size, s.step = make([]float64, len(q.equations)), make([]float64, len(q.equations)), make([]float64, p.states+p.inputs)
	at := make([]int32, p.states)
	for i := range at {
		at[i] = -1
	}
	for k, e := range q.equations {
		at[e] = int32(k)
	}
	for k, part := range [...]struct {
		entries []entry
		width   int
		from    int
	}{{p.a, p.states, 0}, {p.b, p.inputs, p.states}} {
		for _, t := range part.entries {
			row, col := int(t.at)/part.width, int(t.at)%part.width
			if at[row] >= 0 {
				s.entries[k] = append(s.entries[k], slopePlace{at[row], int32(part.from + col), t.register})
			}
		}
	}
	for _, free := range q.free {
		s.sets = append(s.sets, newLeastNorm(len(q.equations), len(free)))
		column := make([]int, p.states+p.inputs)
		for v := range column {
			column[v] = -1
		}
		for j, v := range free {
			column[v] = j
		}
		s.column = append(s.column, column)
	}
	return s
}

// find moves e.x and e.u to a point of rest; true at once where nothing is solved for.
func (s *solver) find(e *Evaluator) bool {
	if len(s.sets) == 0 {
		return true
	}
	copy(s.x, e.x)
	copy(s.u, e.u)
	for k := range s.sets {
		if s.newton(e, k) {
			return true
		}
		copy(e.x, s.x)
		copy(e.u, s.u)
	}
	return false
}

// misses evaluates the residuals and their derivatives and gives half the scaled square
// sum, NaN where the equations have no value.
func (s *solver) misses(e *Evaluator) float64 {
	e.derivatives(e.x, e.u)
	for k, i := range s.p.plan.equations {
		f := e.registers[s.p.rates.results[i]]
		if s.p.sampled {
			f -= e.x[i]
		}
		s.residual[k], s.size[k] = f, 0
	}
	for _, list := range s.entries {
		for _, t := range list {
			s.size[t.equation] += math.Abs(e.registers[t.register]) * s.p.plan.scales[t.variable]
		}
	}
	if s.p.sampled {
		for k, i := range s.p.plan.equations {
			s.size[k] += s.p.plan.scales[i]
		}
	}
	return s.merit()
}

// merit is half the square sum of the residuals in the sizes found last.
func (s *solver) merit() float64 {
	sum := 0.0
	for k, f := range s.residual {
		if s.size[k] > 0 {
			f /= s.size[k]
		}
		sum += f * f / 2
	}
	return sum
}

// trial evaluates the residuals alone; the sizes stay, so that the trials of one search
// are comparable.
func (s *solver) trial(e *Evaluator) float64 {
	e.load(e.x, e.u)
	e.run(s.p.rates.steps)
	for k, i := range s.p.plan.equations {
		s.residual[k] = e.registers[s.p.rates.results[i]]
		if s.p.sampled {
			s.residual[k] -= e.x[i]
		}
	}
	return s.merit()
}

// restful tells whether every residual is nothing beside what moves it.
func (s *solver) restful(e *Evaluator) bool {
	for _, list := range s.entries {
		for _, t := range list { // large coordinates round by more
			v := 0.0
			if int(t.variable) < s.p.states {
				v = e.x[t.variable]
			} else {
				v = e.u[int(t.variable)-s.p.states]
			}
			s.size[t.equation] += math.Abs(e.registers[t.register] * v)
		}
	}
	for k, f := range s.residual {
		if !(math.Abs(f) <= restTolerance*s.size[k]) {
			return false
		}
	}
	return true
}

// newton iterates from e.x, e.u with the k-th set of variables free.
func (s *solver) newton(e *Evaluator, k int) bool {
	miss := s.misses(e)
	for range mostNewtonSteps {
		if miss == 0 {
			return true
		}
		if math.IsNaN(miss) || math.IsInf(miss, 0) {
			return false
		}
		s.direction(e, k)
		if !s.search(e, k, miss) {
			break
		}
		miss = s.misses(e)
	}
	s.misses(e)
	return s.restful(e)
}

// direction is the least-norm Newton step in scaled variables and equations.
func (s *solver) direction(e *Evaluator, k int) {
	l, column := s.sets[k], s.column[k]
	clear(l.a)
	for _, list := range s.entries {
		for _, t := range list {
			if j := column[t.variable]; j >= 0 && s.size[t.equation] > 0 {
				l.a[int(t.equation)*l.cols+j] = e.registers[t.register] * s.p.plan.scales[t.variable] / s.size[t.equation]
			}
		}
	}
	if s.p.sampled { // the residual is next − x
		for row, i := range s.p.plan.equations {
			if j := column[i]; j >= 0 {
				l.a[row*l.cols+j] -= s.p.plan.scales[i] / s.size[row]
			}
		}
	}
	for i, f := range s.residual {
		l.b[i] = -f
		if s.size[i] > 0 {
			l.b[i] = -f / s.size[i]
		}
	}
	l.solve(s.step)
}

// search goes along the step until the residuals shrink; false when they do not.
func (s *solver) search(e *Evaluator, k int, miss float64) bool {
	free := s.p.plan.free[k]
	move := func(t float64) {
		for j, v := range free {
			d := t * s.step[j] * s.p.plan.scales[v]
			if v < s.p.states {
				e.x[v] += d
			} else {
				e.u[v-s.p.states] += d
			}
		}
	}
	t := 1.0
	move(t)
	for range mostHalvings {
		if s.trial(e) < miss*(1-1e-4*t) {
			return true
		}
		move(-t / 2)
		t /= 2
	}
	move(-t)
	return false
}
