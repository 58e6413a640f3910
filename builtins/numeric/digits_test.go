package numeric

import (
	"context"
	"math"
	"math/big"
	"math/rand"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// longBits is the precision of the arithmetic that plays the truth: 60 digits.
const longBits = 200

// longMatrix is a matrix of 200-bit numbers.
type longMatrix struct {
	rows, columns int
	v             []*big.Float
}

func newLong(rows, columns int) *longMatrix {
	m := &longMatrix{rows, columns, make([]*big.Float, rows*columns)}
	for i := range m.v {
		m.v[i] = new(big.Float).SetPrec(longBits)
	}
	return m
}

func longOf(d mat.Matrix) *longMatrix {
	r, c := d.Dims()
	m := newLong(r, c)
	for i := range m.v {
		m.v[i].SetFloat64(d.At(i/c, i%c))
	}
	return m
}

func (m *longMatrix) rounded() *mat.Dense {
	d := mat.NewDense(m.rows, m.columns, nil)
	d.Apply(func(i, j int, _ float64) float64 { f, _ := m.v[i*m.columns+j].Float64(); return f }, d)
	return d
}

// plus is m + sign·b.
func (m *longMatrix) plus(sign int64, b *longMatrix) *longMatrix {
	out := newLong(m.rows, m.columns)
	for i := range out.v {
		t := new(big.Float).SetPrec(longBits).Mul(big.NewFloat(float64(sign)), b.v[i])
		out.v[i].Add(m.v[i], t)
	}
	return out
}

func (m *longMatrix) times(b *longMatrix) *longMatrix {
	out := newLong(m.rows, b.columns)
	t := new(big.Float).SetPrec(longBits)
	for i := 0; i < m.rows; i++ {
		for j := 0; j < b.columns; j++ {
			for k := 0; k < m.columns; k++ {
				t.Mul(m.v[i*m.columns+k], b.v[k*b.columns+j])
				out.v[i*b.columns+j].Add(out.v[i*b.columns+j], t)
			}
		}
	}
	return out
}

func (m *longMatrix) transposed() *longMatrix {
	out := newLong(m.columns, m.rows)
	for i := 0; i < m.rows; i++ {
		for j := 0; j < m.columns; j++ {
			out.v[j*m.rows+i].Set(m.v[i*m.columns+j])
		}
	}
	return out
}

// over divides every entry by the 1×1 matrix s.
func (m *longMatrix) over(s *longMatrix) *longMatrix {
	out := newLong(m.rows, m.columns)
	for i := range out.v {
		out.v[i].Quo(m.v[i], s.v[0])
	}
	return out
}

// refine drives the residual of x to zero with corrections computed in
// binary64; it reports false when they do not shrink below 1e-30.
func refine(x *longMatrix, residual func(*longMatrix) *longMatrix, correct func(*mat.Dense) (*mat.Dense, error)) bool {
	for round := 0; round < 60; round++ {
		r := residual(x).rounded()
		if peakEntry(r) == 0 {
			return true
		}
		step, err := correct(r)
		if err != nil {
			return false
		}
		next := x.plus(1, longOf(step))
		x.v = next.v
		if peakEntry(step) <= 1e-30*peakEntry(x.rounded()) {
			return true
		}
	}
	return false
}

// trueDigits is how many digits of got hold, relative to the largest entry.
func trueDigits(got *mat.Dense, truth *longMatrix) float64 {
	size := peakEntry(truth.rounded())
	e := peakEntry(longOf(got).plus(-1, truth).rounded())
	if e == 0 {
		return 17
	}
	return -math.Log10(e / size)
}

// digitsTally compares claims with the truth.
type digitsTally struct {
	t                         *testing.T
	name                      string
	cases, failed, unresolved int
	caution                   float64
}

func (d *digitsTally) compare(claimed, actual float64) {
	d.cases++
	if claimed > actual+1 {
		d.failed++
		d.t.Errorf("%s, case %d: claims %.2f digits, %.2f hold", d.name, d.cases, claimed, actual)
	}
	d.caution += math.Min(actual, mostDigits) - claimed
}

func (d *digitsTally) report() {
	d.t.Logf("%s: %d comparisons, %d claims too high, %d without truth, mean caution %.2f digits",
		d.name, d.cases, d.failed, d.unresolved, d.caution/float64(max(d.cases, 1)))
	if d.unresolved*4 > d.cases {
		d.t.Errorf("%s: too many cases without truth: %d", d.name, d.unresolved)
	}
}

// graded is a random n×n matrix with singular values from 1 down to 10^−decades.
func graded(r *rand.Rand, n int, decades float64) *mat.Dense {
	var u, v, a mat.Dense
	var qr mat.QR
	qr.Factorize(normalMatrix(r, n, n))
	qr.QTo(&u)
	qr.Factorize(normalMatrix(r, n, n))
	qr.QTo(&v)
	s := mat.NewDense(n, n, nil)
	for i := 0; i < n; i++ {
		s.Set(i, i, math.Pow(10, -decades*float64(i)/math.Max(1, float64(n-1))))
	}
	a.Mul(&u, s)
	a.Mul(&a, &v)
	return &a
}

// spectral is T·diag·T⁻¹ with κ(T) about 10^decades and the given real spectrum.
func spectral(r *rand.Rand, values []float64, decades float64) *mat.Dense {
	n := len(values)
	t := graded(r, n, decades)
	inverse, _, err := Inverse(t)
	if err != nil {
		panic(err)
	}
	var a mat.Dense
	a.Mul(t, mat.NewDiagDense(n, values))
	a.Mul(&a, inverse)
	return &a
}

func TestDigitsOfSolve(t *testing.T) {
	r := rand.New(rand.NewSource(11))
	tally := digitsTally{t: t, name: "solve"}
	for i := 0; i < 150; i++ {
		n := 2 + r.Intn(6)
		a, b := graded(r, n, 12*r.Float64()), normalMatrix(r, n, 1+r.Intn(2))
		s, err := Solve(a, b)
		if err != nil {
			t.Fatal(err)
		}
		x, la, lb := longOf(s.X), longOf(a), longOf(b)
		if !refine(x, func(x *longMatrix) *longMatrix { return lb.plus(-1, la.times(x)) }, func(r *mat.Dense) (*mat.Dense, error) {
			c, err := Solve(a, r)
			return c.X, err
		}) {
			tally.unresolved++
			continue
		}
		tally.compare(s.Certificate.Digits, trueDigits(s.X, x))
	}
	tally.report()
}

func TestDigitsOfSylvester(t *testing.T) {
	r := rand.New(rand.NewSource(12))
	tally := digitsTally{t: t, name: "Sylvester"}
	ctx := context.Background()
	for i := 0; i < 100; i++ {
		m, n := 1+r.Intn(5), 1+r.Intn(5)
		a, b, c := graded(r, m, 8*r.Float64()), graded(r, n, 8*r.Float64()), normalMatrix(r, m, n)
		s, err := Sylvester(ctx, a, b, c)
		if err != nil {
			tally.unresolved++
			continue
		}
		x, la, lb, lc := longOf(s.X), longOf(a), longOf(b), longOf(c)
		if !refine(x, func(x *longMatrix) *longMatrix { return lc.plus(-1, la.times(x)).plus(-1, x.times(lb)) }, func(r *mat.Dense) (*mat.Dense, error) {
			c, err := Sylvester(ctx, a, b, r)
			if err != nil {
				return nil, err
			}
			return c.X, nil
		}) {
			tally.unresolved++
			continue
		}
		tally.compare(s.Certificate.Digits, trueDigits(s.X, x))
	}
	tally.report()
}

// lyapunovTruth refines X for A·X + X·Aᵀ + Q or A·X·Aᵀ − X + Q.
func lyapunovTruth(a, q, start *mat.Dense, sampled bool) (*longMatrix, bool) {
	x, la, lq := longOf(start), longOf(a), longOf(q)
	ok := refine(x, func(x *longMatrix) *longMatrix {
		ax := la.times(x)
		if sampled {
			return ax.times(la.transposed()).plus(-1, x).plus(1, lq)
		}
		return ax.plus(1, ax.transposed()).plus(1, lq)
	}, func(r *mat.Dense) (*mat.Dense, error) { return lyapunovStep(a, r, sampled) })
	return x, ok
}

// lyapunovStep solves for a correction; the residual is made symmetric first.
func lyapunovStep(a, r *mat.Dense, sampled bool) (*mat.Dense, error) {
	var q mat.Dense
	q.Add(r, r.T())
	q.Scale(0.5, &q)
	s, err := Lyapunov(context.Background(), a, &q, sampled)
	if err != nil {
		return nil, err
	}
	return s.X, nil
}

func TestDigitsOfLyapunov(t *testing.T) {
	r := rand.New(rand.NewSource(13))
	for _, sampled := range []bool{false, true} {
		tally := digitsTally{t: t, name: "Lyapunov"}
		for i := 0; i < 80; i++ {
			n := 1 + r.Intn(5)
			values := make([]float64, n)
			for k := range values {
				values[k] = -math.Pow(10, -3*r.Float64())
				if sampled {
					values[k] = 1 - math.Pow(10, -3*r.Float64())*1.5
				}
			}
			a, q := spectral(r, values, 3*r.Float64()), normalMatrix(r, n, n)
			q.Add(q, mat.DenseCopyOf(q.T()))
			s, err := Lyapunov(context.Background(), a, q, sampled)
			if err != nil {
				tally.unresolved++
				continue
			}
			if x, ok := lyapunovTruth(a, q, s.X, sampled); ok {
				tally.compare(s.Certificate.Digits, trueDigits(s.X, x))
			} else {
				tally.unresolved++
			}
		}
		tally.report()
	}
}

// riccatiTruth refines X and gives the gain that belongs to it; one input.
func riccatiTruth(p RiccatiProblem, s *RiccatiSolution) (x, k *longMatrix, ok bool) {
	a, b, q, r := longOf(p.A), longOf(p.B), longOf(p.Q), longOf(p.R)
	gain := func(x *longMatrix) *longMatrix {
		bx := b.transposed().times(x)
		if p.Sampled {
			return bx.times(a).over(r.plus(1, bx.times(b)))
		}
		return bx.over(r)
	}
	var closed mat.Dense
	closed.Mul(p.B, s.K)
	closed.Sub(p.A, &closed)
	coefficient := mat.DenseCopyOf(closed.T())
	x = longOf(s.X)
	ok = refine(x, func(x *longMatrix) *longMatrix {
		xa, k := x.times(a), gain(x)
		if p.Sampled {
			return a.transposed().times(xa).plus(-1, x).plus(1, q).plus(-1, xa.transposed().times(b).times(k))
		}
		return xa.plus(1, xa.transposed()).plus(1, q).plus(-1, x.times(b).times(k))
	}, func(r *mat.Dense) (*mat.Dense, error) { return lyapunovStep(coefficient, r, p.Sampled) })
	return x, gain(x), ok
}

func TestDigitsOfRiccati(t *testing.T) {
	r := rand.New(rand.NewSource(14))
	for _, sampled := range []bool{false, true} {
		tally := digitsTally{t: t, name: "Riccati"}
		for i := 0; i < 100; i++ {
			n := 1 + r.Intn(5)
			values := make([]float64, n)
			for k := range values {
				values[k] = 2 * r.NormFloat64()
			}
			p := RiccatiProblem{A: spectral(r, values, 2.5*r.Float64()), B: normalMatrix(r, n, 1),
				Q: mat.NewDense(n, n, nil), R: mat.NewDense(1, 1, []float64{math.Pow(10, 4*r.Float64()-2)}), Sampled: sampled}
			for k := 0; k < n; k++ {
				p.Q.Set(k, k, math.Pow(10, -6*r.Float64()))
			}
			s, err := Riccati(context.Background(), p)
			if err != nil {
				t.Errorf("case %d: %v", i, err)
				continue
			}
			x, k, ok := riccatiTruth(p, s)
			if !ok {
				tally.unresolved++
				continue
			}
			tally.compare(s.Certificate.Digits, trueDigits(s.X, x))
			tally.compare(s.GainDigits, trueDigits(s.K, k))
		}
		tally.report()
	}
}

// eigenvalueTruth refines a real simple eigenpair by Newton's method on
// (A − λ)·x = 0, xᵀx₀ = 1, with corrections from the bordered system.
func eigenvalueTruth(a *mat.Dense, lambda float64, vector []float64) (*big.Float, bool) {
	n := len(vector)
	la := longOf(a)
	z := newLong(n+1, 1) // x, then λ
	for i, v := range vector {
		z.v[i].SetFloat64(v)
	}
	z.v[n].SetFloat64(lambda)
	ok := refine(z, func(z *longMatrix) *longMatrix {
		x := &longMatrix{n, 1, z.v[:n]}
		ax, r := la.times(x), newLong(n+1, 1)
		t := new(big.Float).SetPrec(longBits)
		r.v[n].SetInt64(1)
		for i := 0; i < n; i++ {
			t.Mul(z.v[n], x.v[i])
			r.v[i].Sub(t, ax.v[i])
			t.Mul(new(big.Float).SetFloat64(vector[i]), x.v[i])
			r.v[n].Sub(r.v[n], t)
		}
		return r
	}, func(r *mat.Dense) (*mat.Dense, error) {
		bordered := mat.NewDense(n+1, n+1, nil)
		now := z.rounded()
		for i := 0; i < n; i++ {
			for j := 0; j < n; j++ {
				bordered.Set(i, j, a.At(i, j))
			}
			bordered.Set(i, i, a.At(i, i)-now.At(n, 0))
			bordered.Set(i, n, -now.At(i, 0))
			bordered.Set(n, i, vector[i])
		}
		s, err := Solve(bordered, r)
		if err != nil {
			return nil, err
		}
		return s.X, nil
	})
	return z.v[n], ok
}

func TestErrorsOfEigenvalues(t *testing.T) {
	r := rand.New(rand.NewSource(15))
	tally := digitsTally{t: t, name: "eigenvalues"}
	for i := 0; i < 80; i++ {
		n := 2 + r.Intn(4)
		values := make([]float64, n)
		for k := range values {
			values[k] = 3 * r.NormFloat64()
		}
		a := spectral(r, values, 6*r.Float64())
		s, err := Eigen(a)
		if err != nil {
			t.Fatal(err)
		}
		for j, v := range s.Values {
			vector := make([]float64, n)
			for k := range vector {
				vector[k] = real(s.Right.At(k, j))
			}
			truth, ok := eigenvalueTruth(a, real(v), vector)
			if !ok || imag(v) != 0 {
				tally.unresolved++
				continue
			}
			e, _ := new(big.Float).Sub(truth, new(big.Float).SetFloat64(real(v))).Float64()
			tally.compare(-math.Log10(s.ErrorOf[j]), -math.Log10(math.Abs(e)+1e-300))
		}
	}
	tally.report()
}

// TestDigitsOfRiccatiAreNotWasted: where X is known to hold to rounding, the claim may not
// be poor because bounds of every datum add up. The gain of a chain of integrators with unit
// weights is the Butterworth polynomial (common practice); a sampled plant with strongly
// growing modes has a huge X that hardly depends on the rounding of its data.
func TestDigitsOfRiccatiAreNotWasted(t *testing.T) {
	const n = 18
	chain, drive, first := mat.NewDense(n, n, nil), mat.NewDense(n, 1, nil), mat.NewDense(n, n, nil)
	for i := range n - 1 {
		chain.Set(i, i+1, 1)
	}
	drive.Set(n-1, 0, 1)
	first.Set(0, 0, 1)
	s, err := Riccati(context.Background(), RiccatiProblem{A: chain, B: drive, Q: first, R: mat.NewDense(1, 1, []float64{1})})
	if err != nil {
		t.Fatal(err)
	}
	butterworth := []float64{1}
	for k := range n / 2 {
		damping := 2 * math.Sin(math.Pi*float64(2*k+1)/(2*n))
		next := make([]float64, len(butterworth)+2)
		for i, c := range butterworth {
			next[i] += c
			next[i+1] += damping * c
			next[i+2] += c
		}
		butterworth = next
	}
	for j := range n {
		if want := butterworth[n-j]; math.Abs(s.K.At(0, j)-want) > 1e-13*want {
			t.Errorf("K[%d] = %.16g, not %.16g", j+1, s.K.At(0, j), want)
		}
	}
	if s.Certificate.Digits < 13 || s.GainDigits < 13 {
		t.Errorf("the chain claims %.1f and %.1f digits", s.Certificate.Digits, s.GainDigits)
	}
	r := rand.New(rand.NewSource(11))
	for k := range 30 {
		size := 3 + k%5
		a := normalMatrix(r, size, size)
		a.Scale(math.Pow(10, float64(k%2)/2), a)
		b, q := normalMatrix(r, size, 1+k%2), mat.NewDense(size, size, nil)
		for i := range size {
			q.Set(i, i, 1)
		}
		_, m := b.Dims()
		weight := mat.NewDense(m, m, nil)
		for i := range m {
			weight.Set(i, i, 1)
		}
		s, err := Riccati(context.Background(), RiccatiProblem{A: a, B: b, Q: q, R: weight, Sampled: true})
		if err != nil {
			t.Fatal(k, err)
		}
		if s.Certificate.Digits < 8 {
			t.Errorf("plant %d, X of size %.1e, claims %.1f digits", k, peakEntry(s.X), s.Certificate.Digits)
		}
	}
}
