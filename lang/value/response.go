package value

import (
	"math"
	"math/big"
	"strings"

	"gainwright/lang/diag"
)

// Response is how the signals of a system run in time. All signals share the instants.
// Signals are counted from the plant's operating point.
type Response struct {
	Title    string
	Instants []float64 // in s
	Signals  []Trace
	Sampled  bool        // the instants are the samples; signals are held between them
	Stays    []LimitStay // when inputs were at their limits; nil without limits
	Source   any         // what figures need to evaluate the response between instants
	Notes    []string
}

// Trace is one signal of a response in its declared unit.
type Trace struct {
	Name   string
	Unit   Unit
	Role   string // "output", "input", "state", "estimate" or "reference"
	Values []float64
	Low    *float64 // the signal's limits; nil for none
	High   *float64
	Held   bool    // constant from an instant to the next
	Err    float64 // absolute error estimate of the values
	Band   *Band   // what figures were read against; nil before
}

// Band is what a signal settles into, and its farthest overshoot; all in the signal's unit
// and s.
type Band struct {
	Low, High    float64
	From         float64 // when it has settled; +Inf when it has not
	PeakAt, Peak float64 // NaN without an overshoot
}

// LimitStay is a time an input spent at a limit. To is +Inf when it is there at the end.
type LimitStay struct {
	Input    string
	Unit     Unit
	Limit    float64 // in the unit
	From, To float64 // in s
}

// Dynamics are a model's own equations as float64 code, all values in the declared units
// and as they are, not counted from an operating point. Rates fills out with the rates of
// the states per second, of a sampled model with the next states; Outputs with the
// outputs. A value that does not exist is NaN or infinite. Nothing is allocated. One
// Dynamics serves one goroutine at a time.
type Dynamics interface {
	Rates(x, u, out []float64)
	Outputs(x, u, out []float64)
}

// Moving is what Model.Source satisfies when the equations can be run. Dynamics gives a
// new evaluator with the nominal parameters, nil where the equations were too large.
type Moving interface{ Dynamics() Dynamics }

// Kind tells the kind.
func (*Response) Kind() Kind { return KResponse }

// FieldNames lists the fields.
func (r *Response) FieldNames() []string {
	if r.Stays != nil {
		return []string{"instants", "signals", "at_limit"}
	}
	return []string{"instants", "signals"}
}

// Field reads a field.
func (r *Response) Field(name string) (Value, bool) {
	switch {
	case name == "instants":
		return quantities(r.Instants, Second(), 0), true
	case name == "signals":
		l := &List{}
		for _, s := range r.Signals {
			l.Items = append(l.Items, Text(s.Name))
		}
		return l, true
	case name == "at_limit" && r.Stays != nil:
		return r.stayReport(), true
	}
	return nil, false
}

// stayReport is a row a stay at a limit; a blank end is one beyond the response.
func (r *Response) stayReport() *Report {
	out := &Report{Title: "times at a limit", Columns: []string{"input", "limit", "reached", "left"}}
	for _, s := range r.Stays {
		row := []Value{Text(s.Input), makeQuantity(Number{F: s.Limit}, s.Unit), makeQuantity(FloatErr(s.From, 1e-12*(s.From+1e-300)), Second()), nil}
		if !math.IsInf(s.To, 1) {
			row[3] = makeQuantity(FloatErr(s.To, 1e-12*s.To), Second())
		}
		out.Rows = append(out.Rows, row)
	}
	return out
}

// quantities lists numbers with a unit and a common error estimate.
func quantities(xs []float64, unit Unit, err float64) *List {
	l := &List{Items: make([]Value, len(xs))}
	for i, x := range xs {
		l.Items[i] = makeQuantity(FloatErr(x, err), unit)
	}
	return l
}

// Trace finds a signal by name: an output first, then an input, then the others.
func (r *Response) Trace(name string) (*Trace, bool) {
	for _, role := range []string{"output", "input", "state", "estimate", "reference"} {
		for i := range r.Signals {
			if r.Signals[i].Role == role && r.Signals[i].Name == name {
				return &r.Signals[i], true
			}
		}
	}
	return nil, false
}

// Index gives the values of a signal named in quotes, r["x"], or some of them, r["x", 3].
func (r *Response) Index(subscripts []Subscript) (Value, error) {
	if len(subscripts) == 0 || len(subscripts) > 2 || subscripts[0].High != nil {
		return nil, diag.New(diag.Type, "a response is indexed by a signal's name, and by a number of instants after it: r[\"x\"] or r[\"x\", 3]")
	}
	name, ok := Force(subscripts[0].Low).(Text)
	if !ok {
		return nil, diag.New(diag.Type, "a response is indexed by a signal's name in quotes, r[\"x\"]")
	}
	t, ok := r.Trace(string(name))
	if !ok {
		names := make([]string, len(r.Signals))
		for i, s := range r.Signals {
			names[i] = s.Name
		}
		e := diag.New(diag.Name, "the response has no signal %q", shorten(string(name)))
		if near := Nearest(string(name), names); near != "" {
			return nil, e.WithHelp("did you mean %q?", near)
		}
		return nil, e.WithHelp("its signals are %s", shorten(strings.Join(names, ", ")))
	}
	if len(subscripts) == 1 {
		return quantities(t.Values, t.Unit, t.Err), nil
	}
	at, single, err := axis{"instant", len(t.Values), nil}.positions(subscripts[1])
	if err != nil {
		return nil, err
	}
	picked := make([]float64, len(at))
	for k, i := range at {
		picked[k] = t.Values[i]
	}
	if single {
		return makeQuantity(FloatErr(picked[0], t.Err), t.Unit), nil
	}
	return quantities(picked, t.Unit, t.Err), nil
}

// Percent is the unit of parts shown in per cent.
func Percent() Unit { return Unit{Text: "%", Scale: big.NewRat(1, 100)} }

// IsPercent tells whether a unit is per cent.
func (u Unit) IsPercent() bool { return u.Text == "%" && u.Dim.IsPlain() }
