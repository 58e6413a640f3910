package eval

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/bits"

	"gainwright/lang/diag"
	"gainwright/lang/model"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// The bounds of a study, and what it takes when nothing is said.
const (
	mostSamples    = 10_000_000
	mostCornered   = 16 // parameters with a tolerance whose corners are taken: 2^16
	mostResults    = 100
	defaultSamples = 1000
	defaultSeed    = 1
)

// study is a study statement being run.
type study struct {
	session *Session
	name    syntax.Ident
	source  *diag.Source
	models  []*studied
	entries []entry
	value   *value.Study
}

// studied is a model that a study varies.
type studied struct {
	name    string
	at      diag.Span
	value   *value.Model
	model   *model.Model
	program *model.Program // nil for a model too large for one
	nominal []float64      // all parameters, in the order of Givens
	varied  []int          // which of them the study's own parameters are
	first   int            // the place of the first of them among the study's parameters
}

// entry is one number of a study.
type entry struct {
	expr syntax.Expr
	code *program
}

// runStudy runs a study and binds it.
func (r *run) runStudy(t *task, src *diag.Source, st *syntax.Study) *diag.Error {
	note, err := r.session.mayBind(src, st.Name)
	if err != nil {
		return err
	}
	s := &study{session: r.session, source: src, name: st.Name}
	if err := s.prepare(t, st); err != nil {
		return err
	}
	if err := s.sample(t); err != nil {
		return err
	}
	r.bound(src, st.Span, st.Name, s.value, "", oneLine(sliceOf(src, st.Span)))
	if note != "" {
		r.remark(src, st.Name.Span, note)
	}
	if s.value.Stopped {
		r.remark(src, st.Span, fmt.Sprintf("%s: stopped after %d of %d samples; what is done is kept, and requirements on it are not judged",
			st.Name.Name, s.value.Done(), s.value.Total()))
	}
	return nil
}

// prepare finds the models, reads the clauses and compiles the expressions.
func (s *study) prepare(t *task, st *syntax.Study) *diag.Error {
	if len(st.Entries) > mostResults {
		return diag.New(diag.Limit, "a study has at most %d results", mostResults).At(st.Name.Span)
	}
	if err := s.findModels(st.Over.Models); err != nil {
		return err
	}
	v := s.value
	if len(v.Parameters) == 0 {
		return diag.New(diag.Name, "%s has no parameter with a tolerance, so every sample would be the nominal one", s.models[0].name).
			At(s.models[0].at).WithHelp("write one as given M = 1200 kg ± 5%%")
	}
	samples, err := s.whole(t, st.Over.Samples, "samples", defaultSamples, 1, mostSamples)
	if err != nil {
		return err
	}
	seed, err := s.whole(t, st.Over.Seed, "seed", defaultSeed, 0, 1<<53)
	if err != nil {
		return err
	}
	v.Samples, v.Seed = samples, int64(seed)
	if st.Over.Corners {
		if k := len(v.Parameters); k > mostCornered {
			return diag.New(diag.Limit, "%d parameters with a tolerance have 2^%d corners; at most 2^%d are taken", k, k, mostCornered).
				At(st.Over.Span).WithHelp("leave out at corners, or the tolerances that matter least")
		}
		v.Corners = 1 << len(v.Parameters)
	}
	if s.session.parts > 1 {
		v.Part, v.Parts = s.session.part, s.session.parts
	}
	for _, e := range st.Entries {
		if err := s.add(e); err != nil {
			return err
		}
	}
	return nil
}

// add compiles a number of the study.
func (s *study) add(e syntax.StudyEntry) *diag.Error {
	l := &lowering{session: s.session, source: s.source}
	code := l.compile(e.Expr, false)
	if l.err != nil {
		return l.err
	}
	s.entries = append(s.entries, entry{expr: e.Expr, code: code})
	s.value.Results = append(s.value.Results, value.StudyResult{Name: e.Name.Name, Text: oneLine(sliceOf(s.source, e.Expr.Extent()))})
	return nil
}

// findModels takes the models by name and lists their parameters with a tolerance.
func (s *study) findModels(names []syntax.Ident) *diag.Error {
	s.value = &value.Study{}
	seen := map[string]bool{}
	for _, name := range names {
		if seen[name.Name] {
			return diag.New(diag.Name, "%s is named twice", name.Name).At(name.Span)
		}
		seen[name.Name] = true
		m, err := s.session.modelNamed(name)
		if err != nil {
			return err
		}
		m.first = len(s.value.Parameters)
		s.models = append(s.models, m)
		s.value.Models = append(s.value.Models, m.name)
		for k, g := range m.model.Givens {
			m.nominal = append(m.nominal, g.Nominal.Float64())
			if g.Tolerance == nil {
				continue
			}
			m.varied = append(m.varied, k)
			low, high := g.Low().Float64(), g.High().Float64()
			s.value.Parameters = append(s.value.Parameters, value.StudyParameter{Model: m.name, Name: g.Name, Unit: g.Unit,
				Nominal: g.Nominal.Float64(), Low: min(low, high), High: max(low, high)})
		}
	}
	return nil
}

// modelNamed finds a model made by a model statement.
func (s *Session) modelNamed(name syntax.Ident) (*studied, *diag.Error) {
	b, ok := s.names[name.Name]
	if !ok {
		return nil, s.unknownName(name.Name, nil).At(name.Span)
	}
	v, ok := b.value.(*value.Model)
	if !ok {
		return nil, diag.New(diag.Type, "%s is %s; a model stands here", name.Name, value.Describe(b.value)).At(name.Span).
			WithHelp("only what a model statement gave can vary: model %s { … }", name.Name)
	}
	m, ok := v.Source.(*model.Model)
	if !ok {
		return nil, internal("reading the model "+name.Name, nil).At(name.Span)
	}
	return &studied{name: name.Name, at: name.Span, value: v, model: m, program: m.Program()}, nil
}

// whole evaluates a clause's whole number.
func (s *study) whole(t *task, e syntax.Expr, what string, otherwise, least, most int) (int, *diag.Error) {
	if e == nil {
		return otherwise, nil
	}
	return wholeClause(s.session, t, s.source, e, what, least, most)
}

func wholeClause(session *Session, t *task, src *diag.Source, e syntax.Expr, what string, least, most int) (int, *diag.Error) {
	v, err := session.evaluate(t, src, e)
	if err != nil {
		return 0, err
	}
	n, ok := v.(value.Number)
	k, whole := 0, false
	if ok {
		k, whole = n.Whole()
	}
	if !whole || k < least || k > most {
		return 0, diag.New(diag.Type, "%s takes a whole number from %d to %d", what, least, most).At(e.Extent())
	}
	return k, nil
}

// sample computes every sample, and finds out first, at the nominal one, that each
// expression reaches a model and gives a number, and its unit.
func (s *study) sample(t *task) *diag.Error {
	v := s.value
	from, to := 0, v.Total()
	if v.Part > 0 {
		from, to = share(v.Total(), v.Part, v.Parts)
	}
	v.First = from
	if err := t.charge(8 * int64(to-from) * int64(len(v.Results))); err != nil {
		return asError(err, "study").At(s.models[0].at)
	}
	w := s.worker(t.ctx, s.session)
	nominal, err := s.nominal(w)
	if err != nil {
		return err
	}
	done := to - from
	if s.session.computed != nil {
		if err := s.take(nominal); err != nil {
			return err
		}
	} else {
		for k := range v.Results {
			v.Results[k].Values = make([]float64, to-from)
		}
		var stopped *diag.Error
		done, stopped = s.spread(t, w, s.flatten(w, nominal), from, to)
		if stopped != nil {
			if !errors.Is(context.Cause(t.ctx), context.Canceled) || done == 0 {
				return stopped
			}
			v.Stopped = true
		}
	}
	for k := range v.Results {
		r := &v.Results[k]
		r.Values = r.Values[:done:done]
		r.FirstFailed = -1
		for i, x := range r.Values {
			if x != x {
				if r.Failed++; r.Failed == 1 {
					r.FirstFailed = from + i
				}
			}
		}
	}
	s.explainFailures(w)
	return nil
}

// take takes values that were computed elsewhere, when they are of this study: its nominal
// sample must come out the same here.
func (s *study) take(nominal []float64) *diag.Error {
	refuse := func(format string, args ...any) *diag.Error {
		return diag.New(diag.File, format, args...).At(s.name.Span).In(s.source)
	}
	values, err := s.session.computed(s.name.Name, s.value)
	if err != nil {
		return asError(err, "merge").At(s.name.Span).In(s.source)
	}
	if len(values) != len(s.value.Results) {
		return refuse("the parts have %d results of this study, and it has %d", len(values), len(s.value.Results))
	}
	for k := range s.value.Results {
		r := &s.value.Results[k]
		if len(values[k]) != s.value.Total() {
			return refuse("the parts have %d samples of this study, and it has %d", len(values[k]), s.value.Total())
		}
		if there := values[k][0]; !(math.Abs(there-nominal[k]) <= 1e-6*math.Abs(nominal[k])+1e-12) && there != nominal[k] {
			return refuse("the parts are of another design: at the nominal parameters %s is %.6g in them, and %.6g here", r.Text, there, nominal[k])
		}
		r.Values = values[k]
	}
	return nil
}

// share gives the samples of one part of several.
func share(total, part, parts int) (from, to int) {
	at := func(k int) int {
		high, low := bits.Mul64(uint64(total), uint64(k))
		q, _ := bits.Div64(high, low, uint64(parts))
		return int(q)
	}
	return at(part - 1), at(part)
}

// nominal evaluates every expression at the nominal parameters.
func (s *study) nominal(w *worker) ([]float64, *diag.Error) {
	out := make([]float64, len(s.entries))
	if failed, why := w.place(0); failed != nil {
		return nil, diag.New(diag.Numerical, "%s at its nominal parameters: %s", failed.name, why).At(failed.at)
	}
	for k, e := range s.entries {
		w.task.reached = false
		v, err := w.evaluate(e)
		if err != nil {
			return nil, err
		}
		if !w.task.reached {
			return nil, s.unreached(e)
		}
		r := &s.value.Results[k]
		switch x := value.Force(v).(type) {
		case value.Quantity:
			r.Unit = x.Unit
		case value.Boolean:
			r.IsTruth = true
		case *value.Report:
			r.IsTruth = x.Holds != nil
		}
		number, failure := numberIn(v, r)
		if failure != nil {
			return nil, asError(failure, "study").At(e.expr.Extent()).In(s.source)
		}
		out[k] = number
	}
	return out, nil
}

// unreached explains an expression that varies with no model.
func (s *study) unreached(e entry) *diag.Error {
	names := s.value.Models[0]
	for _, n := range s.value.Models[1:] {
		names += ", " + n
	}
	return diag.New(diag.Name, "this does not reach %s, so it would stay the same", names).At(e.expr.Extent()).
		WithHelp("names bound before keep their values: write out what varies, as in least_damping(closed(%s, K))", s.value.Models[0]).In(s.source)
}

// numberIn reads a result as a number in the unit that it has at the nominal sample.
func numberIn(v value.Value, r *value.StudyResult) (float64, error) {
	v = value.Force(v)
	if m, ok := v.(*value.Matrix); ok {
		if rows, cols := m.Dims(); rows == 1 && cols == 1 && !m.IsComplex() {
			re, _ := m.Floats()
			return re[0], nil
		}
	}
	switch x := v.(type) {
	case value.Number:
		if r.Unit.IsNone() {
			return x.Float64(), nil
		}
		v = value.Quantity{Magnitude: x, Unit: value.None()}
	case value.Boolean:
		if r.IsTruth {
			return truthNumber(bool(x)), nil
		}
	case *value.Report:
		if x.Holds != nil && r.IsTruth {
			return truthNumber(*x.Holds), nil
		}
	}
	if q, ok := v.(value.Quantity); ok {
		in, err := value.In(q, r.Unit)
		if err != nil {
			return 0, err
		}
		if q, ok := in.(value.Quantity); ok {
			return q.Magnitude.Float64(), nil
		}
		if n, ok := in.(value.Number); ok {
			return n.Float64(), nil
		}
	}
	return 0, diag.New(diag.Type, "a number stands here, and this is %s", value.Describe(v))
}

func truthNumber(holds bool) float64 {
	if holds {
		return 1
	}
	return 0
}
