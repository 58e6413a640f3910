package numeric

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/cmplx"
	"math/rand"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// turned puts a plant into other coordinates: A → T·A·T⁻¹, B → T·B, Q → T⁻ᵀ·Q·T⁻¹
// for a random well-conditioned T.
func turned(r *rand.Rand, a, b, q *mat.Dense) (ta, tb, tq *mat.Dense) {
	n, _ := a.Dims()
	t := normalMatrix(r, n, n)
	for i := 0; i < n; i++ {
		t.Set(i, i, t.At(i, i)+3)
	}
	inverse, _, err := Inverse(t)
	if err != nil {
		panic(err)
	}
	ta, tb, tq = new(mat.Dense), new(mat.Dense), new(mat.Dense)
	ta.Mul(t, a)
	ta.Mul(ta, inverse)
	tb.Mul(t, b)
	tq.Mul(inverse.T(), q)
	tq.Mul(tq, inverse)
	tq.Add(tq, mat.DenseCopyOf(tq.T()))
	tq.Scale(0.5, tq)
	return ta, tb, tq
}

// verdictCase is a plant in coordinates where the answer can be read off.
type verdictCase struct {
	name    string
	sampled bool
	a, b, q *mat.Dense
	hidden  complex128 // the mode that must be named
	refused bool
}

func verdictCases() []verdictCase {
	d := func(n, m int, v ...float64) *mat.Dense { return mat.NewDense(n, m, v) }
	return []verdictCase{
		{"unstable mode without input", false, d(3, 3, 1, 0, 0, 0, -1, 1, 0, 0, -2), d(3, 1, 0, 1, 1), d(3, 3, 1, 0, 0, 0, 1, 0, 0, 0, 1), 1, true},
		{"integrator without input", false, d(3, 3, 0, 0, 0, 0, -1, 1, 0, 0, -2), d(3, 1, 0, 1, 1), d(3, 3, 1, 0, 0, 0, 1, 0, 0, 0, 1), 0, true},
		{"oscillator without input", false, d(3, 3, 0, 2, 0, -2, 0, 0, 0, 0, 1), d(3, 1, 0, 0, 1), d(3, 3, 1, 0, 0, 0, 1, 0, 0, 0, 1), 2i, true},
		{"integrator without weight", false, d(3, 3, 0, 0, 0, 0, -1, 1, 0, 0, -2), d(3, 1, 1, 1, 1), d(3, 3, 0, 0, 0, 0, 1, 0, 0, 0, 1), 0, true},
		{"oscillator without weight", false, d(3, 3, 0, 2, 0, -2, 0, 0, 0, 0, 1), d(3, 1, 1, 0, 1), d(3, 3, 0, 0, 0, 0, 0, 0, 0, 0, 1), 2i, true},
		{"position without weight", false, d(3, 3, 0, 1, 0, 0, 0, 0, 0, 0, -1), d(3, 1, 0, 1, 1), d(3, 3, 0, 0, 0, 0, 1, 0, 0, 0, 1), 0, true},
		{"stable mode without input", false, d(3, 3, -1e-3, 0, 0, 0, -1, 1, 0, 0, 2), d(3, 1, 0, 1, 1), d(3, 3, 1, 0, 0, 0, 1, 0, 0, 0, 1), 0, false},
		{"slow mode without weight", false, d(3, 3, -1e-6, 0, 0, 0, -1, 1, 0, 0, -2), d(3, 1, 1, 1, 1), d(3, 3, 0, 0, 0, 0, 1, 0, 0, 0, 1), 0, false},
		{"slowly unstable mode without weight", false, d(3, 3, 1e-6, 0, 0, 0, -1, 1, 0, 0, -2), d(3, 1, 1, 1, 1), d(3, 3, 0, 0, 0, 0, 1, 0, 0, 0, 1), 0, false},
		{"unstable mode without input, sampled", true, d(3, 3, 1.5, 0, 0, 0, 0.2, 1, 0, 0, 0.5), d(3, 1, 0, 1, 1), d(3, 3, 1, 0, 0, 0, 1, 0, 0, 0, 1), 1.5, true},
		{"integrator without input, sampled", true, d(3, 3, 1, 0, 0, 0, 0.2, 1, 0, 0, 0.5), d(3, 1, 0, 1, 1), d(3, 3, 1, 0, 0, 0, 1, 0, 0, 0, 1), 1, true},
		{"integrator without weight, sampled", true, d(3, 3, 1, 0, 0, 0, 0.2, 1, 0, 0, 0.5), d(3, 1, 1, 1, 1), d(3, 3, 0, 0, 0, 0, 1, 0, 0, 0, 1), 1, true},
		{"circle pair without weight, sampled", true, d(3, 3, 0.6, 0.8, 0, -0.8, 0.6, 0, 0, 0, 2), d(3, 1, 1, 0, 1), d(3, 3, 0, 0, 0, 0, 0, 0, 0, 0, 1), 0.6 + 0.8i, true},
		{"mode at -1 without weight, sampled", true, d(2, 2, -1, 0, 0, 0.5), d(2, 1, 1, 1), d(2, 2, 0, 0, 0, 1), -1, true},
		{"slow mode without weight, sampled", true, d(3, 3, 1-1e-6, 0, 0, 0, 0.2, 1, 0, 0, 0.5), d(3, 1, 1, 1, 1), d(3, 3, 0, 0, 0, 0, 1, 0, 0, 0, 1), 0, false},
		{"stable mode without input, sampled", true, d(3, 3, 0.999, 0, 0, 0, 0.2, 1, 0, 0, 3), d(3, 1, 0, 1, 1), d(3, 3, 1, 0, 0, 0, 1, 0, 0, 0, 1), 0, false},
	}
}

// TestRiccatiVerdicts asks in the plain coordinates and in twenty others, where
// the hidden mode is hidden to rounding only.
func TestRiccatiVerdicts(t *testing.T) {
	one := mat.NewDense(1, 1, []float64{1})
	r := rand.New(rand.NewSource(5))
	for _, c := range verdictCases() {
		for turn := 0; turn <= 20; turn++ {
			a, b, q := c.a, c.b, c.q
			if turn > 0 {
				a, b, q = turned(r, a, b, q)
			}
			s, err := Riccati(context.Background(), RiccatiProblem{A: a, B: b, Q: q, R: one, Sampled: c.sampled})
			name := fmt.Sprintf("%s, turn %d", c.name, turn)
			if !c.refused {
				if err != nil {
					t.Errorf("%s: %v", name, err)
				}
				continue
			}
			var refusal *Refusal
			if !errors.As(err, &refusal) {
				t.Errorf("%s: got %v, %v", name, s, err)
				continue
			}
			nearest := math.Inf(1)
			for _, m := range refusal.Modes {
				nearest = math.Min(nearest, cmplx.Abs(m-c.hidden))
			}
			if nearest > 1e-6 {
				t.Errorf("%s: named %v: %v", name, refusal.Modes, err)
			}
		}
	}
}

// TestRiccatiSlowModesAreNotBoundaryModes: exact zeros in the weights leave no
// doubt about a pole as close to the boundary as −1e-10; it is the true one.
func TestRiccatiSlowModesAreNotBoundaryModes(t *testing.T) {
	for _, slow := range []float64{5e-8, 1e-10} {
		for _, sampled := range []bool{false, true} {
			a, want := mat.NewDense(2, 2, []float64{-slow, 0, 0, 0.5}), -slow
			if sampled {
				a, want = mat.NewDense(2, 2, []float64{1 - slow, 0, 0, 0.5}), 1-slow
			}
			s, err := Riccati(context.Background(), RiccatiProblem{A: a, B: mat.NewDense(2, 1, []float64{1, 1}),
				Q: mat.NewDense(2, 2, []float64{0, 0, 0, 1}), R: mat.NewDense(1, 1, []float64{1}), Sampled: sampled})
			if err != nil {
				t.Errorf("slow %g sampled %v: %v", slow, sampled, err)
				continue
			}
			nearest := math.Inf(1)
			for _, p := range s.Poles {
				nearest = math.Min(nearest, cmplx.Abs(p-complex(want, 0)))
			}
			if nearest > 0.01*slow {
				t.Errorf("slow %g sampled %v: poles %v", slow, sampled, s.Poles)
			}
		}
	}
}

func TestRiccatiRefusesWeights(t *testing.T) {
	a, b := mat.NewDense(2, 2, []float64{0, 1, 0, 0}), mat.NewDense(2, 2, []float64{0, 0, 1, 2})
	q := mat.NewDense(2, 2, []float64{1, 0, 0, 1})
	for name, c := range map[string]struct {
		r       []float64
		sampled bool
	}{
		"zero R":            {[]float64{0, 0, 0, 0}, false},
		"singular R":        {[]float64{1, 1, 1, 1}, false},
		"negative R":        {[]float64{1, 0, 0, -1}, false},
		"dependent, R zero": {[]float64{0, 0, 0, 0}, true},
	} {
		_, err := Riccati(context.Background(), RiccatiProblem{A: a, B: b, Q: q, R: mat.NewDense(2, 2, c.r), Sampled: c.sampled})
		var refusal *Refusal
		if !errors.As(err, &refusal) {
			t.Errorf("%s: %v", name, err)
		}
	}
}

func TestRiccatiDoor(t *testing.T) {
	good := func() RiccatiProblem {
		return RiccatiProblem{A: mat.NewDense(2, 2, []float64{0, 1, 0, 0}), B: mat.NewDense(2, 1, []float64{0, 1}),
			Q: mat.NewDense(2, 2, []float64{1, 0, 0, 1}), R: mat.NewDense(1, 1, []float64{1})}
	}
	for name, spoil := range map[string]func(p *RiccatiProblem){
		"NaN":          func(p *RiccatiProblem) { p.A.Set(0, 0, math.NaN()) },
		"infinite":     func(p *RiccatiProblem) { p.B.Set(0, 0, math.Inf(1)) },
		"infinite N":   func(p *RiccatiProblem) { p.N = mat.NewDense(2, 1, []float64{0, math.Inf(-1)}) },
		"asymmetric Q": func(p *RiccatiProblem) { p.Q.Set(0, 1, 1) },
		"no B":         func(p *RiccatiProblem) { p.B = nil },
		"no Q":         func(p *RiccatiProblem) { p.Q = nil },
		"oblong A":     func(p *RiccatiProblem) { p.A = mat.NewDense(2, 3, nil) },
		"wrong N":      func(p *RiccatiProblem) { p.N = mat.NewDense(1, 2, nil) },
	} {
		p := good()
		spoil(&p)
		if _, err := Riccati(context.Background(), p); err == nil {
			t.Errorf("%s: accepted", name)
		}
	}
	stopped, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := Riccati(stopped, good()); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
}

// TestRiccatiExtremeScales checks invariance under wild units of the states.
func TestRiccatiExtremeScales(t *testing.T) {
	r := rand.New(rand.NewSource(6))
	for trial := 0; trial < 40; trial++ {
		n, sampled := 2+r.Intn(5), trial%2 == 1
		a, b := normalMatrix(r, n, n), normalMatrix(r, n, 1)
		q := mat.NewDense(n, n, nil)
		for i := 0; i < n; i++ {
			q.Set(i, i, 1)
		}
		one := mat.NewDense(1, 1, []float64{1})
		plain, err := Riccati(context.Background(), RiccatiProblem{A: a, B: b, Q: q, R: one, Sampled: sampled})
		if err != nil {
			t.Fatal(err)
		}
		sa, sb, sq := mat.DenseCopyOf(a), mat.DenseCopyOf(b), mat.DenseCopyOf(q)
		unit := make([]float64, n)
		for i := range unit {
			unit[i] = math.Ldexp(1, r.Intn(60)-30)
		}
		for i := 0; i < n; i++ {
			sb.Set(i, 0, b.At(i, 0)/unit[i])
			for j := 0; j < n; j++ {
				sa.Set(i, j, a.At(i, j)*unit[j]/unit[i])
				sq.Set(i, j, q.At(i, j)*unit[i]*unit[j])
			}
		}
		scaled, err := Riccati(context.Background(), RiccatiProblem{A: sa, B: sb, Q: sq, R: one, Sampled: sampled})
		if err != nil {
			t.Fatal(trial, err)
		}
		for i := 0; i < n; i++ {
			for j := 0; j < n; j++ {
				back := scaled.X.At(i, j) / unit[i] / unit[j]
				if e := math.Abs(back-plain.X.At(i, j)) / peakEntry(plain.X); e > 20*math.Pow(10, -plain.Certificate.Digits) {
					t.Errorf("trial %d: X[%d, %d] differs by %g", trial, i, j, e)
				}
			}
		}
	}
}
