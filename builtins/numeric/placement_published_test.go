package numeric

import (
	"context"
	"encoding/json"
	"errors"
	"math"
	"math/big"
	"math/cmplx"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// structureCase is one entry of testdata/published.
type structureCase struct {
	ID        string
	Source    string
	Inputs    map[string]json.RawMessage
	Expect    map[string]json.RawMessage
	Tolerance map[string]json.RawMessage
}

// publishedFiles decodes every file of testdata/published that the pattern names into cases.
func publishedFiles[Case any](t *testing.T, pattern string) []Case {
	t.Helper()
	files, err := filepath.Glob("../../testdata/published/" + pattern)
	if err != nil || len(files) == 0 {
		t.Fatalf("no published cases in %s: %v", pattern, err)
	}
	var out []Case
	for _, file := range files {
		data, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		var cases []Case
		if err := json.Unmarshal(data, &cases); err != nil {
			t.Fatalf("%s: %v", file, err)
		}
		out = append(out, cases...)
	}
	return out
}

// structureCases reads the cases whose id has the prefix.
func structureCases(t *testing.T, prefix string) []structureCase {
	t.Helper()
	var out []structureCase
	for _, c := range publishedFiles[structureCase](t, "*.json") {
		if strings.HasPrefix(c.ID, prefix) {
			out = append(out, c)
		}
	}
	if len(out) == 0 {
		t.Fatalf("no published case is called %s…", prefix)
	}
	return out
}

// numberOf reads a JSON number or a string holding a fraction or decimal.
func numberOf(t *testing.T, raw json.RawMessage) float64 {
	t.Helper()
	var f float64
	if json.Unmarshal(raw, &f) == nil {
		return f
	}
	var s string
	if err := json.Unmarshal(raw, &s); err != nil {
		t.Fatalf("%s is not a number", raw)
	}
	r, ok := new(big.Rat).SetString(s)
	if !ok {
		t.Fatalf("%s is not a number", s)
	}
	f, _ = r.Float64()
	return f
}

func rawList(t *testing.T, raw json.RawMessage) []json.RawMessage {
	t.Helper()
	var list []json.RawMessage
	if err := json.Unmarshal(raw, &list); err != nil {
		t.Fatalf("%s is not a list", raw)
	}
	return list
}

func matrixOf(t *testing.T, raw json.RawMessage) *mat.Dense {
	t.Helper()
	if raw == nil {
		return nil
	}
	var data []float64
	rows := rawList(t, raw)
	for _, row := range rows {
		for _, v := range rawList(t, row) {
			data = append(data, numberOf(t, v))
		}
	}
	return mat.NewDense(len(rows), len(data)/len(rows), data)
}

// complexList reads [re, im] pairs; where conjugates are left out they are added.
func complexList(t *testing.T, raw json.RawMessage, addConjugates bool) []complex128 {
	t.Helper()
	out := []complex128{}
	for _, v := range rawList(t, raw) {
		parts := rawList(t, v)
		z := complex(numberOf(t, parts[0]), numberOf(t, parts[1]))
		out = append(out, z)
		if addConjugates && imag(z) != 0 {
			out = append(out, cmplx.Conj(z))
		}
	}
	return out
}

// worstMatch is the largest distance in the closest-first pairing, relative to
// max(1, |wanted|); +Inf when the counts differ.
func worstMatch(wanted, got []complex128) float64 {
	if len(wanted) != len(got) {
		return math.Inf(1)
	}
	worst := 0.0
	for i, j := range matchPoles(wanted, got) {
		worst = math.Max(worst, cmplx.Abs(wanted[i]-got[j])/math.Max(1, cmplx.Abs(wanted[i])))
	}
	return worst
}

// closedPoles are the eigenvalues of a − b·k.
func closedPoles(t *testing.T, a, b, k *mat.Dense) []complex128 {
	t.Helper()
	var loop mat.Dense
	loop.Mul(b, k)
	loop.Sub(a, &loop)
	values, err := Eigenvalues(&loop)
	if err != nil {
		t.Fatal(err)
	}
	return values
}

func TestPublishedPlacement(t *testing.T) {
	for _, c := range structureCases(t, "place-") {
		t.Run(c.ID, func(t *testing.T) {
			a, b := matrixOf(t, c.Inputs["A"]), matrixOf(t, c.Inputs["B"])
			poles := complexList(t, c.Inputs["poles"], c.Inputs["pairs"] != nil)
			_, inputs := b.Dims()
			robust, err := AssignRobust(context.Background(), a, b, poles, 1)
			if possible, there := c.Expect["possible"]; there && string(possible) == "false" {
				var refusal *Refusal
				if !errors.As(err, &refusal) || worstMatch(complexList(t, c.Expect["fixed_modes"], false), refusal.Modes) > 1e-12 {
					t.Fatalf("want a refusal that names the fixed modes, got %v", err)
				}
				return
			}
			if err != nil {
				t.Fatal(err)
			}
			if want := c.Expect["closed_loop_poles"]; want != nil {
				if e := worstMatch(complexList(t, want, false), closedPoles(t, a, b, robust.K)); e > 1e-10 {
					t.Errorf("poles off by %g", e)
				}
				t.Logf("κ(X) %.4f, example %s; ‖K‖ %.3f", robust.Sensitivity, c.Expect["example_gain_eigenvector_condition"], robust.Norm)
				if robust.Sensitivity > numberOf(t, c.Expect["example_gain_eigenvector_condition"])*1.02 {
					t.Errorf("κ(X) = %g is worse than the example gain's", robust.Sensitivity)
				}
			}
			if inputs != 1 {
				return
			}
			one, err := AssignOneInput(a, b, poles)
			if err != nil {
				t.Fatal(err)
			}
			want := c.Expect["K"]
			if want == nil {
				want = c.Expect["K_minimum_norm"]
			}
			for name, got := range map[string]*Placement{"one input": one, "robust": robust} {
				if e := largestEntryError(matrixOf(t, want), got.K); e > 1e-12 {
					t.Errorf("%s: gain off by %g: %v", name, e, mat.Formatted(got.K))
				}
				t.Logf("%s: error %.1e, digits %.1f", name, largestEntryError(matrixOf(t, want), got.K), got.Certificate.Digits)
			}
		})
	}
}

// largestEntryError is the largest entrywise difference relative to the largest entry.
func largestEntryError(want, got *mat.Dense) float64 {
	rows, columns := want.Dims()
	if r, c := got.Dims(); r != rows || c != columns {
		return math.Inf(1)
	}
	largest, worst := 0.0, 0.0
	for i := 0; i < rows; i++ {
		for j := 0; j < columns; j++ {
			largest = math.Max(largest, math.Abs(want.At(i, j)))
			worst = math.Max(worst, math.Abs(want.At(i, j)-got.At(i, j)))
		}
	}
	return worst / largest
}
