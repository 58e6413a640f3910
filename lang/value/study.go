package value

import (
	"fmt"
	"math"
	"sort"

	"gainwright/lang/diag"
)

// Study is what one or several numbers come to when the parameters of models vary within
// their tolerances. Value number i belongs to sample First + i; samples 0 to Samples − 1
// are drawn, the first of them being the nominal one, and the corners follow.
type Study struct {
	Results    []StudyResult // one with an empty name for a study of a single number
	Models     []string
	Parameters []StudyParameter // those with a tolerance, model by model in the order written
	Samples    int              // drawn, the nominal one included
	Corners    int              // 2^len(Parameters), or 0
	Seed       int64
	First      int // of a part: the number of its first sample
	Part       int // of a part: which one, from 1; 0 for a whole study
	Parts      int
	Stopped    bool // an interruption ended it early: fewer values than samples
}

// StudyResult is one number over all samples, in Unit; NaN marks a failed sample.
type StudyResult struct {
	Name        string
	Text        string // the expression
	Unit        Unit
	IsTruth     bool // 1 and 0 stand for true and false
	Values      []float64
	Failed      int
	Failure     string // what the first failed sample met
	FirstFailed int    // its number
}

// StudyParameter is a parameter with a tolerance; all in Unit.
type StudyParameter struct {
	Model, Name        string
	Unit               Unit
	Nominal, Low, High float64
}

// Kind tells the kind.
func (*Study) Kind() Kind { return KStudy }

// Total is how many samples the whole study has, corners included.
func (s *Study) Total() int { return s.Samples + s.Corners }

// Done is how many samples were computed.
func (s *Study) Done() int {
	if len(s.Results) == 0 {
		return 0
	}
	return len(s.Results[0].Values)
}

// IsWhole tells whether every sample was computed, so that requirements can be judged.
func (s *Study) IsWhole() bool { return s.Part == 0 && !s.Stopped }

// Only gives the study of one of its numbers.
func (s *Study) Only(r StudyResult) *Study {
	one := *s
	r.Name = ""
	one.Results = []StudyResult{r}
	return &one
}

// Single gives the number of a study that has one; another is a Type error.
func (s *Study) Single() (*StudyResult, error) {
	if len(s.Results) == 1 {
		return &s.Results[0], nil
	}
	names := make([]string, len(s.Results))
	for k, r := range s.Results {
		names[k] = r.Name
	}
	return nil, diag.New(diag.Type, "the study has %d results", len(s.Results)).WithHelp("name one of them: .%s", joinOr(names))
}

func joinOr(names []string) string {
	text := ""
	for k, n := range names {
		switch {
		case k == 0:
		case k == len(names)-1:
			text += " or ."
		default:
			text += ", ."
		}
		text += n
	}
	return text
}

// Number gives a value of the result with its unit.
func (r *StudyResult) Number(f float64) Value {
	if r.IsTruth && (f == 0 || f == 1) {
		return Boolean(f == 1)
	}
	return makeQuantity(Float(f), r.Unit)
}

// Extremes gives the places of the smallest and the largest value, −1 when every sample
// failed. Of equal ones it is the first.
func (r *StudyResult) Extremes() (smallest, largest int) {
	smallest, largest = -1, -1
	for k, v := range r.Values {
		if v != v {
			continue
		}
		if smallest < 0 || v < r.Values[smallest] {
			smallest = k
		}
		if largest < 0 || v > r.Values[largest] {
			largest = k
		}
	}
	return smallest, largest
}

// drawn gives the values of the drawn samples that did not fail, sorted.
func (s *Study) drawn(r *StudyResult) []float64 {
	out := make([]float64, 0, len(r.Values))
	for k, v := range r.Values {
		if s.First+k < s.Samples && v == v {
			out = append(out, v)
		}
	}
	sort.Float64s(out)
	return out
}

// Quantile gives the value below which the part q of the drawn samples lies, by linear
// interpolation between neighbours (the seventh definition of Hyndman & Fan 1996).
// Corners and failed samples do not count. It refuses q outside 0 … 1.
func (s *Study) Quantile(q Number) (Value, error) {
	r, err := s.Single()
	if err != nil {
		return nil, err
	}
	p := q.Float64()
	if !(p >= 0 && p <= 1) {
		return nil, Errf(diag.Numerical, "q", "a quantile is asked for a part between 0 and 1, and this is %g", p)
	}
	sorted := s.drawn(r)
	if len(sorted) == 0 {
		return nil, diag.New(diag.Numerical, "every sample failed").WithHelp("%s", r.Failure)
	}
	at := p * float64(len(sorted)-1)
	low := int(at)
	high := min(low+1, len(sorted)-1)
	if sorted[low] == sorted[high] { // infinite ones too
		return r.Number(sorted[low]), nil
	}
	return makeQuantity(Float(sorted[low]+(at-float64(low))*(sorted[high]-sorted[low])), r.Unit), nil
}

// Extreme gives the smallest or the largest value with its sample: fields value, at,
// sample.
func (s *Study) Extreme(largest bool) (*Report, error) {
	r, err := s.Single()
	if err != nil {
		return nil, err
	}
	k, top := r.Extremes()
	title := "smallest"
	if largest {
		k, title = top, "largest"
	}
	if k < 0 {
		return nil, diag.New(diag.Numerical, "every sample failed").WithHelp("%s", r.Failure)
	}
	out := &Report{Title: title, Fields: []Named{{"value", r.Number(r.Values[k])}}}
	if at := s.At(s.First + k); len(at.Fields) > 0 {
		out.Fields = append(out.Fields, Named{"at", at})
	}
	out.Fields = append(out.Fields, Named{"sample", Text(s.SampleName(s.First + k))})
	return out, nil
}

// SampleName says which sample a number means.
func (s *Study) SampleName(sample int) string {
	switch {
	case sample == 0:
		return "nominal"
	case sample >= s.Samples:
		return fmt.Sprintf("corner %d of %d", sample-s.Samples+1, s.Corners)
	}
	return fmt.Sprintf("sample %d", sample)
}

// At gives the parameters of a sample by name; those of several models that share a name
// carry the model's.
func (s *Study) At(sample int) *Report {
	values := make([]float64, len(s.Parameters))
	s.Draw(sample, values)
	out := &Report{}
	names := s.ParameterNames()
	for k, p := range s.Parameters {
		out.Fields = append(out.Fields, Named{names[k], makeQuantity(tidyNumber(values[k]), p.Unit)})
	}
	return out
}

// tidyNumber gives the shortest decimal that is the binary64 number, taken as exact: a
// parameter is what it was set to.
func tidyNumber(f float64) Number { return Number{F: f} }

// ParameterNames lists the parameters, with their model's name where a name stands in
// several models.
func (s *Study) ParameterNames() []string {
	seen := map[string]int{}
	for _, p := range s.Parameters {
		seen[p.Name]++
	}
	out := make([]string, len(s.Parameters))
	for k, p := range s.Parameters {
		out[k] = p.Name
		if seen[p.Name] > 1 {
			out[k] = p.Model + "." + p.Name
		}
	}
	return out
}

// Bound95 is the part of the distribution that can be missed at most, at 95 %, when none
// of n independent samples was missed: 1 − 0.05^(1/n).
func Bound95(n int) float64 {
	if n <= 0 {
		return 1
	}
	return -math.Expm1(math.Log(0.05) / float64(n))
}
