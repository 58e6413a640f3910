package value

import "gainwright/lang/diag"

// Response is how the signals of a system run in time. All signals share the instants.
type Response struct {
	Title    string
	Instants []float64 // in s
	Signals  []Trace
	Sampled  bool // the instants are the samples; signals are held between them
	Source   any  // what figures need to evaluate the response between instants
	Notes    []string
}

// Trace is one signal of a response in its declared unit.
type Trace struct {
	Name   string
	Unit   Unit
	Role   string // "output", "input" or "state"
	Values []float64
	Low    *float64 // the signal's limits; nil for none
	High   *float64
}

// Kind tells the kind.
func (*Response) Kind() Kind { return KResponse }

// FieldNames lists the fields.
func (*Response) FieldNames() []string { return []string{"instants", "signals"} }

// Field reads a field.
func (r *Response) Field(name string) (Value, bool) {
	switch name {
	case "instants":
		return numberList(r.Instants), true
	case "signals":
		l := &List{}
		for _, s := range r.Signals {
			l.Items = append(l.Items, Text(s.Name))
		}
		return l, true
	}
	return nil, false
}

func numberList(xs []float64) *List {
	l := &List{Items: make([]Value, len(xs))}
	for i, x := range xs {
		l.Items[i] = Float(x)
	}
	return l
}

// Trace finds a signal by name: an output first, then an input, then a state.
func (r *Response) Trace(name string) (*Trace, bool) {
	for _, role := range []string{"output", "input", "state"} {
		for i := range r.Signals {
			if r.Signals[i].Role == role && r.Signals[i].Name == name {
				return &r.Signals[i], true
			}
		}
	}
	return nil, false
}

// Index gives the values of a signal named in quotes: r["x"].
func (r *Response) Index(subscripts []Subscript) (Value, error) {
	if len(subscripts) != 1 || subscripts[0].High != nil {
		return nil, diag.New(diag.Type, "a response is indexed by one signal's name, r[\"x\"]")
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
		e := diag.New(diag.Name, "the response has no signal %q", string(name))
		if near := Nearest(string(name), names); near != "" {
			e.WithHelp("did you mean %q?", near)
		}
		return nil, e
	}
	return numberList(t.Values), nil
}
