package numeric

import (
	"encoding/json"
	"fmt"
	"math"
	"math/cmplx"
	"math/rand"
	"slices"
	"testing"

	"gonum.org/v1/gonum/mat"
)

func TestPublishedReachability(t *testing.T) {
	for _, c := range structureCases(t, "reach-") {
		a, b := matrixOf(t, c.Inputs["A"]), matrixOf(t, c.Inputs["B"])
		for name, decide := range map[string]func(a, b *mat.Dense, tol float64) (*StaircaseForm, error){"balanced": Reachability, "as it stands": Staircase} {
			form, err := decide(a, b, 0)
			if err != nil {
				t.Fatal(err)
			}
			if float64(form.Rank) != numberOf(t, c.Expect["rank"]) {
				t.Errorf("%s, %s: rank %d", c.ID, name, form.Rank)
			}
			if e := worstMatch(complexList(t, c.Expect["unreachable_modes"], false), form.Missing); e > 1e-12 {
				t.Errorf("%s, %s: missing modes %v", c.ID, name, form.Missing)
			}
			if raw := c.Expect["controllability_indices"]; raw != nil {
				var want []int
				if err := json.Unmarshal(raw, &want); err != nil || !slices.Equal(want, form.Indices) {
					t.Errorf("%s, %s: indices %v, want %v", c.ID, name, form.Indices, want)
				}
			}
			checkStaircase(t, c.ID, a, b, form)
		}
	}
}

// checkStaircase verifies T·A = Ā·T, T·B = B̄, the zero blocks and the sums.
func checkStaircase(t *testing.T, name string, a, b *mat.Dense, form *StaircaseForm) {
	t.Helper()
	n, m := b.Dims()
	var left, right, input, unit mat.Dense
	left.Mul(form.T, a)
	right.Mul(form.A, form.T)
	input.Mul(form.T, b)
	unit.Mul(form.T, form.Inverse)
	size := mat.Norm(a, 2) + mat.Norm(b, 2)
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			if math.Abs(left.At(i, j)-right.At(i, j)) > 1e-12*size*mat.Norm(form.T, 2) {
				t.Fatalf("%s: T·A − Ā·T is not small", name)
			}
			want := 0.0
			if i == j {
				want = 1
			}
			if math.Abs(unit.At(i, j)-want) > 1e-12 {
				t.Fatalf("%s: T and its inverse do not fit", name)
			}
		}
		for j := 0; j < m; j++ {
			if math.Abs(input.At(i, j)-form.B.At(i, j)) > 1e-12*size*mat.Norm(form.T, 2) {
				t.Fatalf("%s: T·B − B̄ is not small", name)
			}
		}
	}
	for i := form.Rank; i < n; i++ {
		for j := 0; j < form.Rank; j++ {
			if form.A.At(i, j) != 0 {
				t.Fatalf("%s: the unreached part is acted on", name)
			}
		}
	}
	sum := 0
	for _, k := range form.Indices {
		sum += k
	}
	if sum != form.Rank || len(form.Missing) != n-form.Rank {
		t.Fatalf("%s: indices %v and %d missing modes do not fit the rank %d", name, form.Indices, len(form.Missing), form.Rank)
	}
}

func TestPublishedObservability(t *testing.T) {
	for _, c := range structureCases(t, "obs-") {
		form, err := Observability(matrixOf(t, c.Inputs["A"]), matrixOf(t, c.Inputs["C"]), 0)
		if err != nil {
			t.Fatal(err)
		}
		if float64(form.Rank) != numberOf(t, c.Expect["rank"]) {
			t.Errorf("%s: rank %d", c.ID, form.Rank)
		}
		if e := worstMatch(complexList(t, c.Expect["unobservable_modes"], false), form.Missing); e > 1e-12 {
			t.Errorf("%s: missing modes %v", c.ID, form.Missing)
		}
		var output mat.Dense
		output.Mul(form.C, form.T)
		if e := largestEntryError(matrixOf(t, c.Inputs["C"]), &output); e > 1e-14 {
			t.Errorf("%s: C̄·T differs from C by %g", c.ID, e)
		}
	}
}

// hiddenPair builds a pair whose last modes no input moves, turned by a random
// well-conditioned change of states.
func hiddenPair(random *rand.Rand, reached, hidden, inputs int) (a, b *mat.Dense, modes []complex128) {
	n := reached + hidden
	a, b = mat.NewDense(n, n, nil), mat.NewDense(n, inputs, nil)
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			if i < reached || j >= i {
				a.Set(i, j, random.NormFloat64())
			}
		}
		for j := 0; j < inputs && i < reached; j++ {
			b.Set(i, j, random.NormFloat64())
		}
	}
	for k := 0; k < hidden; k++ {
		a.Set(reached+k, reached+k, float64(k+2))
		modes = append(modes, complex(float64(k+2), 0))
	}
	x := gaussian(random, n, n)
	for i := 0; i < n; i++ {
		x.Set(i, i, x.At(i, i)+float64(n))
	}
	var inverse mat.Dense
	_ = inverse.Inverse(x)
	a.Mul(x, a)
	a.Mul(a, &inverse)
	b.Mul(x, b)
	return a, b, modes
}

// Duality and invariance: the verdict of (A, B) is that of (Aᵀ, Bᵀ) as outputs,
// and a change of units of the states by up to ten powers of ten leaves it.
func TestReachabilityDualityAndUnits(t *testing.T) {
	random := rand.New(rand.NewSource(21))
	for trial := 0; trial < 60; trial++ {
		reached, hidden, inputs := 1+random.Intn(6), random.Intn(4), 1+random.Intn(3)
		a, b, modes := hiddenPair(random, reached, hidden, inputs)
		form, err := Reachability(a, b, 0)
		if err != nil {
			t.Fatal(err)
		}
		name := fmt.Sprintf("trial %d (%d+%d states, %d inputs)", trial, reached, hidden, inputs)
		if form.Rank != reached || worstMatch(modes, form.Missing) > 1e-8 {
			t.Errorf("%s: rank %d, missing %v; gap %g / %g", name, form.Rank, form.Missing, form.Above, form.Below)
			continue
		}
		for i, j := range matchPoles(modes, form.Missing) {
			if gap := cmplx.Abs(modes[i] - form.Missing[j]); gap > 100*form.MissingError[j] {
				t.Errorf("%s: mode %v off by %g, claimed %g", name, modes[i], gap, form.MissingError[j])
			}
		}
		checkStaircase(t, name, a, b, form)
		dual, err := Observability(transposed(a), transposed(b), 0)
		if err != nil || dual.Rank != form.Rank || !slices.Equal(dual.Indices, form.Indices) {
			t.Errorf("%s: the dual says rank %d, indices %v", name, dual.Rank, dual.Indices)
		}
		n, _ := a.Dims()
		scaledA, scaledB, _, _ := rescaled(random, a, b, mat.NewDense(1, n, nil), mat.NewDense(1, inputs, nil), 5)
		again, err := Reachability(scaledA, scaledB, 0)
		if err != nil || again.Rank != form.Rank || !slices.Equal(again.Indices, form.Indices) {
			t.Errorf("%s: in other units rank %d, indices %v (gap %g / %g)", name, again.Rank, again.Indices, again.Above, again.Below)
		}
	}
}

// The rank of the reachability matrix decides wrongly here in floating point,
// the staircase form does not: a bidiagonal pair of 20 states (invented), and
// C. C. Paige's diagonal of powers of 1/2 with n = 10 (IEEE Trans. Autom. Control 26, 1981).
func TestStaircaseWherePowersFail(t *testing.T) {
	n := 20
	a, b := mat.NewDense(n, n, nil), mat.NewDense(n, 1, nil)
	for i := 0; i < n; i++ {
		a.Set(i, i, float64(i+1))
		if i+1 < n {
			a.Set(i, i+1, 1)
		}
	}
	b.Set(n-1, 0, 1)
	form, err := Reachability(a, b, 0)
	if err != nil || form.Rank != n {
		t.Errorf("bidiagonal: rank %d, %v", form.Rank, err)
	}
	a, b = mat.NewDense(10, 10, nil), mat.NewDense(10, 1, nil)
	for i := 0; i < 10; i++ {
		a.Set(i, i, math.Ldexp(1, -i))
		b.Set(i, 0, 1)
	}
	if form, err = Reachability(a, b, 0); err != nil || form.Rank != 10 {
		t.Errorf("powers of 1/2: rank %d, gap %g, %v", form.Rank, form.Above, err)
	}
}

func TestPublishedKalmanSplit(t *testing.T) {
	for _, c := range structureCases(t, "kalman-4") {
		a, b, out := matrixOf(t, c.Inputs["A"]), matrixOf(t, c.Inputs["B"]), matrixOf(t, c.Inputs["C"])
		split, err := KalmanSplit(a, b, out)
		if err != nil {
			t.Fatal(err)
		}
		var modes map[string][]float64
		if err := json.Unmarshal(c.Expect["modes"], &modes); err != nil {
			t.Fatal(err)
		}
		for k, part := range []string{"reachable_observable", "reachable_unobservable", "unreachable_observable", "unreachable_unobservable"} {
			if float64(split.Sizes[k]) != numberOf(t, c.Expect[part]) {
				t.Fatalf("%s: sizes %v", c.ID, split.Sizes)
			}
			var want []complex128
			for _, v := range modes[part] {
				want = append(want, complex(v, 0))
			}
			if e := worstMatch(want, split.Poles[k]); e > 1e-12 {
				t.Errorf("%s: %s has poles %v", c.ID, part, split.Poles[k])
			}
		}
		checkSplit(t, c.ID, a, b, out, split)
		// The part that remains is 1/(s + 1).
		if gain := split.C.At(0, 0) * split.B.At(0, 0); math.Abs(gain-1) > 1e-12 || math.Abs(split.A.At(0, 0)+1) > 1e-12 {
			t.Errorf("%s: the minimal part is %g/(s − %g)", c.ID, gain, split.A.At(0, 0))
		}
	}
}

func checkSplit(t *testing.T, name string, a, b, c *mat.Dense, split *Split) {
	t.Helper()
	var left, right, input, output mat.Dense
	left.Mul(split.T, a)
	right.Mul(split.A, split.T)
	input.Mul(split.T, b)
	output.Mul(split.C, split.T)
	left.Sub(&left, &right)
	limit := 1e-11 * split.Certificate.Condition
	if mat.Norm(&left, 2) > limit*(1+mat.Norm(a, 2))*mat.Norm(split.T, 2) {
		t.Errorf("%s: T·A − Ā·T is %g", name, mat.Norm(&left, 2))
	}
	left.Reset()
	left.Sub(&input, split.B)
	if mat.Norm(&left, 2) > limit*(1+mat.Norm(b, 2))*mat.Norm(split.T, 2) {
		t.Errorf("%s: T·B − B̄ is %g", name, mat.Norm(&left, 2))
	}
	left.Reset()
	left.Sub(&output, c)
	if mat.Norm(&left, 2) > limit*(1+mat.Norm(c, 2)) {
		t.Errorf("%s: C̄·T − C is %g", name, mat.Norm(&left, 2))
	}
}

// Random systems put together from four parts, with couplings that the parts
// allow, turned by a random change of states.
func TestKalmanSplitOfAssembledSystems(t *testing.T) {
	random := rand.New(rand.NewSource(33))
	acts := [4][4]bool{{true, false, true, false}, {true, true, true, true}, {false, false, true, false}, {false, false, true, true}}
	for trial := 0; trial < 80; trial++ {
		sizes := [4]int{random.Intn(3), random.Intn(3), random.Intn(3), random.Intn(3)}
		n, m, p := sizes[0]+sizes[1]+sizes[2]+sizes[3], 1+random.Intn(2), 1+random.Intn(2)
		if n == 0 {
			continue
		}
		a, b, c := mat.NewDense(n, n, nil), mat.NewDense(n, m, nil), mat.NewDense(p, n, nil)
		var part []int
		var poles [4][]complex128
		for k, size := range sizes {
			for i := 0; i < size; i++ {
				part = append(part, k)
			}
		}
		for i := range part {
			for j := range part {
				if part[i] == part[j] && j > i || part[i] != part[j] && acts[part[i]][part[j]] {
					a.Set(i, j, random.NormFloat64())
				}
			}
			pole := -float64(i+1) - random.Float64()/2
			a.Set(i, i, pole)
			poles[part[i]] = append(poles[part[i]], complex(pole, 0))
			for j := 0; j < m && part[i] < 2; j++ {
				b.Set(i, j, 0.5+random.Float64())
			}
			for j := 0; j < p && part[i]%2 == 0; j++ {
				c.Set(j, i, 0.5+random.Float64())
			}
		}
		x := gaussian(random, n, n)
		var inverse mat.Dense
		if inverse.Inverse(x) != nil || mat.Cond(x, 2) > 100 {
			continue
		}
		a.Mul(x, a)
		a.Mul(a, &inverse)
		b.Mul(x, b)
		c.Mul(c, &inverse)
		name := fmt.Sprintf("trial %d, parts %v", trial, sizes)
		split, err := KalmanSplit(a, b, c)
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if split.Sizes != sizes {
			t.Errorf("%s: found %v (gap %g / %g)", name, split.Sizes, split.Above, split.Below)
			continue
		}
		for k := range poles {
			if e := worstMatch(poles[k], split.Poles[k]); e > 1e-9 {
				t.Errorf("%s: part %d has poles %v, want %v", name, k, split.Poles[k], poles[k])
			}
		}
		checkSplit(t, name, a, b, c, split)
	}
}

func TestStaircaseDegenerateShapes(t *testing.T) {
	empty, err := Reachability(nil, nil, 0)
	if err != nil || empty.Rank != 0 || len(empty.Missing) != 0 {
		t.Errorf("no states: %v, %v", empty, err)
	}
	a := mat.NewDense(2, 2, []float64{1, 2, 0, 3})
	none, err := Reachability(a, nil, 0)
	if err != nil || none.Rank != 0 || worstMatch([]complex128{1, 3}, none.Missing) > 1e-15 {
		t.Errorf("no inputs: %v, %v", none, err)
	}
	blind, err := KalmanSplit(a, mat.NewDense(2, 1, []float64{0, 1}), nil)
	if err != nil || blind.Sizes != [4]int{0, 2, 0, 0} {
		t.Errorf("no outputs: %v, %v", blind, err)
	}
	zero, err := Reachability(mat.NewDense(3, 3, nil), mat.NewDense(3, 2, nil), 0)
	if err != nil || zero.Rank != 0 || len(zero.Missing) != 3 {
		t.Errorf("all zero: %v, %v", zero, err)
	}
	nan := mat.NewDense(1, 1, []float64{math.NaN()})
	for name, f := range map[string]func() error{
		"A not finite":    func() error { _, err := Reachability(nan, nil, 0); return err },
		"B not finite":    func() error { _, err := Staircase(mat.NewDense(1, 1, nil), nan, 0); return err },
		"C not finite":    func() error { _, err := Observability(mat.NewDense(1, 1, nil), nan, 0); return err },
		"split not fit":   func() error { _, err := KalmanSplit(a, mat.NewDense(3, 1, nil), nil); return err },
		"C too wide":      func() error { _, err := KalmanSplit(a, nil, mat.NewDense(1, 3, nil)); return err },
		"A not square":    func() error { _, err := Staircase(mat.NewDense(1, 2, nil), nil, 0); return err },
		"outputs not fit": func() error { _, err := Observability(a, mat.NewDense(1, 3, nil), 0); return err },
	} {
		if f() == nil {
			t.Errorf("%s: want an error", name)
		}
	}
}
