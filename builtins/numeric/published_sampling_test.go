package numeric

import (
	"context"
	"encoding/json"
	"math"
	"math/big"
	"os"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// samplingReference reads SciPy's sampled forms, checking the header.
func samplingReference(t *testing.T) map[string][]*mat.Dense {
	t.Helper()
	data, err := os.ReadFile("testdata/sampling_reference.json")
	if err != nil {
		t.Fatal(err)
	}
	var header struct {
		Header struct{ Tool, Version, Command, Date string }
	}
	if err := json.Unmarshal(data, &header); err != nil || header.Header.Tool == "" || header.Header.Version == "" || header.Header.Date == "" {
		t.Fatalf("the reference does not say where it comes from: %v %+v", err, header)
	}
	var raw map[string]json.RawMessage
	if err := json.Unmarshal(data, &raw); err != nil {
		t.Fatal(err)
	}
	reference := map[string][]*mat.Dense{}
	for _, method := range []string{"zoh", "foh", "bilinear"} {
		var matrices [][][]float64
		if err := json.Unmarshal(raw[method], &matrices); err != nil || len(matrices) != 4 {
			t.Fatalf("%s: %v", method, err)
		}
		for _, rows := range matrices {
			m := mat.NewDense(len(rows), len(rows[0]), nil)
			for i, row := range rows {
				m.SetRow(i, row)
			}
			reference[method] = append(reference[method], m)
		}
	}
	return reference
}

// number reads a JSON number, or a text that holds a fraction, a decimal or pi.
type number float64

func (n *number) UnmarshalJSON(data []byte) error {
	var text string
	if json.Unmarshal(data, &text) == nil {
		if text == "pi" {
			*n = math.Pi
			return nil
		}
		r, ok := new(big.Rat).SetString(text)
		if !ok {
			return json.Unmarshal(data, (*float64)(n))
		}
		f, _ := r.Float64()
		*n = number(f)
		return nil
	}
	return json.Unmarshal(data, (*float64)(n))
}

type publishedMatrix [][]number

func (p publishedMatrix) dense() *mat.Dense {
	if len(p) == 0 {
		return nil
	}
	m := mat.NewDense(len(p), len(p[0]), nil)
	for i, row := range p {
		for j, v := range row {
			m.Set(i, j, float64(v))
		}
	}
	return m
}

type publishedCase struct {
	ID     string
	Source string
	Inputs struct {
		A, B, C, Q, R, W publishedMatrix
		T                number
		Num, Den         []number
		Equation         string
	}
	Expect struct {
		Ad, Bd, ExpA, Qd, Nd, Rd, Wd publishedMatrix
		X                            publishedMatrix
		Hankel                       []number        `json:"hankel_singular_values"`
		Reach                        publishedMatrix `json:"reachability_gramian"`
		See                          publishedMatrix `json:"observability_gramian"`
		Tight                        float64         `json:"Bd_11_relative_tolerance"`
		Num, Den                     []number
	}
	Tolerance struct{ Rel, Abs float64 }
}

func (c *publishedCase) check(t *testing.T, what string, got *mat.Dense, want publishedMatrix) {
	t.Helper()
	if len(want) == 0 {
		t.Errorf("%s (%s): no published %s", c.ID, c.Source, what)
		return
	}
	truth := want.dense()
	bound := math.Max(c.Tolerance.Rel, 1e-12)*largestEntry(truth) + c.Tolerance.Abs
	var difference mat.Dense
	difference.Sub(got, truth)
	if e := largestEntry(&difference); e > bound {
		t.Errorf("%s (%s): %s is off by %.2e, allowed %.2e", c.ID, c.Source, what, e, bound)
	}
}

func TestPublishedSamplingCases(t *testing.T) {
	cases := publishedFiles[publishedCase](t, "sampling.json")
	for _, c := range append(cases, publishedFiles[publishedCase](t, "gramians.json")...) {
		switch in := c.Inputs; {
		case len(in.Num) > 0:
			c.checkTransfer(t)
		case len(c.Expect.Qd) > 0:
			qd, nd, rd, _, err := VanLoanCost(in.A.dense(), in.B.dense(), in.Q.dense(), nil, in.R.dense(), float64(in.T))
			if err != nil {
				t.Fatal(err)
			}
			c.check(t, "Q_d", qd, c.Expect.Qd)
			c.check(t, "N_d", nd, c.Expect.Nd)
			c.check(t, "R_d", rd, c.Expect.Rd)
		case len(c.Expect.Wd) > 0:
			wd, _, err := VanLoanNoise(in.A.dense(), in.W.dense(), float64(in.T))
			if err != nil {
				t.Fatal(err)
			}
			c.check(t, "W_d", wd, c.Expect.Wd)
		case len(c.Expect.ExpA) > 0:
			e, _, err := Exponential(in.A.dense())
			if err != nil {
				t.Fatal(err)
			}
			c.check(t, "the exponential", e, c.Expect.ExpA)
		case len(c.Expect.Hankel) > 0:
			c.checkHankel(t)
		case in.Equation != "":
			x, err := Lyapunov(context.Background(), in.A.dense(), in.Q.dense(), true)
			if err != nil {
				t.Fatal(err)
			}
			c.check(t, "X", x.X, c.Expect.X)
		default:
			ad, bd, _, err := Hold(in.A.dense(), in.B.dense(), float64(in.T))
			if err != nil {
				t.Fatal(err)
			}
			c.check(t, "A_d", ad, c.Expect.Ad)
			c.check(t, "B_d", bd, c.Expect.Bd)
			if want := c.Expect.Bd.dense().At(0, 0); c.Expect.Tight > 0 && math.Abs(bd.At(0, 0)-want) > 1e-15*want {
				t.Errorf("%s: B_d[1, 1] is %v, not %v", c.ID, bd.At(0, 0), want)
			}
		}
	}
}

// checkTransfer holds the companion realisation of num/den and compares the
// response with the published quotient at points off the poles.
func (c *publishedCase) checkTransfer(t *testing.T) {
	t.Helper()
	n := len(c.Inputs.Den) - 1
	a, b, out := mat.NewDense(n, n, nil), mat.NewDense(n, 1, nil), mat.NewDense(1, n, nil)
	for j := range n {
		if j+1 < n {
			a.Set(j, j+1, 1)
		}
		a.Set(n-1, j, -float64(c.Inputs.Den[n-j]))
	}
	for j, v := range c.Inputs.Num {
		out.Set(0, len(c.Inputs.Num)-1-j, float64(v))
	}
	b.Set(n-1, 0, 1)
	ad, bd, _, err := Hold(a, b, float64(c.Inputs.T))
	if err != nil {
		t.Fatal(err)
	}
	response, err := NewFrequencyResponse(ad, bd, out, nil)
	if err != nil {
		t.Fatal(err)
	}
	for _, z := range []complex128{2, -3, 0.3 + 2i, 1i} {
		var above, below complex128
		for _, v := range c.Expect.Num {
			above = above*z + complex(float64(v), 0)
		}
		for _, v := range c.Expect.Den {
			below = below*z + complex(float64(v), 0)
		}
		g, err := response.At(z)
		if err != nil {
			t.Fatal(err)
		}
		difference, want := g.At(0, 0)-above/below, above/below
		if math.Hypot(real(difference), imag(difference)) > c.Tolerance.Rel*math.Hypot(real(want), imag(want)) {
			t.Errorf("%s (%s): at %v %v, not %v", c.ID, c.Source, z, g.At(0, 0), want)
		}
	}
}

func (c *publishedCase) checkHankel(t *testing.T) {
	t.Helper()
	ctx := context.Background()
	a, b, out := c.Inputs.A.dense(), c.Inputs.B.dense(), c.Inputs.C.dense()
	h, err := HankelSingularValues(ctx, a, b, out, false)
	if err != nil {
		t.Fatal(err)
	}
	for i, want := range c.Expect.Hankel {
		// Far below the case's own bound: each value relative to itself.
		if e := math.Abs(h.Values[i]/float64(want) - 1); e > 1e-11 {
			t.Errorf("%s: value %d is off by %.1e, claimed digits %.1f", c.ID, i+1, e, h.Digits[i])
		}
	}
	w, _, err := ReachabilityGramian(ctx, a, b, false)
	if err != nil {
		t.Fatal(err)
	}
	c.check(t, "the reachability gramian", w, c.Expect.Reach)
	m, _, err := ObservabilityGramian(ctx, a, out, false)
	if err != nil {
		t.Fatal(err)
	}
	c.check(t, "the observability gramian", m, c.Expect.See)
}
