package report

import (
	"path/filepath"
	"slices"
	"strings"
	"unicode"
	"unicode/utf8"

	"gainwright/lang/eval"
	"gainwright/lang/figure"
	"gainwright/lang/value"
)

// draw gives the drawing of an event's value, with names of its own on the page.
func (d *Document) draw(e eval.Event, v value.Value) string {
	var drawing *figure.Drawing
	var ok bool
	switch x := value.Force(v).(type) {
	case *value.Study:
		drawing, ok = figure.DrawStudy(x, d.limitsOf)
	case *value.Report:
		if x.Basis == nil {
			drawing, ok = figure.Draw(x)
			break
		}
		drawing, ok = figure.DrawFigures(x, func(field string) []figure.Limit { return d.limitsOfField(e.Text, x, field) })
	default:
		drawing, ok = figure.Draw(v)
	}
	if !ok {
		return ""
	}
	d.figures = append(d.figures, Figure{d.figureName(e), drawing})
	return drawing.SVG("figure-" + itoa(len(d.figures)))
}

// longest name of a figure that is made of a statement's words
const longestName = 40

// figureName is the name that a statement shows, or its line: it stays when figures before
// it come or go. It has letters, digits and - alone, and differs from the others also where
// capital letters are not told from small ones.
func (d *Document) figureName(e eval.Event) string {
	name := strings.Map(func(r rune) rune {
		switch {
		case r == '.':
			return '-'
		case r == '_' || unicode.IsLetter(r) || unicode.IsDigit(r):
			return r
		}
		return -1
	}, e.Text)
	if e.Requirement != nil || utf8.RuneCountInString(name) != utf8.RuneCountInString(e.Text) || len(name) > longestName {
		name = "line-" + itoa(e.Line)
	}
	if e.Source != nil && e.Source != d.run.Source {
		base := filepath.Base(e.Source.Name)
		name = strings.TrimSuffix(base, filepath.Ext(base)) + "-" + name
	}
	unlike := name
	for k := 2; slices.ContainsFunc(d.figures, func(f Figure) bool { return strings.EqualFold(f.Name, unlike) }); k++ {
		unlike = name + "-" + itoa(k)
	}
	return unlike
}

// limitsOf gives what the document requires of a study's number.
func (d *Document) limitsOf(r *value.StudyResult) []figure.Limit {
	var limits []figure.Limit
	for _, e := range d.run.Events {
		if q := e.Requirement; q != nil && q.Study != nil && sameSamples(&q.Study.Results[0], r) {
			limits = append(limits, figure.Limit{Op: q.Op, Bound: q.Bound})
		}
	}
	return limits
}

// limitsOfField gives what the document requires of a figure of a response, where it is
// required in the words that it is shown in: f shown, f.overshoot required.
func (d *Document) limitsOfField(text string, r *value.Report, field string) []figure.Limit {
	var limits []figure.Limit
	for _, f := range r.Fields {
		number, ok := value.Force(f.Value).(value.Quantity)
		if f.Name != field || !ok {
			continue
		}
		for _, e := range d.run.Events {
			q := e.Requirement
			if q == nil || q.Study != nil || !begins(e.Text, text+"."+field) {
				continue
			}
			// The name may mean another report by now; its number would tell.
			left, ok := value.Force(q.Left).(value.Quantity)
			if !ok || left.Unit.Text != number.Unit.Text || left.Magnitude.Float64() != number.Magnitude.Float64() {
				continue
			}
			if bound, err := value.In(q.Right, number.Unit); err == nil {
				if b, ok := bound.(value.Quantity); ok {
					limits = append(limits, figure.Limit{Op: q.Op, Bound: b.Magnitude.Float64()})
				}
			}
		}
	}
	return limits
}

// begins tells whether a condition begins with a whole field.
func begins(condition, field string) bool {
	rest, ok := strings.CutPrefix(condition, field)
	next, _ := utf8.DecodeRuneInString(rest)
	return ok && next != '_' && next != '[' && next != '.' && !unicode.IsLetter(next) && !unicode.IsDigit(next)
}

// showsStudy tells whether a study has a drawing elsewhere: where it is shown, or at an
// earlier requirement.
func (d *Document) showsStudy(s *value.Study) bool {
	has := func(v value.Value) bool {
		other, ok := value.Force(v).(*value.Study)
		if !ok {
			return false
		}
		for k := range other.Results {
			if sameSamples(&other.Results[k], &s.Results[0]) {
				return true
			}
		}
		return false
	}
	for _, e := range d.run.Events {
		if e.Shown != nil && has(e.Shown.Value) {
			return true
		}
	}
	for _, r := range d.all() {
		if q := r.Event.Requirement; q != nil && q.Study != nil && r.Figure != "" && has(q.Study) {
			return true
		}
	}
	return false
}

// sameSamples tells whether two results are one: a study's number is handed on without
// copying its samples.
func sameSamples(a, b *value.StudyResult) bool {
	return len(a.Values) > 0 && len(b.Values) == len(a.Values) && &a.Values[0] == &b.Values[0]
}
