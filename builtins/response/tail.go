package response

import (
	"fmt"
	"math"
	"math/big"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

// tail is one signal of a linear motion for all time: final + c·e^(a·t)·d, or final +
// c·aᵏ·d at the samples, where a decays. where none is set there is no final value and none says why.
type tail struct {
	final  value.Number
	none   string
	hidden string // a mode that does not decay and does not show
	a      grid
	c, d   []float64
	period float64 // between samples; 0 for a continuous one
}

// motion is the same before the final value is taken off: c·e^(a·t)·d with the drive among
// the states, over the rationals where it can be had.
type motion struct {
	a, c, d             grid
	exactA, exactC, exD *exact.Matrix
}

// wholeMotion tells whether the response is one linear motion from start to end.
func (c *course) wholeMotion() bool {
	q := c.q
	if c.noisy || q.limited || q.dynamics != nil || q.hybrid() {
		return false
	}
	return q.drive.kind != list && q.drive.kind != function
}

// motionOf makes the motion of row i of closedC (outputs, then inputs).
func (q *request) motionOf(i int) (*motion, error) {
	n := q.closedA.r
	order := 0 // states of the drive
	switch q.drive.kind {
	case step:
		order = 1
	case ramp:
		order = 2
	case impulse:
		if q.clock > 0 {
			order = 1 // one sample, then zero
		}
	}
	size := n + order
	m := &motion{a: newGrid(size, size), c: newGrid(1, size), d: newGrid(size, 1)}
	m.a.put(0, 0, q.closedA)
	copy(m.c.v, q.closedC.row(i))
	copy(m.d.v, q.start)
	ch, amp := q.drive.channel, q.drive.amplitude
	if order > 0 {
		for k := range n {
			m.a.v[k*size+n] = q.closedB.at(k, ch) * amp
		}
		m.c.v[n] = q.closedD.at(i, ch) * amp
		m.d.v[n] = 1
		sampled := q.clock > 0
		switch {
		case q.drive.kind == ramp && sampled:
			m.d.v[n], m.d.v[n+1] = 0, q.clock
			m.a.v[n*size+n], m.a.v[n*size+n+1], m.a.v[(n+1)*size+n+1] = 1, 1, 1
		case q.drive.kind == ramp:
			m.d.v[n], m.d.v[n+1] = 0, 1
			m.a.v[n*size+n+1] = 1
		case q.drive.kind == step && sampled:
			m.a.v[n*size+n] = 1
		}
	} else if q.drive.kind == impulse {
		for k := range n {
			m.d.v[k] += q.closedB.at(k, ch) * amp
		}
	}
	return m, q.makeExact(m, i, order)
}

// makeExact puts the plant's exact entries where the motion has their roundings.
func (q *request) makeExact(m *motion, i, order int) error {
	n := q.n
	if q.closed || i >= q.p || !system.ExactPlant(q.plant) || n+order > system.ExactOrder {
		return nil
	}
	var err error
	parts := []**exact.Matrix{&m.exactA, &m.exactC, &m.exD}
	for k, g := range []grid{m.a, m.c, m.d} {
		if *parts[k], err = exact.FromFloats(g.r, g.c, g.v); err != nil {
			return value.Errf(kindNumerical, "response", "%v", err)
		}
	}
	amp := rational(q.drive.exactly)
	times := func(x *big.Rat) *big.Rat { return new(big.Rat).Mul(x, amp) }
	for r, x := range q.startAs {
		m.exD.Set(r, 0, rational(x))
	}
	for r := range n {
		for c := range n {
			m.exactA.Set(r, c, q.plant.A.Exact().At(r, c))
		}
		m.exactC.Set(0, r, q.plant.C.Exact().At(i, r))
		ch := q.drive.channel
		if q.drive.kind == still || q.drive.kind == impulse && order == 0 {
			if q.drive.kind == impulse {
				m.exD.Set(r, 0, new(big.Rat).Add(rational(q.startAs[r]), times(q.plant.B.Exact().At(r, ch))))
			}
			continue
		}
		m.exactA.Set(r, n, times(q.exactInto(r, ch)))
	}
	if order > 0 && q.drive.channel < q.m {
		m.exactC.Set(0, n, times(q.plant.D.Exact().At(i, q.drive.channel)))
	}
	return nil
}

func rational(n value.Number) *big.Rat {
	if n.IsExact() {
		return n.Exact
	}
	return new(big.Rat).SetFloat64(n.F)
}

func (q *request) exactInto(r, ch int) *big.Rat {
	if ch < q.m {
		return q.plant.B.Exact().At(r, ch)
	}
	return new(big.Rat).SetFloat64(q.closedB.at(r, ch))
}

// tailOf finds the final value of row i of closedC and what is left besides.
func (q *request) tailOf(i int) (*tail, error) {
	m, err := q.motionOf(i)
	if err != nil {
		return nil, err
	}
	var t *tail
	if m.exactA != nil {
		t, err = q.exactTail(m)
	} else {
		t, err = q.floatTail(m)
	}
	if err != nil {
		return nil, err
	}
	t.period = q.clock
	return t, q.noteHidden(t)
}

// noteHidden tells of modes that do not decay where the response has a final value nonetheless.
func (q *request) noteHidden(t *tail) error {
	if t.none != "" {
		return nil
	}
	roots, err := q.spectrum()
	if err != nil {
		return err
	}
	for _, r := range roots {
		if !decays(r, q.clock > 0) {
			t.hidden = fmt.Sprintf("the mode at %s does not decay, and this response does not show it: the system is not stable inside", poleText(r.Value))
		}
	}
	return nil
}

func decays(r system.Root, sampled bool) bool {
	if sampled {
		return cmplx.Abs(r.Value) < 1-r.Err
	}
	return real(r.Value) < -r.Err
}

func poleText(p complex128) string {
	switch {
	case math.Abs(imag(p)) <= 1e-12*cmplx.Abs(p):
		return fmt.Sprintf("%.5g", real(p))
	case math.Abs(real(p)) <= 1e-12*cmplx.Abs(p):
		return fmt.Sprintf("± %.5gi", math.Abs(imag(p)))
	}
	return fmt.Sprintf("%.5g ± %.5gi", real(p), math.Abs(imag(p)))
}

// judge tells why a motion with this pole has no final value, "" where the pole decays.
func judge(r system.Root, sampled bool) string {
	if decays(r, sampled) {
		return ""
	}
	p, word := r.Value, "s"
	grows := real(p) > r.Err
	if sampled {
		word = "z"
		grows = cmplx.Abs(p) > 1+r.Err
	}
	if grows {
		return fmt.Sprintf("none: it grows without bound (pole at %s = %s)", word, poleText(p))
	}
	return fmt.Sprintf("none: it does not come to rest (pole at %s = %s)", word, poleText(p))
}

// exactTail works on the signal's own transform, with what cancels taken out exactly.
func (q *request) exactTail(m *motion) (*tail, error) {
	zero := exact.NewMatrix(1, 1)
	g, err := exact.Transfer(m.exactA, m.exD, m.exactC, zero)
	if err != nil {
		return nil, value.Errf(kindNumerical, "response", "%v", err)
	}
	y := g[0][0]
	rest, at := new(big.Rat), new(big.Rat)
	if q.clock > 0 {
		at.SetInt64(1)
	}
	factor := exact.NewPolynomial(big.NewRat(1, 1), new(big.Rat).Neg(at))
	den, often := y.Den, 0
	for den.Degree() > 0 && den.Eval(at).Sign() == 0 {
		if den, _, err = den.DivMod(factor); err != nil {
			return nil, err
		}
		often++
	}
	if often > 1 {
		return &tail{none: "none: it keeps growing, as an integrator's answer does"}, nil
	}
	roots, err := system.RootsOf(den)
	if err != nil {
		return nil, err
	}
	for _, r := range roots {
		if why := judge(r, q.clock > 0); why != "" {
			return &tail{none: why}, nil
		}
	}
	if often == 1 {
		rest.Quo(y.Num.Eval(at), den.Eval(at))
	}
	t := &tail{final: value.Rat(rest)}
	left := y
	if often == 1 { // take rest/(s − at) off
		off, err := exact.NewRational(exact.Constant(rest), factor)
		if err != nil {
			return nil, err
		}
		left = y.Sub(off)
	}
	return t, q.realiseTail(t, left, m)
}

// realiseTail gives the tail states: those of the system where it decays, else those of
// the transform alone.
func (q *request) realiseTail(t *tail, left exact.Rational, m *motion) error {
	if direct, ok := q.directTail(m); ok {
		t.a, t.c, t.d = direct.a, direct.c, direct.d
		return nil
	}
	a, b, c, _, err := exact.Realize([][]exact.Rational{{left}})
	if err != nil {
		return value.Errf(kindNumerical, "response", "%v", err)
	}
	n, _ := a.Dims()
	t.a, t.c, t.d = grid{n, n, a.Float64()}, c.Float64(), b.Float64()
	return nil
}

// directTail takes the states as deviations from where they come to rest; ok is false
// where the loop does not decay.
func (q *request) directTail(m *motion) (*tail, bool) {
	if q.drive.kind == ramp {
		return nil, false
	}
	roots, err := q.spectrum()
	if err != nil {
		return nil, false
	}
	for _, r := range roots {
		if !decays(r, q.clock > 0) {
			return nil, false
		}
	}
	n := q.closedA.r
	t := &tail{a: q.closedA, c: m.c.v[:n], d: append([]float64(nil), m.d.v[:n]...)}
	if q.drive.kind == impulse && q.clock > 0 {
		return &tail{a: m.a, c: m.c.v, d: m.d.v}, true
	}
	if q.drive.kind != step || n == 0 {
		return t, true
	}
	// rest: a·x + b = 0, or x = a·x + b
	lhs, rhs := mat.NewDense(n, n, nil), mat.NewDense(n, 1, nil)
	for i := range n {
		for j := range n {
			x := -q.closedA.at(i, j)
			if q.clock > 0 && i == j {
				x++
			}
			lhs.Set(i, j, x)
		}
		rhs.Set(i, 0, m.a.at(i, n))
	}
	rest, wrong, ok := restOf(lhs, rhs, m.c.v[:n])
	if !ok {
		return nil, false
	}
	t.final = value.FloatErr(m.c.v[n]+dot(m.c.v[:n], rest), wrong[0])
	for i := range n {
		t.d[i] -= rest[i]
	}
	return t, true
}

func conditionOf(err error) mat.Condition {
	if c, ok := err.(mat.Condition); ok {
		return c
	}
	return 0
}

// floatTail judges a motion in binary64: what is not moved or not seen is split off by
// orthogonal reductions when the loop as a whole does not decay.
func (q *request) floatTail(m *motion) (*tail, error) {
	if t, ok := q.directTail(m); ok {
		scale := largest(t.d) * largest(t.c)
		t.final.Err = math.Max(t.final.Err, 1e-14*(math.Abs(t.final.F)+scale))
		return t, nil
	}
	dense := func(g grid) *mat.Dense { return mat.NewDense(g.r, g.c, g.v) }
	split, err := numeric.KalmanSplit(dense(m.a), dense(m.d), dense(m.c))
	if err != nil {
		return nil, system.Refused(err, "response")
	}
	k := split.Sizes[0]
	t := &tail{a: newGrid(k, k), c: make([]float64, k), d: make([]float64, k)}
	for i := range k {
		for j := range k {
			t.a.v[i*k+j] = split.A.At(i, j)
		}
		t.c[i], t.d[i] = split.C.At(0, i), split.B.At(i, 0)
	}
	at, kept := complex(0, 0), 0
	if q.clock > 0 {
		at = 1
	}
	size := largest(m.a.v)
	for i, p := range split.Poles[0] {
		if cmplx.Abs(p-at) <= math.Max(10*split.PoleError[0][i], 1e-12*size) {
			kept++
			continue
		}
		if why := judge(system.Root{Value: p, Err: split.PoleError[0][i]}, q.clock > 0); why != "" {
			return &tail{none: why}, nil
		}
	}
	if kept > 1 {
		return &tail{none: "none: it keeps growing, as an integrator's answer does"}, nil
	}
	return t, t.takeRestOff(at, kept, split.Certificate.Digits)
}

// takeRestOff moves the part of the one mode that stays into the final value.
func (t *tail) takeRestOff(at complex128, kept int, digits float64) error {
	if kept == 0 || t.a.r == 0 {
		return nil
	}
	n := t.a.r
	e, err := numeric.Eigen(mat.NewDense(n, n, append([]float64(nil), t.a.v...)))
	if err != nil {
		return system.Refused(err, "response")
	}
	best := 0
	for j, p := range e.Values {
		if cmplx.Abs(p-at) < cmplx.Abs(e.Values[best]-at) {
			best = j
		}
	}
	inner, scale, out := 0.0, 0.0, 0.0
	driven, seen := 0.0, 0.0 // the sums without cancellation
	for i := range n {
		v, w := real(e.Right.At(i, best)), real(e.Left.At(i, best))
		inner += w * t.d[i]
		scale += w * v
		out += t.c[i] * v
		driven += math.Abs(w * t.d[i])
		seen += math.Abs(t.c[i] * v)
	}
	part := inner / scale
	for i := range n {
		t.d[i] -= part * real(e.Right.At(i, best))
	}
	rest := out * part
	turned := float64(n) * 0x1p-52 // how far rounding turns the mode's vectors: by the poles' errors over their distance
	for j, p := range e.Values {
		if j != best {
			turned = math.Max(turned, e.ErrorOf[j]/cmplx.Abs(p-e.Values[best]))
		}
	}
	t.final = value.FloatErr(rest, math.Max(math.Abs(rest)*math.Pow(10, -math.Max(digits-1, 1)), math.Abs(driven*seen/scale)*turned))
	return nil
}
