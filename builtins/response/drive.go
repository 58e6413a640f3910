package response

import (
	"errors"
	"fmt"
	"math"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// drive is what the system answers to.
type drive struct {
	kind      driveKind
	channel   int // −1 when every channel of the plant's inputs has its own column
	amplitude float64
	exactly   value.Number // the amplitude as it was given
	samples   [][]float64  // of a list: a row an instant, a column a driven channel
	spacing   float64      // between the rows in s
	function  *value.Function
	asNumber  bool // the function takes a plain number of seconds
}

type driveKind int

const (
	still driveKind = iota
	step
	impulse
	ramp
	list
	function
)

var driveWords = map[string]driveKind{"step": step, "impulse": impulse, "ramp": ramp}

// readDrive reads `to` and `amplitude`.
func (q *request) readDrive() error {
	d := &q.drive
	d.amplitude, d.exactly = 1, value.Int(1)
	v, given := q.call.Args["to"]
	if !given {
		if q.call.Has("from") || q.call.Has("noise") {
			if q.call.Has("amplitude") {
				return value.Errf(diag.Type, "amplitude", "an amplitude needs a drive: to: \"step\"")
			}
			return nil
		}
		v = value.Text("step")
	}
	switch x := v.(type) {
	case value.Text:
		kind, ok := driveWords[string(x)]
		if !ok {
			e := value.Errf(diag.Name, "to", "%q is no drive", string(x))
			if near := value.Nearest(string(x), []string{"step", "impulse", "ramp"}); near != "" {
				return e.WithHelp("did you mean %q?", near)
			}
			return e.WithHelp("to is \"step\", \"impulse\", \"ramp\", a number, a list of samples or a function of t")
		}
		d.kind = kind
	case value.Number, value.Quantity:
		d.kind = step
		if err := q.needsChannel(); err != nil {
			return err
		}
		if q.call.Has("amplitude") {
			return value.Errf(diag.Type, "amplitude", "the step's height is given twice")
		}
		if err := q.setAmplitude(x, 0); err != nil {
			return forParam(err, "to")
		}
		if d.amplitude == 0 {
			d.kind = still
		}
		return nil
	case *value.Function:
		d.kind, d.function = function, x
	default:
		d.kind = list
		if err := q.readSamples(v); err != nil {
			return forParam(err, "to")
		}
	}
	if d.kind != list {
		if err := q.needsChannel(); err != nil {
			return err
		}
	}
	if a, ok := q.call.Args["amplitude"]; ok {
		if d.kind == list || d.kind == function {
			return value.Errf(diag.Type, "amplitude", "an amplitude goes with a step, an impulse or a ramp")
		}
		perSecond := map[driveKind]int{step: 0, impulse: -1, ramp: 1}[d.kind]
		if d.kind == impulse && q.plant.Every != nil {
			perSecond = 0
		}
		return forParam(q.setAmplitude(a, perSecond), "amplitude")
	}
	return nil
}

func (q *request) setAmplitude(v value.Value, perSecond int) (err error) {
	d := &q.drive
	if d.exactly, err = numberInUnit(v, q.channels[d.channel].Signal, perSecond); err != nil {
		return err
	}
	d.amplitude, err = finite(d.exactly.Float64())
	return err
}

// readSamples reads a list for one channel, or a matrix with a column for each input.
func (q *request) readSamples(v value.Value) error {
	d := &q.drive
	if m, ok := v.(*value.Matrix); ok {
		r, c := m.Dims()
		if r == 1 && (c != q.m || q.m == 1) {
			r, c = c, 1
		}
		if c > 1 {
			if c != q.m || m.IsComplex() {
				return diag.New(diag.Shape, "the samples are %d×%d; they need a column for each of the %d inputs", r, c, q.m)
			}
			re, _ := m.Floats()
			d.channel = -1
			for i := range r {
				d.samples = append(d.samples, re[i*c:(i+1)*c])
			}
			return q.checkSamples()
		}
	}
	items, err := value.Elements(v)
	if err != nil {
		return diag.New(diag.Type, "to is \"step\", \"impulse\", \"ramp\", a number, a list of samples or a function of t; this is %s", value.Describe(v))
	}
	if err := q.needsChannel(); err != nil {
		return err
	}
	for _, item := range items {
		x, err := inUnit(item, q.channels[d.channel].Signal, 0)
		if err != nil {
			return err
		}
		d.samples = append(d.samples, []float64{x})
	}
	return q.checkSamples()
}

func (q *request) checkSamples() error {
	if len(q.drive.samples) < 2 {
		return diag.New(diag.Shape, "a list of samples needs at least two")
	}
	for _, row := range q.drive.samples {
		for _, x := range row {
			if _, err := finite(x); err != nil {
				return err
			}
		}
	}
	return nil
}

// driven lists the channels that carry something.
func (q *request) driven() []int {
	switch {
	case q.drive.kind == still || q.drive.kind == impulse:
		return nil
	case q.drive.channel >= 0:
		return []int{q.drive.channel}
	}
	out := make([]int, q.m)
	for i := range out {
		out[i] = i
	}
	return out
}

// at fills the driven channels' values at sample k of time t.
func (q *request) driveAt(k int, t float64, out []float64) error {
	d := &q.drive
	switch d.kind {
	case step:
		out[d.channel] = d.amplitude
	case ramp:
		out[d.channel] = d.amplitude * t
	case impulse:
		out[d.channel] = 0
		if k == 0 && !(q.hybrid() && q.channels[d.channel].kind == atInput) {
			out[d.channel] = d.amplitude
		}
	case list:
		where := t / d.spacing
		i := int(math.Min(math.Floor(where*(1+1e-14)), float64(len(d.samples)-1)))
		part := where - float64(i)
		if i == len(d.samples)-1 || math.Abs(part) < 1e-12*where {
			part = 0
		}
		for j, ch := range q.driven() {
			out[ch] = d.samples[i][j]
			if part > 0 {
				out[ch] += part * (d.samples[i+1][j] - d.samples[i][j])
			}
		}
	case function:
		return q.callFunction(t, out)
	}
	return nil
}

// callFunction evaluates a function of time: with a quantity in s, or where the function
// refuses that, with a plain number of seconds.
func (q *request) callFunction(t float64, out []float64) error {
	d := &q.drive
	number := value.FloatErr(t, 0)
	var v value.Value
	var err error
	if !d.asNumber {
		v, err = q.call.Apply(d.function, value.Quantity{Magnitude: number, Unit: value.Second()})
		var refused *diag.Error
		if errors.As(err, &refused) && (refused.Kind == diag.Unit || refused.Kind == diag.Type) {
			if w, again := q.call.Apply(d.function, number); again == nil {
				d.asNumber, v, err = true, w, nil
			}
		}
	} else {
		v, err = q.call.Apply(d.function, number)
	}
	if err != nil {
		return err
	}
	x, err := inUnit(v, q.channels[d.channel].Signal, 0)
	if err != nil {
		return diag.New(diag.Type, "at t = %.6g s the function of t: %v", t, err).For("to")
	}
	out[d.channel] = x
	return nil
}

// course of the drive between corners: channel i is Σ coefficients[i][j]·τʲ/j!, τ from start.
type drivePiece struct {
	start, end   float64
	coefficients [][]float64
}

// the drive as polynomials: this many coefficients, by kind
var driveOrder = map[driveKind]int{step: 1, ramp: 2, list: 2, function: 5}

// pieces cuts the drive into polynomials over [0, until]; wrong is by how much they may
// miss a function.
func (q *request) pieces(until float64, intervals int) (out []drivePiece, wrong float64, err error) {
	d := &q.drive
	switch d.kind {
	case step:
		return []drivePiece{{0, until, [][]float64{{d.amplitude}}}}, 0, nil
	case ramp:
		return []drivePiece{{0, until, [][]float64{{0, d.amplitude}}}}, 0, nil
	case list:
		for i := 0; i+1 < len(d.samples) && float64(i)*d.spacing < until*(1-1e-12); i++ {
			p := drivePiece{start: float64(i) * d.spacing, end: math.Min(float64(i+1)*d.spacing, until)}
			for j := range d.samples[i] {
				p.coefficients = append(p.coefficients, []float64{d.samples[i][j], (d.samples[i+1][j] - d.samples[i][j]) / d.spacing})
			}
			out = append(out, p)
		}
		if last := out[len(out)-1]; last.end < until*(1-1e-12) {
			p := drivePiece{start: last.end, end: until}
			for _, x := range d.samples[len(d.samples)-1] {
				p.coefficients = append(p.coefficients, []float64{x, 0})
			}
			out = append(out, p)
		}
		return out, 0, nil
	case function:
		return q.functionPieces(until, intervals)
	}
	return []drivePiece{{0, until, nil}}, 0, nil
}

// deepest is how often an interval is halved to close in on a corner of a function.
const deepest = 40

// functionPieces approximates the function of t by quartics through five points of each
// interval, halving where a point between is missed by more than 1e-11 of the largest
// value: corners and jumps are closed in on.
func (q *request) functionPieces(until float64, intervals int) (out []drivePiece, wrong float64, err error) {
	values := make([]float64, len(q.channels))
	ch, largestSeen, calls := q.drive.channel, 0.0, 0
	f := func(t float64) (float64, error) {
		if calls++; calls > 20*mostInstants {
			return 0, diag.New(diag.Limit, "the function of t would have to be evaluated too often").For("to")
		}
		err := q.callFunction(t, values)
		largestSeen = math.Max(largestSeen, math.Abs(values[ch]))
		return values[ch], err
	}
	var fit func(a, b float64, depth int) error
	fit = func(a, b float64, depth int) error {
		if q.call.Context.Err() != nil {
			return q.call.Context.Err()
		}
		var y [5]float64
		for i := range y {
			var err error
			if y[i], err = f(a + (b-a)*float64(i)/4); err != nil {
				return err
			}
		}
		c := quartic(y, b-a)
		miss := 0.0
		for _, part := range [...]float64{0.09, 0.61} {
			between, err := f(a + (b-a)*part)
			if err != nil {
				return err
			}
			miss = math.Max(miss, math.Abs(between-polynomialAt(c, (b-a)*part)))
		}
		if miss > 1e-11*largestSeen && depth < deepest && b-a > 1e-13*until {
			middle := (a + b) / 2
			if err := fit(a, middle, depth+1); err != nil {
				return err
			}
			return fit(middle, b, depth+1)
		}
		if depth == deepest || b-a <= 1e-13*until {
			c = []float64{y[0], 0, 0, 0, 0} // a jump: no polynomial goes through it
		}
		wrong = math.Max(wrong, miss*math.Min(1, (b-a)/until*float64(intervals)))
		out = append(out, drivePiece{a, b, [][]float64{c}})
		return nil
	}
	for i := range intervals {
		if err := fit(until*float64(i)/float64(intervals), until*float64(i+1)/float64(intervals), 0); err != nil {
			return nil, 0, err
		}
	}
	return out, wrong, nil
}

// quartic gives the derivatives at 0 of the polynomial through values at 0, h/4, …, h.
func quartic(y [5]float64, h float64) []float64 {
	d := h / 4
	// Newton's forward differences, expanded in powers.
	d1, d2 := y[1]-y[0], y[2]-2*y[1]+y[0]
	d3 := y[3] - 3*y[2] + 3*y[1] - y[0]
	d4 := y[4] - 4*y[3] + 6*y[2] - 4*y[1] + y[0]
	return []float64{y[0],
		(d1 - d2/2 + d3/3 - d4/4) / d,
		(d2 - d3 + 11*d4/12) / (d * d),
		(d3 - 3*d4/2) / (d * d * d),
		d4 / (d * d * d * d)}
}

// polynomialAt is Σ c_j·tʲ/j!.
func polynomialAt(c []float64, t float64) float64 {
	s := 0.0
	for j := len(c) - 1; j >= 0; j-- {
		s = s*t/float64(j+1) + c[j]
	}
	return s
}

// title says what is shown.
func (q *request) title() string {
	word := map[driveKind]string{still: "free motion", step: "step response", impulse: "impulse response", ramp: "ramp response",
		list: "response to samples", function: "response"}[q.drive.kind]
	if q.drive.kind == function && q.drive.function.Name != "" {
		word = fmt.Sprintf("response to %s", q.drive.function.Name)
	}
	if q.drive.channel >= 0 && q.drive.kind != still && len(q.channels) > 1 {
		word += " from " + q.channels[q.drive.channel].Name
	}
	if q.dynamics != nil {
		word += ", own equations"
	}
	return word
}
