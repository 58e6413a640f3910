package render

import "gainwright/lang/value"

// responseJSON holds the instants once and the values of each signal beside them.
type responseJSON struct {
	Kind     string       `json:"kind"`
	Title    string       `json:"title,omitempty"`
	Instants []any        `json:"instants"`
	Sampled  bool         `json:"sampled"`
	Signals  []signalJSON `json:"signals"`
	AtLimit  []stayJSON   `json:"at_limit,omitempty"`
	Notes    []string     `json:"notes,omitempty"`
}

type signalJSON struct {
	Name   string `json:"name"`
	Role   string `json:"role"`
	Unit   string `json:"unit,omitempty"`
	Values []any  `json:"values"`
	Low    any    `json:"low,omitempty"`
	High   any    `json:"high,omitempty"`
	Error  any    `json:"error,omitempty"` // estimate of the absolute error
}

type stayJSON struct {
	Input string `json:"input"`
	Unit  string `json:"unit,omitempty"`
	Limit any    `json:"limit"`
	From  any    `json:"reached"`
	To    any    `json:"left"`
}

func responseObject(r *value.Response) responseJSON {
	out := responseJSON{Kind: "response", Title: r.Title, Instants: floatsJSON(r.Instants), Sampled: r.Sampled, Signals: []signalJSON{}, Notes: r.Notes}
	for _, s := range r.Signals {
		t := signalJSON{Name: s.Name, Role: s.Role, Unit: s.Unit.Text, Values: floatsJSON(s.Values), Error: floatJSON(s.Err)}
		if s.Low != nil {
			t.Low = floatJSON(*s.Low)
		}
		if s.High != nil {
			t.High = floatJSON(*s.High)
		}
		out.Signals = append(out.Signals, t)
	}
	for _, s := range r.Stays {
		out.AtLimit = append(out.AtLimit, stayJSON{s.Input, s.Unit.Text, floatJSON(s.Limit), floatJSON(s.From), floatJSON(s.To)})
	}
	return out
}

func floatsJSON(xs []float64) []any {
	out := make([]any, len(xs))
	for i, x := range xs {
		out[i] = floatJSON(x)
	}
	return out
}
