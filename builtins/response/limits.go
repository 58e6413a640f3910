package response

import (
	"math"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

const (
	kindNumerical = diag.Numerical
	kindLimit     = diag.Limit
)

// mostSwitches bounds how often inputs may reach or leave their limits.
const mostSwitches = 100_000

// A law is continuous at a limit: what it asks for passes the bound, so that the motion
// goes on in the next mode from the same state. limitedStretch runs one polynomial of the
// drive, from mode to mode. Between two looks, one step of the instants' spacing or less,
// a crossing is found from the signs at both ends and, where the demand turns back in
// between, from its extremum.
func (p *linearPath) limitedStretch(z []float64, start, end float64) error {
	q := p.q
	pattern, err := p.patternAt(z)
	if err != nil {
		return err
	}
	for t := start; t < end; {
		if len(p.pieces) > mostSwitches {
			return value.Errf(kindLimit, "limit", "an input reaches its limit more than %d times", mostSwitches)
		}
		if err := q.call.Context.Err(); err != nil {
			return err
		}
		m, err := p.modeOf(pattern)
		if err != nil {
			return err
		}
		p.pieces = append(p.pieces, piece{t, end, m, append([]float64(nil), z...)})
		next, changed, err := p.untilSwitch(m, pattern, z, t, end)
		if err != nil {
			return err
		}
		p.pieces[len(p.pieces)-1].end = next
		if !allFinite(z) {
			return grewTooLarge(next)
		}
		t = next
		if changed < 0 {
			break
		}
		// The input that crossed changes its mode by the way its demand runs.
		p.cross(m, pattern, changed, z)
	}
	return nil
}

// patternAt reads which inputs lie beyond their limits.
func (p *linearPath) patternAt(z []float64) ([]byte, error) {
	free := make([]byte, p.q.m)
	for i := range free {
		free[i] = '0'
	}
	m, err := p.modeOf(free)
	if err != nil {
		return nil, err
	}
	rate := make([]float64, p.size)
	m.prop.Rates(rate, z)
	for i := range free {
		s, d := dot(m.ask.row(i), z), dot(m.ask.row(i), rate)
		switch {
		case s > p.q.high[i] || s == p.q.high[i] && d > 0:
			free[i] = '+'
		case s < p.q.low[i] || s == p.q.low[i] && d < 0:
			free[i] = '-'
		}
	}
	return free, nil
}

// cross moves an input into or out of its limit.
func (p *linearPath) cross(m *mode, pattern []byte, i int, z []float64) {
	if pattern[i] != '0' {
		pattern[i] = '0'
		return
	}
	s := dot(m.ask.row(i), z)
	if math.Abs(s-p.q.high[i]) < math.Abs(s-p.q.low[i]) {
		pattern[i] = '+'
	} else {
		pattern[i] = '-'
	}
}

// excess is positive where the pattern no longer holds for input i: how far a free demand
// lies beyond the nearer limit, or one at a limit inside of it.
func (p *linearPath) excess(m *mode, pattern []byte, i int, z []float64) float64 {
	s := dot(m.ask.row(i), z)
	switch pattern[i] {
	case '+':
		return p.q.high[i] - s
	case '-':
		return s - p.q.low[i]
	}
	return math.Max(s-p.q.high[i], p.q.low[i]-s)
}

// untilSwitch moves z on until an input's pattern ends, and names the input (−1: the end).
func (p *linearPath) untilSwitch(m *mode, pattern []byte, z []float64, t, end float64) (float64, int, error) {
	q := p.q
	span := p.period / 4
	tiny := 1e-13 * math.Max(end, p.period)
	before, trial := append([]float64(nil), z...), make([]float64, p.size)
	rates := make([]float64, p.size)
	moved := func(dt float64) ([]float64, error) {
		copy(trial, before)
		return trial, m.prop.Advance(trial, dt)
	}
	for t < end {
		h := math.Min(span, end-t)
		if end-t-h < tiny {
			h = end - t
		}
		copy(before, z)
		if h == span {
			if err := m.prop.Step(-2, z, before); err != nil {
				return 0, 0, err
			}
		} else if err := m.prop.Advance(z, h); err != nil {
			return 0, 0, err
		}
		first, who := math.Inf(1), -1
		for i := range q.m {
			if math.IsInf(q.low[i], 0) && math.IsInf(q.high[i], 0) {
				continue
			}
			at, found, err := p.firstExcess(m, pattern, i, before, z, h, moved, rates)
			if err != nil {
				return 0, 0, err
			}
			if found && at < first {
				first, who = at, i
			}
		}
		if who >= 0 {
			w, err := moved(first)
			if err != nil {
				return 0, 0, err
			}
			copy(z, w)
			return math.Min(t+math.Max(first, tiny/16), end), who, nil
		}
		if h == end-t {
			return end, -1, nil
		}
		t += h
	}
	return end, -1, nil
}

// firstExcess looks for the first time within a step at which input i breaks the pattern.
func (p *linearPath) firstExcess(m *mode, pattern []byte, i int, before, after []float64, h float64, moved func(float64) ([]float64, error), rates []float64) (float64, bool, error) {
	value := func(z []float64) float64 { return p.excess(m, pattern, i, z) }
	slope := func(z []float64) float64 {
		m.prop.Rates(rates, z)
		d := dot(m.ask.row(i), rates)
		s := dot(m.ask.row(i), z)
		if pattern[i] == '+' || pattern[i] == '0' && s-p.q.high[i] < p.q.low[i]-s {
			d = -d
		}
		return d
	}
	reach := h
	floor := 0.0
	for _, bound := range [...]float64{p.q.high[i], p.q.low[i]} {
		if !math.IsInf(bound, 0) {
			floor += 1e-13 * math.Abs(bound)
		}
	}
	if value(after) <= floor {
		// It may have gone beyond and come back: look at the extremum.
		if !(slope(before) > 0 && slope(after) < 0) {
			return 0, false, nil
		}
		top, err := bisect(h, moved, func(z []float64) bool { return slope(z) < 0 })
		if err != nil {
			return 0, false, err
		}
		w, err := moved(top)
		if err != nil || value(w) <= floor {
			return 0, false, err
		}
		reach = top
	}
	if value(before) > floor {
		return 0, true, nil
	}
	at, err := bisect(reach, moved, func(z []float64) bool { return value(z) > 0 })
	return at, true, err
}

// bisect finds the time in [0, h] at which a condition becomes true, to the last bit but few.
func bisect(h float64, moved func(float64) ([]float64, error), holds func(z []float64) bool) (float64, error) {
	low, high := 0.0, h
	for range 60 {
		middle := (low + high) / 2
		if middle == low || middle == high {
			break
		}
		z, err := moved(middle)
		if err != nil {
			return 0, err
		}
		if holds(z) {
			high = middle
		} else {
			low = middle
		}
	}
	return high, nil
}

// stays lists the times inputs spent at their limits.
func (p *linearPath) stays() []value.LimitStay {
	if !p.q.limited {
		return nil
	}
	c := newStayCounter(p.q)
	for _, part := range p.pieces {
		for i, at := range []byte(part.mode.pattern) {
			c.see(i, part.start, at)
		}
	}
	return c.all
}

// stayCounter joins what is seen at times in order to stays.
type stayCounter struct {
	q    *request
	open []int // index of the running stay of each input, −1 for none
	all  []value.LimitStay
}

func newStayCounter(q *request) *stayCounter {
	c := &stayCounter{q: q, open: make([]int, q.m), all: []value.LimitStay{}}
	for i := range c.open {
		c.open[i] = -1
	}
	return c
}

// see takes note of where input i is from time t on: '+' or '-' at a limit, '0' free.
func (c *stayCounter) see(i int, t float64, at byte) {
	bound := map[byte]float64{'+': c.q.high[i] + c.q.u0[i], '-': c.q.low[i] + c.q.u0[i]}[at]
	if k := c.open[i]; k >= 0 {
		if at != '0' && c.all[k].Limit == bound {
			return
		}
		c.all[k].To = t
		c.open[i] = -1
	}
	if at != '0' {
		c.open[i] = len(c.all)
		c.all = append(c.all, value.LimitStay{Input: c.q.plant.Inputs[i].Name, Unit: c.q.plant.Inputs[i].Unit, Limit: bound, From: t, To: math.Inf(1)})
	}
}
