package render

import (
	"fmt"
	"strings"

	"gainwright/lang/value"
)

// digits of a study's values: what samples scatter by is seldom worth more
const studyDigits = 4

// layStudy shows a study's spread: of one number its extremes with their parameters and
// what drives it, of several a table.
func layStudy(s *value.Study, o Options) laid {
	if o.digits() == DefaultDigits {
		o.Digits = studyDigits
	}
	r := &value.Report{Title: studyTitle(s)}
	if len(s.Results) == 1 {
		r.Fields = spreadFields(s, o)
		if t, ok := s.Field("influence"); ok && len(s.Parameters) > 1 {
			if influence, ok := force(t).(*value.Report); ok {
				r.Columns = append([]string{}, influence.Columns...)
				r.Rows = influence.Rows
			}
		}
	} else {
		r.Columns = []string{"result", "smallest", "median", "largest", "failed"}
		for _, result := range s.Results {
			one := s.Only(result)
			row := []value.Value{value.Text(result.Name)}
			for _, f := range []string{"smallest", "median", "largest", "failed"} {
				v, _ := one.Field(f)
				if e, ok := v.(*value.Report); ok {
					v, _ = e.Field("value")
				}
				row = append(row, v)
			}
			r.Rows = append(r.Rows, row)
		}
	}
	for _, result := range s.Results {
		if result.Failed > 0 {
			r.Notes = append(r.Notes, strings.TrimSpace(fmt.Sprintf("%s %d of %d failed, the first is %s: %s", result.Name, result.Failed,
				s.Done(), s.SampleName(result.FirstFailed), result.Failure)))
		}
	}
	l := layReport(r, o)
	if o.Drawing != nil {
		if drawing := o.Drawing(s, o.width()-2); len(drawing) > 0 {
			l.lines = append(append(l.lines, ""), drawing...)
		}
	}
	return l
}

func studyTitle(s *value.Study) string {
	text := fmt.Sprintf("over %s: %d samples", strings.Join(s.Models, ", "), s.Samples)
	if s.Corners > 0 {
		text += fmt.Sprintf(", %d corners", s.Corners)
	}
	text += fmt.Sprintf(", seed %d", s.Seed)
	if s.Part > 0 {
		text += fmt.Sprintf("; part %d of %d", s.Part, s.Parts)
	}
	if s.Stopped {
		text += fmt.Sprintf("; stopped after %d", s.Done())
	}
	return text
}

// spreadFields are the extremes with their parameters, the middle, and what failed.
func spreadFields(s *value.Study, o Options) []value.Named {
	var out []value.Named
	for _, name := range []string{"smallest", "median", "largest"} {
		v, ok := s.Field(name)
		if !ok {
			continue
		}
		e, ok := v.(*value.Report)
		if !ok {
			out = append(out, value.Named{Name: name, Value: v})
			continue
		}
		number, _ := e.Field("value")
		out = append(out, value.Named{Name: name, Value: number})
		if at, ok := e.Field("at"); ok {
			where, _ := e.Field("sample")
			var parts []string
			for _, f := range at.(*value.Report).Fields {
				parts = append(parts, f.Name+" "+Inline(f.Value, o))
			}
			out = append(out, value.Named{Name: "  at " + fmt.Sprint(where), Value: value.Text(strings.Join(parts, ", "))})
		}
	}
	failed, _ := s.Field("failed")
	return append(out, value.Named{Name: "failed", Value: failed})
}

// studyObject has the fields that are numbers and tables; values and draws are asked for
// by name.
func studyObject(s *value.Study) reportJSON {
	var fields []value.Named
	for _, name := range s.FieldNames() {
		v, ok := s.Field(name)
		if !ok || name == "values" || name == "draws" || name == "quantile" {
			continue
		}
		fields = append(fields, value.Named{Name: name, Value: v})
	}
	return reportJSON{Kind: "study", Title: studyTitle(s), Fields: orderedOrNil(fields)}
}
