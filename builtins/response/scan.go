package response

import (
	"errors"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"gainwright/builtins/numeric"
	"gainwright/lang/value"
)

// reading gathers what figures are made of while a signal is followed, in fractions of the
// way from start to end: v = (y − from)/way. Pieces come in order and are monotone; times
// inside one are located, not read off a grid.
type reading struct {
	from, way   float64
	within      float64
	low, high   float64 // where the rise begins and ends, in fractions
	top         float64
	topAt       float64
	bottom      float64
	bottomAt    float64
	lowAt       float64 // NaN until passed
	highAt      float64
	outside     bool
	settledAt   float64
	peak        float64 // of |y|
	peakAt      float64
	samplesOnly bool
}

func newReading(from, way, within float64) *reading {
	return &reading{from: from, way: way, within: within, low: 0.1, high: 0.9, top: math.Inf(-1), bottom: math.Inf(1), lowAt: math.NaN(), highAt: math.NaN()}
}

func (r *reading) fraction(y float64) float64 { return (y - r.from) / r.way }

// point takes a value that the signal has at a time.
func (r *reading) point(t, y float64) {
	v := r.fraction(y)
	if v > r.top {
		r.top, r.topAt = v, t
	}
	if v < r.bottom {
		r.bottom, r.bottomAt = v, t
	}
	if a := math.Abs(y); a > r.peak {
		r.peak, r.peakAt = a, t
	}
}

// first takes the value at the start.
func (r *reading) first(t, y float64) {
	r.point(t, y)
	v := r.fraction(y)
	if v >= r.low {
		r.lowAt = t
	}
	if v >= r.high {
		r.highAt = t
	}
	r.outside, r.settledAt = math.Abs(v-1) > r.within, t
}

// piece takes a monotone stretch; passes finds the time at which the signal passes a value.
func (r *reading) piece(ta, ya, tb, yb float64, passes func(y float64) float64) {
	r.point(tb, yb)
	a, b := r.fraction(ya), r.fraction(yb)
	at := func(v float64) float64 {
		if r.samplesOnly || v == b {
			return tb
		}
		return passes(r.from + v*r.way)
	}
	if math.IsNaN(r.lowAt) && a < r.low && b >= r.low {
		r.lowAt = at(r.low)
	}
	if math.IsNaN(r.highAt) && a < r.high && b >= r.high {
		r.highAt = at(r.high)
	}
	if math.Abs(b-1) > r.within {
		r.outside = true
		return
	}
	if r.outside {
		r.outside = false
		if a > 1 {
			r.settledAt = at(1 + r.within)
		} else {
			r.settledAt = at(1 - r.within)
		}
	}
}

var errUnlocated = errors.New("the signal swings too often before it settles")

// most steps of one scan
const mostLooks = 6_000_000

// finest step in radians of the fastest mode that matters: 40 to a swing
const lookAngle = 0.15

// scan follows a tail until what is left cannot change the reading.
func (t *tail) scan(r *reading) error {
	if t.period > 0 {
		return t.scanSamples(r)
	}
	n := t.a.r
	final := t.final.Float64()
	if n == 0 {
		r.first(0, final)
		return nil
	}
	rows := grid{1, n, t.c}
	m, err := modalOf(t.a, t.d, rows)
	if err != nil {
		return err
	}
	fastest := 0.0
	for _, p := range m.poles {
		fastest = math.Max(fastest, cmplx.Abs(p))
	}
	if fastest == 0 {
		fastest = 1
	}
	f := &follower{tail: t, final: final, modes: m, z: append([]float64(nil), t.d...), next: make([]float64, n), rate: make([]float64, n), trial: make([]float64, n)}
	if f.prop, err = numeric.NewPropagator(mat.NewDense(n, n, append([]float64(nil), t.a.v...)), lookAngle/fastest); err != nil {
		return err
	}
	return f.run(r)
}

// follower walks along a tail with steps that grow as fast modes die.
type follower struct {
	tail                 *tail
	final                float64
	modes                *modal
	prop                 *numeric.Propagator
	z, next, rate, trial []float64
	time                 float64
}

func (f *follower) value(z []float64) float64 { return f.final + dot(f.tail.c, z) }

func (f *follower) slope(z []float64) float64 {
	f.prop.Rates(f.rate, z)
	return dot(f.tail.c, f.rate)
}

// left bounds how far the signal is from its final value at any time from t on, and gives
// the level of the step that suits the modes that are not negligible yet.
func (f *follower) left(t, negligible float64) (bound float64, level int) {
	fastest := 0.0
	for j, p := range f.modes.poles {
		a := f.modes.amplitude.v[j] * math.Exp(math.Min(0, real(p))*t)
		bound += 2 * a
		if a > negligible {
			fastest = math.Max(fastest, cmplx.Abs(p))
		}
	}
	if fastest == 0 {
		return bound, 0
	}
	return bound, max(0, int(math.Floor(math.Log2(lookAngle/fastest/f.prop.Period()))))
}

func (f *follower) run(r *reading) error {
	way := math.Abs(r.way)
	y, slope := f.value(f.z), f.slope(f.z)
	r.first(0, y)
	for k := 0; ; k++ {
		bound, level := f.left(f.time, 1e-9*way)
		if r.done(bound / way) {
			return nil
		}
		if k > mostLooks {
			return errUnlocated
		}
		if err := f.prop.Step(level, f.next, f.z); err != nil {
			return err
		}
		span := math.Ldexp(f.prop.Period(), level)
		nextY, nextSlope := f.value(f.next), f.slope(f.next)
		if slope*nextSlope < 0 {
			turn := f.locate(span, func(z []float64) bool { return f.slope(z)*slope < 0 })
			top := f.value(f.moved(turn))
			r.piece(f.time, y, f.time+turn, top, f.passes(0, turn, y))
			r.piece(f.time+turn, top, f.time+span, nextY, f.passes(turn, span, top))
		} else {
			r.piece(f.time, y, f.time+span, nextY, f.passes(0, span, y))
		}
		f.z, f.next = f.next, f.z
		f.time += span
		y, slope = nextY, nextSlope
	}
}

// moved is the state some time after the present one.
func (f *follower) moved(dt float64) []float64 {
	copy(f.trial, f.z)
	if f.prop.Advance(f.trial, dt) != nil {
		clear(f.trial)
	}
	return f.trial
}

func (f *follower) locate(h float64, holds func(z []float64) bool) float64 {
	low, high := 0.0, h
	for range 60 {
		middle := (low + high) / 2
		if middle == low || middle == high {
			break
		}
		if holds(f.moved(middle)) {
			high = middle
		} else {
			low = middle
		}
	}
	return high
}

// passes locates where the signal, monotone between two times of this step, has a value.
func (f *follower) passes(from, to, y float64) func(level float64) float64 {
	return func(level float64) float64 {
		side := y < level
		low, high := from, to
		for range 60 {
			middle := (low + high) / 2
			if middle == low || middle == high {
				break
			}
			if (f.value(f.moved(middle)) < level) == side {
				low = middle
			} else {
				high = middle
			}
		}
		return f.time + high
	}
}

// overshoots smaller than this part of the way are rounding
const rounding = 1e-9

// done tells whether what is still to come, no further from the end than bound, can change
// nothing.
func (r *reading) done(bound float64) bool {
	return bound <= r.within && bound <= r.low && bound <= math.Max(r.top-1, rounding)
}

// scanSamples follows a sampled tail from sample to sample.
func (t *tail) scanSamples(r *reading) error {
	r.samplesOnly = true
	n := t.a.r
	final := t.final.Float64()
	way := math.Abs(r.way)
	m, err := modalOf(t.a, t.d, grid{1, n, t.c})
	if err != nil {
		return err
	}
	z, next := append([]float64(nil), t.d...), make([]float64, n)
	y := final + dot(t.c, z)
	r.first(0, y)
	for k := 1; ; k++ {
		bound := 0.0
		for j, p := range m.poles {
			bound += 2 * m.amplitude.v[j] * math.Pow(math.Min(1, cmplx.Abs(p)), float64(k-1))
		}
		if k > n && (r.done(bound/way) || largest(z) == 0) {
			return nil
		}
		if k > mostLooks {
			return errUnlocated
		}
		t.a.apply(next, z)
		z, next = next, z
		after := final + dot(t.c, z)
		r.piece(float64(k-1)*t.period, y, float64(k)*t.period, after, nil)
		y = after
	}
}

// follow reads a signal that is known only from start to end of a path: on a mesh fine
// enough to see every turn, turns and crossings located between.
func follow(r *reading, mesh []float64, at func(t float64) float64) {
	if len(mesh) == 0 {
		return
	}
	y := make([]float64, len(mesh))
	for i, t := range mesh {
		y[i] = at(t)
	}
	r.first(mesh[0], y[0])
	ta, ya := mesh[0], y[0]
	passes := func(a, b, ya float64) func(level float64) float64 {
		return func(level float64) float64 {
			side := ya < level
			low, high := a, b
			for range 70 {
				middle := (low + high) / 2
				if middle == low || middle == high {
					break
				}
				if (at(middle) < level) == side {
					low = middle
				} else {
					high = middle
				}
			}
			return high
		}
	}
	for i := 1; i < len(mesh); i++ {
		if i+1 < len(mesh) && (y[i]-y[i-1])*(y[i+1]-y[i]) < 0 {
			sign := 1.0
			if y[i] < y[i-1] {
				sign = -1
			}
			turn := goldenTop(mesh[i-1], mesh[i+1], func(t float64) float64 { return sign * at(t) })
			turn = math.Max(turn, ta)
			if top := at(turn); sign*top >= sign*y[i] {
				r.piece(ta, ya, turn, top, passes(ta, turn, ya))
				ta, ya = turn, top
				if turn >= mesh[i] {
					continue
				}
			}
		}
		if mesh[i] <= ta {
			continue
		}
		r.piece(ta, ya, mesh[i], y[i], passes(ta, mesh[i], ya))
		ta, ya = mesh[i], y[i]
	}
}

// goldenTop finds the largest value between two times by golden sections.
func goldenTop(a, b float64, f func(t float64) float64) float64 {
	const g = 0.6180339887498949
	c, d := b-g*(b-a), a+g*(b-a)
	fc, fd := f(c), f(d)
	for range 60 {
		if b-a <= 1e-14*math.Abs(b) {
			break
		}
		if fc > fd {
			b, d, fd = d, c, fc
			c = b - g*(b-a)
			fc = f(c)
		} else {
			a, c, fc = c, d, fd
			d = a + g*(b-a)
			fd = f(d)
		}
	}
	return (a + b) / 2
}

// followSamples reads a sampled response.
func followSamples(r *reading, t *value.Trace, instants []float64) {
	r.samplesOnly = true
	r.first(instants[0], t.Values[0])
	for k := 1; k < len(instants); k++ {
		r.piece(instants[k-1], t.Values[k-1], instants[k], t.Values[k], nil)
	}
}
