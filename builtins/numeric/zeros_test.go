package numeric

import (
	"context"
	"encoding/json"
	"math"
	"math/cmplx"
	"math/rand"
	"os"
	"slices"
	"testing"

	"gonum.org/v1/gonum/mat"
)

func denseRows(rows [][]float64) *mat.Dense {
	if len(rows) == 0 {
		return nil
	}
	m := mat.NewDense(len(rows), len(rows[0]), nil)
	for i, row := range rows {
		m.SetRow(i, row)
	}
	return m
}

// zerosReference is the exact reference of testdata/zeros_reference.json.
type zerosReference struct {
	Name       string
	A, B, C, D [][]float64
	Rank       int
	Zeros      [][2]float64
	Infinite   []int
}

func readZerosReference(t testing.TB) []zerosReference {
	t.Helper()
	data, err := os.ReadFile("testdata/zeros_reference.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct {
		Tool, Command, Date string
		Cases               []zerosReference
	}
	if err := json.Unmarshal(data, &file); err != nil {
		t.Fatal(err)
	}
	if file.Tool == "" || file.Command == "" || file.Date == "" || len(file.Cases) < 20 {
		t.Fatal("the reference file lacks its header or cases")
	}
	return file.Cases
}

func (r zerosReference) zeros() []complex128 {
	out := []complex128{}
	for _, z := range r.Zeros {
		out = append(out, complex(z[0], z[1]))
	}
	return out
}

func TestPublishedZeros(t *testing.T) {
	for _, c := range structureCases(t, "zeros-") {
		t.Run(c.ID, func(t *testing.T) {
			got, err := TransmissionZeros(context.Background(), matrixOf(t, c.Inputs["A"]), matrixOf(t, c.Inputs["B"]), matrixOf(t, c.Inputs["C"]), matrixOf(t, c.Inputs["D"]))
			if err != nil {
				t.Fatal(err)
			}
			if e := worstMatch(complexList(t, c.Expect["zeros"], false), got.Zeros); e > 1e-13 {
				t.Errorf("zeros %v off by %g", got.Zeros, e)
			}
			if float64(got.NormalRank) != numberOf(t, c.Expect["normal_rank_of_transfer_matrix"]) {
				t.Errorf("normal rank %d", got.NormalRank)
			}
		})
	}
}

// The zeros of sampled integrators (K. J. Åström, P. Hagander, J. Sternby,
// Automatica 20, 1984) and of a sampled motor, from their held matrices.
func TestSamplingZeros(t *testing.T) {
	e := math.Exp(-1)
	for name, c := range map[string]struct {
		a, b []float64
		want []complex128
	}{
		"double integrator": {[]float64{1, 1, 0, 1}, []float64{0.5, 1}, []complex128{-1}},
		"triple integrator": {[]float64{1, 1, 0.5, 0, 1, 1, 0, 0, 1}, []float64{1. / 6, 0.5, 1}, []complex128{complex(-2-math.Sqrt(3), 0), complex(math.Sqrt(3)-2, 0)}},
		"motor":             {[]float64{1, 1 - e, 0, e}, []float64{e, 1 - e}, []complex128{complex(-(1-2*e)/e, 0)}},
	} {
		n := len(c.b)
		out := mat.NewDense(1, n, nil)
		out.Set(0, 0, 1)
		got, err := TransmissionZeros(context.Background(), mat.NewDense(n, n, c.a), mat.NewDense(n, 1, c.b), out, nil)
		if err != nil {
			t.Fatal(err)
		}
		if e := worstMatch(c.want, got.Zeros); e > 1e-13 {
			t.Errorf("%s: %v", name, got.Zeros)
		}
	}
}

func TestZerosAgainstExactReference(t *testing.T) {
	random := rand.New(rand.NewSource(4))
	for _, c := range readZerosReference(t) {
		a, b, cc, d := denseRows(c.A), denseRows(c.B), denseRows(c.C), denseRows(c.D)
		for trial := 0; trial < 4; trial++ {
			if trial > 0 { // other units of states, inputs and outputs
				a, b, cc, d = rescaled(random, denseRows(c.A), denseRows(c.B), denseRows(c.C), denseRows(c.D), []float64{0, 2, 4, 6}[trial])
			}
			got, err := TransmissionZeros(context.Background(), a, b, cc, d)
			if err != nil {
				t.Fatalf("%s: %v", c.Name, err)
			}
			p, m := d.Dims()
			if got.NormalRank != c.Rank || got.Singular != (c.Rank < min(p, m)) {
				t.Errorf("%s (trial %d): normal rank %d, want %d", c.Name, trial, got.NormalRank, c.Rank)
			}
			if !slices.Equal(got.Infinite, c.Infinite) {
				t.Errorf("%s (trial %d): orders at infinity %v, want %v", c.Name, trial, got.Infinite, c.Infinite)
			}
			want := c.zeros()
			if len(want) != len(got.Zeros) {
				t.Errorf("%s (trial %d): zeros %v, want %v; gap %g / %g at %g", c.Name, trial, got.Zeros, want, got.Above, got.Below, got.Threshold)
				continue
			}
			if len(want) == 0 {
				continue
			}
			worst, largest := 0.0, 0.0
			for i, j := range matchPoles(want, got.Zeros) {
				gap := cmplx.Abs(want[i] - got.Zeros[j])
				worst, largest = math.Max(worst, gap), math.Max(largest, cmplx.Abs(want[i]))
				if gap > 10*got.ErrorOf[j] {
					t.Errorf("%s (trial %d): zero %v off by %.2g, claimed %.2g", c.Name, trial, want[i], gap, got.ErrorOf[j])
				}
				if got.SigmaMin[j] > 1e-13 {
					t.Errorf("%s (trial %d): σ at %v is %g", c.Name, trial, got.Zeros[j], got.SigmaMin[j])
				}
			}
			t.Logf("%s (trial %d): worst %.1e, digits %.1f, gap %.1g / %.1g", c.Name, trial, worst, got.Certificate.Digits, got.Above, got.Below)
			if truth := -math.Log10(math.Max(worst, 1e-300) / math.Max(largest, 1e-300)); largest > 0 && got.Certificate.Digits > truth+1 {
				t.Errorf("%s (trial %d): %.1f digits claimed, %.1f hold", c.Name, trial, got.Certificate.Digits, truth)
			}
			if worst > 1e-8*math.Max(1, largest) {
				t.Errorf("%s (trial %d): off by %g", c.Name, trial, worst)
			}
		}
	}
}

// rescaled changes the units of states, inputs and outputs by random powers of
// ten up to the given exponent.
func rescaled(random *rand.Rand, a, b, c, d *mat.Dense, exponent float64) (*mat.Dense, *mat.Dense, *mat.Dense, *mat.Dense) {
	factor := func() float64 { return math.Pow(10, exponent*(2*random.Float64()-1)) }
	n, m := b.Dims()
	p, _ := c.Dims()
	a, b, c, d = mat.DenseCopyOf(a), mat.DenseCopyOf(b), mat.DenseCopyOf(c), mat.DenseCopyOf(d)
	for i := 0; i < n; i++ {
		f := factor()
		for j := 0; j < n; j++ {
			a.Set(i, j, a.At(i, j)*f)
		}
		for j := 0; j < n; j++ {
			a.Set(j, i, a.At(j, i)/f)
		}
		for j := 0; j < m; j++ {
			b.Set(i, j, b.At(i, j)*f)
		}
		for j := 0; j < p; j++ {
			c.Set(j, i, c.At(j, i)/f)
		}
	}
	for j := 0; j < m; j++ {
		f := factor()
		for i := 0; i < n; i++ {
			b.Set(i, j, b.At(i, j)*f)
		}
		for i := 0; i < p; i++ {
			d.Set(i, j, d.At(i, j)*f)
		}
	}
	for i := 0; i < p; i++ {
		f := factor()
		for j := 0; j < n; j++ {
			c.Set(i, j, c.At(i, j)*f)
		}
		for j := 0; j < m; j++ {
			d.Set(i, j, d.At(i, j)*f)
		}
	}
	return a, b, c, d
}

func TestDecouplingZeros(t *testing.T) {
	ctx := context.Background()
	// One mode in each of the four parts (see the published split): poles −1 moved and seen,
	// −2 moved only, −3 seen only, −4 neither; 1/(s + 1) remains.
	c := structureCases(t, "kalman-4")[0]
	got, err := TransmissionZeros(ctx, matrixOf(t, c.Inputs["A"]), matrixOf(t, c.Inputs["B"]), matrixOf(t, c.Inputs["C"]), nil)
	if err != nil {
		t.Fatal(err)
	}
	for name, pair := range map[string][2][]complex128{
		"transmission":      {{}, got.Zeros},
		"invariant":         {{-2, -3, -4}, got.Invariant},
		"input decoupling":  {{-3, -4}, got.InputDecoupling},
		"output decoupling": {{-2, -4}, got.OutputDecoupling},
		"both":              {{-4}, got.BothDecoupling},
	} {
		if worstMatch(pair[0], pair[1]) > 1e-11 {
			t.Errorf("%s: %v, want %v", name, pair[1], pair[0])
		}
	}
	if got.NormalRank != 1 || got.Singular {
		t.Errorf("normal rank %d", got.NormalRank)
	}
}

// Zeros of the transposed system are the same, and output injection, state
// feedback and changes of states leave them.
func TestZerosInvariance(t *testing.T) {
	ctx, random := context.Background(), rand.New(rand.NewSource(77))
	for trial := 0; trial < 30; trial++ {
		n, m := 2+random.Intn(9), 1+random.Intn(3)
		if m >= n {
			continue
		}
		a, b, c, d := gaussian(random, n, n), gaussian(random, n, m), gaussian(random, m, n), mat.NewDense(m, m, nil)
		if trial%2 == 0 {
			d.Set(0, 0, 1)
		}
		first, err := TransmissionZeros(ctx, a, b, c, d)
		if err != nil {
			t.Fatal(err)
		}
		dual, err := TransmissionZeros(ctx, transposed(a), transposed(c), transposed(b), transposed(d))
		if err != nil {
			t.Fatal(err)
		}
		k := gaussian(random, m, n)
		var feedback, output mat.Dense
		feedback.Mul(b, k)
		feedback.Sub(a, &feedback)
		output.Mul(d, k)
		output.Sub(c, &output)
		fed, err := TransmissionZeros(ctx, &feedback, b, &output, d)
		if err != nil {
			t.Fatal(err)
		}
		for name, other := range map[string]*Zeros{"dual": dual, "with feedback": fed} {
			if len(other.Zeros) != len(first.Zeros) {
				t.Errorf("trial %d: %s: %d zeros, %d before", trial, name, len(other.Zeros), len(first.Zeros))
				continue
			}
			for i, j := range matchPoles(first.Zeros, other.Zeros) {
				if gap := cmplx.Abs(first.Zeros[i] - other.Zeros[j]); gap > 10*(first.ErrorOf[i]+other.ErrorOf[j])+1e-13 {
					t.Errorf("trial %d: %s: zero %v against %v, claimed %g and %g", trial, name, first.Zeros[i], other.Zeros[j], first.ErrorOf[i], other.ErrorOf[j])
				}
			}
		}
	}
}

func TestZerosDegenerateShapes(t *testing.T) {
	ctx := context.Background()
	a := mat.NewDense(2, 2, []float64{0, 1, -2, -3})
	if z, err := TransmissionZeros(ctx, nil, nil, nil, mat.NewDense(2, 2, []float64{1, 2, 2, 4})); err != nil || z.NormalRank != 1 || !z.Singular || len(z.Zeros) != 0 {
		t.Errorf("no states: %v, %v", z, err)
	}
	if z, err := TransmissionZeros(ctx, a, nil, mat.NewDense(1, 2, []float64{1, 0}), nil); err != nil || len(z.Zeros) != 0 || len(z.InputDecoupling) != 2 {
		t.Errorf("no inputs: %v, %v", z, err)
	}
	if z, err := TransmissionZeros(ctx, a, mat.NewDense(2, 1, []float64{0, 1}), nil, nil); err != nil || len(z.Zeros) != 0 || len(z.OutputDecoupling) != 2 {
		t.Errorf("no outputs: %v, %v", z, err)
	}
	nan := mat.NewDense(1, 1, []float64{math.NaN()})
	one := mat.NewDense(1, 1, []float64{1})
	for name, f := range map[string]func() error{
		"A": func() error { _, err := TransmissionZeros(ctx, nan, one, one, one); return err },
		"B": func() error { _, err := TransmissionZeros(ctx, one, nan, one, one); return err },
		"C": func() error { _, err := TransmissionZeros(ctx, one, one, nan, one); return err },
		"D": func() error { _, err := TransmissionZeros(ctx, one, one, one, nan); return err },
		"shape of C": func() error {
			_, err := TransmissionZeros(ctx, one, one, mat.NewDense(1, 2, nil), nil)
			return err
		},
		"shape of D": func() error {
			_, err := TransmissionZeros(ctx, one, one, one, mat.NewDense(2, 1, nil))
			return err
		},
	} {
		if f() == nil {
			t.Errorf("%s: want an error", name)
		}
	}
}
