package response

import (
	"math"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// the largest numbers of instants and of instants times signals
const (
	mostInstants = 1_000_000
	mostNumbers  = 20_000_000
)

// request is a response as it was asked for, in declared units, signals as deviations.
type request struct {
	call          *value.Call
	plant         *value.Plant
	n, m, p       int
	a, b, c, d    grid
	enters        grid // n×k: how the references of integrators drive the plant
	enterRefs     []value.Signal
	clock         float64 // time between samples in s; 0 where nothing is sampled
	closed        bool
	law           *law
	channels      []channel
	drive         drive
	start         []float64 // the plant's states
	startAs       []value.Number
	low, high     []float64 // of the inputs; infinite for none
	limited       bool
	until         float64
	untilGiven    bool
	points        int // intervals between instants; of a sampled law, within a sample
	noise         *noise
	dynamics      value.Dynamics // nil for the linear plant
	own           *own
	x0, u0, y0    []float64 // the operating point
	notes         []string
	closedA       grid // the free loop's matrix over (x, q)
	closedB       grid // how the channels drive it
	closedC       grid // outputs and inputs, (p + m)×(n + q)
	closedD       grid
	through       grid // (I − K_y·D)⁻¹
	algebraicLoop bool
}

// hybrid tells whether a sampled law acts on a continuous plant.
func (q *request) hybrid() bool { return q.clock > 0 && q.plant.Every == nil }

func readRequest(c *value.Call) (*request, error) {
	p := c.Plant("plant")
	q := &request{call: c, plant: p, a: gridOf(p.A), b: gridOf(p.B), c: gridOf(p.C), d: gridOf(p.D)}
	q.n, q.m, q.p = q.a.r, len(p.Inputs), len(p.Outputs)
	for _, part := range []*value.Matrix{p.A, p.B, p.C, p.D} {
		if err := numeric.Finite("the plant's matrix", part.Dense()); err != nil {
			return nil, value.Errf(diag.Numerical, "plant", "%v", err)
		}
	}
	if p.Every != nil {
		q.clock = p.Every.Float64()
	}
	q.enters = newGrid(q.n, 0)
	if e := system.ReferenceEnters(p); e != nil {
		q.enters = gridOf(e)
		for _, name := range e.Columns {
			q.enterRefs = append(q.enterRefs, value.Signal{Name: name, Unit: value.None()})
		}
	}
	q.x0, q.u0, q.y0 = point(p.X0, q.n), point(p.U0, q.m), point(p.Y0, q.p)
	for _, step := range []func() error{q.readLaw, q.close, q.readChannels, q.readDrive, q.readStart, q.readLimits, q.readNonlinear, q.readUntil, q.readNoise} {
		if err := step(); err != nil {
			return nil, err
		}
	}
	if largest(q.x0) > 0 || largest(q.u0) > 0 || largest(q.y0) > 0 {
		q.notes = append(q.notes, "signals are counted from the operating point, which the plant lists as .operating_point")
	}
	return q, nil
}

func point(numbers []value.Number, n int) []float64 {
	out := make([]float64, n)
	for i := range min(n, len(numbers)) {
		out[i] = numbers[i].Float64()
	}
	return out
}

// inUnit reads a number, or a quantity in a declared unit, times or over a power of time.
func inUnit(v value.Value, s value.Signal, perSecond int) (float64, error) {
	n, err := numberInUnit(v, s, perSecond)
	if err != nil {
		return 0, err
	}
	return finite(n.Float64())
}

func numberInUnit(v value.Value, s value.Signal, perSecond int) (n value.Number, err error) {
	switch x := value.Force(v).(type) {
	case value.Number:
		return x, nil
	case value.Quantity:
		want := s.Unit
		if want.Scale == nil {
			want = value.None()
		}
		var wanted value.Value = value.Quantity{Magnitude: value.Int(1), Unit: want}
		for k := perSecond; k != 0; {
			second := value.Quantity{Magnitude: value.Int(1), Unit: value.Second()}
			var err error
			if k > 0 {
				wanted, err = value.Divide(wanted, second)
				k--
			} else {
				wanted, err = value.Multiply(wanted, second)
				k++
			}
			if err != nil {
				return n, err
			}
		}
		ratio, err := value.Divide(x, wanted)
		if err != nil {
			return n, err
		}
		if n, ok := plainNumber(ratio); ok {
			return n, nil
		}
		unit := s.Unit.Text
		if unit == "" {
			unit = "no unit"
		}
		switch perSecond {
		case 1:
			unit += " per s"
		case -1:
			unit += " times s"
		}
		return n, diag.New(diag.Unit, "%s is declared in %s; this is in %s", s.Name, unit, x.Unit.Text)
	case *value.Matrix:
		if r, c := x.Dims(); r == 1 && c == 1 && !x.IsComplex() {
			if entry, ok := x.At(0, 0).(value.Number); ok {
				return entry, nil
			}
		}
	}
	return n, diag.New(diag.Type, "a number or a quantity is needed for %s; this is %s", s.Name, value.Describe(v))
}

func plainNumber(v value.Value) (n value.Number, ok bool) {
	switch x := v.(type) {
	case value.Number:
		return x, true
	case value.Quantity:
		if x.Unit.Dim.IsPlain() && !x.Unit.IsHertz() {
			n, err := x.SI()
			return n, err == nil
		}
	}
	return n, false
}

func finite(x float64) (float64, error) {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return 0, diag.New(diag.Numerical, "the number is too large for a response")
	}
	return x, nil
}

// forParam points an error at a parameter.
func forParam(err error, param string) error {
	if d, ok := err.(*diag.Error); ok && d.Param == "" {
		return d.For(param)
	}
	return err
}

// readStart reads `from`: a value for each state, as a deviation.
func (q *request) readStart() error {
	q.start, q.startAs = make([]float64, q.n), make([]value.Number, q.n)
	for i := range q.startAs {
		q.startAs[i] = value.Int(0)
	}
	v, ok := q.call.Args["from"]
	if !ok {
		return nil
	}
	items, err := value.Elements(v)
	if err != nil {
		items = []value.Value{v}
	}
	if len(items) != q.n {
		return value.Errf(diag.Shape, "from", "from has %d values; the plant has %d states", len(items), q.n)
	}
	for i, item := range items {
		if q.startAs[i], err = numberInUnit(item, q.plant.States[i], 0); err != nil {
			return forParam(err, "from")
		}
		if q.start[i], err = finite(q.startAs[i].Float64()); err != nil {
			return forParam(err, "from")
		}
	}
	return nil
}

// readLimits reads `limit` for each input, as it is, and turns it into deviations.
func (q *request) readLimits() error {
	q.low, q.high = make([]float64, q.m), make([]float64, q.m)
	for i := range q.m {
		q.low[i], q.high[i] = math.Inf(-1), math.Inf(1)
	}
	v, ok := q.call.Args["limit"]
	if !ok {
		return nil
	}
	if q.algebraicLoop {
		return value.Errf(diag.Numerical, "limit", "the law and the plant both answer at once (an algebraic loop), so that a limited input need not be unique")
	}
	each, err := q.limitOfEach(v)
	if err != nil {
		return err
	}
	for i, pair := range each {
		low, high, err := q.oneLimit(pair, i)
		if err != nil {
			return forParam(err, "limit")
		}
		if !(low < high) {
			return value.Errf(diag.Type, "limit", "the limits of %s leave no room: %.6g to %.6g", q.plant.Inputs[i].Name, low, high)
		}
		q.low[i], q.high[i] = low-q.u0[i], high-q.u0[i]
		q.limited = true
		if q.low[i] > 0 || q.high[i] < 0 {
			return value.Errf(diag.Numerical, "limit", "the operating point of %s lies outside its limits", q.plant.Inputs[i].Name)
		}
	}
	return nil
}

// limitOfEach gives what was written for each input.
func (q *request) limitOfEach(v value.Value) ([]value.Value, error) {
	each := make([]value.Value, q.m)
	items, err := value.Elements(v)
	switch {
	case err != nil:
		for i := range each {
			each[i] = v
		}
		if q.m > 1 {
			if _, quantity := v.(value.Quantity); quantity {
				return nil, value.Errf(diag.Shape, "limit", "there are %d inputs; list a limit for each", q.m)
			}
		}
		return each, nil
	case q.m == 1 && len(items) == 2:
		each[0] = v
		return each, nil
	case len(items) == q.m:
		if m, ok := v.(*value.Matrix); ok {
			if _, c := m.Dims(); c == 2 {
				for _, s := range q.plant.Inputs {
					if s.Unit.Text != "" && !s.Unit.IsCoherent() {
						return nil, value.Errf(diag.Unit, "limit", "rows of numbers do not say whether they are in %s or in its SI unit", s.Unit.Text).
							WithHelp("list a symmetric limit for each input, with its unit")
					}
				}
			}
		}
		return items, nil
	}
	return nil, value.Errf(diag.Shape, "limit", "%d limits for %d inputs", len(items), q.m)
}

func (q *request) oneLimit(v value.Value, i int) (low, high float64, err error) {
	if items, err := value.Elements(v); err == nil && len(items) == 2 {
		if low, err = inUnit(items[0], q.plant.Inputs[i], 0); err != nil {
			return 0, 0, err
		}
		high, err = inUnit(items[1], q.plant.Inputs[i], 0)
		return low, high, err
	}
	high, err = inUnit(v, q.plant.Inputs[i], 0)
	if high < 0 {
		return 0, 0, diag.New(diag.Type, "a symmetric limit is positive; [low, high] gives two ends")
	}
	return -high, high, err
}

// readNonlinear finds the model's own equations.
func (q *request) readNonlinear() error {
	if !q.call.Truth("nonlinear") {
		return nil
	}
	if q.plant.Origin == nil {
		return value.Errf(diag.Type, "nonlinear", "this plant comes from matrices and has no equations of its own").
			WithHelp("a model { … } has; a law goes beside it: response(model, gain: K, nonlinear: true)")
	}
	moving, ok := q.plant.Origin.Source.(value.Moving)
	if ok {
		q.dynamics = moving.Dynamics()
	}
	if q.dynamics == nil {
		return value.Errf(diag.Limit, "nonlinear", "the equations of %s are too large to be run, or were not given as equations", q.plant.Origin.Name)
	}
	if whole := q.plant.Origin.Plant; len(whole.Inputs) != q.m || len(whole.Outputs) != q.p {
		return value.Errf(diag.Type, "nonlinear", "this is a part of %s; give the whole model and choose with input: …", q.plant.Origin.Name)
	}
	return nil
}
