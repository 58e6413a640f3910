package response

import (
	"math"
	"math/cmplx"

	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

const (
	fewestPoints = 400  // intervals of a continuous response whose points are not given
	mostPoints   = 8000 // of one with many swings
	eachSwing    = 24   // intervals of a swing
	mostSamples  = 20_000
	leftOver     = 0.003 // the part of a mode that the chosen time leaves
	idle         = 10.0  // s, where nothing tells how long to look
)

// readUntil reads `until` and `points`, or chooses them from the modes that show.
func (q *request) readUntil() error {
	q.untilGiven = q.call.Has("until")
	q.until = q.call.Number("until").Float64()
	if d := &q.drive; d.kind == list {
		switch {
		case q.clock > 0:
			d.spacing = q.clock
			if !q.untilGiven {
				q.until = float64(len(d.samples)-1) * q.clock
			}
		case !q.untilGiven:
			return value.Errf(diag.Type, "to", "a list for a continuous system needs until: …, over which its samples are spread evenly")
		default:
			d.spacing = q.until / float64(len(d.samples)-1)
		}
	}
	swing := 0.0
	if q.until == 0 || !q.call.Has("points") {
		span, fastest, err := q.chosenSpan()
		if err != nil {
			return err
		}
		if q.until == 0 {
			q.until = span
		}
		swing = fastest
	}
	if math.IsInf(q.until, 0) || q.until < 1e-290 {
		return value.Errf(diag.Numerical, "until", "the time to look at cannot be %.3g s", q.until)
	}
	return q.readPoints(swing)
}

func (q *request) readPoints(swing float64) error {
	given := 0
	if q.call.Has("points") {
		var ok bool
		if given, ok = q.call.Number("points").Whole(); !ok || given < 2 || given > mostInstants {
			return value.Errf(diag.Type, "points", "points is a whole number from 2 to %d", mostInstants)
		}
	}
	switch {
	case q.clock == 0 && given > 0:
		q.points = given - 1
	case q.clock == 0:
		q.points = min(mostPoints, max(fewestPoints, int(math.Ceil(q.until*swing/(2*math.Pi)*eachSwing))))
	default:
		samples := math.Floor(q.until / q.clock * (1 + 1e-9))
		if samples < 1 {
			return value.Errf(diag.Type, "until", "until is shorter than one sample, %.6g s", q.clock)
		}
		if samples > mostInstants {
			return value.Errf(diag.Limit, "until", "%.0f samples are too many: at most %d", samples, mostInstants)
		}
		if q.plant.Every != nil {
			if given > 0 {
				return value.Errf(diag.Type, "points", "a sampled system has its own instants, every %.6g s", q.clock)
			}
			return nil
		}
		wanted := float64(fewestPoints)
		if given > 0 {
			wanted = float64(given - 1)
		}
		q.points = int(math.Max(1, math.Min(50, math.Ceil(wanted/samples))))
		if given > 0 {
			q.points = int(math.Max(1, math.Ceil(wanted/samples)))
		}
	}
	return nil
}

// chosenSpan is how long the modes that show in the outputs need to die down, rounded up
// to a round number, and the fastest swing that shows.
func (q *request) chosenSpan() (span, fastest float64, err error) {
	n := q.closedA.r
	d := make([]float64, n)
	copy(d, q.start)
	ratesOnly := false // d are the rates at the start: amplitudes are over the pole
	if q.drive.kind == step || q.drive.kind == ramp || q.drive.kind == list || q.drive.kind == function {
		ratesOnly = q.clock == 0
		if ratesOnly {
			moved := make([]float64, n)
			q.closedA.apply(moved, d)
			copy(d, moved)
		}
	}
	for j := range q.channels {
		if q.drive.kind != still && (j == q.drive.channel || q.drive.channel < 0 && j < q.m) {
			for i := range n {
				d[i] += q.closedB.at(i, j)
			}
		}
	}
	if q.noise != nil || q.call.Has("noise") {
		for i := range q.n {
			d[i]++
		}
	}
	rows := grid{q.p, n, q.closedC.v[:q.p*n]}
	if q.p == 0 {
		rows = unit(n)
	}
	m, err := modalOf(q.closedA, d, rows)
	if err != nil {
		return 0, 0, system.Refused(err, "plant")
	}
	span, fastest = m.span(rates(m.poles, q.clock), ratesOnly)
	if span == 0 {
		span = idle
		if q.clock > 0 {
			span = 0
		}
	}
	if q.limited || q.dynamics != nil {
		span *= 1.5
	}
	if q.clock > 0 {
		span = math.Max(span, float64(n+6)*q.clock)
		span = math.Min(span, mostSamples*q.clock)
		samples := math.Ceil(roundUp(span)/q.clock*(1-1e-9) - 1e-9)
		return samples * q.clock, fastest, nil
	}
	return roundUp(span), fastest, nil
}

// span looks at every mode of every signal. Flat modes, integrators, need no time.
func (m *modal) span(poles []complex128, ratesOnly bool) (span, fastest float64) {
	scale := 0.0
	for _, p := range poles {
		scale = math.Max(scale, cmplx.Abs(p))
	}
	amplitude := func(r, j int) float64 {
		a := m.amplitude.at(r, j)
		if ratesOnly {
			a /= cmplx.Abs(poles[j])
		}
		return a
	}
	flat := func(j int) bool { return cmplx.Abs(poles[j]) <= 1e-9*scale }
	for r := range m.amplitude.r {
		top := 0.0
		for j := range poles {
			if !flat(j) {
				top = math.Max(top, amplitude(r, j))
			}
		}
		for j, p := range poles {
			if flat(j) || amplitude(r, j) <= leftOver*top || top == 0 {
				continue
			}
			need := 0.0
			switch {
			case math.Abs(real(p)) <= 1e-9*cmplx.Abs(p):
				need = 10 * 2 * math.Pi / math.Abs(imag(p))
			case real(p) > 0:
				need = 5 / real(p)
			default:
				need = math.Log(math.Min(amplitude(r, j)/(leftOver*top), 1e6)) / -real(p)
			}
			span = math.Max(span, need)
			if amplitude(r, j) > 0.01*top {
				fastest = math.Max(fastest, math.Abs(imag(p)))
			}
		}
	}
	for j, p := range poles { // what grows sets the end
		for r := range m.amplitude.r {
			if real(p) > 1e-9*cmplx.Abs(p) && !flat(j) && amplitude(r, j) > 1e-9*largest(m.amplitude.row(r)) {
				span = math.Min(span, 5/real(p))
			}
		}
	}
	return span, fastest
}

// roundUp gives the next of 1, 1.5, 2, 2.5, 3, 4, 5, 6, 8, 10 times a power of ten.
func roundUp(x float64) float64 {
	if x <= 0 || math.IsInf(x, 0) {
		return x
	}
	exponent := int(math.Floor(math.Log10(x)))
	for _, f := range [...]float64{1, 1.5, 2, 2.5, 3, 4, 5, 6, 8, 10, 15} {
		digits := math.Round(f * 10)
		var y float64
		if exponent >= 1 {
			y = digits * math.Pow10(exponent-1)
		} else {
			y = digits / math.Pow10(1-exponent)
		}
		if y >= x*(1-1e-12) {
			return y
		}
	}
	return x
}
