package eval

import (
	"fmt"
	"math"
	"sort"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// The largest of the three steps of a sensitivity's central differences, as a part of the
// parameter; the others are a half and a quarter of it.
const sensitivityStep = 0.004

// parameterChange is what one parameter does to a number.
type parameterChange struct {
	name             string
	nominal          value.Value
	rate, err        float64 // of the number, per one per cent of the parameter
	half             float64 // the half-width of the tolerance in per cent; NaN without one
	failure          string
	ofZero, hasWidth bool
}

// runSensitivity is sensitivity(EXPR) over …, bound to a name unless that is empty: the
// relative change of a number for one per cent more of each parameter of the models.
func (r *run) runSensitivity(t *task, src *diag.Source, name syntax.Ident, e syntax.Expr, over *syntax.Over) *diag.Error {
	note := ""
	if name.Name != "" {
		var err *diag.Error
		if note, err = r.session.mayBind(src, name); err != nil {
			return err
		}
	}
	call, ok := e.(*syntax.Call)
	if !ok || len(call.Args) != 1 || call.Args[0].Name != nil {
		return diag.New(diag.Type, "sensitivity takes one number").At(e.Extent()).WithHelp("sensitivity(EXPR) over MODEL")
	}
	report, err := r.session.sensitivity(t, src, call.Args[0].Value, over)
	if err != nil {
		return err
	}
	span := diag.Span{Start: e.Extent().Start, End: over.Span.End}
	if name.Name == "" {
		event := r.event(src, span, oneLine(sliceOf(src, span)))
		event.Shown = &Shown{Value: report}
		r.emit(event)
		return nil
	}
	span.Start = name.Span.Start
	r.bound(src, span, name, report, "", oneLine(sliceOf(src, span)))
	if note != "" {
		r.remark(src, name.Span, note)
	}
	return nil
}

// sensitivity works the table out.
func (s *Session) sensitivity(t *task, src *diag.Source, e syntax.Expr, over *syntax.Over) (*value.Report, *diag.Error) {
	study := &study{session: s, source: src}
	if err := study.findModels(over.Models); err != nil {
		return nil, err
	}
	if err := study.add(syntax.StudyEntry{Expr: e}); err != nil {
		return nil, err
	}
	w := study.worker(t.ctx, s)
	nominal, err := study.nominal(w)
	if err != nil {
		return nil, err
	}
	d := &differences{worker: w, nominal: nominal[0], unit: study.value.Results[0].Unit}
	if study.value.Results[0].IsTruth {
		return nil, diag.New(diag.Type, "a number stands here, and this is true or false").At(e.Extent())
	}
	var changes []parameterChange
	names := givenNames(study.models)
	for k, m := range study.models {
		for j := range m.model.Givens {
			c, err := d.of(k, j)
			if err != nil {
				return nil, err
			}
			c.name = names[m.name+"."+m.model.Givens[j].Name]
			changes = append(changes, c)
		}
	}
	sort.SliceStable(changes, func(a, b int) bool { return math.Abs(changes[a].rate) > math.Abs(changes[b].rate) })
	return d.report(changes), nil
}

// givenNames names the parameters; those of several models that share a name carry the model's.
func givenNames(models []*studied) map[string]string {
	seen := map[string]int{}
	for _, m := range models {
		for _, g := range m.model.Givens {
			seen[g.Name]++
		}
	}
	out := map[string]string{}
	for _, m := range models {
		for _, g := range m.model.Givens {
			full := m.name + "." + g.Name
			out[full] = g.Name
			if seen[g.Name] > 1 {
				out[full] = full
			}
		}
	}
	return out
}

// differences takes central differences of a number by the parameters of models.
type differences struct {
	worker  *worker
	nominal float64
	unit    value.Unit
}

// of gives the change by parameter j of model k. A parameter whose nominal value is zero is
// changed by parts of the half-width of its tolerance instead.
func (d *differences) of(k, j int) (parameterChange, *diag.Error) {
	m := d.worker.study.models[k]
	g := m.model.Givens[j]
	p := m.nominal[j]
	c := parameterChange{nominal: value.Quantity{Magnitude: g.Nominal, Unit: g.Unit}, half: math.NaN()}
	if g.Unit.IsNone() {
		c.nominal = g.Nominal
	}
	scale := math.Abs(p)
	if g.Tolerance != nil {
		half := (g.High().Float64() - g.Low().Float64()) / 2
		if c.hasWidth = true; scale == 0 {
			scale, c.ofZero = math.Abs(half), true
		}
		if scale > 0 {
			c.half = math.Abs(half) / scale * 100
		}
	}
	if scale == 0 {
		c.failure = "its nominal value is zero and it has no tolerance"
		return c, nil
	}
	// Romberg's table of three central differences (Richardson 1911): the last two
	// extrapolations tell each other's error.
	var rates [3]float64
	for i := range rates {
		step := sensitivityStep * scale / float64(int(1)<<i)
		up, failure, err := d.at(k, j, p+step)
		if err != nil {
			return c, err
		}
		down, failed, err := d.at(k, j, p-step)
		if err != nil {
			return c, err
		}
		if failure == "" {
			failure = failed
		}
		if failure != "" {
			c.failure = failure
			return c, nil
		}
		rates[i] = (up - down) / (2 * sensitivityStep / float64(int(1)<<i)) / 100
	}
	first, second := (4*rates[1]-rates[0])/3, (4*rates[2]-rates[1])/3
	c.rate = (16*second - first) / 15
	// What rounding leaves of a difference of two equal numbers, beside what the steps say.
	noise := math.Abs(d.nominal) * 0x1p-52 / sensitivityStep / 100
	c.err = math.Abs(c.rate-second) + noise
	if math.Abs(c.rate) <= 10*noise {
		c.rate, c.err = 0, 0
	}
	if d.nominal != 0 {
		c.rate, c.err = c.rate/math.Abs(d.nominal), c.err/math.Abs(d.nominal)
	}
	return c, nil
}

// at evaluates the number with parameter j of model k set; failure is why there is none.
func (d *differences) at(k, j int, p float64) (number float64, failure string, stopped *diag.Error) {
	w := d.worker
	before := w.parameters[k][j]
	w.parameters[k][j] = p
	defer func() { w.parameters[k][j] = before }()
	if m, why := w.placeParameters(); m != nil {
		return 0, m.name + ": " + why.Error(), nil
	}
	v, err := w.evaluate(w.study.entries[0])
	if w.task.ctx.Err() != nil {
		return 0, "", w.task.stopError()
	}
	if err != nil {
		return 0, err.Message, nil
	}
	number, wrong := numberIn(v, &w.study.value.Results[0])
	if wrong != nil {
		return 0, asError(wrong, "sensitivity").Message, nil
	}
	return number, "", nil
}

// report lays the changes out, strongest first.
func (d *differences) report(changes []parameterChange) *value.Report {
	unit, relative := d.unit, d.nominal != 0
	per := 1.0
	if relative {
		unit, per = value.Percent(), 100
	}
	result := d.worker.study.value.Results[0]
	out := &value.Report{Title: "for one per cent more of each parameter", Fields: []value.Named{{Name: "value", Value: result.Number(d.nominal)}},
		Columns: []string{"parameter", "nominal", "change per percent", "change over tolerance"}}
	if !relative {
		out.Notes = append(out.Notes, "the number is zero, so its changes stand in its own unit")
	}
	cell := func(f, err float64) value.Value {
		n := value.FloatErr(f*per, err*per)
		if f == 0 && err == 0 {
			n = value.Int(0)
		}
		if unit.IsNone() {
			return n
		}
		return value.Quantity{Magnitude: n, Unit: unit}
	}
	for _, c := range changes {
		row := []value.Value{value.Text(c.name), c.nominal, nil, nil}
		switch {
		case c.failure != "":
			out.Notes = append(out.Notes, fmt.Sprintf("%s: %s", c.name, c.failure))
		default:
			row[2] = cell(c.rate, c.err)
			if c.hasWidth {
				row[3] = cell(math.Abs(c.rate)*c.half, c.err*c.half)
			}
			if c.ofZero {
				out.Notes = append(out.Notes, c.name+": its nominal value is zero, so one per cent of the half-width of its tolerance is taken")
			}
		}
		out.Rows = append(out.Rows, row)
	}
	return out
}
