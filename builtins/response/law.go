package response

import (
	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// law is what commands the inputs: with its own states q,
//
//	q' (or q⁺) = own·q + fromY·y + fromU·u + fromR·r + fromW·w
//	s = toU·q + stateGain·x + outputGain·y + references·r + v,   u = s within its limits
//
// r are references, w the references of integrators in the plant, v what is added at the
// plant's inputs. Without a law s = v.
type law struct {
	states                           []value.Signal
	refs                             []value.Signal
	own, fromY, fromU, fromR, fromW  grid
	toU, stateGain, outputGain, refG grid
}

// plainLaw is no law at all, for a plant of the given sizes.
func plainLaw(n, m, p, w int) *law {
	return &law{own: newGrid(0, 0), fromY: newGrid(0, p), fromU: newGrid(0, m), fromR: newGrid(0, 0), fromW: newGrid(0, w),
		toU: newGrid(m, 0), stateGain: newGrid(m, n), outputGain: newGrid(m, p), refG: newGrid(m, 0)}
}

// readLaw makes the law of the arguments gain, observer, reference and feedback. period is
// the time between the law's samples, 0 for a continuous one.
func (q *request) readLaw() error {
	c := q.call
	q.law = plainLaw(q.n, q.m, q.p, q.enters.c)
	if c.Has("feedback") {
		for _, other := range []string{"gain", "observer", "reference"} {
			if c.Has(other) {
				return value.Errf(diag.Type, other, "%s and feedback are two laws; give one", other)
			}
		}
		return q.feedbackLaw()
	}
	if !c.Has("gain") {
		for _, other := range []string{"observer", "reference", "every"} {
			if c.Has(other) {
				return value.Errf(diag.Type, other, "%s belongs to a law: give gain: … with it", other)
			}
		}
		return nil
	}
	q.closed = true
	return q.gainLaw()
}

func valuesOf(v value.Value) *value.Matrix {
	if g, ok := v.(*value.Gain); ok {
		return g.Values
	}
	m, _ := v.(*value.Matrix)
	return m
}

// fits checks a matrix argument for its size and for being real.
func fits(m *value.Matrix, param string, rows, cols int) error {
	r, c := m.Dims()
	if r != rows || c != cols {
		return value.Errf(diag.Shape, param, "%s is %d×%d; the plant needs %d×%d", param, r, c, rows, cols)
	}
	if m.IsComplex() {
		return value.Errf(diag.Type, param, "%s must be real", param)
	}
	return nil
}

func (q *request) gainLaw() error {
	c, l := q.call, q.law
	k := valuesOf(c.Args["gain"])
	if err := fits(k, "gain", q.m, q.n); err != nil {
		return err
	}
	if err := q.lawPeriod(); err != nil {
		return err
	}
	gain := gridOf(k)
	if c.Has("reference") {
		n := valuesOf(c.Args["reference"])
		_, cols := n.Dims()
		if err := fits(n, "reference", q.m, cols); err != nil {
			return err
		}
		l.refG, l.refs = gridOf(n), system.Numbered("r", cols)
		if g, ok := c.Args["reference"].(*value.Gain); ok && len(g.ColumnSignals) == cols {
			l.refs = g.ColumnSignals
		}
		l.fromR = newGrid(0, cols)
	}
	if !c.Has("observer") {
		l.stateGain = gain.scaled(-1)
		return nil
	}
	o := valuesOf(c.Args["observer"])
	if err := fits(o, "observer", q.n, q.p); err != nil {
		return err
	}
	return q.observerLaw(gain, gridOf(o))
}

// observerLaw puts an estimate of the states into the law. The observer is told the input
// as the plant gets it, within its limits.
func (q *request) observerLaw(k, obs grid) error {
	l := q.law
	a, b, w := q.a, q.b, q.enters
	if q.hybrid() {
		if w.c > 0 {
			return value.Errf(diag.Type, "gain", "integrators of a continuous plant cannot be fed by a sampled law; sample the plant first, then give it integrators")
		}
		var err error
		if a, b, err = q.heldPlant(q.clock); err != nil {
			return err
		}
	}
	l.states = estimated(q.plant.States)
	l.fromR, l.fromW = newGrid(q.n, l.refG.c), w
	if q.clock > 0 && system.IsCurrentForm(q.call.Args["observer"]) {
		if !q.d.isZero() {
			return value.Errf(diag.Numerical, "observer", "the current form needs a plant without a direct term D")
		}
		keep := unit(q.n).minus(obs.times(q.c))
		l.own, l.fromY, l.fromU = a.times(keep), a.times(obs), b
		l.toU, l.outputGain = k.times(keep).scaled(-1), k.times(obs).scaled(-1)
		return nil
	}
	l.own = a.minus(obs.times(q.c))
	l.fromY, l.fromU = obs, b.minus(obs.times(q.d))
	l.toU = k.scaled(-1)
	return nil
}

func estimated(states []value.Signal) []value.Signal {
	out := append([]value.Signal(nil), states...)
	for i := range out {
		out[i].Name += "̂"
	}
	return out
}

// feedbackLaw is u = v − H·(y − r).
func (q *request) feedbackLaw() error {
	q.closed = true
	h, err := value.ToPlant(q.call.Args["feedback"])
	if err != nil {
		if d, ok := err.(*diag.Error); ok {
			return d.For("feedback")
		}
		return err
	}
	if rows, cols := dims(h.D); rows != q.m || cols != q.p {
		return value.Errf(diag.Shape, "feedback", "the feedback system has %d inputs and %d outputs; the plant needs one with %d inputs (its outputs) and %d outputs (its inputs)", cols, rows, q.p, q.m)
	}
	if n, _ := h.A.Dims(); h.Every != nil {
		if err := q.setClock(h.Every.Float64(), "feedback"); err != nil {
			return err
		}
	} else if err := q.lawPeriod(); err != nil {
		return err
	} else if n > 0 && q.clock > 0 {
		return value.Errf(diag.Type, "feedback", "the feedback is continuous and has states, and it is to act every %.6g s; sample it first", q.clock)
	}
	l := q.law
	l.own, l.fromY = gridOf(h.A), gridOf(h.B)
	n := l.own.r
	l.fromR, l.fromU, l.fromW = l.fromY.scaled(-1), newGrid(n, q.m), newGrid(n, q.enters.c)
	l.toU, l.outputGain = gridOf(h.C).scaled(-1), gridOf(h.D).scaled(-1)
	l.refG = gridOf(h.D)
	l.states = h.States
	for _, s := range q.plant.Outputs {
		s.Name = "r_" + s.Name
		l.refs = append(l.refs, s)
	}
	return nil
}

func dims(m *value.Matrix) (int, int) { return m.Dims() }

// lawPeriod finds how often the law acts: `every`, or the sample time of the plant the
// gains were made for.
func (q *request) lawPeriod() error {
	for _, name := range []string{"gain", "observer"} {
		if g, ok := q.call.Args[name].(*value.Gain); ok && g.Plant != nil && g.Plant.Every != nil {
			if err := q.setClock(g.Plant.Every.Float64(), name); err != nil {
				return err
			}
		} else if ok && g.Plant != nil && q.plant.Every != nil {
			return value.Errf(diag.Type, name, "%s was made for a continuous plant, and this one is sampled every %.6g s", name, q.clock)
		}
	}
	if q.call.Has("every") {
		return q.setClock(q.call.Number("every").Float64(), "every")
	}
	return nil
}

// setClock takes over a sample time unless another one is known.
func (q *request) setClock(period float64, param string) error {
	if q.clock > 0 && q.clock != period {
		return value.Errf(diag.Type, param, "two sample times: %.6g s and %.6g s", q.clock, period)
	}
	q.clock = period
	return nil
}

// heldPlant samples the continuous plant with its inputs held.
func (q *request) heldPlant(period float64) (a, b grid, err error) {
	ad, bd, _, err := numeric.Hold(q.plant.A.Dense(), q.plant.B.Dense(), period)
	if err != nil {
		return a, b, system.Refused(err, "plant")
	}
	a, b = newGrid(q.n, q.n), newGrid(q.n, q.m)
	for i := range q.n {
		for j := range q.n {
			a.v[i*q.n+j] = ad.At(i, j)
		}
		for j := range q.m {
			b.v[i*q.m+j] = bd.At(i, j)
		}
	}
	return a, b, nil
}
