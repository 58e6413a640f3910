package report

import (
	"gainwright/lang/figure"
	"gainwright/lang/value"
)

// draw gives the drawing of a value, with names of its own on the page.
func (d *Document) draw(text string, v value.Value) string {
	var drawing *figure.Drawing
	var ok bool
	if s, isStudy := value.Force(v).(*value.Study); isStudy {
		drawing, ok = figure.DrawStudy(s, d.limitsOf)
	} else {
		drawing, ok = figure.Draw(v)
	}
	if !ok {
		return ""
	}
	d.figures = append(d.figures, Figure{text, drawing})
	return drawing.SVG("figure-" + itoa(len(d.figures)))
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
