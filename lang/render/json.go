package render

import (
	"bytes"
	"encoding/json"
	"math"
	"math/big"
	"path/filepath"

	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/value"
)

// The objects below fix the order of the keys.

type lineJSON struct {
	File        string           `json:"file,omitempty"`
	Line        int              `json:"line"`
	Column      int              `json:"column,omitempty"`
	Source      string           `json:"source,omitempty"`
	Value       any              `json:"value,omitempty"`
	Requirement *requirementJSON `json:"requirement,omitempty"`
	Claim       *claimJSON       `json:"claim,omitempty"`
	Error       *errorJSON       `json:"error,omitempty"`
	Note        string           `json:"note,omitempty"`
}

type requirementJSON struct {
	Source         string `json:"source"`
	Met            bool   `json:"met"`
	WithinRounding bool   `json:"within_rounding,omitempty"`
	NotJudged      bool   `json:"not_judged,omitempty"`
	Left           any    `json:"left,omitempty"`
	Operator       string `json:"operator,omitempty"`
	Right          any    `json:"right,omitempty"`
	Because        string `json:"because,omitempty"`
	Why            string `json:"why,omitempty"`
}

type claimJSON struct {
	Source     string      `json:"source"`
	Agrees     bool        `json:"agrees"`
	Undecided  bool        `json:"undecided"`
	WorstUnits any         `json:"worst_units"`
	Entries    []entryJSON `json:"entries"`
	Poles      []any       `json:"poles,omitempty"`
	Notes      []string    `json:"notes,omitempty"`
}

type entryJSON struct {
	At       []int  `json:"at"`
	Part     string `json:"part,omitempty"`
	Name     string `json:"name,omitempty"`
	Printed  string `json:"printed"`
	Computed any    `json:"computed"`
	Units    any    `json:"units"`
	Cannot   string `json:"cannot_be_judged,omitempty"`
}

type errorJSON struct {
	Message string `json:"message"`
	Hint    string `json:"hint,omitempty"`
}

// JSON gives an event as one line of JSON with its end, or nil for a binding, which is
// not printed. An event of another file than main carries the file's name.
func JSON(e eval.Event, main *diag.Source) []byte {
	line := lineJSON{Line: e.Line}
	if e.Source != nil && e.Source != main {
		line.File = filepath.ToSlash(e.Source.Name)
	}
	switch {
	case e.Shown != nil:
		line.Source = e.Text
		line.Value = shownJSON(e.Shown)
	case e.Requirement != nil:
		line.Requirement = requirementOf(e)
	case e.Claim != nil:
		line.Claim = claimOf(e)
	case e.Error != nil:
		line.Error = &errorJSON{Message: e.Error.Message, Hint: e.Error.Help}
		if s := e.Error.Source; s != nil {
			line.Line, line.Column = s.Position(e.Error.Span.Start)
			line.File = ""
			if s != main {
				line.File = filepath.ToSlash(s.Name)
			}
		}
	case e.Note != "":
		line.Note = e.Note
	default:
		return nil
	}
	return encode(line)
}

// encode writes without escaping < and >, which requirements are full of.
func encode(v any) []byte {
	var b bytes.Buffer
	enc := json.NewEncoder(&b)
	enc.SetEscapeHTML(false)
	if err := enc.Encode(v); err != nil {
		// Every object here is built from texts and checked numbers.
		b.Reset()
		b.WriteString(`{"line":0,"error":{"message":"internal: a value could not be written as JSON"}}` + "\n")
	}
	return b.Bytes()
}

func shownJSON(s *eval.Shown) any {
	if s.In != nil {
		if converted, err := value.In(s.Value, *s.In); err == nil {
			return valueJSON(converted)
		}
	}
	return valueJSON(s.Value)
}

func requirementOf(e eval.Event) *requirementJSON {
	r := e.Requirement
	out := &requirementJSON{Source: e.Text, Met: r.Met, WithinRounding: r.WithinRounding,
		NotJudged: r.NotJudged, Operator: r.Op, Because: r.Because, Why: r.Why}
	if r.Left != nil {
		out.Left = plainJSON(r.Left)
	}
	if r.Right != nil {
		out.Right = plainJSON(r.Right)
	}
	return out
}

// plainJSON is a bare number where the value is a real number or a quantity, else the value.
func plainJSON(v value.Value) any {
	switch x := v.(type) {
	case value.Number:
		return realJSON(x)
	case value.Quantity:
		return quantityJSON(x.Magnitude, x.Unit.Text)
	}
	return valueJSON(v)
}

func claimOf(e eval.Event) *claimJSON {
	c := e.Claim
	out := &claimJSON{Source: e.Text, Agrees: c.Agrees, Undecided: c.Undecided,
		WorstUnits: floatJSON(c.WorstUnits), Entries: []entryJSON{}, Notes: c.Notes}
	for _, entry := range c.Entries {
		at := entry.At
		if at == nil {
			at = []int{}
		}
		var computed any
		if entry.Computed != nil {
			computed = plainJSON(entry.Computed)
		}
		out.Entries = append(out.Entries, entryJSON{At: at, Part: entry.Part, Name: entry.Name,
			Printed: entry.Printed, Computed: computed, Units: floatJSON(entry.Units), Cannot: entry.Cannot})
	}
	for _, p := range c.Poles {
		out.Poles = append(out.Poles, valueJSON(p))
	}
	return out
}

// floatJSON is a number, or a word where JSON has none.
func floatJSON(x float64) any {
	switch {
	case math.IsInf(x, 1):
		return "infinity"
	case math.IsInf(x, -1):
		return "-infinity"
	case math.IsNaN(x):
		return "undefined"
	case x == 0:
		return 0
	}
	return x
}

func realJSON(n value.Number) any {
	if n.Exact == nil {
		return floatJSON(n.F)
	}
	return ratJSON(n.Exact)
}

// ratJSON is the nearest number; one beyond binary64 keeps its exponent.
func ratJSON(r *big.Rat) any {
	f, _ := r.Float64()
	if math.IsInf(f, 0) || f == 0 && r.Sign() != 0 {
		return json.Number(new(big.Float).SetPrec(64).SetRat(r).Text('e', 16))
	}
	return floatJSON(f)
}
