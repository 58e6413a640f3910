package builtins_test

import (
	"context"
	"encoding/json"
	"fmt"
	"math"
	"math/big"
	"math/cmplx"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"gainwright/builtins"
	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/value"
	"gainwright/stdlib"
)

// publishedCase is one case of testdata/published; its source is in the file.
type publishedCase struct {
	ID        string                     `json:"id"`
	Function  string                     `json:"function"`
	Source    string                     `json:"source"`
	Inputs    map[string]json.RawMessage `json:"inputs"`
	Expect    map[string]json.RawMessage `json:"expect"`
	Tolerance struct {
		Rel      *float64 `json:"rel"`
		Abs      *float64 `json:"abs"`
		PolesRel *float64 `json:"poles_rel"`
	} `json:"tolerance"`
}

// caseRun works one case: it writes a script of the language and judges what the script's names hold.
type caseRun struct {
	*testing.T
	c       publishedCase
	session *eval.Session
	events  []eval.Event
}

// published maps the function of a case to its judge.
var published = map[string]func(r *caseRun){
	"characteristic polynomial and poles":       judgeCharacteristic,
	"reachability rank":                         judgeReachability,
	"observability rank":                        judgeObservability,
	"Kalman decomposition":                      judgeKalmanSplit,
	"pole assignment, single input (Bass-Gura)": judgeBassGura,
	"pole assignment with an unreachable mode":  judgeFixedMode,
	"pole assignment, several inputs":           judgeSeveralInputs,
	"observer gain":                             judgeObserver,
	"reduced-order observer":                    judgeReducedObserver,
	"pole assignment with integral action":      judgeIntegral,
	"static prefilter for unit DC gain":         judgePrefilter,
	"continuous Riccati (LQ gain)":              judgeRiccati,
	"discrete Riccati (LQ gain)":                judgeRiccati,
	"continuous Kalman gain":                    judgeKalmanGain,
	"discrete Kalman gain":                      judgeKalmanGain,
	"LQG compensator":                           judgeCompensator,
	"zero-order hold":                           judgeHold,
	"zero-order hold of a transfer function":    judgeHeldTransfer,
	"reachability after sampling":               judgeLostBySampling,
	"sampled LQ problem":                        judgeSampledCost,
	"sampled process noise":                     judgeSampledNoise,
	"matrix exponential":                        judgeExponential,
	"transfer function":                         judgeTransfer,
	"transmission zeros":                        judgeZeros,
	"gramians and Hankel singular values":       judgeHankel,
	"Lyapunov equation":                         judgeLyapunov,
	"distance to unreachability":                judgeDistance,
	"Bessel poles":                              judgeBessel,
	"Butterworth poles":                         judgeButterworth,
	"ITAE polynomials":                          judgeITAE,
	"gain and phase margin":                     judgeMargins,
	"a colleague's rounded numbers":             judgeRounded,
	"export to single precision":                judgeSinglePrecision,
	"unit conversion":                           judgeUnits,
	"step-response figures":                     judgeStep,
}

func TestPublishedCasesThroughTheLanguage(t *testing.T) {
	files, err := filepath.Glob("../testdata/published/*.json")
	if err != nil || len(files) == 0 {
		t.Fatal("no published cases found", err)
	}
	count := 0
	for _, file := range files {
		data, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		var cases []publishedCase
		if err := json.Unmarshal(data, &cases); err != nil {
			t.Fatal(file, err)
		}
		for _, c := range cases {
			count++
			t.Run(c.ID, func(t *testing.T) {
				judge, ok := published[c.Function]
				if !ok {
					t.Fatalf("no judge for %q", c.Function)
				}
				if c.Source == "" {
					t.Error("the case names no source")
				}
				judge(&caseRun{T: t, c: c})
			})
		}
	}
	if count < 105 {
		t.Errorf("%d cases were found; 105 are kept", count)
	}
}

// literal writes a JSON number, list or fraction in the language.
func literal(raw json.RawMessage) string {
	var v any
	d := json.NewDecoder(strings.NewReader(string(raw)))
	d.UseNumber()
	if err := d.Decode(&v); err != nil {
		panic(err)
	}
	return written(v)
}

func written(v any) string {
	switch v := v.(type) {
	case []any:
		parts := make([]string, len(v))
		for i, x := range v {
			parts[i] = written(x)
		}
		return "[" + strings.Join(parts, ", ") + "]"
	case string:
		return v
	}
	return fmt.Sprint(v)
}

// poles writes a list of [re, im]; members with im < 0 are left to their conjugates.
func poles(raw json.RawMessage) string {
	var list [][2]any
	d := json.NewDecoder(strings.NewReader(string(raw)))
	d.UseNumber()
	if err := d.Decode(&list); err != nil {
		panic(err)
	}
	var parts []string
	for _, p := range list {
		im := fmt.Sprint(p[1])
		f, _ := new(big.Rat).SetString(im)
		switch {
		case f.Sign() == 0:
			parts = append(parts, fmt.Sprint(p[0]))
		case f.Sign() > 0:
			parts = append(parts, fmt.Sprintf("(%s) ± (%s)*1i", p[0], im))
		}
	}
	return "[" + strings.Join(parts, ", ") + "]"
}

// script runs a text; $X stands for the input X as a literal and @X for the input X as a pole list.
func (r *caseRun) script(text string) {
	r.Helper()
	for name, raw := range r.c.Inputs {
		if name == "poles" || name == "claimed_poles" {
			text = strings.ReplaceAll(text, "@"+name, poles(raw))
			continue
		}
		if len(raw) > 0 && raw[0] != '"' || name == "T" {
			text = strings.ReplaceAll(text, "$"+name+"$", literal(raw))
		}
	}
	r.session = eval.New(eval.Options{Builtins: builtins.Table(), Library: stdlib.Files})
	r.events = nil
	r.session.RunText(context.Background(), diag.NewSource(r.c.ID, text), func(e eval.Event) { r.events = append(r.events, e) })
}

// ok runs a text that must not fail.
func (r *caseRun) ok(text string) {
	r.Helper()
	r.script(text)
	for _, e := range r.events {
		if e.Error != nil {
			r.Fatal(e.Error.Render())
		}
	}
}

// refusal gives the message of a text that must fail.
func (r *caseRun) refusal(text string) string {
	r.Helper()
	r.script(text)
	for _, e := range r.events {
		if e.Error != nil {
			return e.Error.Message
		}
	}
	r.Fatal("was not refused")
	return ""
}

func (r *caseRun) has(input string) bool { _, ok := r.c.Inputs[input]; return ok }

// get gives what a name of the script holds.
func (r *caseRun) get(name string) value.Value {
	r.Helper()
	v, ok := r.session.Lookup(name)
	if !ok {
		r.Fatalf("%s is not bound", name)
	}
	return value.Force(v)
}

// numbers flattens a value into complex numbers, row by row.
func numbers(v value.Value) []complex128 {
	switch v := value.Force(v).(type) {
	case value.Number:
		return []complex128{complex(v.Float64(), 0)}
	case value.Quantity:
		if n, err := v.SI(); err == nil {
			return []complex128{complex(n.Float64(), 0)}
		}
		return nil
	case value.Complex:
		return []complex128{v.Complex128()}
	case *value.List:
		var all []complex128
		for _, x := range v.Items {
			all = append(all, numbers(x)...)
		}
		return all
	case *value.Gain:
		return numbers(v.Values)
	case *value.Matrix:
		re, im := v.Floats()
		out := make([]complex128, len(re))
		for i := range re {
			out[i] = complex(re[i], 0)
			if im != nil {
				out[i] = complex(re[i], im[i])
			}
		}
		return out
	case *value.Polynomial:
		var all []complex128
		for _, c := range v.Coefficients() {
			all = append(all, complex(c.Float64(), 0))
		}
		return all
	}
	return nil
}

// isExactValue tells whether every number of a value is exact.
func isExactValue(v value.Value) bool {
	switch v := value.Force(v).(type) {
	case value.Number:
		return v.IsExact()
	case value.Complex:
		return v.IsExact()
	case *value.Matrix:
		return v.IsExact()
	case *value.Gain:
		return v.Values.IsExact()
	case *value.Polynomial:
		return v.Exact != nil
	case *value.List:
		for _, x := range v.Items {
			if !isExactValue(x) {
				return false
			}
		}
		return true
	}
	return false
}

// floats flattens JSON numbers, fractions and nested lists.
func floats(raw json.RawMessage) []float64 {
	var v any
	d := json.NewDecoder(strings.NewReader(string(raw)))
	d.UseNumber()
	if err := d.Decode(&v); err != nil {
		panic(err)
	}
	var all []float64
	var walk func(any)
	walk = func(v any) {
		if list, ok := v.([]any); ok {
			for _, x := range list {
				walk(x)
			}
			return
		}
		x, ok := new(big.Rat).SetString(fmt.Sprint(v))
		if !ok {
			panic(fmt.Sprint("no number: ", v))
		}
		f, _ := x.Float64()
		all = append(all, f)
	}
	walk(v)
	return all
}

// rel is the tolerance of the case, or the fallback when it names none; 0 stands for exactness.
func (r *caseRun) rel(fallback float64) float64 {
	if r.c.Tolerance.Rel != nil {
		return *r.c.Tolerance.Rel
	}
	return fallback
}

// near compares a value with an expectation, relative to the largest entry; with tolerance 0 the value must be exact.
func (r *caseRun) near(name, field string, tolerance float64) {
	r.Helper()
	raw, ok := r.c.Expect[field]
	if !ok {
		r.Fatalf("the case expects no %s", field)
	}
	v := r.get(name)
	got, want := numbers(v), floats(raw)
	if len(got) != len(want) {
		r.Fatalf("%s: %d numbers, want %d: %v, want %v", field, len(got), len(want), got, want)
	}
	if tolerance == 0 {
		if !isExactValue(v) {
			r.Errorf("%s: the result is not exact", field)
		}
		tolerance = 1e-15
	}
	largest := 0.0
	for _, x := range want {
		largest = math.Max(largest, math.Abs(x))
	}
	for i := range want {
		if d := cmplx.Abs(got[i] - complex(want[i], 0)); !(d <= tolerance*largest) && !(largest == 0 && d <= tolerance) {
			r.Errorf("%s[%d] = %v, want %v", field, i, got[i], want[i])
		}
	}
}

// pairs reads a list of [re, im].
func pairs(raw json.RawMessage) []complex128 {
	f := floats(raw)
	var all []complex128
	for i := 0; i+1 < len(f); i += 2 {
		all = append(all, complex(f[i], f[i+1]))
	}
	return all
}

// samePoles matches two sets greedily and compares relative to max(1, |pole|).
func (r *caseRun) samePoles(name string, want []complex128, tolerance float64) {
	r.Helper()
	got := numbers(r.get(name))
	if len(got) != len(want) {
		r.Fatalf("%s: %d poles, want %d: %v, want %v", name, len(got), len(want), got, want)
	}
	used := make([]bool, len(got))
	for _, w := range want {
		best := -1
		for j, g := range got {
			if !used[j] && (best < 0 || cmplx.Abs(g-w) < cmplx.Abs(got[best]-w)) {
				best = j
			}
		}
		used[best] = true
		if d := cmplx.Abs(got[best] - w); !(d <= tolerance*math.Max(1, cmplx.Abs(w))) {
			r.Errorf("%s: pole %v, want %v", name, got[best], w)
		}
	}
}

func (r *caseRun) polesRel(fallback float64) float64 {
	if r.c.Tolerance.PolesRel != nil {
		return *r.c.Tolerance.PolesRel
	}
	return fallback
}

// truth compares a truth value.
func (r *caseRun) truth(name, field string) {
	r.Helper()
	var want bool
	if err := json.Unmarshal(r.c.Expect[field], &want); err != nil {
		r.Fatal(field, err)
	}
	if got := r.get(name); got != value.Boolean(want) {
		r.Errorf("%s = %v, want %v", field, got, want)
	}
}
