package exact

import (
	"errors"
	"math"
	"math/big"
	"testing"
)

func TestShapesWithoutEntries(t *testing.T) {
	none := NewMatrix(0, 0)
	if d, err := none.Determinant(); err != nil || d.Cmp(ratOne) != 0 {
		t.Errorf("determinant %v %v, want 1", d, err)
	}
	checkPolynomial(t, "0×0", none.CharacteristicPolynomial(), PolynomialOfIntegers(1))
	inverse, err := none.Inverse()
	checkMatrix(t, "inverse", inverse, err, none)
	if trace, err := none.Trace(); err != nil || trace.Sign() != 0 {
		t.Errorf("trace %v %v", trace, err)
	}
	wide, tall := NewMatrix(0, 3), NewMatrix(3, 0)
	checkMatrix(t, "3×0 times 0×3", must(tall.Mul(wide)), nil, NewMatrix(3, 3))
	checkMatrix(t, "0×3 times 3×0", must(wide.Mul(tall)), nil, none)
	checkMatrix(t, "kernel of 0×3", wide.Kernel(), nil, Identity(3))
	checkMatrix(t, "kernel of 3×0", tall.Kernel(), nil, none)
	checkMatrix(t, "image of 3×0", tall.Image(), nil, tall)
	if wide.Rank() != 0 || tall.Rank() != 0 || !wide.IsZero() || !wide.Transpose().Equal(tall) {
		t.Error("rank, zero test or transpose of a matrix without entries")
	}
	if _, err := wide.Solve(NewMatrix(0, 2)); !errors.As(err, new(*UnderdeterminedError)) {
		t.Errorf("no equations in three unknowns: %v", err)
	}
	if _, err := tall.Solve(NewMatrix(3, 1)); err != nil {
		t.Errorf("three equations 0 = 0: %v", err)
	}
	if _, err := tall.Solve(ints(3, 1, 0, 1, 0)); err != ErrInconsistent {
		t.Errorf("0 = 1: %v", err)
	}
}

func TestPlantsWithoutStatesInputsOrOutputs(t *testing.T) {
	for n := range 3 {
		for m := range 3 {
			for p := range 3 {
				a, b, c, d := NewMatrix(n, n), NewMatrix(n, m), NewMatrix(p, n), NewMatrix(p, m)
				for i := range min(p, m) {
					d.Set(i, i, ratOne)
				}
				s, err := KalmanSplit(a, b, c)
				if err != nil || s.Sizes != [4]int{0, 0, 0, n} {
					t.Errorf("n=%d m=%d p=%d: %v %v", n, m, p, s, err)
				}
				split, err := ReachableSplit(a, b)
				if err != nil || split.Rank != 0 || split.Missing.Degree() != n || len(split.Indices) != m {
					t.Errorf("n=%d m=%d: %v %v", n, m, split, err)
				}
				z, err := InvariantZeros(a, b, c, d)
				if err != nil || z.NormalRank != min(m, p) || z.Singular {
					t.Errorf("n=%d m=%d p=%d: zeros %v %v", n, m, p, z, err)
				}
				g, err := Transfer(a, b, c, d)
				if err != nil || len(g) != p {
					t.Errorf("n=%d m=%d p=%d: transfer %v %v", n, m, p, g, err)
				}
				ar, br, cr, dr, err := Realize(g)
				if err != nil || ar.rows != 0 || p > 0 && (br.cols != m || !dr.Equal(d)) || cr.rows != p {
					t.Errorf("n=%d m=%d p=%d: realized %v %v %v %v %v", n, m, p, ar, br, cr, dr, err)
				}
				if _, err := ReachabilityMatrix(a, b); err != nil {
					t.Error(err)
				}
				if _, err := ObservabilityMatrix(a, c); err != nil {
					t.Error(err)
				}
			}
		}
	}
	k, err := BassGura(NewMatrix(0, 0), NewMatrix(0, 1), PolynomialOfIntegers(1))
	checkMatrix(t, "gain without states", k, err, NewMatrix(1, 0))
	k, err = Ackermann(NewMatrix(0, 0), NewMatrix(0, 1), PolynomialOfIntegers(1))
	checkMatrix(t, "gain without states", k, err, NewMatrix(1, 0))
	k, err = AssignReachable(NewMatrix(2, 2), NewMatrix(2, 1), PolynomialOfIntegers(1, 0, 0))
	checkMatrix(t, "nothing reached, nothing wanted", k, err, NewMatrix(1, 2))
	if f, err := ControllerForm(NewMatrix(0, 0), NewMatrix(0, 1)); err != nil || f.A.rows != 0 {
		t.Errorf("controller form without states: %v %v", f, err)
	}
}

func TestZeroAndNilpotentMatrices(t *testing.T) {
	for n := 1; n <= 7; n++ {
		zero, chain := NewMatrix(n, n), companion(PolynomialOfIntegers(append([]int64{1}, make([]int64, n)...)...))
		for _, m := range []*Matrix{zero, chain} {
			p := m.CharacteristicPolynomial()
			if p.Degree() != n || p.Coefficient(n-1).Sign() != 0 || p.Coefficient(0).Sign() != 0 {
				t.Errorf("characteristic polynomial %v", p)
			}
			if _, err := m.Inverse(); err != ErrSingular {
				t.Errorf("inverse of a nilpotent matrix: %v", err)
			}
			if d, err := m.Determinant(); err != nil || d.Sign() != 0 {
				t.Errorf("determinant %v %v", d, err)
			}
			roots, err := p.Roots(17)
			if err != nil || len(roots) != 1 || roots[0].Multiplicity != n || !roots[0].Exact || roots[0].Value != 0 {
				t.Errorf("roots of sⁿ: %v %v", roots, err)
			}
		}
		if power, err := chain.Power(n); err != nil || !power.IsZero() {
			t.Errorf("nilpotent power %v %v", power, err)
		}
		sizes, ok, err := JordanSizes(chain, PolynomialOfIntegers(1, 0))
		if err != nil || !ok || len(sizes) != 1 || sizes[0] != n {
			t.Errorf("chain of length %d: %v %v %v", n, sizes, ok, err)
		}
		sizes, ok, err = JordanSizes(zero, PolynomialOfIntegers(1, 0))
		if err != nil || !ok || len(sizes) != n || sizes[0] != 1 {
			t.Errorf("zero matrix: %v %v %v", sizes, ok, err)
		}
	}
}

func TestZeroPolynomialAndConstants(t *testing.T) {
	var zero Polynomial
	one := PolynomialOfIntegers(1)
	if zero.Degree() != -1 || zero.Lead().Sign() != 0 || !zero.Equal(NewPolynomial(ratZero, ratZero)) || len(zero.Coefficients()) != 0 {
		t.Error("the zero polynomial")
	}
	if _, _, err := one.DivMod(zero); err != ErrZeroDivision {
		t.Errorf("division by zero: %v", err)
	}
	if _, err := NewRational(one, zero); err != ErrZeroDivision {
		t.Errorf("zero denominator: %v", err)
	}
	for _, p := range []Polynomial{zero, one, PolynomialOfIntegers(-7)} {
		roots, err := p.Roots(17)
		factors, complete := p.Factorize()
		if err != nil || len(roots) != 0 || len(factors) != 0 || !complete || len(p.SquareFree()) != 0 || len(p.RationalRoots()) != 0 {
			t.Errorf("%v: roots %v %v, factors %v", p, roots, err, factors)
		}
		if !p.Derivative().IsZero() || !zero.Mul(p).IsZero() || !p.Gcd(zero).Equal(p.Monic()) || p.RealRootsBetween(nil, nil) != 0 {
			t.Errorf("%v: derivative, product, common divisor or root count", p)
		}
	}
	if _, err := NewRouthTable(zero); err == nil {
		t.Error("a Routh table of the zero polynomial")
	}
	if _, err := NewJuryTable(zero); err == nil {
		t.Error("a Jury table of the zero polynomial")
	}
	if table, err := NewRouthTable(one); err != nil || !table.Stable() {
		t.Errorf("a constant has no unstable root: %v %v", table, err)
	}
	if table, err := NewJuryTable(one); err != nil || !table.Stable() {
		t.Errorf("a constant has no unstable root: %v %v", table, err)
	}
	if p, err := zero.Power(0); err != nil || !p.Equal(one) {
		t.Errorf("0⁰ = %v %v", p, err)
	}
}

func TestWrongShapesAreErrors(t *testing.T) {
	a, b := NewMatrix(2, 3), NewMatrix(2, 2)
	for name, f := range map[string]func() error{
		"add":         func() error { _, err := a.Add(b); return err },
		"subtract":    func() error { _, err := a.Sub(b); return err },
		"multiply":    func() error { _, err := a.Mul(b); return err },
		"hadamard":    func() error { _, err := a.Hadamard(b); return err },
		"stack":       func() error { _, err := Stack(a, b); return err },
		"augment":     func() error { _, err := Augment(a, NewMatrix(3, 1)); return err },
		"solve":       func() error { _, err := a.Solve(NewMatrix(3, 1)); return err },
		"inverse":     func() error { _, err := a.Inverse(); return err },
		"determinant": func() error { _, err := a.Determinant(); return err },
		"trace":       func() error { _, err := a.Trace(); return err },
		"power":       func() error { _, err := a.Power(2); return err },
		"evaluate":    func() error { _, err := PolynomialOfIntegers(1, 0).EvalMatrix(a); return err },
		"reach":       func() error { _, err := ReachabilityMatrix(b, NewMatrix(3, 1)); return err },
		"observe":     func() error { _, err := ObservabilityMatrix(b, NewMatrix(1, 3)); return err },
		"split":       func() error { _, err := KalmanSplit(b, NewMatrix(2, 1), NewMatrix(1, 3)); return err },
		"transfer":    func() error { _, err := Transfer(b, b, b, NewMatrix(2, 1)); return err },
		"zeros":       func() error { _, err := InvariantZeros(b, b, b, NewMatrix(1, 2)); return err },
		"two inputs":  func() error { _, err := BassGura(b, b, PolynomialOfIntegers(1, 0, 0)); return err },
		"jordan":      func() error { _, _, err := JordanSizes(a, PolynomialOfIntegers(1, 0)); return err },
	} {
		var size *SizeError
		if err := f(); !errors.As(err, &size) || size.Error() == "" {
			t.Errorf("%s: %v, want an error that carries the shapes", name, err)
		}
	}
	var wanted *WantedError
	if _, err := BassGura(b, NewMatrix(2, 1), PolynomialOfIntegers(1, 0)); !errors.As(err, &wanted) || wanted.Degree != 1 || wanted.States != 2 {
		t.Errorf("too few poles: %v", err)
	}
	var improper *ImproperError
	entry, _ := NewRational(PolynomialOfIntegers(1, 0, 0), PolynomialOfIntegers(1, 1))
	if _, _, _, _, err := Realize([][]Rational{{entry}}); !errors.As(err, &improper) {
		t.Errorf("an improper entry: %v", err)
	}
}

func TestConstructorsRefuseBadData(t *testing.T) {
	for _, x := range []float64{math.NaN(), math.Inf(1), math.Inf(-1)} {
		if _, err := FromFloats(1, 2, []float64{0, x}); err == nil {
			t.Errorf("%v was taken", x)
		}
	}
	if _, err := FromFloats(2, 2, []float64{1}); err == nil {
		t.Error("one number filled four places")
	}
	if _, err := FromRows([][]*big.Rat{{ratOne}, {ratOne, ratOne}}); err == nil {
		t.Error("rows of unequal length were taken")
	}
	if _, err := FromRows([][]*big.Rat{{nil}}); err == nil {
		t.Error("a missing entry was taken")
	}
	x := big.NewRat(1, 3)
	m, p := Column(x), NewPolynomial(x)
	x.SetInt64(5)
	if m.At(0, 0).Cmp(big.NewRat(1, 3)) != 0 || p.Lead().Cmp(big.NewRat(1, 3)) != 0 {
		t.Error("a constructor kept the caller's number")
	}
	f, err := FromFloats(1, 3, []float64{0.1, math.MaxFloat64, 5e-324})
	if err != nil || f.Float64()[0] != 0.1 || f.Float64()[1] != math.MaxFloat64 || f.Float64()[2] != 5e-324 {
		t.Errorf("binary64 values did not survive: %v %v", f, err)
	}
}

func TestHugeResultsAreRefused(t *testing.T) {
	huge := new(big.Rat).SetInt(new(big.Int).Lsh(big.NewInt(1), 600_000))
	m := Diagonal(huge, huge)
	for name, f := range map[string]func() error{
		"product":     func() error { _, err := m.Mul(m); return err },
		"power":       func() error { _, err := ints(1, 1, 9).Power(1 << 40); return err },
		"determinant": func() error { _, err := m.Determinant(); return err },
		"inverse":     func() error { _, err := m.Inverse(); return err },
		"kronecker":   func() error { _, err := m.Kronecker(m); return err },
		"check":       m.CheckSize,
		"polynomial":  func() error { _, err := PolynomialOfIntegers(1, 1).Power(1 << 40); return err },
		"composition": func() error { _, err := NewPolynomial(huge, huge).Compose(NewPolynomial(huge, huge)); return err },
		"gain":        func() error { _, err := BassGura(m, Column(ratOne, ratOne), PolynomialOfIntegers(1, 0, 0)); return err },
		"reach":       func() error { _, err := ReachableSplit(m, Column(huge, ratOne)); return err },
		"routh":       func() error { _, err := NewRouthTable(NewPolynomial(huge, huge, huge, huge)); return err },
	} {
		if err := f(); !errors.Is(err, ErrTooLarge) {
			t.Errorf("%s: %v, want a refusal", name, err)
		}
	}
	if _, err := Identity(2).Power(math.MinInt); err != nil {
		t.Errorf("a power of the identity: %v", err)
	}
	if p, err := PolynomialOfIntegers(1).Power(math.MaxInt); err != nil || !p.Equal(PolynomialOfIntegers(1)) {
		t.Errorf("a power of one: %v %v", p, err)
	}
}
