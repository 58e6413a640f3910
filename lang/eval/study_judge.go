package eval

import (
	"fmt"
	"math"
	"strconv"
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// judgeStudy judges a comparison of a study with a bound: it must hold for every sample,
// and a failed sample makes it missed. The study stands on the left unless swapped is set.
func judgeStudy(s *value.Study, op string, bound value.Value, swapped bool) (*Requirement, error) {
	r, err := s.Single()
	if err != nil {
		return nil, err
	}
	limit, err := boundIn(bound, r)
	if err != nil {
		return nil, err
	}
	if swapped {
		op = turned(op)
	}
	out := &Requirement{Op: op, Right: bound, Sampled: true, Met: true, Study: s, Bound: limit}
	if b, ok := bound.(value.Boolean); ok && !r.IsTruth {
		return nil, diag.New(diag.Type, "the study's samples are numbers, and this compares them with %v", b)
	}
	smallest, largest := r.Extremes()
	worst := smallest
	if op == "<" || op == "<=" {
		worst = largest
	}
	missed, missedCorners := 0, 0
	for k, v := range r.Values {
		if holds(op, v, limit) {
			continue
		}
		if out.Met && v == v && (op == "==" || op == "!=") {
			worst = k
		}
		out.Met = false
		if s.First+k < s.Samples {
			missed++
		} else {
			missedCorners++
		}
	}
	if worst >= 0 && (out.Met || !holds(op, r.Values[worst], limit)) { // not when only failed samples miss
		out.Left = r.Number(r.Values[worst])
	}
	if !s.IsWhole() {
		out.Met, out.NotJudged = false, true
		out.Because = fmt.Sprintf("only %d of %d samples are there", s.Done(), s.Total())
		if s.Part > 0 {
			out.Because = fmt.Sprintf("part %d of %d: requirements are judged when the parts are merged", s.Part, s.Parts)
		}
		return out, nil
	}
	out.Because = sampledBecause(s, r, worst, missed, missedCorners)
	return out, nil
}

// boundIn reads a bound in the study's unit.
func boundIn(bound value.Value, r *value.StudyResult) (float64, error) {
	bound = value.Force(bound)
	if n, ok := bound.(value.Number); ok && !r.Unit.IsNone() && !r.Unit.Dim.IsPlain() {
		return 0, diag.New(diag.Unit, "the study is in %s, and the bound %s has no unit", r.Unit.Text, value.Describe(n)).
			WithHelp("write its unit, or compare with a plain literal where the unit is coherent")
	}
	if b, ok := bound.(value.Boolean); ok {
		return truthNumber(bool(b)), nil
	}
	if q, ok := bound.(value.Quantity); ok && r.Unit.IsNone() {
		if !q.Unit.Dim.IsPlain() {
			return 0, diag.New(diag.Unit, "the study is a plain number, and the bound is in %s", q.Unit.Text).
				WithHelp("poles and rates of decay are plain numbers, in 1/s")
		}
		n, err := q.SI()
		return n.Float64(), err
	}
	f, err := numberIn(bound, r)
	if err != nil {
		return 0, diag.New(diag.Type, "a study is compared with a number, and this is %s", value.Describe(bound))
	}
	return f, nil
}

func turned(op string) string {
	switch op {
	case "<":
		return ">"
	case "<=":
		return ">="
	case ">":
		return "<"
	case ">=":
		return "<="
	}
	return op
}

// holds compares; a failed sample, NaN, never holds.
func holds(op string, v, limit float64) bool {
	switch op {
	case "<":
		return v < limit
	case "<=":
		return v <= limit
	case ">":
		return v > limit
	case ">=":
		return v >= limit
	case "==":
		return v == limit
	}
	return v == v && v != limit
}

// sampledBecause says how many samples missed and what that tells, and where the worst is.
func sampledBecause(s *value.Study, r *value.StudyResult, worst, missed, missedCorners int) string {
	text := fmt.Sprintf("%d of %d missed", missed, s.Samples)
	// The nominal sample was not drawn and says nothing about the distribution.
	if missed == 0 && s.Samples > 1 {
		text += fmt.Sprintf(": under %s %% of this distribution at 95 %%", partText(100*value.Bound95(s.Samples-1)))
	}
	if s.Corners > 0 {
		text += fmt.Sprintf("; %d of %d corners missed", missedCorners, s.Corners)
	}
	if r.Failed > 0 {
		text += fmt.Sprintf("; %d failed, the first is %s: %s", r.Failed, s.SampleName(r.FirstFailed), r.Failure)
	}
	if worst >= 0 {
		text += "; the worst at " + placeText(s, s.First+worst)
	}
	return text
}

// partText rounds a part up to two significant digits, so that "under" stays true.
func partText(percent float64) string {
	if percent >= 100 {
		return "100"
	}
	step := math.Pow(10, math.Floor(math.Log10(percent))-1)
	return fmt.Sprintf("%.2g", math.Ceil(percent/step-1e-9)*step)
}

// placeText names a sample by its parameters.
func placeText(s *value.Study, sample int) string {
	draw := make([]float64, len(s.Parameters))
	s.Draw(sample, draw)
	parts := make([]string, len(draw))
	for k, name := range s.ParameterNames() {
		parts[k] = strings.TrimSpace(name + " " + fourDigits(draw[k]) + " " + s.Parameters[k].Unit.Text)
	}
	return strings.Join(parts, ", ") + " (" + s.SampleName(sample) + ")"
}

// fourDigits writes a number with four significant digits, without a power of ten where
// that is short.
func fourDigits(x float64) string {
	if size := math.Abs(x); size < 1e-4 || size >= 1e7 {
		return fmt.Sprintf("%.4g", x)
	}
	rounded, _ := strconv.ParseFloat(fmt.Sprintf("%.3e", x), 64)
	return strconv.FormatFloat(rounded, 'f', -1, 64)
}
