package response

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/value"
)

// mode is the loop with each input free or at a limit: z' = M·z over
// z = (x, q, 1, the drive and its derivatives), linear and without inputs.
type mode struct {
	pattern string
	prop    *numeric.Propagator
	read    grid // outputs, inputs, states, estimates, references: a row a trace
	ask     grid // what each input would be without its limits
}

// piece is a stretch of the motion with one mode and one polynomial of the drive.
type piece struct {
	start, end float64
	mode       *mode
	z          []float64 // at start
}

// linearPath is the motion of a continuous linear loop, piece by piece.
type linearPath struct {
	q      *request
	order  int // coefficients of the drive's polynomials
	driven []int
	size   int
	period float64
	modes  map[string]*mode
	pieces []piece
}

func (q *request) newLinearPath(period float64) *linearPath {
	p := &linearPath{q: q, driven: q.driven(), order: driveOrder[q.drive.kind], period: period, modes: map[string]*mode{}}
	p.size = q.n + q.law.own.r + 1 + len(p.driven)*p.order
	return p
}

// modeOf makes the mode of a pattern: one character an input, '-' at its low limit, '+' at
// its high one, '0' free.
func (p *linearPath) modeOf(pattern []byte) (*mode, error) {
	if m, ok := p.modes[string(pattern)]; ok {
		return m, nil
	}
	q, l := p.q, p.q.law
	n, k, one := q.n, l.own.r, q.n+l.own.r
	into := q.places()
	drive := newGrid(len(q.channels), p.size) // the channels' values in z
	for j, ch := range p.driven {
		drive.v[ch*p.size+one+1+j*p.order] = 1
	}
	x, own := newGrid(n, p.size), newGrid(k, p.size)
	x.put(0, 0, unit(n))
	own.put(0, n, unit(k))
	ask := l.toU.times(own).plus(l.stateGain.plus(l.outputGain.times(q.c)).times(x)).plus(l.refG.times(into.r).plus(into.v).times(drive))
	ask = q.through.times(ask)
	u := ask.plus(newGrid(q.m, p.size))
	for i, at := range pattern {
		bound := map[byte]float64{'-': q.low[i], '+': q.high[i]}
		if at != '0' {
			row := u.row(i)
			clear(row)
			row[one] = bound[at]
		}
	}
	y := q.c.times(x).plus(q.d.times(u))
	r, w := into.r.times(drive), q.enters.times(into.w.times(drive))
	generator := newGrid(p.size, p.size)
	generator.put(0, 0, q.a.times(x).plus(q.b.times(u)).plus(w))
	generator.put(n, 0, l.own.times(own).plus(l.fromY.times(y)).plus(l.fromU.times(u)).plus(l.fromR.times(r)).plus(l.fromW.times(into.w.times(drive))))
	for j := range p.driven {
		for c := range p.order - 1 {
			at := one + 1 + j*p.order + c
			generator.v[at*p.size+at+1] = 1
		}
	}
	prop, err := numeric.NewPropagator(mat.NewDense(p.size, p.size, generator.v), p.period)
	if err != nil {
		return nil, value.Errf(kindNumerical, "plant", "%v", err)
	}
	m := &mode{pattern: string(pattern), prop: prop, ask: ask, read: newGrid(q.p+q.m+n+k, p.size)}
	m.read.put(0, 0, y)
	m.read.put(q.p, 0, u)
	m.read.put(q.p+q.m, 0, x)
	m.read.put(q.p+q.m+n, 0, own)
	p.modes[string(pattern)] = m
	return m, nil
}

// begin is the state at the start, an impulse taken in.
func (p *linearPath) begin() []float64 {
	q := p.q
	z := make([]float64, p.size)
	copy(z, q.start)
	z[q.n+q.law.own.r] = 1
	if q.drive.kind == impulse {
		for i := range q.closedB.r {
			z[i] += q.closedB.at(i, q.drive.channel) * q.drive.amplitude
		}
	}
	return z
}

// drivenBy sets the drive's part of z at the start of one of its polynomials.
func (p *linearPath) drivenBy(z []float64, d drivePiece) {
	one := p.q.n + p.q.law.own.r
	for j, c := range d.coefficients {
		copy(z[one+1+j*p.order:one+1+(j+1)*p.order], c)
	}
}

// run moves the loop through all pieces of the drive.
func (p *linearPath) run(drives []drivePiece) error {
	z := p.begin()
	free := make([]byte, p.q.m)
	for i := range free {
		free[i] = '0'
	}
	for _, d := range drives {
		if err := p.q.call.Context.Err(); err != nil {
			return err
		}
		p.drivenBy(z, d)
		if p.q.limited {
			if err := p.limitedStretch(z, d.start, d.end); err != nil {
				return err
			}
			continue
		}
		m, err := p.modeOf(free)
		if err != nil {
			return err
		}
		p.pieces = append(p.pieces, piece{d.start, d.end, m, append([]float64(nil), z...)})
		if err := m.prop.Advance(z, d.end-d.start); err != nil {
			return err
		}
		if !allFinite(z) {
			return grewTooLarge(d.end)
		}
	}
	return nil
}

func grewTooLarge(t float64) error {
	return value.Errf(kindNumerical, "until", "the response grows beyond 1e308 before t = %.6g s", t)
}

func allFinite(z []float64) bool {
	s := 0.0
	for _, x := range z {
		s += x * 0
	}
	return s == 0
}

// record fills the traces at evenly spaced instants, k·spacing.
func (p *linearPath) record(traces []value.Trace, spacing float64, count int) error {
	z := make([]float64, p.size)
	rows := len(traces)
	k := 0
	for i, part := range p.pieces {
		copy(z, part.z)
		last := i == len(p.pieces)-1
		// the instants from k on that lie in this piece; one at a corner belongs to the later piece
		from := k
		for k < count && (last || float64(k)*spacing < part.end*(1-1e-13)) {
			k++
		}
		if k == from {
			continue
		}
		if err := part.mode.prop.Advance(z, math.Max(0, float64(from)*spacing-part.start)); err != nil {
			return err
		}
		read := part.mode.read
		err := part.mode.prop.Walk(0, k-from-1, z, func(j int, z []float64) {
			for r := range rows {
				traces[r].Values[from+j] = dot(read.row(r), z)
			}
		})
		if err != nil {
			return err
		}
	}
	return nil
}

// accuracy estimates the absolute error of each trace: what the exponentials leave, and by
// how much the steps miss one move over the whole piece.
func (p *linearPath) accuracy(traces []value.Trace, spacing float64, count int) {
	digits := 16.0
	for _, m := range p.modes {
		digits = math.Min(digits, m.prop.Digits())
	}
	relative := math.Pow(10, -digits) * 4
	first, last := p.pieces[0], p.pieces[len(p.pieces)-1]
	z := append([]float64(nil), last.z...)
	gap := make([]float64, len(traces))
	if at := float64(count-1) * spacing; at > last.start && len(p.pieces) == 1 {
		if last.mode.prop.Advance(z, at-last.start) == nil {
			for r := range traces {
				gap[r] = math.Abs(dot(first.mode.read.row(r), z) - traces[r].Values[count-1])
			}
		}
	}
	for r := range traces {
		traces[r].Err = 2*gap[r] + relative*largest(traces[r].Values)
	}
}

// linearResponse runs a continuous linear loop.
func (q *request) linearResponse() (*value.Response, error) {
	count := q.points + 1
	spacing := q.until / float64(q.points)
	if err := q.charge(count); err != nil {
		return nil, err
	}
	drives, wrong, err := q.pieces(q.until, min(q.points, 1000))
	if err != nil {
		return nil, err
	}
	path := q.newLinearPath(spacing)
	if err := path.run(drives); err != nil {
		return nil, system.Refused(err, "plant")
	}
	r := &value.Response{Title: q.title(), Instants: evenly(spacing, count), Signals: q.traces(count)}
	if err := path.record(r.Signals, spacing, count); err != nil {
		return nil, system.Refused(err, "plant")
	}
	for _, t := range r.Signals {
		if !allFinite(t.Values) {
			return nil, grewTooLarge(q.until)
		}
	}
	path.accuracy(r.Signals, spacing, count)
	if wrong > 0 {
		for i := range r.Signals {
			r.Signals[i].Err += wrong * largest(r.Signals[i].Values) / math.Max(largestDrive(drives), wrong)
		}
	}
	if q.noise != nil {
		if err := q.addNoise(r, spacing, count); err != nil {
			return nil, err
		}
	}
	q.referenceTraces(r, drives)
	r.Stays = path.stays()
	r.Source = &course{q: q, linear: path, noisy: q.noise != nil}
	return r, nil
}

func largestDrive(drives []drivePiece) float64 {
	most := 0.0
	for _, d := range drives {
		for _, c := range d.coefficients {
			most = math.Max(most, math.Abs(c[0]))
		}
	}
	return most
}

func evenly(spacing float64, count int) []float64 {
	out := make([]float64, count)
	for k := range out {
		out[k] = float64(k) * spacing
	}
	return out
}

// referenceTraces shows references beside the signals.
func (q *request) referenceTraces(r *value.Response, drives []drivePiece) {
	for j, ch := range q.driven() {
		if q.channels[ch].kind == atInput {
			continue
		}
		t := value.Trace{Name: q.channels[ch].Name, Unit: q.channels[ch].Unit, Role: "reference", Values: make([]float64, len(r.Instants))}
		at := 0
		for k, x := range r.Instants {
			for at+1 < len(drives) && x >= drives[at].end*(1-1e-13) {
				at++
			}
			t.Values[k] = polynomialAt(drives[at].coefficients[j], x-drives[at].start)
		}
		r.Signals = append(r.Signals, t)
	}
}

// charge accounts for the numbers a response holds.
func (q *request) charge(count int) error {
	signals := q.p + q.m + q.n + q.law.own.r
	if count > mostInstants || count*signals > mostNumbers {
		return value.Errf(kindLimit, "points", "%d instants of %d signals are too many: at most %d numbers", count, signals, mostNumbers).
			WithHelp("a shorter until, or fewer points")
	}
	return q.call.Charge(int64(count) * int64(signals) * 8)
}
