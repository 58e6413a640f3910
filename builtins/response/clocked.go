package response

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/value"
)

// clocked runs what acts at samples. At each sample the law reads the outputs just before
// it, its input is cut to the limits and held, and the plant moves to the next sample: by
// its own recursion, by the exponential of the held plant, or by its own equations.
type clocked struct {
	q                   *request
	x, own, nextOwn     []float64
	u, ask, y, seen, in []float64 // input, demand, output, output with noise, channels
	error               []float64 // of the measurement
	r, w, nextX         []float64
	mover               mover
	counter             *stayCounter
}

// mover is a continuous plant between samples; nil for a sampled plant.
type mover interface {
	// begin tells that u is held from time t, where the states are x.
	begin(t float64, x, u []float64) error
	// at reads states and outputs at a time within the sample.
	at(t float64, x, y []float64) error
	// end moves x to the end of the sample.
	end(t float64, x []float64) error
}

func (q *request) newClocked() *clocked {
	k := &clocked{q: q, x: append([]float64(nil), q.start...), own: make([]float64, q.law.own.r), nextOwn: make([]float64, q.law.own.r),
		u: make([]float64, q.m), ask: make([]float64, q.m), y: make([]float64, q.p), seen: make([]float64, q.p),
		in: make([]float64, len(q.channels)), r: make([]float64, len(q.law.refs)), w: make([]float64, q.enters.c), nextX: make([]float64, q.n), error: make([]float64, q.p)}
	k.counter = newStayCounter(q)
	return k
}

// sample reads the outputs and forms the inputs of sample number n at time t.
func (k *clocked) sample(n int, t float64) error {
	q, l := k.q, k.q.law
	clear(k.in)
	if q.drive.kind != still {
		if err := q.driveAt(n, t, k.in); err != nil {
			return err
		}
	}
	copy(k.r, k.in[q.m:q.m+len(k.r)])
	copy(k.w, k.in[q.m+len(k.r):])
	if q.noise != nil {
		q.noise.measure(k.error)
	}
	if !l.outputGain.isZero() { // the output without what the input adds at once
		if err := k.outputs(false); err != nil {
			return err
		}
	}
	copy(k.ask, k.in[:q.m])
	l.toU.add(k.ask, k.own)
	l.stateGain.add(k.ask, k.x)
	l.outputGain.add(k.ask, k.seen)
	l.refG.add(k.ask, k.r)
	if q.algebraicLoop {
		q.through.apply(k.u, k.ask)
	} else {
		copy(k.u, k.ask)
	}
	for i := range k.u {
		at := byte('0')
		switch {
		case k.ask[i] >= q.high[i]:
			k.u[i], at = q.high[i], '+'
		case k.ask[i] <= q.low[i]:
			k.u[i], at = q.low[i], '-'
		}
		if q.limited {
			k.counter.see(i, t, at)
		}
	}
	if err := k.outputs(true); err != nil {
		return err
	}
	// the law's next states
	l.own.apply(k.nextOwn, k.own)
	l.fromY.add(k.nextOwn, k.seen)
	l.fromU.add(k.nextOwn, k.u)
	l.fromR.add(k.nextOwn, k.r)
	l.fromW.add(k.nextOwn, k.w)
	return nil
}

// outputs fills y, and what is seen of it through the noise, with or without what the
// inputs add at once.
func (k *clocked) outputs(through bool) error {
	q := k.q
	switch {
	case q.dynamics != nil:
		if err := q.ownOutputs(k.x, k.u, k.y); err != nil {
			return err
		}
	default:
		q.c.apply(k.y, k.x)
		if through {
			q.d.add(k.y, k.u)
		}
	}
	for i, y := range k.y {
		k.seen[i] = y + k.error[i]
	}
	return nil
}

// advance moves the plant to the next sample and the law to its next states.
func (k *clocked) advance(t, next float64) error {
	q := k.q
	switch {
	case k.mover != nil:
		if err := k.mover.end(next, k.x); err != nil {
			return err
		}
	case q.dynamics != nil:
		if err := q.ownRates(k.x, k.u, k.nextX, t); err != nil {
			return err
		}
		copy(k.x, k.nextX)
	default:
		q.a.apply(k.nextX, k.x)
		q.b.add(k.nextX, k.u)
		q.enters.add(k.nextX, k.w)
		copy(k.x, k.nextX)
	}
	if q.noise != nil && k.mover == nil {
		q.noise.push(k.x)
	}
	k.own, k.nextOwn = k.nextOwn, k.own
	if !allFinite(k.x) || !allFinite(k.own) {
		return grewTooLarge(next)
	}
	return nil
}

// heldMover is a linear plant with held inputs: an exact step from x and u.
type heldMover struct {
	q     *request
	prop  *numeric.Propagator
	z     []float64 // x and u at the last time read
	last  float64
	inner float64 // the spacing of the instants
}

func (q *request) newHeldMover(spacing float64) (*heldMover, error) {
	size := q.n + q.m
	g := newGrid(size, size)
	g.put(0, 0, q.a)
	g.put(0, q.n, q.b)
	prop, err := numeric.NewPropagator(mat.NewDense(size, size, g.v), spacing)
	if err != nil {
		return nil, system.Refused(err, "plant")
	}
	return &heldMover{q: q, prop: prop, z: make([]float64, size), inner: spacing}, nil
}

func (h *heldMover) begin(t float64, x, u []float64) error {
	copy(h.z, x)
	copy(h.z[h.q.n:], u)
	h.last = t
	return nil
}

func (h *heldMover) move(t float64) error {
	dt := t - h.last
	switch {
	case dt <= 0:
		return nil
	case math.Abs(dt-h.inner) < 1e-9*h.inner:
		copy(h.prop.Spare(), h.z)
		if err := h.prop.Step(0, h.z, h.prop.Spare()); err != nil {
			return err
		}
		if h.q.noise != nil {
			h.q.noise.push(h.z[:h.q.n])
		}
	default:
		if err := h.prop.Advance(h.z, dt); err != nil {
			return err
		}
	}
	h.last = t
	return nil
}

func (h *heldMover) at(t float64, x, y []float64) error {
	if err := h.move(t); err != nil {
		return err
	}
	copy(x, h.z[:h.q.n])
	h.q.c.apply(y, x)
	h.q.d.add(y, h.z[h.q.n:])
	return nil
}

func (h *heldMover) end(t float64, x []float64) error {
	if err := h.move(t); err != nil {
		return err
	}
	copy(x, h.z[:h.q.n])
	return nil
}

// clockedResponse runs a sampled system or a sampled law on a continuous plant; with the
// plant's own equations three times, to learn the sizes of the states and what a halved
// tolerance changes.
func (q *request) clockedResponse() (*value.Response, error) {
	if q.dynamics == nil || !q.hybrid() {
		return q.clockedRun()
	}
	return q.withHalvedTolerance(q.clockedRun)
}

func (q *request) clockedRun() (*value.Response, error) {
	samples := int(math.Floor(q.until/q.clock*(1+1e-9))) + 1
	within := 1
	if q.hybrid() {
		within = q.points
	}
	count := (samples-1)*within + 1
	if err := q.charge(count); err != nil {
		return nil, err
	}
	if q.noise != nil {
		q.noise.restart()
	}
	k := q.newClocked()
	spacing := q.clock / float64(within)
	path, err := q.chooseMover(k, spacing, samples)
	if err != nil {
		return nil, err
	}
	if q.drive.kind == impulse && q.hybrid() && q.channels[q.drive.channel].kind == atInput {
		for i := range q.n { // the blow comes just before the first sample
			k.x[i] += q.b.at(i, q.drive.channel) * q.drive.amplitude
		}
	}
	r := &value.Response{Title: q.title(), Instants: evenly(spacing, count), Signals: q.traces(count), Sampled: !q.hybrid()}
	refs := q.clockedReferences(r, count)
	for n := range samples {
		if err := k.whole(r, path, n, n == samples-1, within, spacing, refs); err != nil {
			return nil, err
		}
	}
	q.finishClocked(r, k, path)
	return r, nil
}

// whole runs one sample and, unless it is the last, moves on to the next.
func (k *clocked) whole(r *value.Response, path *heldPath, n int, last bool, within int, spacing float64, refs []int) error {
	q := k.q
	if n&63 == 0 && q.call.Context.Err() != nil {
		return q.call.Context.Err()
	}
	t := float64(n) * q.clock
	if err := k.sample(n, t); err != nil {
		return err
	}
	if k.mover != nil {
		if err := k.mover.begin(t, k.x, k.u); err != nil {
			return err
		}
		path.note(k.x, k.u)
	}
	k.store(r.Signals, n*within, refs)
	if last {
		return nil
	}
	if err := k.inside(r.Signals, n*within, within, t, spacing, refs); err != nil {
		return err
	}
	return k.advance(t, float64(n+1)*q.clock)
}

func (q *request) chooseMover(k *clocked, spacing float64, samples int) (*heldPath, error) {
	if !q.hybrid() {
		return nil, nil
	}
	path := &heldPath{q: q, clock: q.clock}
	if q.dynamics != nil {
		k.mover = q.newOwnMover(path)
		return path, nil
	}
	m, err := q.newHeldMover(spacing)
	if err != nil {
		return nil, err
	}
	k.mover, path.prop = m, m.prop
	path.starts = make([]float64, 0, samples*(q.n+q.m))
	return path, q.call.Charge(int64(samples) * int64(q.n+q.m) * 8)
}

// clockedReferences adds traces for the references that are driven.
func (q *request) clockedReferences(r *value.Response, count int) []int {
	var refs []int
	for _, ch := range q.driven() {
		if q.channels[ch].kind != atInput {
			refs = append(refs, ch)
			r.Signals = append(r.Signals, value.Trace{Name: q.channels[ch].Name, Unit: q.channels[ch].Unit, Role: "reference", Values: make([]float64, count), Held: true})
		}
	}
	return refs
}

// store writes the signals at a sample.
func (k *clocked) store(traces []value.Trace, at int, refs []int) {
	i := 0
	put := func(values []float64) {
		for _, v := range values {
			traces[i].Values[at] = v
			i++
		}
	}
	shown := k.y
	if k.q.noise != nil && k.mover == nil {
		shown = k.seen
	}
	put(shown)
	put(k.u)
	put(k.x)
	put(k.own)
	for _, ch := range refs {
		put(k.in[ch : ch+1])
	}
}

// inside writes the instants between two samples.
func (k *clocked) inside(traces []value.Trace, at, within int, t, spacing float64, refs []int) error {
	if within == 1 {
		return nil
	}
	x, y := k.nextX, make([]float64, k.q.p)
	for j := 1; j < within; j++ {
		if err := k.mover.at(t+float64(j)*spacing, x, y); err != nil {
			return err
		}
		i := 0
		for _, part := range [][]float64{y, k.u, x, k.own} {
			for _, v := range part {
				traces[i].Values[at+j] = v
				i++
			}
		}
		for _, ch := range refs {
			traces[i].Values[at+j] = k.in[ch]
			i++
		}
	}
	return nil
}

func (q *request) finishClocked(r *value.Response, k *clocked, path *heldPath) {
	if q.limited {
		r.Stays = k.counter.all
	}
	relative := 1e-14
	if path != nil && path.prop != nil {
		relative = math.Max(relative, 4*math.Pow(10, -path.prop.Digits()))
	}
	growth := math.Sqrt(float64(len(r.Instants)))
	for i := range r.Signals {
		r.Signals[i].Err = relative * growth * largest(r.Signals[i].Values)
	}
	r.Source = &course{q: q, held: path, sampled: !q.hybrid(), noisy: q.noise != nil, samples: r}
}
