package model

import (
	"encoding/json"
	"math"
	"math/big"
	"os"
	"strings"
	"testing"

	"gainwright/lang/value"
)

type header struct{ Tool, Version, Command, Date string }

// readReference reads a stored reference and its header.
func readReference(t *testing.T, name string, into any, h *header) {
	t.Helper()
	data, err := os.ReadFile("testdata/" + name)
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(data, into); err != nil {
		t.Fatal(err)
	}
	if h.Tool == "" || h.Version == "" || h.Command == "" || h.Date == "" {
		t.Fatalf("%s has no header: %+v", name, *h)
	}
}

// Jacobians of 48 seeded random models, 16 of them rational, by sympy's symbolic derivatives.
func TestDerivativesAgainstSympy(t *testing.T) {
	var reference struct {
		Header header
		Cases  []struct {
			Name, Model string
			Rational    bool
			A, B, C, D  [][]string
		}
	}
	readReference(t, "derivatives.json", &reference, &reference.Header)
	if len(reference.Cases) < 30 {
		t.Fatalf("only %d cases", len(reference.Cases))
	}
	for _, c := range reference.Cases {
		m, err := build(t, c.Model, nil)
		if err != nil {
			t.Errorf("%s: %s\n%s", c.Name, err.Render(), c.Model)
			continue
		}
		p := m.Value().Plant
		compareReference(t, c.Name+" A", c.Model, p.A, c.A, c.Rational)
		compareReference(t, c.Name+" B", c.Model, p.B, c.B, c.Rational)
		compareReference(t, c.Name+" C", c.Model, p.C, c.C, c.Rational)
		compareReference(t, c.Name+" D", c.Model, p.D, c.D, c.Rational)
		compareFlat(t, m)
	}
}

// compareReference demands equality of fractions, and of decimals that the difference lies
// within the error the matrix itself states (twice, since it is an estimate) or within
// 1e-12 of the largest entry, and that the statement is not idle.
func compareReference(t *testing.T, name, model string, m *value.Matrix, want [][]string, rational bool) {
	t.Helper()
	if rational && !m.IsExact() {
		t.Errorf("%s is floating though the equations are rational\n%s", name, model)
		return
	}
	re, _ := m.Floats()
	largest := 0.0
	for _, x := range re {
		largest = math.Max(largest, math.Abs(x))
	}
	if !m.IsExact() && m.Err > 1e-9*math.Max(largest, 1e-3) {
		t.Errorf("%s states the error %g beside entries up to %g", name, m.Err, largest)
	}
	_, cols := m.Dims()
	for i, row := range want {
		for j, text := range row {
			w, ok := new(big.Rat).SetString(text)
			if !ok {
				t.Fatalf("%s: %q", name, text)
			}
			if m.IsExact() && rational {
				if m.Exact().At(i, j).Cmp(w) != 0 {
					t.Errorf("%s[%d, %d] = %s, sympy gives %s\n%s", name, i+1, j+1, m.Exact().At(i, j).RatString(), text, model)
				}
				continue
			}
			x, _ := w.Float64()
			if got := re[i*cols+j]; !(math.Abs(got-x) <= 2*m.Err+1e-15*math.Abs(x)) {
				t.Errorf("%s[%d, %d] = %.17g with the error %g, sympy gives %s\n%s", name, i+1, j+1, got, m.Err, text, model)
			}
		}
	}
}

// Points of rest against SciPy's root finder, polished with mpmath.
func TestRestAgainstSciPy(t *testing.T) {
	var reference struct {
		Header header
		Cases  []struct {
			Name, Model string
			Solution    map[string]string
		}
	}
	readReference(t, "rest.json", &reference, &reference.Header)
	for _, c := range reference.Cases {
		m, err := build(t, c.Model, nil)
		if err != nil {
			t.Errorf("%s: %s", c.Name, err.Render())
			continue
		}
		if strings.Contains(c.Model, "around rest") && !m.operating.atRest {
			t.Errorf("%s is not at rest", c.Name)
		}
		for name, text := range c.Solution {
			want, _ := new(big.Float).SetString(text)
			w, _ := want.Float64()
			for v := range len(m.States) + len(m.Inputs) {
				if m.signalOf(v).Name != name {
					continue
				}
				n := *m.operating.point.variable(v)
				if d := math.Abs(n.Float64() - w); d > 2*n.ErrorEstimate()+1e-15*math.Abs(w) || n.ErrorEstimate() > 1e-9*math.Abs(w)+1e-12 {
					t.Errorf("%s: %s = %.17g with the error %g, SciPy gives %s", c.Name, name, n.Float64(), n.ErrorEstimate(), text)
				}
			}
		}
		compareFlat(t, m)
	}
}
