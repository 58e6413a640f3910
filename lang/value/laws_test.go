package value

import (
	"math"
	"math/big"
	"math/rand/v2"
	"testing"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
)

func must[T any](t *testing.T) func(v T, err error) T {
	return func(v T, err error) T {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
		return v
	}
}

func randomRat(r *rand.Rand) Number { return Rat(big.NewRat(r.Int64N(2001)-1000, r.Int64N(60)+1)) }

func randomMatrix(t *testing.T, r *rand.Rand, rows, cols int, isComplex bool) *Matrix {
	t.Helper()
	items := make([]Value, rows*cols)
	for k := range items {
		items[k] = randomRat(r)
		if isComplex {
			items[k] = MakeComplex(randomRat(r), randomRat(r))
		}
	}
	return must[*Matrix](t)(scalarsMatrix(rows, cols, items))
}

// A ring's laws on every exact kind: distribution, a − a, and division undoing multiplication.
func TestExactLaws(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 5))
	value := must[Value](t)
	kinds := map[string]func() Value{
		"number":  func() Value { return randomRat(r) },
		"complex": func() Value { return MakeComplex(randomRat(r), randomRat(r)) },
		"matrix":  func() Value { return randomMatrix(t, r, 3, 3, false) },
		"complex matrix": func() Value {
			return randomMatrix(t, r, 2, 2, true)
		},
		"polynomial": func() Value {
			return ExactPolynomial("s", exact.NewPolynomial(randomRat(r).Exact, randomRat(r).Exact, randomRat(r).Exact))
		},
		"transfer": func() Value {
			num := ExactPolynomial("s", exact.NewPolynomial(randomRat(r).Exact, randomRat(r).Exact))
			den := ExactPolynomial("s", exact.NewPolynomial(big.NewRat(1, 1), randomRat(r).Exact, randomRat(r).Exact))
			return must[*Transfer](t)(RatioTransfer(num, den))
		},
	}
	for name, make := range kinds {
		for range 25 {
			a, b, c := make(), make(), make()
			left := value(Multiply(a, value(Add(b, c))))
			right := value(Add(value(Multiply(a, b)), value(Multiply(a, c))))
			if same, err := Equal(left, right); err != nil || !bool(same) {
				t.Fatalf("%s: a(b + c) differs from ab + ac (%v)", name, err)
			}
			if same, err := Equal(value(Subtract(value(Add(a, b)), b)), a); err != nil || !bool(same) {
				t.Fatalf("%s: (a + b) − b differs from a (%v)", name, err)
			}
			inverse, err := Power(b, Int(-1))
			if err != nil {
				continue // singular by chance
			}
			if same, err := Equal(value(Multiply(value(Multiply(a, b)), inverse)), a); err != nil || !bool(same) {
				t.Fatalf("%s: a·b·b⁻¹ differs from a (%v)", name, err)
			}
			cube := value(Power(a, Int(3)))
			if same, _ := Equal(cube, value(Multiply(a, value(Multiply(a, a))))); !bool(same) {
				t.Fatalf("%s: a³ differs from a·a·a", name)
			}
		}
	}
}

func TestDecimalLiteralsAddExactly(t *testing.T) {
	sum := must[Value](t)(Add(rat("0.1"), rat("0.2")))
	if same, err := Equal(sum, rat("0.3")); err != nil || !bool(same) {
		t.Error("0.1 + 0.2 is not 0.3")
	}
}

// exactOf gives the value of a floating or exact number as a rational.
func exactOf(n Number) *big.Rat {
	if n.Exact != nil {
		return n.Exact
	}
	return new(big.Rat).SetFloat64(n.F)
}

// The error estimate covers the true error of random chains of operations that cancel:
// the same chain runs on rationals, whose inputs differ from the floating ones by less
// than the floating inputs' own Err.
func TestErrorEstimateIsHonest(t *testing.T) {
	r := rand.New(rand.NewPCG(7, 11))
	worst := 0.0
	for trial := range 3000 {
		truth, floating := randomRat(r), Number{}
		floating = must[Value](t)(Floating(truth)).(Number)
		for range 8 {
			x := randomRat(r)
			if trial%2 == 0 && r.IntN(3) == 0 { // cancel nearly everything
				f, _ := truth.Exact.Float64()
				x = Rat(new(big.Rat).SetFloat64(-f * (1 + 0x1p-40)))
			}
			y := must[Value](t)(Floating(x)).(Number)
			switch r.IntN(4) {
			case 0, 1:
				truth, floating = must[Number](t)(addNumbers(truth, x)), must[Number](t)(addNumbers(floating, y))
			case 2:
				truth, floating = must[Number](t)(multiplyNumbers(truth, x)), must[Number](t)(multiplyNumbers(floating, y))
			case 3:
				if x.IsZero() {
					continue
				}
				truth, floating = must[Number](t)(divideNumbers(truth, x)), must[Number](t)(divideNumbers(floating, y))
			}
		}
		gap, _ := new(big.Rat).Sub(exactOf(floating), truth.Exact).Float64()
		if floating.Exact != nil {
			continue
		}
		if math.Abs(gap) > floating.Err*(1+1e-9) {
			t.Fatalf("trial %d: error %g, estimate %g", trial, gap, floating.Err)
		}
		if floating.Err > 0 {
			worst = math.Max(worst, math.Abs(gap)/floating.Err)
		}
	}
	if worst < 0.01 { // an estimate that is always huge would be no estimate
		t.Errorf("the estimate is at least %g times too large everywhere", 1/worst)
	}
}

func TestMatrixErrorEstimateIsHonest(t *testing.T) {
	r := rand.New(rand.NewPCG(13, 17))
	check := func(name string, exactResult, floating *Matrix) {
		t.Helper()
		if floating.IsExact() {
			t.Fatalf("%s stayed exact", name)
		}
		re, im := floating.Floats()
		for k := range re {
			i, j := k/floating.cols, k%floating.cols
			gap, _ := new(big.Rat).Sub(new(big.Rat).SetFloat64(re[k]), exactResult.exactRe.At(i, j)).Float64()
			if im != nil {
				other, _ := new(big.Rat).Sub(new(big.Rat).SetFloat64(im[k]), exactResult.imaginary().At(i, j)).Float64()
				gap = math.Hypot(gap, other)
			}
			if math.Abs(gap) > 1.5*floating.Err {
				t.Fatalf("%s: entry [%d, %d] is off by %g, estimate %g", name, i+1, j+1, gap, floating.Err)
			}
		}
	}
	for trial := range 60 {
		isComplex := trial%2 == 0
		n := 2 + trial%4
		a, b := randomMatrix(t, r, n, n, isComplex), randomMatrix(t, r, n, n, isComplex)
		fa, fb := a.Floating(), b.Floating()
		check("sum", must[*Matrix](t)(addMatrices(a, b)), must[*Matrix](t)(addMatrices(fa, fb)))
		check("product", must[*Matrix](t)(multiplyMatrices(a, b)), must[*Matrix](t)(multiplyMatrices(fa, fb)))
		factor, _ := asComplex(MakeComplex(randomRat(r), Int(2)))
		check("scaled", must[*Matrix](t)(scaleMatrix(a, factor)), must[*Matrix](t)(scaleMatrix(fa, factor)))
		inverse, err := InvertMatrix(a)
		if err != nil {
			continue
		}
		check("inverse", inverse, must[*Matrix](t)(InvertMatrix(fa)))
	}
}

// The Hilbert matrix of order 8 has condition number 1.5e10 (Todd 1961); its inverse in
// binary64 keeps about five digits, and the estimate must say so without giving up.
func TestInverseOfHilbertMatrix(t *testing.T) {
	n := 8
	items := make([]Value, n*n)
	for k := range items {
		items[k] = Rat(big.NewRat(1, int64(k/n+k%n+1)))
	}
	h := must[*Matrix](t)(scalarsMatrix(n, n, items))
	truth := must[*Matrix](t)(InvertMatrix(h))
	f := must[*Matrix](t)(InvertMatrix(h.Floating()))
	re, _ := f.Floats()
	gap := 0.0
	for k, x := range truth.exactRe.Float64() {
		gap = math.Max(gap, math.Abs(x-re[k]))
	}
	if gap > f.Err || f.Err > 1e6*gap {
		t.Errorf("error %g, estimate %g", gap, f.Err)
	}
	if corner := truth.exactRe.At(0, 0); corner.Cmp(big.NewRat(64, 1)) != 0 {
		t.Errorf("the corner of the exact inverse is %s, not 64", corner)
	}
}

func TestSingularMatrices(t *testing.T) {
	m := matrixOf(t, 2, 2, "1", "2", "2", "4")
	for _, singular := range []*Matrix{m, m.Floating(), zeroMatrix(3, 3), zeroMatrix(3, 3).Floating(), must[*Matrix](t)(scaleMatrix(m, Complex{ExactRe: ratZero, ExactIm: ratOne}))} {
		_, err := InvertMatrix(singular)
		if e, ok := err.(*diag.Error); !ok || e.Kind != diag.Numerical {
			t.Errorf("%v", err)
		}
	}
	scaled := FloatMatrix(2, 2, []float64{1e-200, 0, 0, 1e200}, 0)
	if _, err := InvertMatrix(scaled); err != nil {
		t.Errorf("a badly scaled diagonal matrix is invertible: %v", err)
	}
	if _, err := Power(&Gain{Values: matrixOf(t, 1, 2, "1", "2")}, Int(-1)); err == nil {
		t.Error("a 1×2 gain has no inverse")
	}
}

func TestCaps(t *testing.T) {
	limit := func(name string, err error) {
		t.Helper()
		if e, ok := err.(*diag.Error); !ok || e.Kind != diag.Limit {
			t.Errorf("%s: %v is no limit", name, err)
		}
	}
	inner := must[Value](t)(Power(Int(9), Int(9)))
	_, err := Power(Int(9), inner)
	limit("9^9^9", err)
	_, err = Power(rat("1/3"), must[Value](t)(Power(Int(10), Int(30))))
	limit("(1/3)^10^30", err)
	_, err = Power(Complex{ExactRe: ratOne, ExactIm: ratOne}, inner)
	limit("(1+i)^9^9", err)
	_, err = Power(Float(9), inner)
	if e, ok := err.(*diag.Error); !ok || e.Kind != diag.Numerical {
		t.Errorf("floating 9^9^9: %v", err)
	}
	if v := must[Value](t)(Power(Int(-1), must[Value](t)(Power(Int(10), Int(30))))); !v.(Number).IsWhole() {
		t.Errorf("(-1)^10^30 = %v", v)
	}
	s := ExactPolynomial("s", exact.PolynomialOfIntegers(1, 1))
	_, err = Power(s, Int(1_000_000))
	limit("(s+1)^10^6", err)
	limit("10⁶×10⁶ floating", CheckSize(1_000_000, 1_000_000, false))
	limit("600×600 exact", CheckSize(600, 600, true))
	if err := CheckSize(400, 400, false); err != nil {
		t.Errorf("400×400 floating: %v", err)
	}
	long := FloatMatrix(10_000, 1, make([]float64, 10_000), 0)
	_, err = multiplyMatrices(long, transposeMatrix(long))
	limit("outer product", err)
	x := Value(rat("1/3"))
	for err = nil; err == nil; {
		x, err = Multiply(x, x)
	}
	limit("squaring on and on", err)
	m := Value(matrixOf(t, 2, 2, "1", "1", "1", "0"))
	if _, err = Power(m, inner); err == nil {
		t.Error("a huge power of a matrix gave a result")
	}
}

func TestPowers(t *testing.T) {
	for _, c := range []struct{ base, exponent, want string }{
		{"4", "1/2", "2"}, {"9/4", "-1/2", "2/3"}, {"27/8", "2/3", "9/4"}, {"2", "10", "1024"}, {"2/3", "-2", "9/4"}, {"0", "0", "1"},
		{"0", "1/2", "0"}, {"1024", "1/10", "2"}, {"-2", "3", "-8"},
	} {
		v, err := Power(rat(c.base), rat(c.exponent))
		if n, ok := v.(Number); err != nil || !ok || n.Exact == nil || n.Exact.Cmp(rat(c.want).Exact) != 0 {
			t.Errorf("%s^%s = %v %v", c.base, c.exponent, v, err)
		}
	}
	if v, err := Power(rat("-4"), rat("1/2")); err != nil || v.(Complex).ExactIm.Cmp(big.NewRat(2, 1)) != 0 {
		t.Errorf("(-4)^(1/2) = %v %v", v, err)
	}
	if v, err := Power(rat("-4"), rat("3/2")); err != nil || v.(Complex).ExactIm.Cmp(big.NewRat(-8, 1)) != 0 {
		t.Errorf("(-4)^(3/2) = %v %v", v, err)
	}
	v, err := Power(rat("-8"), rat("1/3"))
	if c, ok := v.(Complex); err != nil || !ok || math.Abs(real(c.C)-1) > 1e-15 || math.Abs(imag(c.C)-math.Sqrt(3)) > 1e-15 {
		t.Errorf("(-8)^(1/3) = %v %v", v, err)
	}
	v, err = Power(rat("2"), rat("1/2"))
	if n, ok := v.(Number); err != nil || !ok || n.Exact != nil || math.Abs(n.F-math.Sqrt2) > n.Err {
		t.Errorf("2^(1/2) = %v %v", v, err)
	}
	for _, b := range []Value{Int(-1), rat("-1/2")} {
		if v, err := Power(Int(0), b); err == nil {
			t.Errorf("0^%v = %v", b, v)
		}
	}
}

func TestDivisionByZero(t *testing.T) {
	values := oneOfEach(t)
	for _, kind := range []Kind{KNumber, KComplex, KQuantity, KMatrix, KGain, KList, KPolynomial, KTransfer, KPlant, KModel} {
		for _, zero := range []Value{Int(0), Number{}} {
			v, err := Divide(values[kind], zero)
			if e, ok := err.(*diag.Error); !ok || e.Kind != diag.Numerical {
				t.Errorf("%s / 0 = %v, %v", kind, v, err)
			}
		}
	}
	if _, err := Add(Number{F: math.MaxFloat64}, Number{F: math.MaxFloat64}); err == nil {
		t.Error("overflow went unnoticed")
	}
	if _, err := Subtract(Number{F: math.Inf(1)}, Number{F: math.Inf(1)}); err == nil {
		t.Error("∞ − ∞ gave a result")
	}
	if v, err := Negate(Number{}); err != nil || math.Signbit(v.(Number).F) {
		t.Errorf("−0.0 = %v %v", v, err)
	}
}

func TestConjugatePairs(t *testing.T) {
	l := must[Value](t)(PlusMinus(Int(-2), Complex{ExactRe: ratZero, ExactIm: big.NewRat(3, 1)})).(*List)
	first, second := l.Items[0].(Complex), l.Items[1].(Complex)
	if !l.Pair || first.Quadratic == nil || first.Quadratic != second.Quadratic || first.ExactIm.Sign() != 1 {
		t.Fatalf("%v", l)
	}
	if !first.Quadratic.Exact.Equal(exact.PolynomialOfIntegers(1, 4, 13)) {
		t.Errorf("quadratic %s", first.Quadratic.Exact)
	}
	_, err := PlusMinus(Int(1), rat("0.05"))
	if err == nil || err.Error() != "the right side of ± is real; a tolerance belongs to `given`" {
		t.Errorf("%v", err)
	}
	// damping 0.7, frequency 1.1: s² + 1.54 s + 1.21, exact though the roots are not
	pair := must[*List](t)(PairFromQuadratic(rat("1.54"), rat("1.21")))
	p := must[*Polynomial](t)(PolynomialFromPoles(&List{Items: append(append([]Value{}, pair.Items...), rat("-0.9"), rat("-1.2"))}))
	if p.Exact == nil || p.Exact.Coefficient(3).Cmp(rat("3.64").Exact) != 0 || p.Exact.Coefficient(0).Cmp(rat("1.3068").Exact) != 0 {
		t.Errorf("%v", p.Exact)
	}
	if real(pair.Items[0].(Complex).C) == 0 || pair.Items[0].(Complex).ExactRe != nil {
		t.Errorf("%v", pair.Items[0])
	}
	out, err := Coerce(Param{Name: "poles", Shape: PoleList}, &List{Items: []Value{Int(-1), MakeComplex(Int(-1), Int(2))}})
	if err == nil {
		t.Errorf("an unpaired pole gave %v", out)
	}
}

// A factor known to 1e-6 makes a product known no better, on whichever side it stands.
func TestUncertainFactors(t *testing.T) {
	const uncertainty = 1e-6
	r := rand.New(rand.NewPCG(71, 73))
	move := func(n int) []float64 {
		out := make([]float64, n)
		for k := range out {
			out[k] = uncertainty * (2*r.Float64() - 1)
		}
		return out
	}
	for range 50 {
		a, b := randomMatrix(t, r, 3, 3, false).Floating(), randomMatrix(t, r, 3, 3, false).Floating()
		a.Err = uncertainty
		moved := FloatMatrix(3, 3, addSlices(a.re, move(9)), 0)
		p := FloatPolynomial("s", a.re[:4], uncertainty)
		movedP, q := FloatPolynomial("s", addSlices(p.F, move(len(p.F))), 0), FloatPolynomial("s", b.re[:4], 0)
		for _, turned := range []bool{false, true} {
			x, y, z := a, b, moved
			f, g, h := p, q, movedP
			multiply, convolve := multiplyMatrices, multiplyPolynomials
			if turned {
				multiply = func(a, b *Matrix) (*Matrix, error) { return multiplyMatrices(b, a) }
				convolve = func(a, b *Polynomial) (*Polynomial, error) { return multiplyPolynomials(b, a) }
			}
			product := must[*Matrix](t)(multiply(x, y))
			gap := largest(addSlices(product.re, scaleSlice(must[*Matrix](t)(multiply(z, y)).re, -1)))
			if gap > product.Err || product.Err > 1000*gap {
				t.Fatalf("matrix: changed by %g, estimate %g", gap, product.Err)
			}
			result := must[*Polynomial](t)(convolve(f, g))
			gap = largest(addSlices(result.F, scaleSlice(must[*Polynomial](t)(convolve(h, g)).F, -1)))
			if gap > result.Err || result.Err > 1000*gap {
				t.Fatalf("polynomial: changed by %g, estimate %g", gap, result.Err)
			}
		}
	}
}
