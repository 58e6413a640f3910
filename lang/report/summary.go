package report

import (
	"fmt"
	"math"
	"strings"

	"gainwright/lang/render"
	"gainwright/lang/value"
)

// Summary is what stands on top.
type Summary struct {
	Headline string // one sentence
	Passes   bool
	Verdicts []Line
	Rests    []Ground
}

// Line is a requirement or a claim in the summary.
type Line struct {
	render.Verdict
	Line int
	File string
	Kind string // "required" or "claimed"
}

// Ground is something the answers rest on.
type Ground struct{ What, Text string }

func (d *Document) summarise() {
	var met, missed, agrees, differs, unjudged int
	var failed *Result
	for _, r := range d.all() {
		if r.Failure != "" {
			failed = &r
		}
		if r.Verdict == nil {
			continue
		}
		kind := "required"
		if r.Event.Claim != nil {
			kind = "claimed"
		}
		d.Summary.Verdicts = append(d.Summary.Verdicts, Line{Verdict: *r.Verdict, Line: r.Line, File: r.File, Kind: kind})
		switch r.Verdict.Word {
		case "met":
			met++
		case "missed":
			missed++
		case "agrees":
			agrees++
		case "not judged":
			unjudged++
		default:
			differs++
		}
	}
	d.Summary.Passes = failed == nil && missed == 0 && differs == 0 && unjudged == 0
	d.Summary.Headline = headline(met, missed, agrees, differs, unjudged)
	if failed != nil {
		line, _ := 0, 0
		if s := failed.Event.Error.Source; s == d.run.Source {
			line, _ = s.Position(failed.Event.Error.Span.Start)
		}
		where := ""
		if line > 0 {
			where = fmt.Sprintf(" in line %d", line)
		}
		d.Summary.Headline = "The file stops at an error" + where + "; what stands below it was not run. " + d.Summary.Headline
	}
	d.Summary.Rests = d.grounds()
}

// all are the results in reading order.
func (d *Document) all() []Result {
	var all []Result
	for _, list := range d.results {
		all = append(all, list...)
	}
	return append(all, d.loose...)
}

func headline(met, missed, agrees, differs, unjudged int) string {
	var parts []string
	switch all := met + missed; {
	case all == 0:
		parts = append(parts, "Nothing is required.")
	case missed == 0 && all == 1:
		parts = append(parts, "The one requirement is met.")
	case missed == 0:
		parts = append(parts, fmt.Sprintf("All %d requirements are met.", all))
	case all == 1:
		parts = append(parts, "The one requirement is missed.")
	default:
		parts = append(parts, fmt.Sprintf("%d of %d requirements missed.", missed, all))
	}
	switch all := agrees + differs; {
	case all == 0:
	case differs == 0 && all == 1:
		parts = append(parts, "The one claim agrees.")
	case differs == 0:
		parts = append(parts, fmt.Sprintf("All %d claims agree.", all))
	case all == 1:
		parts = append(parts, "The one claim disagrees or cannot be decided.")
	default:
		parts = append(parts, fmt.Sprintf("%d of %d claims disagree or cannot be decided.", differs, all))
	}
	if unjudged > 0 {
		parts = append(parts, plural(unjudged, "requirement was", "requirements were")+" not judged.")
	}
	return strings.Join(parts, " ")
}

func plural(n int, one, many string) string {
	if n == 1 {
		return "1 " + one
	}
	return fmt.Sprintf("%d %s", n, many)
}

// grounds tells how the answers came about: arithmetic, digits, tolerances, samples.
func (d *Document) grounds() []Ground {
	var grounds []Ground
	exact, floating, worst, worstText := 0, 0, math.Inf(1), ""
	for _, r := range d.all() {
		if r.Shown == nil {
			continue
		}
		digits, ok := holdingDigits(r.Event.Shown.Value, 0)
		switch {
		case !ok:
		case math.IsInf(digits, 1):
			exact++
		default:
			floating++
			if digits < worst {
				worst, worstText = digits, r.Event.Text
			}
		}
	}
	if exact+floating > 0 {
		text := plural(exact, "shown value is", "shown values are") + " exact; " + plural(floating, "is", "are") + " floating"
		switch {
		case floating == 0:
			text = "every shown value is exact"
		case exact == 0:
			text = "every shown value is floating"
		}
		grounds = append(grounds, Ground{"arithmetic", text})
	}
	if floating > 0 {
		grounds = append(grounds, Ground{"digits that hold", fmt.Sprintf("at least %d, fewest in %s", int(math.Floor(worst)), worstText)})
	}
	grounds = append(grounds, d.tolerances()...)
	grounds = append(grounds, d.studies()...)
	return grounds
}

// deepest nesting of fields that is looked through
const deepest = 4

// holdingDigits is how many digits hold of the worst number in a value; infinite when all
// are exact. A number that is nothing but rounding around zero does not count.
func holdingDigits(v value.Value, depth int) (digits float64, ok bool) {
	digits = math.Inf(1)
	if depth > deepest {
		return digits, false
	}
	take := func(x float64) {
		ok = true
		if x > 0 {
			digits = math.Min(digits, x)
		}
	}
	from := func(v value.Value) {
		if x, found := holdingDigits(v, depth+1); found {
			take(x)
		}
	}
	switch x := value.Force(v).(type) {
	case value.Number:
		take(x.Digits())
	case value.Quantity:
		take(x.Magnitude.Digits())
	case value.Complex:
		if x.IsExact() {
			take(math.Inf(1))
		} else if size := math.Hypot(real(x.C), imag(x.C)); size > 0 {
			take(value.FloatErr(size, x.Err).Digits())
		}
	case *value.Matrix:
		take(x.Digits())
	case *value.Polynomial:
		for _, c := range x.Coefficients() {
			take(c.Digits())
		}
	case *value.Transfer:
		for _, row := range x.Entries {
			for _, e := range row {
				from(e.Num)
				from(e.Den)
			}
		}
	case *value.Gain:
		from(x.Values)
	case *value.Plant:
		for _, m := range []*value.Matrix{x.A, x.B, x.C, x.D} {
			if r, c := m.Dims(); r*c > 0 {
				take(m.Digits())
			}
		}
	case *value.Model:
		if x.Plant != nil {
			from(x.Plant)
		}
	case *value.List:
		for _, item := range x.Items {
			from(item)
		}
	case *value.Report:
		for _, f := range x.Fields {
			from(f.Value)
		}
	}
	return digits, ok
}

// tolerances lists the parameters that models vary.
func (d *Document) tolerances() []Ground {
	var grounds []Ground
	for _, e := range d.run.Events {
		if e.Bound == nil {
			continue
		}
		m, ok := e.Bound.Value.(*value.Model)
		if !ok {
			continue
		}
		v, ok := m.Field("tolerances")
		if !ok {
			continue
		}
		table, ok := value.Force(v).(*value.Report)
		if !ok {
			continue
		}
		var parts []string
		for _, row := range table.Rows {
			if len(row) < 3 {
				continue
			}
			name, _ := row[0].(value.Text)
			parts = append(parts, fmt.Sprintf("%s %s ± %s", name, render.Inline(row[1], d.run.Options), render.Inline(row[2], d.run.Options)))
		}
		if len(parts) > 0 {
			grounds = append(grounds, Ground{"tolerances of " + m.Name, strings.Join(parts, ", ")})
		}
	}
	return grounds
}

// studies tells of each study how many samples it had.
func (d *Document) studies() []Ground {
	var grounds []Ground
	for _, e := range d.run.Events {
		if e.Bound == nil || e.Bound.Value == nil || e.Bound.Value.Kind() != value.KStudy {
			continue
		}
		fields, ok := e.Bound.Value.(value.HasFields)
		if !ok {
			continue
		}
		var parts []string
		for _, name := range []string{"samples", "corners", "seed", "failed"} {
			if v, ok := fields.Field(name); ok {
				parts = append(parts, name+" "+render.Inline(v, d.run.Options))
			}
		}
		grounds = append(grounds, Ground{"study " + e.Bound.Name, strings.Join(parts, ", ")})
	}
	return grounds
}
