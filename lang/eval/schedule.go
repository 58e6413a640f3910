package eval

import (
	"fmt"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// most values of the parameter in a schedule
const mostNodes = 1000

// schedule is a schedule statement being run: a gain, or a number, at evenly spaced values
// of one parameter.
type schedule struct {
	study     *study
	worker    *worker
	at        diag.Span // the expression
	model     *studied
	parameter int
	text      string // the parameter's name
	unit      value.Unit
	role      string // of a gain; "state feedback" for a matrix of its size; "" for what closes no loop
	result    value.Unit
	rows      []value.Signal
	columns   []value.Signal
	size      [2]int
	nodes     []scheduled
	between   []scheduled
}

// scheduled is the gain at one value of the parameter, with the figures of the loop that it
// closes there.
type scheduled struct {
	parameter      float64
	entries        []float64
	err            float64
	damping, decay value.Value // nil without a loop
	there          []float64   // between the nodes, of what closes no loop: the expression's own entries
}

// runSchedule runs a schedule and binds its table.
func (r *run) runSchedule(t *task, src *diag.Source, st *syntax.Schedule) *diag.Error {
	note, err := r.session.mayBind(src, st.Name)
	if err != nil {
		return err
	}
	s, count, err := r.session.prepareSchedule(t, src, st)
	if err != nil {
		return err
	}
	if err := s.compute(count); err != nil {
		return err
	}
	r.bound(src, st.Span, st.Name, s.report(), "", oneLine(sliceOf(src, st.Span)))
	if note != "" {
		r.remark(src, st.Name.Span, note)
	}
	return nil
}

// prepareSchedule finds the model and its parameter, reads the clauses and compiles the
// expression.
func (s *Session) prepareSchedule(t *task, src *diag.Source, st *syntax.Schedule) (*schedule, int, *diag.Error) {
	out := &schedule{study: &study{session: s, source: src}, at: st.Expr.Extent(), parameter: -1, text: st.Parameter.Name}
	if err := out.study.findModels([]syntax.Ident{st.Model}); err != nil {
		return nil, 0, err
	}
	out.model = out.study.models[0]
	var names []string
	for k, g := range out.model.model.Givens {
		names = append(names, g.Name)
		if g.Name == st.Parameter.Name {
			out.parameter, out.unit = k, g.Unit
		}
	}
	if out.parameter < 0 {
		e := diag.New(diag.Name, "%s has no parameter %s", st.Model.Name, st.Parameter.Name).At(st.Parameter.Span)
		if near := diag.Nearest(st.Parameter.Name, names); near != "" {
			return nil, 0, e.WithHelp("did you mean %s?", near)
		}
		return nil, 0, e.WithHelp("a parameter is declared as given %s = …", st.Parameter.Name)
	}
	count, err := wholeClause(s, t, src, st.Steps, "in … steps", 2, mostNodes)
	if err != nil {
		return nil, 0, err
	}
	from, err := out.end(t, st.From)
	if err != nil {
		return nil, 0, err
	}
	to, err := out.end(t, st.To)
	if err != nil {
		return nil, 0, err
	}
	if from == to {
		return nil, 0, diag.New(diag.Type, "the schedule begins and ends at the same value").At(st.To.Extent())
	}
	if err := out.study.add(syntax.StudyEntry{Expr: st.Expr}); err != nil {
		return nil, 0, err
	}
	for k := range count {
		part := float64(k) / float64(count-1)
		out.nodes = append(out.nodes, scheduled{parameter: from + (to-from)*part})
		if k > 0 {
			out.between = append(out.between, scheduled{parameter: from + (to-from)*(float64(k)-0.5)/float64(count-1)})
		}
	}
	out.nodes[count-1].parameter = to
	out.worker = out.study.worker(t.ctx, s)
	return out, count, nil
}

// end reads an end of the parameter's range in the parameter's unit.
func (s *schedule) end(t *task, e syntax.Expr) (float64, *diag.Error) {
	v, err := s.study.session.evaluate(t, s.study.source, e)
	if err != nil {
		return 0, err
	}
	f, wrong := s.inParameterUnit(v)
	if wrong != nil {
		return 0, asError(wrong, "schedule").At(e.Extent())
	}
	return f, nil
}

// inParameterUnit reads a value of the parameter; a bare 0 needs no unit.
func (s *schedule) inParameterUnit(v value.Value) (float64, error) {
	refuse := func(kind diag.Kind, text string) error {
		return value.Errf(kind, s.text, "%s is in %s, and this %s", s.text, s.unit.Text, text).WithHelp("write it with its unit, as in 3 %s", s.unit.Text)
	}
	switch x := value.Force(v).(type) {
	case value.Number:
		if !s.unit.IsNone() && x.Sign() != 0 {
			return 0, refuse(diag.Unit, "has no unit")
		}
		return x.Float64(), nil
	case value.Quantity:
		if s.unit.IsNone() && !x.Unit.Dim.IsPlain() {
			return 0, value.Errf(diag.Unit, s.text, "%s has no unit, and this is in %s", s.text, x.Unit.Text)
		}
		if f, err := numberIn(x, &value.StudyResult{Unit: s.unit}); err == nil {
			return f, nil
		}
		return 0, refuse(diag.Unit, "is in "+x.Unit.Text)
	}
	return 0, value.Errf(diag.Type, s.text, "a value of %s stands here, and this is %s", s.text, value.Describe(v))
}

// compute works out the nodes, and then what interpolation gives in the middle between two.
func (s *schedule) compute(count int) *diag.Error {
	progress := func(done int) {
		if report := s.study.session.progress; report != nil {
			report(done, 2*count-1)
		}
	}
	for k := range s.nodes {
		n := &s.nodes[k]
		if err := s.place(n.parameter); err != nil {
			return err
		}
		v, err := s.evaluate(n.parameter)
		if err != nil {
			return err
		}
		if k == 0 {
			if !s.worker.task.reached {
				return s.study.unreached(s.study.entries[0])
			}
			if err := s.shape(v); err != nil {
				return err
			}
		}
		if err := s.read(v, n); err != nil {
			return err
		}
		if err := s.judge(n); err != nil {
			return err
		}
		progress(k + 1)
	}
	for k := range s.between {
		b, left, right := &s.between[k], &s.nodes[k], &s.nodes[k+1]
		for i, x := range left.entries {
			b.entries = append(b.entries, (x+right.entries[i])/2)
		}
		b.err = (left.err + right.err) / 2
		if err := s.place(b.parameter); err != nil {
			return err
		}
		if s.role != "" {
			if err := s.judge(b); err != nil {
				return err
			}
		} else {
			v, err := s.evaluate(b.parameter)
			if err != nil {
				return err
			}
			there := scheduled{}
			if err := s.read(v, &there); err != nil {
				return err
			}
			b.there = there.entries
		}
		progress(count + k + 1)
	}
	return nil
}

// place gives the model the parameter's value.
func (s *schedule) place(parameter float64) *diag.Error {
	s.worker.parameters[0][s.parameter] = parameter
	if m, why := s.worker.placeParameters(); m != nil {
		return diag.New(diag.Numerical, "at %s: %s", s.valueText(parameter), why).At(m.at).In(s.study.source)
	}
	return nil
}

func (s *schedule) evaluate(parameter float64) (value.Value, *diag.Error) {
	v, err := s.worker.evaluate(s.study.entries[0])
	if s.worker.task.ctx.Err() != nil {
		return nil, s.worker.task.stopError()
	}
	if err != nil {
		place := *err
		place.Message = fmt.Sprintf("at %s: %s", s.valueText(parameter), err.Message)
		return nil, &place
	}
	return value.Force(v), nil
}

func (s *schedule) valueText(parameter float64) string {
	text := s.text + " " + fourDigits(parameter)
	if !s.unit.IsNone() {
		text += " " + s.unit.Text
	}
	return text
}

// shape learns from the first node what is scheduled.
func (s *schedule) shape(v value.Value) *diag.Error {
	plant := s.plant()
	switch x := v.(type) {
	case *value.Gain:
		s.rows, s.columns = x.RowSignals, x.ColumnSignals
		s.size[0], s.size[1] = x.Values.Dims()
		if x.Role == "state feedback" && s.size == [2]int{len(plant.Inputs), plant.Order()} ||
			x.Role == "observer" && s.size == [2]int{plant.Order(), len(plant.Outputs)} {
			s.role = x.Role
		}
		return nil
	case *value.Matrix:
		s.size[0], s.size[1] = x.Dims()
		if s.size == [2]int{len(plant.Inputs), plant.Order()} {
			s.role, s.rows, s.columns = "state feedback", plant.Inputs, plant.States
		}
		return nil
	case value.Quantity:
		s.result = x.Unit
	}
	s.size = [2]int{1, 1}
	return nil
}

// plant is the model at the value that was placed.
func (s *schedule) plant() *value.Plant {
	return s.worker.overlay[s.model.name].(*value.Model).Plant
}

// read takes the entries of a value of the shape of the first.
func (s *schedule) read(v value.Value, into *scheduled) *diag.Error {
	var m *value.Matrix
	switch x := v.(type) {
	case *value.Gain:
		m = x.Values
	case *value.Matrix:
		m = x
	default:
		f, wrong := numberIn(v, &value.StudyResult{Unit: s.result})
		if wrong != nil {
			return diag.New(diag.Type, "a schedule is of a gain, a matrix or a number, and this is %s", value.Describe(v)).At(s.at).In(s.study.source)
		}
		into.entries = []float64{f}
		return nil
	}
	if r, c := m.Dims(); m.IsComplex() || [2]int{r, c} != s.size {
		return diag.New(diag.Type, "at %s this is %s, and %d×%d real numbers at the first value", s.valueText(into.parameter),
			value.Describe(v), s.size[0], s.size[1]).At(s.at).In(s.study.source)
	}
	entries, _ := m.Floats()
	into.entries, into.err = append([]float64{}, entries...), m.Err
	return nil
}

// judge finds the least damping and the slowest decay of the loop that the gain closes.
func (s *schedule) judge(n *scheduled) *diag.Error {
	if s.role == "" {
		return nil
	}
	plant := *s.plant()
	gain := value.FloatMatrix(s.size[0], s.size[1], append([]float64{}, n.entries...), n.err)
	left, right := plant.B, gain
	if s.role == "observer" {
		left, right = gain, plant.C
	}
	fed, err := value.Multiply(left, right)
	if err == nil {
		fed, err = value.Subtract(plant.A, fed)
	}
	if err != nil {
		return asError(err, "schedule").At(s.at).In(s.study.source)
	}
	plant.A = fed.(*value.Matrix)
	for _, f := range [...]struct {
		name string
		to   *value.Value
	}{{"least_damping", &n.damping}, {"slowest_decay", &n.decay}} {
		v, err := s.figure(f.name, &plant)
		if err != nil {
			return asError(err, f.name).At(s.at).In(s.study.source)
		}
		*f.to = v
	}
	return nil
}

// figure asks a built-in for a figure of a plant.
func (s *schedule) figure(name string, plant *value.Plant) (value.Value, error) {
	b, ok := s.study.session.builtins[name]
	if !ok {
		return nil, internal("looking for "+name, nil)
	}
	call := s.study.session.newCall(&frame{task: s.worker.task}, b, &callSite{}, &ties{task: s.worker.task})
	call.Args["plant"] = plant
	return b.Func(call)
}
