package exact

import (
	"fmt"
	"math"
	"math/big"
	"math/rand/v2"
	"testing"
)

func frac(a, b int64) *big.Rat { return big.NewRat(a, b) }

// quadratic gives s² − 2·re·s + re² + im².
func quadratic(re, im *big.Rat) Polynomial {
	norm := new(big.Rat).Add(new(big.Rat).Mul(re, re), new(big.Rat).Mul(im, im))
	return NewPolynomial(ratOne, new(big.Rat).Mul(re, frac(-2, 1)), norm)
}

func TestRationalRootsAndPairsAreExact(t *testing.T) {
	p := NewPolynomial(frac(7, 3)).
		Mul(PolynomialOfIntegers(1, 0)).Mul(PolynomialOfIntegers(1, 0)).
		Mul(NewPolynomial(ratOne, frac(61322, 1000000))).
		Mul(quadratic(frac(-1, 3), frac(5, 7))).Mul(quadratic(frac(-1, 3), frac(5, 7))).
		Mul(quadratic(ratZero, frac(2, 1))).
		Mul(PolynomialOfIntegers(1, 0, -2))
	roots, err := p.Roots(17)
	if err != nil {
		t.Fatal(err)
	}
	want := []struct {
		re, im       *big.Rat // nil when irrational
		value        complex128
		multiplicity int
	}{
		{nil, nil, complex(-math.Sqrt2, 0), 1},
		{frac(-1, 3), frac(-5, 7), complex(-1.0/3, -5.0/7), 2},
		{frac(-1, 3), frac(5, 7), complex(-1.0/3, 5.0/7), 2},
		{frac(-61322, 1000000), ratZero, complex(-0.061322, 0), 1},
		{ratZero, frac(-2, 1), -2i, 1},
		{ratZero, ratZero, 0, 2},
		{ratZero, frac(2, 1), 2i, 1},
		{nil, nil, complex(math.Sqrt2, 0), 1},
	}
	if len(roots) != len(want) {
		t.Fatalf("%d roots, want %d", len(roots), len(want))
	}
	for k, r := range roots {
		w := want[k]
		if r.Value != w.value || r.Multiplicity != w.multiplicity || r.Exact != (w.re != nil) {
			t.Errorf("root %d: %v ×%d exact %v, want %v ×%d", k, r.Value, r.Multiplicity, r.Exact, w.value, w.multiplicity)
		}
		if w.re != nil && (r.ExactRe.Cmp(w.re) != 0 || r.ExactIm.Cmp(w.im) != 0 || r.Radius != 0) {
			t.Errorf("root %d: %v + %v·i, radius %g", k, r.ExactRe, r.ExactIm, r.Radius)
		}
	}
	rational := p.RationalRoots()
	if len(rational) != 2 || rational[0].Value.Cmp(frac(-61322, 1000000)) != 0 || rational[1].Multiplicity != 2 {
		t.Errorf("rational roots %v", rational)
	}
}

// Wilkinson's polynomial with one coefficient changed by 2⁻²³ (J. H. Wilkinson,
// Rounding Errors in Algebraic Processes, 1963): ten roots leave the real axis.
// The figures are those printed there, to nine decimals, from memory.
func TestWilkinsonPerturbed(t *testing.T) {
	var list []*big.Rat
	for k := range int64(20) {
		list = append(list, frac(k+1, 1))
	}
	change := make([]*big.Rat, 20)
	for k := range change {
		change[k] = ratZero
	}
	change[0] = frac(-1, 1<<23)
	roots, err := PolynomialWithRoots(list...).Add(NewPolynomial(change...)).Roots(17)
	if err != nil {
		t.Fatal(err)
	}
	printed := []complex128{8.917250249, 20.846908101, complex(10.095266145, 0.643500904), complex(16.730737466, 2.812624894), complex(19.502439400, 1.940330347)}
	for _, w := range printed {
		found := false
		for _, r := range roots {
			found = found || math.Abs(real(r.Value-w)) < 6e-10 && math.Abs(imag(r.Value-w)) < 6e-10
		}
		if !found {
			t.Errorf("root %v is missing", w)
		}
	}
	onAxis := 0
	for _, r := range roots {
		if r.Im.Sign() == 0 {
			onAxis++
		}
	}
	if onAxis != 10 {
		t.Errorf("%d real roots, want 10", onAxis)
	}
}

// Whether a part vanishes is decided, however small it may be.
func TestSidesOfTheAxesAreDecided(t *testing.T) {
	tiny := frac(1, 1_000_000_000_000)
	tiny.Mul(tiny, tiny) // 10⁻²⁴
	damped := NewPolynomial(ratOne, tiny, frac(2, 1))
	undamped := PolynomialOfIntegers(1, 0, 3)
	close := NewPolynomial(ratOne, frac(-2, 1), new(big.Rat).Add(ratOne, tiny)) // 1 ± 10⁻¹²·i
	near := NewPolynomial(ratOne, frac(-4, 1), new(big.Rat).Sub(frac(4, 1), new(big.Rat).Mul(frac(2, 1), tiny)))
	cubic := PolynomialOfIntegers(1, 0, 0, -2)
	for name, p := range map[string]Polynomial{
		"apart":    damped,
		"together": damped.Mul(undamped).Mul(close).Mul(near).Mul(cubic),
		"even":     PolynomialOfIntegers(1, 0, 5, 0, 5),
		"mirrored": PolynomialOfIntegers(1, 0, 0, 0, 2).Mul(PolynomialOfIntegers(1, 0, 3, 0, 3)),
	} {
		roots, err := p.Roots(17)
		if err != nil {
			t.Fatal(err)
		}
		axis, realRoots := 0, 0
		for _, r := range roots {
			if r.Re.Sign() == 0 {
				axis += r.Multiplicity
			}
			if r.Im.Sign() == 0 {
				realRoots += r.Multiplicity
				if imag(r.Value) != 0 {
					t.Errorf("%s: real root shown as %v", name, r.Value)
				}
			}
		}
		table, err := NewRouthTable(p)
		if err != nil || axis != table.Axis {
			t.Errorf("%s: %d roots on the axis, the Routh table says %d (%v)", name, axis, table.Axis, err)
		}
		if count := p.RealRootsBetween(nil, nil); realRoots != count {
			t.Errorf("%s: %d real roots, Sturm counts %d", name, realRoots, count)
		}
		right := 0
		for _, r := range roots {
			if r.Re.Sign() > 0 {
				right += r.Multiplicity
			}
		}
		if right != table.Right {
			t.Errorf("%s: %d roots on the right, the Routh table says %d", name, right, table.Right)
		}
	}
}

// Discs found to few digits must hold the roots found to many.
func TestDiscsAreHonest(t *testing.T) {
	random := rand.New(rand.NewPCG(21, 1))
	for round := range 40 {
		n := 3 + random.IntN(25)
		c := make([]*big.Rat, n+1)
		for k := range c {
			c[k] = big.NewRat(random.Int64N(2001)-1000, random.Int64N(50)+1)
			if round%3 == 0 { // widely spread magnitudes
				c[k].Mul(c[k], new(big.Rat).SetFrac(intOne, new(big.Int).Lsh(intOne, uint(random.IntN(300)))))
			}
		}
		if c[0].Sign() == 0 {
			continue
		}
		p := NewPolynomial(c...)
		coarse, err1 := p.Roots(6)
		fine, err2 := p.Roots(50)
		if err1 != nil || err2 != nil || len(coarse) != len(fine) {
			t.Fatal(err1, err2, len(coarse), len(fine))
		}
		total := 0
		for k, r := range coarse {
			total += r.Multiplicity
			distance := magnitude(new(big.Float).SetPrec(2000).Sub(r.Re, fine[k].Re), new(big.Float).SetPrec(2000).Sub(r.Im, fine[k].Im))
			if limit := r.Radius + fine[k].Radius; distance.Cmp(big.NewFloat(limit)) > 0 {
				t.Errorf("%v: root %d moved by %v, radii %g", p, k, distance, limit)
			}
			size, _ := magnitude(r.Re, r.Im).Float64()
			if r.Radius > 1e-5*size {
				t.Errorf("%v: radius %g of root %v", p, r.Radius, r.Value)
			}
			if k > 0 && compareRoots(coarse[k-1], r) > 0 {
				t.Errorf("roots out of order")
			}
		}
		if total != n {
			t.Errorf("%v has %d roots", p, total)
		}
	}
}

func TestManyCloseRoots(t *testing.T) {
	// 1, 1 + 10⁻⁶, …, shifted off the rationals by an added constant.
	var list []*big.Rat
	for k := range int64(8) {
		list = append(list, frac(1_000_000+k, 1_000_000))
	}
	p := PolynomialWithRoots(list...)
	tiny, _ := new(big.Rat).SetString("1e-50")
	roots, err := p.Add(Constant(tiny)).Roots(17)
	if err != nil || len(roots) != 8 {
		t.Fatal(err, len(roots))
	}
	for k, r := range roots {
		value, _ := list[k].Float64()
		if math.Abs(real(r.Value)-value) > 1e-8 || imag(r.Value) != 0 {
			t.Errorf("root %v, near %v", r.Value, value)
		}
	}
}

func TestSixtyRootsInBoundedTime(t *testing.T) {
	a := decimalMatrix(60, 60, 5)
	p := a.CharacteristicPolynomial()
	roots, err := p.Roots(17)
	if err != nil || len(roots) != 60 {
		t.Fatal(err, len(roots))
	}
	sum := new(big.Float).SetPrec(200)
	for _, r := range roots {
		sum.Add(sum, r.Re)
	}
	trace, _ := a.Trace()
	want := new(big.Float).SetPrec(200).SetRat(trace)
	if difference, _ := new(big.Float).Sub(sum, want).Float64(); math.Abs(difference) > 1e-14 {
		t.Errorf("the roots add up to %v, the trace is %v", sum, want)
	}
}

func TestIncompleteFactorizationSaysSo(t *testing.T) {
	// The minimal polynomial of √2 + √3 + √5 + √7 + √11 + √13 splits into factors
	// of degree at most 2 modulo every prime (H. P. F. Swinnerton-Dyer), and is irreducible.
	p := PolynomialOfIntegers(1, 0)
	for _, d := range []int64{2, 3, 5, 7, 11, 13} {
		p = swinnertonDyer(p, d)
	}
	factors, complete := p.Factorize()
	if len(factors) != 1 || !factors[0].Polynomial.Equal(p) || complete {
		t.Errorf("degree %d: %d factors, complete %v", p.Degree(), len(factors), complete)
	}
	roots, err := p.Roots(12)
	if err != nil || len(roots) != 64 {
		t.Fatalf("%d roots, %v", len(roots), err)
	}
	largest := math.Sqrt(2) + math.Sqrt(3) + math.Sqrt(5) + math.Sqrt(7) + math.Sqrt(11) + math.Sqrt(13)
	if got := real(roots[63].Value); math.Abs(got-largest) > 1e-13*largest {
		t.Errorf("largest root %v, want %v", got, largest)
	}
}

// swinnertonDyer gives p(s − √d)·p(s + √d).
func swinnertonDyer(p Polynomial, d int64) Polynomial {
	// p(s + √d) = a + b·√d, by Horner's scheme over pairs.
	var a, b Polynomial
	s := PolynomialOfIntegers(1, 0)
	for k := p.Degree(); k >= 0; k-- {
		a, b = a.Mul(s).Add(b.Scale(frac(d, 1))).Add(Constant(p.Coefficient(k))), b.Mul(s).Add(a)
	}
	return a.Mul(a).Sub(b.Mul(b).Scale(frac(d, 1)))
}

func FuzzPolynomialWork(f *testing.F) {
	f.Add([]byte{1, 0, 3, 0, 2})
	f.Add([]byte{1, 2, 3, 4, 5, 6, 7})
	f.Add([]byte{0, 0, 255, 128, 1})
	f.Fuzz(func(t *testing.T, data []byte) {
		c := make([]*big.Rat, min(len(data), 14))
		for k := range c {
			c[k] = big.NewRat(int64(int8(data[k])), int64(k%3+1))
		}
		p := NewPolynomial(c...)
		factors, complete := p.Factorize()
		product := Constant(p.Lead())
		for _, factor := range factors {
			power, _ := factor.Polynomial.Power(factor.Multiplicity)
			product = product.Mul(power)
		}
		if !complete || !product.Equal(p) {
			t.Fatalf("%v: %v", p, factors)
		}
		roots, err := p.Roots(17)
		count := 0
		for _, r := range roots {
			count += r.Multiplicity
		}
		if err != nil || count != max(p.Degree(), 0) {
			t.Fatal(p, count, err)
		}
		if p.IsZero() {
			return
		}
		table, err := NewRouthTable(p)
		if err != nil {
			t.Fatal(err)
		}
		var places [3]int
		for _, r := range roots {
			places[r.Re.Sign()+1] += r.Multiplicity
		}
		if places != [3]int{table.Left, table.Axis, table.Right} {
			t.Fatalf("%v: roots %v, table %s", p, places, fmt.Sprint(table.Left, table.Axis, table.Right))
		}
	})
}
