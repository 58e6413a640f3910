package numeric

import (
	"context"
	"errors"
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// table is a matrix in a JSON file.
type table [][]number

func (t table) dense() *mat.Dense {
	if len(t) == 0 {
		return nil
	}
	d := mat.NewDense(len(t), len(t[0]), nil)
	d.Apply(func(i, j int, _ float64) float64 { return float64(t[i][j]) }, d)
	return d
}

func (t table) transposed() *mat.Dense { return mat.DenseCopyOf(t.dense().T()) }

// pairs are complex numbers in a JSON file.
type pairs [][2]number

func (p pairs) values() []complex128 {
	w := make([]complex128, len(p))
	for i, v := range p {
		w[i] = complex(float64(v[0]), float64(v[1]))
	}
	return w
}

// errorRelativeTo is the largest difference relative to the largest entry of want.
func errorRelativeTo(got, want *mat.Dense) float64 {
	var d mat.Dense
	d.Sub(got, want)
	return peakEntry(&d) / peakEntry(want)
}

type riccatiCase struct {
	ID       string
	Function string
	Source   string
	Inputs   struct {
		A, B, C, Q, R, N, W, V table
	}
	Expect struct {
		X, K, P     table
		L           table
		LPredictor  table `json:"L_predictor"`
		Poles       pairs `json:"closed_loop_poles"`
		ErrorPoles  pairs `json:"error_poles"`
		Exists      *bool `json:"stabilising_solution_exists"`
		HiddenModes pairs `json:"unobservable_imaginary_axis_modes"`
	}
	Tolerance struct {
		Rel      float64
		PolesRel float64 `json:"poles_rel"`
	}
}

// TestRiccatiPublished runs the published cases; each names its source in the
// file.
func TestRiccatiPublished(t *testing.T) {
	cases := append(publishedFiles[riccatiCase](t, "riccati.json"), publishedFiles[riccatiCase](t, "kalman_gain.json")...)
	for _, c := range cases {
		if c.Function == "LQG compensator" {
			continue // two such problems in one
		}
		t.Run(c.ID, func(t *testing.T) { checkPublished(t, c) })
	}
}

func checkPublished(t *testing.T, c riccatiCase) {
	in := c.Inputs
	p := RiccatiProblem{Sampled: strings.HasPrefix(c.Function, "discrete")}
	filter := in.C != nil
	if filter {
		p.A, p.B, p.Q, p.R = in.A.transposed(), in.C.transposed(), in.W.dense(), in.V.dense()
	} else {
		p.A, p.B, p.Q, p.R, p.N = in.A.dense(), in.B.dense(), in.Q.dense(), in.R.dense(), in.N.dense()
	}
	s, err := Riccati(context.Background(), p)
	if c.Expect.Exists != nil && !*c.Expect.Exists {
		var refusal *Refusal
		if !errors.As(err, &refusal) || spectrumDistance(refusal.Modes, c.Expect.HiddenModes.values()) > 1e-12 && c.Expect.HiddenModes != nil {
			t.Fatalf("got %v, %v", s, err)
		}
		return
	}
	if err != nil {
		t.Fatal(err)
	}
	compare := func(name string, got *mat.Dense, want *mat.Dense, digits float64) {
		e := errorRelativeTo(got, want)
		if e > c.Tolerance.Rel {
			t.Errorf("%s is off by %g", name, e)
		}
		if e > 10*math.Pow(10, -digits) {
			t.Errorf("%s is off by %g but claims %.1f digits", name, e, digits)
		}
	}
	x, k, poles := c.Expect.X, c.Expect.K.dense(), c.Expect.Poles
	if filter {
		x, poles = c.Expect.P, c.Expect.ErrorPoles
		gain := c.Expect.L
		if gain == nil {
			gain = c.Expect.LPredictor
		}
		k = gain.transposed()
	}
	if x != nil {
		compare("X", s.X, x.dense(), s.Certificate.Digits)
	}
	compare("K", s.K, k, s.GainDigits)
	want := poles.values()
	size := 1.0
	for _, v := range want {
		size = math.Max(size, math.Hypot(real(v), imag(v)))
	}
	if e := spectrumDistance(s.Poles, want); e > c.Tolerance.PolesRel*size {
		t.Errorf("poles are off by %g", e)
	}
}
