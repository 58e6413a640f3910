package render

import (
	"math"
	"math/big"
	"math/rand/v2"
	"strings"
	"testing"

	"gainwright/lang/value"
)

func TestTheSignSaysWhetherTheTextIsTheValue(t *testing.T) {
	for _, c := range []struct {
		v    value.Value
		want string
	}{
		{num("0.3"), "= 0.3"},
		{num("-0.3"), "= -0.3"},
		{num("12345"), "= 12345"},
		{num("1.23456"), "≈ 1.2346  (exact kept)"},
		{num("0.000012345"), "= 1.2345e-5"},
		{num("999999999999999"), "= 999999999999999"},
		{num("1234567890123456"), "≈ 1.2346e15  (exact kept)"},
		{num("99999.95"), "≈ 1.0000e5  (exact kept)"},
		{num("22/7"), "= 22/7 ≈ 3.1429"},
		{num("-1/3"), "= -1/3 ≈ -0.33333"},
		{num("1/101"), "≈ 0.0099010  (exact kept)"},
		{num("10001/3"), "≈ 3333.7  (exact kept)"},
		{value.Number{F: 0.5}, "= 0.5"},
		{value.Number{F: 0.1}, "≈ 0.1"},
		{value.Float(0.5), "≈ 0.50000"},
		{value.Number{F: math.Copysign(0, -1)}, "= 0"},
		{value.FloatErr(-1e-17, 1e-16), "≈ 0  (smaller than its own uncertainty, 1e-16)"},
		{value.FloatErr(-0.0004, 0.00003), "≈ -0.0004  (1 digit holds)"},
		{value.FloatErr(123456, 3), "≈ 1.235e5  (4 digits hold)"},
		{value.Complex{ExactRe: rat("0"), ExactIm: rat("-1.5")}, "= -1.5i"},
		{value.Complex{ExactRe: rat("1/3"), ExactIm: rat("2")}, "≈ 0.33333 + 2i  (exact kept)"},
	} {
		got := strings.TrimSpace(Text("", c.v, nil, Options{}))
		if got != c.want {
			// Without a label an exact value shows its sign too.
			t.Errorf("%v: %q, want %q", c.v, got, c.want)
		}
	}
}

func TestFractionsAreShownWhenAskedFor(t *testing.T) {
	o := Options{Fractions: true}
	for _, c := range []struct {
		v    value.Value
		want string
	}{
		{num("104544/109"), "v = 104544/109\n"},
		{num("0.5"), "v = 1/2\n"},
		{num("7"), "v = 7\n"},
		{value.Complex{ExactRe: rat("1/3"), ExactIm: rat("-2/3")}, "v = 1/3 - 2/3*1i\n"},
		{poly("s", "1", "-19/240"), "v = s - 19/240\n"},
		{exactRows("19/1440 -2"), "v =\n  19/1440   -2\n"},
	} {
		if got := Text("v", c.v, nil, o); got != c.want {
			t.Errorf("%q, want %q", got, c.want)
		}
	}
}

// The printed text parsed as a number is the value exactly when the figure says so, and
// within half a unit of its last digit otherwise.
func TestCutNumbersAgainstTheirText(t *testing.T) {
	random := rand.New(rand.NewPCG(3, 14))
	for range 20_000 {
		num := big.NewInt(random.Int64N(2_000_000_000) - 1_000_000_000)
		den := big.NewInt(1 + random.Int64N([]int64{1, 10, 1000, 1 << 40}[random.IntN(4)]))
		r := new(big.Rat).SetFrac(num, den)
		scale := new(big.Int).Exp(big.NewInt(10), big.NewInt(random.Int64N(20)), nil)
		if random.IntN(2) == 0 {
			r.Quo(r, new(big.Rat).SetInt(scale))
		} else {
			r.Mul(r, new(big.Rat).SetInt(scale))
		}
		digits := 1 + random.IntN(9)
		f := exactFigure(r, digits)
		for _, text := range []string{f.text(), f.fixed(), f.scientific()} {
			back, ok := new(big.Rat).SetString(text)
			if !ok {
				t.Fatalf("%s is shown as %q", r, text)
			}
			if (back.Cmp(r) == 0) != (f.sign == exactly) {
				t.Fatalf("%s with %d digits is shown as %q, sign %v", r.RatString(), digits, text, f.sign)
			}
			half := new(big.Rat).Quo(new(big.Rat).Abs(back), new(big.Rat).SetFloat64(2*math.Pow(10, float64(digits-1))))
			off := new(big.Rat).Sub(back, r)
			if f.sign != exactly && off.Abs(off).Cmp(half) > 0 {
				t.Fatalf("%s with %d digits is shown as %q, too far off", r.RatString(), digits, text)
			}
		}
	}
}

func TestDigitsAreNeverMoreThanHold(t *testing.T) {
	random := rand.New(rand.NewPCG(2, 71))
	for range 20_000 {
		x := (random.Float64() + 0.01) * math.Pow(10, float64(random.IntN(30)-15))
		err := x * math.Pow(10, -float64(random.IntN(16))) * random.Float64()
		f := floatFigure(x, err, 9)
		if f.digits == "0" {
			if x > err {
				t.Fatalf("%g with error %g is shown as 0", x, err)
			}
			continue
		}
		// One digit is always shown of a number that exceeds its error.
		if n := len(f.digits); n > 1 && err > x*math.Pow(10, -float64(n)) {
			t.Fatalf("%g with error %g is shown with %d digits", x, err, n)
		}
	}
}

func TestZeroNeverHasASign(t *testing.T) {
	for _, m := range []*value.Matrix{
		value.FloatMatrix(1, 3, []float64{math.Copysign(0, -1), -1e-18, 1}, 1e-15),
		value.FloatComplexMatrix(1, 2, []float64{-1e-18, 1}, []float64{-1e-18, 2}, 1e-15),
	} {
		if got := Text("m", m, nil, Options{}); strings.Contains(got, "-0") || strings.Contains(got, "- 0") {
			t.Errorf("a signed zero: %q", got)
		}
	}
}
