package eval

import (
	"math"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// require judges a requirement and tells how it came out.
func (r *run) require(t *task, src *diag.Source, st *syntax.Require) *diag.Error {
	j := judge{session: r.session, task: t, source: src}
	outcome, err := j.condition(st.Cond)
	if err != nil {
		return err
	}
	outcome.Why = st.Why
	if !outcome.Met && !outcome.NotJudged {
		r.outcome.Missed = true
	}
	e := r.event(src, st.Span, oneLine(sliceOf(src, st.Cond.Extent())))
	e.Requirement = outcome
	r.emit(e)
	return nil
}

type judge struct {
	session *Session
	task    *task
	source  *diag.Source
}

// condition judges a condition: its comparisons one by one, so that both sides can be
// shown, and no further than the answer needs.
func (j *judge) condition(e syntax.Expr) (*Requirement, *diag.Error) {
	switch e := e.(type) {
	case *syntax.Unary:
		if e.Op == "not" {
			return j.negation(e)
		}
	case *syntax.Binary:
		switch e.Op {
		case "and", "or":
			return j.combination(e)
		case "==", "!=", "<", "<=", ">", ">=":
			return j.comparison(e)
		}
	}
	v, err := j.session.evaluate(j.task, j.source, e)
	if err != nil {
		return nil, err
	}
	if s, ok := v.(*value.Study); ok {
		outcome, failure := judgeStudy(s, "==", value.Boolean(true), false)
		if failure != nil {
			return nil, asError(failure, "require").At(e.Extent()).In(j.source)
		}
		return outcome, nil
	}
	holds, failure := asTruth(v)
	if failure != nil {
		return nil, asError(failure, "require").At(e.Extent()).In(j.source)
	}
	return &Requirement{Met: holds, Because: because(v)}, nil
}

func (j *judge) negation(e *syntax.Unary) (*Requirement, *diag.Error) {
	inner, err := j.condition(e.X)
	if err != nil || inner.NotJudged {
		return inner, err
	}
	if inner.Sampled {
		return nil, diag.New(diag.Type, "the negation of a requirement on a study is ambiguous").At(e.At).
			WithHelp("it would hold when one sample does not; turn the comparison round instead")
	}
	inner.Met = !inner.Met
	if inner.Op != "" && !inner.Met {
		inner.Because = "this holds: " + j.text(e.X)
	}
	return inner, nil
}

func (j *judge) combination(e *syntax.Binary) (*Requirement, *diag.Error) {
	left, err := j.condition(e.L)
	if err != nil {
		return nil, err
	}
	decided := left.Met == (e.Op == "or")
	if decided && !left.NotJudged {
		j.explain(left, e.L)
		return left, nil
	}
	right, err := j.condition(e.R)
	if err != nil {
		return nil, err
	}
	if right.Met == (e.Op == "or") && !right.NotJudged {
		j.explain(right, e.R)
		return right, nil
	}
	both := &Requirement{
		Met:            e.Op == "and",
		NotJudged:      left.NotJudged || right.NotJudged,
		WithinRounding: left.WithinRounding || right.WithinRounding,
	}
	if !both.Met {
		both.Because = "neither holds"
	}
	return both, nil
}

// explain says which part of a combination decided.
func (j *judge) explain(part *Requirement, e syntax.Expr) {
	if part.Because != "" {
		return
	}
	if part.Met {
		part.Because = "this holds: " + j.text(e)
	} else {
		part.Because = "this does not hold: " + j.text(e)
	}
}

func (j *judge) text(e syntax.Expr) string { return oneLine(sliceOf(j.source, e.Extent())) }

func (j *judge) comparison(e *syntax.Binary) (*Requirement, *diag.Error) {
	left, err := j.session.evaluate(j.task, j.source, e.L)
	if err != nil {
		return nil, err
	}
	right, err := j.session.evaluate(j.task, j.source, e.R)
	if err != nil {
		return nil, err
	}
	left, right = inUnitOf(left, right, e.L), inUnitOf(right, left, e.R)
	outcome, failure := compareSides(e.Op, left, right)
	if failure != nil {
		return nil, asError(failure, "require").At(e.At).In(j.source)
	}
	return outcome, nil
}

// inUnitOf reads a bound typed without a unit in the other side's, where that is the SI
// unit itself: a settling time below 2 is one below 2 s. A computed plain number is never
// read so, since a slip of units could hide in it.
func inUnitOf(v, other value.Value, typed syntax.Expr) value.Value {
	if minus, ok := typed.(*syntax.Unary); ok && minus.Op == "-" {
		typed = minus.X
	}
	literal, isLiteral := typed.(*syntax.Number)
	n, isNumber := value.Force(v).(value.Number)
	q, isQuantity := value.Force(other).(value.Quantity)
	if study, ok := other.(*value.Study); ok && len(study.Results) == 1 {
		q.Unit, isQuantity = study.Results[0].Unit, !study.Results[0].Unit.IsNone()
	}
	if isNumber && isQuantity && q.Unit.IsPercent() { // parts shown in per cent are plain numbers
		if hundred, err := value.Multiply(n, value.Int(100)); err == nil {
			return value.Quantity{Magnitude: hundred.(value.Number), Unit: q.Unit}
		}
	}
	if !isLiteral || literal.Unit != nil || !isNumber || !isQuantity || !q.Unit.IsCoherent() {
		return v
	}
	return value.Quantity{Magnitude: n, Unit: q.Unit}
}

func compareSides(op string, left, right value.Value) (*Requirement, error) {
	if s, ok := left.(*value.Study); ok {
		return judgeStudy(s, op, right, false)
	}
	if s, ok := right.(*value.Study); ok {
		return judgeStudy(s, op, left, true)
	}
	met, err := value.Compare(op, left, right)
	if err != nil {
		return nil, err
	}
	out := &Requirement{Met: bool(met), Left: left, Op: op, Right: right}
	if indistinguishable(left, right) {
		out.Met, out.WithinRounding = op != "!=", true
	}
	return out, nil
}

// indistinguishable tells whether two values, at least one of them rounded, differ by no
// more than their own uncertainty.
func indistinguishable(a, b value.Value) bool {
	if x, ok := a.(*value.List); ok {
		y, ok := b.(*value.List)
		if !ok || len(x.Items) != len(y.Items) {
			return false
		}
		rounded := false
		for i := range x.Items {
			same, _ := value.Equal(x.Items[i], y.Items[i])
			within := indistinguishable(x.Items[i], y.Items[i])
			if !bool(same) && !within {
				return false
			}
			rounded = rounded || within
		}
		return rounded
	}
	difference, err := value.Subtract(a, b)
	if err != nil {
		return false
	}
	switch d := difference.(type) {
	case value.Number:
		return d.Exact == nil && math.Abs(d.F) <= d.Err
	case value.Quantity:
		return d.Magnitude.Exact == nil && math.Abs(d.Magnitude.F) <= d.Magnitude.Err
	case value.Complex:
		return d.ExactRe == nil && math.Hypot(real(d.C), imag(d.C)) <= d.Err
	case *value.Matrix:
		re, im := d.Floats()
		return !d.IsExact() && allWithin(re, d.Err) && allWithin(im, d.Err)
	case *value.Polynomial:
		return d.Exact == nil && allWithin(d.F, d.Err)
	}
	return false
}

func allWithin(x []float64, bound float64) bool {
	for _, v := range x {
		if !(math.Abs(v) <= bound) {
			return false
		}
	}
	return true
}

// because reads a report's own explanation of its truth.
func because(v value.Value) string {
	report, ok := v.(*value.Report)
	if !ok {
		return ""
	}
	for _, f := range report.Fields {
		if text, ok := f.Value.(value.Text); ok && f.Name == "because" {
			return string(text)
		}
	}
	return ""
}
