package response

import (
	"errors"
	"math"
	"sort"

	"gainwright/builtins/numeric"
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// The tolerances of the three runs of a model's own equations: the first learns how large
// the states become, the second gives the answer, the third, at half the tolerance, tells
// how many digits hold.
const (
	roughTolerance = 1e-6
	fineTolerance  = 1e-11
)

// most steps of the integration whose dense form is kept
const mostSegments = 200_000

// own holds what the runs of the equations share.
type own struct {
	tolerance float64
	scale     []float64 // of the states and of the law's states
	x, u, y   []float64 // as they are, not as deviations
}

// ownRates fills out with the rates at deviations x and u; of a sampled model with the
// next states, as deviations.
func (q *request) ownRates(x, u, out []float64, t float64) error {
	o := q.ownRoom()
	for i := range x {
		o.x[i] = q.x0[i] + x[i]
	}
	for i := range u {
		o.u[i] = q.u0[i] + u[i]
	}
	q.dynamics.Rates(o.x, o.u, out)
	if q.plant.Every != nil {
		for i := range out {
			out[i] -= q.x0[i]
		}
		if !allFinite(out) {
			return value.Errf(kindNumerical, "plant", "the equations have no finite value at t = %.6g s", t)
		}
	}
	return nil
}

// ownOutputs fills y with the outputs as deviations.
func (q *request) ownOutputs(x, u, y []float64) error {
	o := q.ownRoom()
	for i := range x {
		o.x[i] = q.x0[i] + x[i]
	}
	for i := range u {
		o.u[i] = q.u0[i] + u[i]
	}
	q.dynamics.Outputs(o.x, o.u, y)
	for i := range y {
		y[i] -= q.y0[i]
	}
	if !allFinite(y) {
		return value.Errf(kindNumerical, "plant", "an output has no finite value on the way")
	}
	return nil
}

func (q *request) ownRoom() *own {
	if q.own == nil {
		size := q.n + q.law.own.r
		q.own = &own{tolerance: fineTolerance, scale: make([]float64, size), x: make([]float64, q.n), u: make([]float64, q.m), y: make([]float64, q.p)}
	}
	return q.own
}

// withHalvedTolerance runs three times and puts the difference of the last two into the errors.
func (q *request) withHalvedTolerance(run func() (*value.Response, error)) (*value.Response, error) {
	o := q.ownRoom()
	o.tolerance = roughTolerance
	for i := range o.scale {
		o.scale[i] = 1e-3
		if i < q.n {
			if r := q.plant.States[i].Range; r != nil {
				o.scale[i] = r.Float64()
			}
			o.scale[i] = math.Max(o.scale[i]*1e-3, math.Abs(q.start[i]))
		}
	}
	first, err := run()
	if err != nil {
		return nil, integrationError(err)
	}
	for i := range o.scale {
		o.scale[i] = math.Max(largest(first.Signals[q.p+q.m+i].Values), 1e-290)
	}
	o.tolerance = fineTolerance
	second, err := run()
	if err != nil {
		return nil, integrationError(err)
	}
	o.tolerance = fineTolerance / 2
	third, err := run()
	if err != nil {
		return nil, integrationError(err)
	}
	for i := range third.Signals {
		gap := 0.0
		for k, x := range third.Signals[i].Values {
			gap = math.Max(gap, math.Abs(x-second.Signals[i].Values[k]))
		}
		// Halving the tolerance of a fifth-order pair takes away about half of the error.
		third.Signals[i].Err = 2*gap + 1e-14*largest(third.Signals[i].Values)
	}
	return third, nil
}

func integrationError(err error) error {
	var known *diag.Error
	if errors.As(err, &known) {
		return err
	}
	if errors.Is(err, numeric.ErrStiff) {
		return value.Errf(kindLimit, "until", "%v", err).WithHelp("a shorter until")
	}
	return value.Errf(kindNumerical, "plant", "%v", err)
}

// newIntegrator makes an integrator with the tolerances of this run.
func (q *request) newIntegrator(size int, rates func(t float64, z, out []float64)) *numeric.Integrator {
	o := q.ownRoom()
	g := numeric.NewIntegrator(size, rates)
	g.Relative = o.tolerance
	for i := range g.Absolute {
		g.Absolute[i] = o.tolerance * o.scale[i]
	}
	return g
}

// keep adds a step to the path, and sees that not too many are kept.
func keep(path *[]*numeric.Segment, s *numeric.Segment, q *request) error {
	if len(*path) >= mostSegments {
		return value.Errf(kindLimit, "until", "the equations need more than %d steps for this time", mostSegments)
	}
	if len(*path)&255 == 0 {
		if err := q.call.Context.Err(); err != nil {
			return err
		}
		if err := q.call.Charge(int64(256 * 40 * (q.n + q.law.own.r))); err != nil {
			return err
		}
	}
	*path = append(*path, s.Clone())
	return nil
}

// ownMover moves the model's own equations from sample to sample with held inputs.
type ownMover struct {
	q    *request
	g    *numeric.Integrator
	u    []float64
	path *heldPath
	from int // first segment of this sample
	next float64
}

func (q *request) newOwnMover(path *heldPath) *ownMover {
	m := &ownMover{q: q, u: make([]float64, q.m), path: path}
	m.g = q.newIntegrator(q.n, func(t float64, z, out []float64) { _ = q.ownRates(z, m.u, out, t) })
	return m
}

// begin integrates the whole sample at once; at and end read from it.
func (m *ownMover) begin(t float64, x, u []float64) error {
	copy(m.u, u)
	m.from = len(m.path.segments)
	m.path.firsts = append(m.path.firsts, m.from)
	m.g.Start(t, x)
	m.next = t + m.q.clock
	for m.g.Time() < m.next {
		if err := m.g.Step(m.next); err != nil {
			return err
		}
		if err := keep(&m.path.segments, m.g.Segment(), m.q); err != nil {
			return err
		}
	}
	return nil
}

func (m *ownMover) at(t float64, x, y []float64) error {
	find(m.path.segments[m.from:], t).At(t, x)
	return m.q.ownOutputs(x, m.u, y)
}

func (m *ownMover) end(t float64, x []float64) error {
	copy(x, m.g.State())
	if m.q.noise != nil {
		m.q.noise.push(x)
	}
	return nil
}

// find gives the segment that holds a time; segments lie one after the other.
func find(segments []*numeric.Segment, t float64) *numeric.Segment {
	after := sort.Search(len(segments), func(i int) bool { return segments[i].Start > t })
	return segments[max(after-1, 0)]
}

// densePath is the motion of the equations under a law that acts all the time, or none.
type densePath struct {
	q        *request
	drives   []drivePiece
	segments []*numeric.Segment
	piece    int // of the drive, while running
	counter  *stayCounter
	pattern  []byte
	in       []float64
	ask, u   []float64
	y        []float64
}

// nonlinearResponse runs a model's own equations, continuous in all.
func (q *request) nonlinearResponse() (*value.Response, error) {
	if q.algebraicLoop {
		return nil, value.Errf(kindNumerical, "feedback", "the law and the plant answer at once to each other (an algebraic loop), which the model's own equations leave open")
	}
	if q.drive.kind == impulse && q.channels[q.drive.channel].kind == atInput {
		return nil, value.Errf(diag.Type, "to", "an impulse on a model's own equations has no meaning of its own; start from the state it leaves, with from: …")
	}
	drives, wrong, err := q.pieces(q.until, min(q.points, 1000))
	if err != nil {
		return nil, err
	}
	r, err := q.withHalvedTolerance(func() (*value.Response, error) { return q.denseRun(drives) })
	if err == nil && wrong > 0 {
		for i := range r.Signals {
			r.Signals[i].Err += wrong * largest(r.Signals[i].Values) / math.Max(largestDrive(drives), wrong)
		}
	}
	if err == nil {
		q.referenceTraces(r, drives)
	}
	return r, err
}

func (q *request) newDensePath(drives []drivePiece) *densePath {
	p := &densePath{q: q, drives: drives, counter: newStayCounter(q), pattern: make([]byte, q.m),
		in: make([]float64, len(q.channels)), ask: make([]float64, q.m), u: make([]float64, q.m), y: make([]float64, q.p)}
	return p
}

// inputs forms the demand and the input at a state z = (x, q).
func (p *densePath) inputs(t float64, z []float64) {
	q, l := p.q, p.q.law
	x, own := z[:q.n], z[q.n:]
	d := &p.drives[p.piece]
	for j, ch := range q.driven() {
		p.in[ch] = polynomialAt(d.coefficients[j], t-d.start)
	}
	copy(p.ask, p.in[:q.m])
	l.toU.add(p.ask, own)
	l.stateGain.add(p.ask, x)
	if !l.outputGain.isZero() {
		_ = q.ownOutputs(x, p.u, p.y)
		l.outputGain.add(p.ask, p.y)
	}
	l.refG.add(p.ask, p.in[q.m:q.m+l.refG.c])
	for i, s := range p.ask {
		p.u[i] = math.Min(q.high[i], math.Max(q.low[i], s))
	}
}

func (p *densePath) rates(t float64, z, out []float64) {
	q, l := p.q, p.q.law
	p.inputs(t, z)
	_ = q.ownRates(z[:q.n], p.u, out[:q.n], t)
	if len(z) > q.n {
		if q.ownOutputs(z[:q.n], p.u, p.y) != nil {
			out[0] = math.NaN()
			return
		}
		rates := out[q.n:]
		l.own.apply(rates, z[q.n:])
		l.fromY.add(rates, p.y)
		l.fromU.add(rates, p.u)
		l.fromR.add(rates, p.in[q.m:q.m+l.refG.c])
	}
}

// look reads the pattern of the limits.
func (p *densePath) look(t float64, z []float64, pattern []byte) {
	p.inputs(t, z)
	for i, s := range p.ask {
		pattern[i] = '0'
		if s > p.q.high[i] {
			pattern[i] = '+'
		} else if s < p.q.low[i] {
			pattern[i] = '-'
		}
	}
}

func (q *request) denseRun(drives []drivePiece) (*value.Response, error) {
	count := q.points + 1
	spacing := q.until / float64(q.points)
	if err := q.charge(count); err != nil {
		return nil, err
	}
	if q.noise != nil {
		q.noise.restart()
	}
	p := q.newDensePath(drives)
	z := make([]float64, q.n+q.law.own.r)
	copy(z, q.start)
	g := q.newIntegrator(len(z), p.rates)
	r := &value.Response{Title: q.title(), Instants: evenly(spacing, count), Signals: q.traces(count)}
	pushed := 0
	for i, d := range drives {
		p.piece = i
		g.Start(d.start, z)
		p.look(d.start, z, p.pattern)
		p.see(d.start)
		for g.Time() < d.end {
			limit := d.end
			if q.noise != nil {
				if at := float64(pushed+1) * spacing; at < limit*(1-1e-12) {
					limit = at
				}
			}
			if err := p.step(g, limit); err != nil {
				return nil, err
			}
			copy(z, g.State())
			if q.noise != nil && g.Time() == limit {
				q.noise.push(z[:q.n])
				pushed++
				g.Start(limit, z)
			}
		}
	}
	if err := p.record(r, z); err != nil {
		return nil, err
	}
	if q.limited {
		r.Stays = p.counter.all
	}
	r.Source = &course{q: q, dense: p, noisy: q.noise != nil}
	return r, nil
}

func (p *densePath) see(t float64) {
	if p.q.limited {
		for i, at := range p.pattern {
			p.counter.see(i, t, at)
		}
	}
}

// step takes one step, and where an input reaches or leaves a limit inside it, steps again
// to just there.
func (p *densePath) step(g *numeric.Integrator, limit float64) error {
	before := append(make([]float64, 0, len(g.State())), g.State()...)
	if err := g.Step(limit); err != nil {
		return err
	}
	s := g.Segment()
	if p.q.limited {
		if at, found := p.firstChange(s); found && at < s.Start+s.Span {
			start := s.Start
			g.Start(start, before)
			for g.Time() < at {
				if err := g.Step(at); err != nil {
					return err
				}
				if err := keep(&p.segments, g.Segment(), p.q); err != nil {
					return err
				}
			}
			g.Start(at, append([]float64(nil), g.State()...))
			p.see(at)
			return nil
		}
	}
	return keep(&p.segments, s, p.q)
}

// firstChange finds the first time in a step at which the pattern of the limits changes,
// looking at eight places inside; p.pattern is the new one then.
func (p *densePath) firstChange(s *numeric.Segment) (float64, bool) {
	z, pattern := make([]float64, len(p.q.start)+p.q.law.own.r), make([]byte, p.q.m)
	differs := func(t float64) bool {
		s.At(t, z)
		p.look(t, z, pattern)
		return string(pattern) != string(p.pattern)
	}
	const looks = 8
	for k := 1; k <= looks; k++ {
		low, high := s.Start+s.Span*float64(k-1)/looks, s.Start+s.Span*float64(k)/looks
		if !differs(high) {
			continue
		}
		for range 60 {
			middle := (low + high) / 2
			if middle == low || middle == high {
				break
			}
			if differs(middle) {
				high = middle
			} else {
				low = middle
			}
		}
		differs(high)
		copy(p.pattern, pattern)
		return high, high > s.Start
	}
	return 0, false
}

// at reads states, outputs and inputs at a time.
func (p *densePath) at(t float64, z, y, u []float64) error {
	for p.piece+1 < len(p.drives) && t >= p.drives[p.piece].end {
		p.piece++
	}
	for p.piece > 0 && t < p.drives[p.piece].start {
		p.piece--
	}
	find(p.segments, t).At(t, z)
	p.inputs(t, z)
	copy(u, p.u)
	return p.q.ownOutputs(z[:p.q.n], p.u, y)
}

func (p *densePath) record(r *value.Response, z []float64) error {
	y, u := make([]float64, p.q.p), make([]float64, p.q.m)
	for k, t := range r.Instants {
		if err := p.at(math.Min(t, p.drives[len(p.drives)-1].end), z, y, u); err != nil {
			return err
		}
		i := 0
		for _, part := range [][]float64{y, u, z} {
			for _, v := range part {
				r.Signals[i].Values[k] = v
				i++
			}
		}
	}
	return nil
}
