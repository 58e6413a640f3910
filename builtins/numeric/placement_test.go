package numeric

import (
	"context"
	"encoding/json"
	"errors"
	"math"
	"math/big"
	"math/cmplx"
	"math/rand"
	"os"
	"testing"

	"gonum.org/v1/gonum/mat"
)

func gaussian(random *rand.Rand, rows, columns int) *mat.Dense {
	m := mat.NewDense(rows, columns, nil)
	for i := 0; i < rows; i++ {
		for j := 0; j < columns; j++ {
			m.Set(i, j, random.NormFloat64())
		}
	}
	return m
}

// The comparison with SciPy's place_poles (method "YT") on testdata/placement_reference.json:
// poles at least to 1e-10, κ of the unit eigenvectors no worse than 1.05 times
// SciPy's in any case and no worse on average.
func TestPlacementAgainstSciPy(t *testing.T) {
	data, err := os.ReadFile("testdata/placement_reference.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct {
		Tool, Command, Date string
		Cases               []struct {
			Name  string
			A, B  [][]float64
			Poles [][2]float64
			SciPy struct{ Kappa, Error, Norm *float64 }
		}
	}
	if err := json.Unmarshal(data, &file); err != nil {
		t.Fatal(err)
	}
	if file.Tool == "" || file.Command == "" || file.Date == "" {
		t.Fatal("the reference file lacks its header")
	}
	sum, count := 0.0, 0.0
	for _, c := range file.Cases {
		a, b := denseRows(c.A), denseRows(c.B)
		var poles []complex128
		for _, p := range c.Poles {
			poles = append(poles, complex(p[0], p[1]))
		}
		got, err := AssignRobust(context.Background(), a, b, poles, 1)
		if err != nil {
			t.Errorf("%s: %v", c.Name, err)
			continue
		}
		off := worstMatch(poles, closedPoles(t, a, b, got.K))
		if c.SciPy.Kappa == nil {
			t.Logf("%-28s κ %9.3f, poles %.1e (SciPy refused)", c.Name, got.Sensitivity, off)
			continue
		}
		t.Logf("%-28s κ %9.3f (SciPy %9.3f), poles %.1e (SciPy %.1e), ‖K‖ %8.2f (SciPy %8.2f), digits %.1f",
			c.Name, got.Sensitivity, *c.SciPy.Kappa, off, *c.SciPy.Error, got.Norm, *c.SciPy.Norm, got.Certificate.Digits)
		if off > 1e-10*math.Max(1, got.Sensitivity/100) {
			t.Errorf("%s: poles off by %g", c.Name, off)
		}
		if got.Sensitivity > 1.05**c.SciPy.Kappa {
			t.Errorf("%s: κ %.4f, SciPy reaches %.4f", c.Name, got.Sensitivity, *c.SciPy.Kappa)
		}
		sum += math.Log(got.Sensitivity / *c.SciPy.Kappa)
		count++
	}
	t.Logf("κ relative to SciPy's, geometric mean: %.3f", math.Exp(sum/count))
	if sum > 0 {
		t.Errorf("on average κ is %.3f times SciPy's", math.Exp(sum/count))
	}
}

// polynomialOf multiplies out the roots, highest power first.
func polynomialOf(roots []complex128) []complex128 {
	p := []complex128{1}
	for _, r := range roots {
		p = append(p, 0)
		for i := len(p) - 1; i > 0; i-- {
			p[i] -= r * p[i-1]
		}
	}
	return p
}

// coefficientGap is the largest coefficient difference relative to the largest
// coefficient.
func coefficientGap(a, b []complex128) float64 {
	p, q := polynomialOf(a), polynomialOf(b)
	worst, largest := 0.0, 0.0
	for i := range p {
		worst, largest = math.Max(worst, cmplx.Abs(p[i]-q[i])), math.Max(largest, cmplx.Abs(p[i]))
	}
	return worst / largest
}

func TestRepeatedPolesBeyondTheInputs(t *testing.T) {
	random := rand.New(rand.NewSource(7))
	for _, c := range []struct {
		n, m  int
		poles []complex128
		limit float64 // on the poles themselves
	}{
		{4, 2, []complex128{-2, -2, -2, -2}, 1e-6},
		{5, 2, []complex128{-1, -1, -1, -2, -3}, 1e-6},
		{6, 2, []complex128{0, 0, 0, 0, 0, 0}, 1e-3},
		{6, 3, []complex128{0, 0, 0, 0, 0, 0}, 1e-6},
		{6, 2, []complex128{-1 + 1i, -1 - 1i, -1 + 1i, -1 - 1i, -1 + 1i, -1 - 1i}, 1e-6},
		{7, 3, []complex128{-1, -1, -1, -1, -1, -1, -1}, 1e-3},
	} {
		for trial := 0; trial < 5; trial++ {
			a, b := gaussian(random, c.n, c.n), gaussian(random, c.n, c.m)
			got, err := AssignRobust(context.Background(), a, b, c.poles, 1)
			if err != nil {
				t.Errorf("%d states, %d inputs, %v: %v", c.n, c.m, c.poles, err)
				continue
			}
			closed := closedPoles(t, a, b, got.K)
			if gap := coefficientGap(c.poles, closed); gap > 1e-10 {
				t.Errorf("%d states, %d inputs, %v: polynomial off by %g", c.n, c.m, c.poles, gap)
			}
			if off := worstMatch(c.poles, closed); off > c.limit {
				t.Errorf("%d states, %d inputs, %v: poles off by %g: %v", c.n, c.m, c.poles, off, got.Certificate.Notes)
			}
			if !math.IsInf(got.Sensitivity, 1) {
				t.Errorf("a loop that must be defective has κ = %g", got.Sensitivity)
			}
		}
	}
}

// Four states with controllability indices 3 and 1 cannot have two double
// poles and a full set of eigenvectors (H. H. Rosenbrock 1970); they must
// still be assigned.
func TestPolesThatForbidFullEigenvectors(t *testing.T) {
	a := mat.NewDense(4, 4, []float64{0, 1, 0, 0, 0, 0, 1, 0, 1, 2, 3, 1, 1, 0, 1, 2})
	b := mat.NewDense(4, 2, []float64{0, 0, 0, 0, 1, 0, 0, 1})
	poles := []complex128{-1, -1, -2, -2}
	got, err := AssignRobust(context.Background(), a, b, poles, 1)
	if err != nil {
		t.Fatal(err)
	}
	closed := closedPoles(t, a, b, got.K)
	if gap := coefficientGap(poles, closed); gap > 1e-12 {
		t.Errorf("polynomial off by %g: %v", gap, closed)
	}
}

func TestPlacementDegenerateInputs(t *testing.T) {
	random := rand.New(rand.NewSource(3))
	ctx := context.Background()
	poles := []complex128{-1, -2 + 1i, -2 - 1i, -3}
	a := gaussian(random, 4, 4)
	column := gaussian(random, 4, 1)
	second := gaussian(random, 4, 1)
	join := func(columns ...*mat.Dense) *mat.Dense {
		out := mat.NewDense(4, len(columns), nil)
		for j, c := range columns {
			for i := 0; i < 4; i++ {
				out.Set(i, j, c.At(i, 0))
			}
		}
		return out
	}
	zero := mat.NewDense(4, 1, nil)
	var doubled, mixed mat.Dense
	doubled.Scale(-2, column)
	mixed.Add(column, second)
	for name, b := range map[string]*mat.Dense{
		"proportional columns":     join(column, &doubled),
		"a zero column":            join(column, zero, second),
		"dependent columns":        join(column, second, &mixed),
		"as many as states":        gaussian(random, 4, 4),
		"more inputs than states":  gaussian(random, 4, 6),
		"inputs of unlike size":    scaledColumns(gaussian(random, 4, 3), 1e-9, 1, 1e9),
		"more inputs, rank three":  join(column, second, gaussian(random, 4, 1), &mixed, &doubled),
		"one input in five copies": join(column, column, column, column, column),
	} {
		got, err := AssignRobust(ctx, a, b, poles, 1)
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if off := worstMatch(poles, closedPoles(t, a, b, got.K)); off > 1e-11 {
			t.Errorf("%s: poles off by %g", name, off)
		}
		if name == "as many as states" && math.Abs(got.Sensitivity-1) > 1e-10 {
			t.Errorf("full freedom must give κ = 1, not %g", got.Sensitivity)
		}
	}
	var refusal *Refusal
	if _, err := AssignRobust(ctx, a, join(zero, zero), poles, 1); !errors.As(err, &refusal) || len(refusal.Modes) != 4 {
		t.Errorf("no input at all: want a refusal with four modes, got %v", err)
	}
	one, err := AssignRobust(ctx, mat.NewDense(1, 1, []float64{3}), mat.NewDense(1, 1, []float64{2}), []complex128{-1}, 1)
	if err != nil || math.Abs(one.K.At(0, 0)-2) > 1e-15 {
		t.Errorf("one state: %v, %v", one, err)
	}
}

func scaledColumns(m *mat.Dense, factors ...float64) *mat.Dense {
	rows, _ := m.Dims()
	for j, f := range factors {
		for i := 0; i < rows; i++ {
			m.Set(i, j, m.At(i, j)*f)
		}
	}
	return m
}

func TestPlacementRefusals(t *testing.T) {
	ctx := context.Background()
	a, b := mat.NewDense(3, 3, []float64{1, 0, 0, 0, -2, 1, 0, 0, -3}), mat.NewDense(3, 1, []float64{0, 1, 1})
	var refusal *Refusal
	if _, err := AssignOneInput(a, b, []complex128{-1, -2, -3}); !errors.As(err, &refusal) || len(refusal.Modes) != 1 || cmplx.Abs(refusal.Modes[0]-1) > 1e-14 {
		t.Errorf("the mode at 1 must be named, got %v", err)
	}
	if got, err := AssignOneInput(a, b, []complex128{-5, 1, -6}); err != nil || worstMatch([]complex128{-5, 1, -6}, got.Poles) > 1e-12 || len(got.Kept) != 1 {
		t.Errorf("the mode at 1 is among the wanted poles: %v, %v", got, err)
	}
	if _, err := AssignRobust(ctx, a, b, []complex128{1, -2 + 1i, -2 - 1.5i}, 1); !errors.As(err, &refusal) || len(refusal.Modes) != 2 {
		t.Errorf("an unpaired complex pole must be refused by name, got %v", err)
	}
	for name, f := range map[string]func() error{
		"two poles of three": func() error { _, err := AssignRobust(ctx, a, b, []complex128{1, 2}, 1); return err },
		"pole not finite": func() error {
			_, err := AssignRobust(ctx, a, b, []complex128{1, 2, cmplx.Inf()}, 1)
			return err
		},
		"A not finite": func() error {
			_, err := AssignRobust(ctx, mat.NewDense(1, 1, []float64{math.NaN()}), mat.NewDense(1, 1, nil), []complex128{1}, 1)
			return err
		},
		"shapes": func() error {
			_, err := AssignRobust(ctx, a, mat.NewDense(2, 1, nil), []complex128{1, 2, 3}, 1)
			return err
		},
		"two inputs to one": func() error { _, err := AssignOneInput(a, mat.NewDense(3, 2, nil), []complex128{1, 2, 3}); return err },
		"no state":          func() error { _, err := AssignRobust(ctx, nil, nil, nil, 1); return err },
	} {
		if f() == nil {
			t.Errorf("%s: want an error", name)
		}
	}
	cancelled, cancel := context.WithCancel(ctx)
	cancel()
	random := rand.New(rand.NewSource(5))
	if _, err := AssignRobust(cancelled, gaussian(random, 6, 6), gaussian(random, 6, 2), []complex128{-1, -2, -3, -4, -5, -6}, 1); !errors.Is(err, context.Canceled) {
		t.Errorf("a cancelled context must stop the ascent, got %v", err)
	}
}

// The same seed gives the same bits, and an orthogonal change of states leaves
// κ what it was.
func TestPlacementSeedAndInvariance(t *testing.T) {
	random := rand.New(rand.NewSource(11))
	a, b := gaussian(random, 6, 6), gaussian(random, 6, 2)
	poles := []complex128{-1, -2, -1 + 2i, -1 - 2i, -3 + 1i, -3 - 1i}
	first, err := AssignRobust(context.Background(), a, b, poles, 9)
	if err != nil {
		t.Fatal(err)
	}
	second, _ := AssignRobust(context.Background(), a, b, poles, 9)
	if !mat.Equal(first.K, second.K) {
		t.Error("the same seed gave another gain")
	}
	var qr mat.QR
	qr.Factorize(gaussian(random, 6, 6))
	var q, turned, input mat.Dense
	qr.QTo(&q)
	turned.Mul(q.T(), a)
	turned.Mul(&turned, &q)
	input.Mul(q.T(), b)
	third, err := AssignRobust(context.Background(), &turned, &input, poles, 9)
	if err != nil {
		t.Fatal(err)
	}
	if ratio := third.Sensitivity / first.Sensitivity; ratio > 1.02 || ratio < 0.98 {
		t.Errorf("κ %g before and %g after an orthogonal change of states", first.Sensitivity, third.Sensitivity)
	}
}

// exactOneInputGain is J. Ackermann's formula over the rationals (Regelungstechnik
// 1972): the last row of the inverse reachability matrix times p(A), for the very
// binary64 numbers given.
func exactOneInputGain(a, b *mat.Dense, poles []float64) []*big.Rat {
	n, _ := a.Dims()
	rational := func(v float64) *big.Rat { return new(big.Rat).SetFloat64(v) }
	// Rows of the system Cᵀ·y = e_n: row i is (Aⁱb)ᵀ.
	rows := make([][]*big.Rat, n)
	column := make([]*big.Rat, n)
	for i := range column {
		column[i] = rational(b.At(i, 0))
	}
	for k := 0; k < n; k++ {
		rows[k] = append(append([]*big.Rat(nil), column...), rational(0))
		next := make([]*big.Rat, n)
		for i := range next {
			next[i] = new(big.Rat)
			for j := range column {
				next[i].Add(next[i], new(big.Rat).Mul(rational(a.At(i, j)), column[j]))
			}
		}
		column = next
	}
	rows[n-1][n] = rational(1)
	for k := 0; k < n; k++ {
		pivot := k
		for pivot < n && rows[pivot][k].Sign() == 0 {
			pivot++
		}
		if pivot == n {
			return nil
		}
		rows[k], rows[pivot] = rows[pivot], rows[k]
		for i := 0; i < n; i++ {
			if i == k || rows[i][k].Sign() == 0 {
				continue
			}
			f := new(big.Rat).Quo(rows[i][k], rows[k][k])
			for j := k; j <= n; j++ {
				rows[i][j] = new(big.Rat).Sub(rows[i][j], new(big.Rat).Mul(f, rows[k][j]))
			}
		}
	}
	y := make([]*big.Rat, n)
	for i := range y {
		y[i] = new(big.Rat).Quo(rows[i][n], rows[i][i])
	}
	for _, p := range poles { // y ← y·(A − pI)
		next := make([]*big.Rat, n)
		for j := range next {
			next[j] = new(big.Rat).Neg(new(big.Rat).Mul(rational(p), y[j]))
			for i := range y {
				next[j].Add(next[j], new(big.Rat).Mul(y[i], rational(a.At(i, j))))
			}
		}
		y = next
	}
	return y
}

// The claimed digits of the one-input gain against the exact gain: never more
// than one too many, over random problems of graded conditioning.
func TestOneInputDigitsAreHonest(t *testing.T) {
	random := rand.New(rand.NewSource(1994))
	worst, modest, cases := 0.0, 0.0, 0
	for trial := 0; trial < 240; trial++ {
		n := 2 + random.Intn(6)
		grade := math.Pow(10, -3*random.Float64())
		a, b := gaussian(random, n, n), gaussian(random, n, 1)
		switch trial % 3 {
		case 1: // weakly coupled states
			for i := 0; i < n; i++ {
				for j := 0; j < n; j++ {
					if i != j {
						a.Set(i, j, a.At(i, j)*grade)
					}
				}
				b.Set(i, 0, b.At(i, 0)*math.Pow(grade, random.Float64()))
			}
		case 2: // poles far away, states close together
			for i := 0; i < n; i++ {
				for j := 0; j < n; j++ {
					a.Set(i, j, a.At(i, j)*grade)
				}
				a.Set(i, i, 1+a.At(i, i))
			}
		}
		poles, wanted := make([]float64, n), make([]complex128, n)
		for i := range poles {
			poles[i] = -float64(1+random.Intn(9)) / 2
			if trial%4 == 0 {
				poles[i] = -2
			}
			wanted[i] = complex(poles[i], 0)
		}
		exact := exactOneInputGain(a, b, poles)
		got, err := AssignOneInput(a, b, wanted)
		if err != nil || exact == nil {
			continue // numerically unreachable: refused
		}
		cases++
		off, largest := new(big.Rat), new(big.Rat)
		for i, k := range exact {
			gap := new(big.Rat).Sub(k, new(big.Rat).SetFloat64(got.K.At(0, i)))
			if gap.Abs(gap).Cmp(off) > 0 {
				off = gap
			}
			if size := new(big.Rat).Abs(k); size.Cmp(largest) > 0 {
				largest = size
			}
		}
		e, _ := off.Quo(off, largest).Float64()
		truth := math.Min(mostDigits, -math.Log10(math.Max(e, 1e-300)))
		excess := got.Certificate.Digits - truth
		worst, modest = math.Max(worst, excess), modest-excess
		if excess > 1 {
			t.Errorf("trial %d, n = %d: %.1f digits claimed, %.1f hold (condition %.1e)", trial, n, got.Certificate.Digits, truth, got.Certificate.Condition)
		}
	}
	t.Logf("%d cases: at most %.2f digits too many, on average %.2f too few", cases, worst, modest/float64(cases))
	if cases < 200 {
		t.Errorf("only %d cases were judged", cases)
	}
}

// States in units that differ by many powers of ten, with modes that no input
// moves: the wanted poles are reached all the same, and the modes kept.
func TestPlacementInOtherUnitsWithKeptModes(t *testing.T) {
	random := rand.New(rand.NewSource(15))
	for trial := 0; trial < 40; trial++ {
		reached, hidden, inputs := 3+random.Intn(3), random.Intn(3), 1+random.Intn(3)
		a, b, modes := hiddenPair(random, reached, hidden, inputs)
		n := reached + hidden
		a, b, _, _ = rescaled(random, a, b, mat.NewDense(1, n, nil), mat.NewDense(1, inputs, nil), float64(trial%5))
		poles := append([]complex128{-2 + 1i, -2 - 1i}, modes...)
		for len(poles) < n {
			poles = append(poles, complex(-float64(len(poles)), 0))
		}
		got, err := AssignRobust(context.Background(), a, b, poles, 1)
		if err != nil {
			t.Errorf("trial %d: %v", trial, err)
			continue
		}
		if len(got.Kept) != hidden {
			t.Errorf("trial %d: kept %v, want %v", trial, got.Kept, modes)
		}
		if off := worstMatch(poles, closedPoles(t, a, b, got.K)); off > 1e-7 {
			t.Errorf("trial %d (%d+%d states, %d inputs): poles off by %g, %v", trial, reached, hidden, inputs, off, got.Certificate)
		}
		if off := worstMatch(poles, got.Poles); off > 1e-7 {
			t.Errorf("trial %d: reported poles off by %g", trial, off)
		}
	}
}
