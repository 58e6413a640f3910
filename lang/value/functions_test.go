package value

import (
	"math"
	"math/big"
	"strings"
	"testing"
)

func TestExactFunctionValues(t *testing.T) {
	deg := func(n string) Value { return Quantity{rat(n), mustUnit(t, "deg")} }
	for _, c := range []struct {
		name string
		f    func(Value) (Value, error)
		x    Value
		want string
	}{
		{"sqrt", Sqrt, Int(4), "2"}, {"sqrt", Sqrt, rat("9/4"), "3/2"}, {"sqrt", Sqrt, Int(0), "0"}, {"exp", Exp, Int(0), "1"},
		{"log", Log, Int(1), "0"}, {"log10", Log10, rat("0.001"), "-3"}, {"log10", Log10, Int(1_000_000), "6"},
		{"sin", Sin, Int(0), "0"}, {"sin", Sin, deg("90"), "1"}, {"sin", Sin, deg("-30"), "-1/2"}, {"sin", Sin, deg("750"), "1/2"},
		{"cos", Cos, Int(0), "1"}, {"cos", Cos, deg("60"), "1/2"}, {"cos", Cos, deg("90"), "0"}, {"cos", Cos, deg("180"), "-1"},
		{"tan", Tan, Int(0), "0"}, {"tan", Tan, deg("45"), "1"}, {"tan", Tan, deg("135"), "-1"}, {"sin", Sin, Quantity{rat("1/12"), mustUnit(t, "rev")}, "1/2"},
		{"asin", Asin, Int(0), "0"}, {"acos", Acos, Int(1), "0"}, {"atan", Atan, Int(0), "0"},
		{"abs", Abs, rat("-3/2"), "3/2"}, {"abs", Abs, Complex{ExactRe: big.NewRat(3, 1), ExactIm: big.NewRat(-4, 1)}, "5"},
		{"floor", Floor, rat("-3/2"), "-2"}, {"floor", Floor, Number{F: 2.7}, "2"}, {"sign", Sign, rat("-0.1"), "-1"},
		{"decibels", Decibels, rat("0.1"), "-20"}, {"from_decibels", FromDecibels, Int(40), "100"},
		{"argument", Argument, Int(2), "0"},
		{"real", Real, Complex{ExactRe: big.NewRat(3, 1), ExactIm: big.NewRat(-4, 1)}, "3"},
	} {
		v, err := c.f(c.x)
		n, ok := v.(Number)
		if err != nil || !ok || n.Exact == nil || n.Exact.Cmp(rat(c.want).Exact) != 0 {
			t.Errorf("%s(%v) = %v %v, want exactly %s", c.name, c.x, v, err, c.want)
		}
	}
	v, err := Sqrt(Int(-9))
	if c, ok := v.(Complex); err != nil || !ok || c.ExactIm == nil || c.ExactIm.Cmp(big.NewRat(3, 1)) != 0 {
		t.Errorf("sqrt(-9) = %v %v", v, err)
	}
	if v, err := Atan2(Int(0), Int(5)); err != nil || !v.(Number).IsWhole() {
		t.Errorf("atan2(0, 5) = %v %v", v, err)
	}
}

// Reference values to 20 digits, from memory of the usual constants: √2, e, ln 2, sin 1,
// cos 1, π/4, log₁₀ 2, arcsin ½ = π/6, sin 1° and √2/2.
func TestFloatingFunctionValues(t *testing.T) {
	deg := func(n string) Value { return Quantity{rat(n), mustUnit(t, "deg")} }
	for _, c := range []struct {
		name string
		f    func(Value) (Value, error)
		x    Value
		want string
	}{
		{"sqrt", Sqrt, Int(2), "1.4142135623730950488"}, {"exp", Exp, Int(1), "2.7182818284590452354"},
		{"log", Log, Int(2), "0.69314718055994530942"}, {"sin", Sin, Int(1), "0.84147098480789650665"},
		{"cos", Cos, Int(1), "0.54030230586813971740"}, {"atan", Atan, Int(1), "0.78539816339744830962"},
		{"log10", Log10, Int(2), "0.30102999566398119521"}, {"asin", Asin, rat("1/2"), "0.52359877559829887308"},
		{"sin 1 deg", Sin, deg("1"), "0.017452406437283512819"}, {"sin 45 deg", Sin, deg("45"), "0.70710678118654752440"},
		{"sin 36000001 deg", Sin, deg("36000001"), "0.017452406437283512819"},
		{"argument", Argument, Complex{ExactRe: ratZero, ExactIm: ratOne}, "1.5707963267948966192"},
	} {
		v, err := c.f(c.x)
		n, ok := v.(Number)
		if err != nil || !ok || n.Exact != nil {
			t.Errorf("%s = %v %v", c.name, v, err)
			continue
		}
		gap, _ := new(big.Rat).Sub(new(big.Rat).SetFloat64(n.F), rat(c.want).Exact).Float64()
		if math.Abs(gap) > n.Err || n.Err > 4e-16*math.Max(1, math.Abs(n.F)) {
			t.Errorf("%s = %.17g, off by %g, estimate %g", c.name, n.F, gap, n.Err)
		}
	}
	if v, err := Log(rat("1e400")); err != nil || math.Abs(v.(Number).F-400*math.Ln10) > 1e-12 {
		t.Errorf("log(1e400) = %v %v", v, err)
	}
	if v, err := Sqrt(rat("2e700")); err != nil || v.(Number).F == 0 {
		if err == nil || !strings.Contains(err.Error(), "1.8e308") {
			t.Errorf("sqrt(2e700) = %v %v", v, err)
		}
	}
}

// An uncertain argument makes an uncertain result: near π the sine loses what it must.
func TestFunctionsCarryErrors(t *testing.T) {
	x := Number{F: math.Pi, Err: 1e-10}
	v, err := Sin(x)
	if n := v.(Number); err != nil || n.Err < 1e-10 || n.Err > 1.1e-10 {
		t.Errorf("sin(π ± 1e-10) has the estimate %g", n.Err)
	}
	v, err = Exp(Number{F: 10, Err: 1e-8})
	if n := v.(Number); err != nil || math.Abs(n.Err/n.F-1e-8) > 1e-14 {
		t.Errorf("exp has the relative estimate %g", n.Err/n.F)
	}
	v, err = Sqrt(Number{F: 0, Err: 1e-16})
	if n := v.(Number); err != nil || n.Err != 1e-8 {
		t.Errorf("sqrt(0 ± 1e-16) has the estimate %g", n.Err)
	}
}

func TestRefusedArguments(t *testing.T) {
	for name, f := range map[string]func() (Value, error){
		"log(0)": func() (Value, error) { return Log(Int(0)) }, "asin(2)": func() (Value, error) { return Asin(Int(2)) },
		"tan(90 deg)":  func() (Value, error) { return Tan(Quantity{rat("90"), mustUnit(t, "deg")}) },
		"sqrt(matrix)": func() (Value, error) { return Sqrt(IdentityMatrix(2)) },
		"floor(i)":     func() (Value, error) { return Floor(Complex{ExactRe: ratOne, ExactIm: ratOne}) },
		"atan2(0, 0)":  func() (Value, error) { return Atan2(Int(0), Int(0)) },
		"min()":        func() (Value, error) { return Min(&List{}) },
		"min(1 m, 1 s)": func() (Value, error) {
			return Min(Quantity{Int(1), mustUnit(t, "m")}, Quantity{Int(1), mustUnit(t, "s")})
		},
		"exp(1e6)":    func() (Value, error) { return Exp(Int(1_000_000)) },
		"decibels(0)": func() (Value, error) { return Decibels(Int(0)) },
		"1i < 2": func() (Value, error) {
			v, err := Compare("<", Complex{ExactRe: ratZero, ExactIm: ratOne}, Int(2))
			return v, err
		},
	} {
		if v, err := f(); err == nil {
			t.Errorf("%s = %v", name, v)
		}
	}
}

func TestReductionsAndRounding(t *testing.T) {
	list := &List{Items: []Value{rat("1/3"), rat("-2"), rat("5/2")}}
	for name, c := range map[string]struct {
		f    func() (Value, error)
		want string
	}{
		"min": {func() (Value, error) { return Min(list) }, "-2"}, "max": {func() (Value, error) { return Max(Int(1), Int(3), Int(2)) }, "3"},
		"sum":        {func() (Value, error) { return Sum(list) }, "5/6"},
		"sum matrix": {func() (Value, error) { return Sum(matrixOf(t, 2, 2, "1", "2", "3", "4")) }, "10"},
		"sum ()":     {func() (Value, error) { return Sum(&List{}) }, "0"},
		"round":      {func() (Value, error) { return Round(rat("2.345"), 2) }, "2.35"}, "round −": {func() (Value, error) { return Round(rat("-2.5"), 0) }, "-3"},
		"round tens": {func() (Value, error) { return Round(rat("1251"), -2) }, "1300"},
	} {
		v, err := c.f()
		if n, ok := v.(Number); err != nil || !ok || n.Exact == nil || n.Exact.Cmp(rat(c.want).Exact) != 0 {
			t.Errorf("%s = %v %v, want %s", name, v, err, c.want)
		}
	}
}

func TestDecimals(t *testing.T) {
	for _, c := range []struct {
		r, want string
		ends    bool
	}{{"1/8", "0.125", true}, {"-0.05", "-0.05", true}, {"24/7", "24/7", false}, {"-3", "-3", true}, {"1e-30", "0.000000000000000000000000000001", true},
		{"1/3125", "0.00032", true}, {"0", "0", true}, {"2.50", "2.5", true}} {
		text, ends := Decimal(rat(c.r).Exact)
		if text != c.want || ends != c.ends {
			t.Errorf("%s: %s %v, want %s", c.r, text, ends, c.want)
		}
	}
	if !Equalish(FloatErr(1, 1e-3), rat("1.0005")) || Equalish(FloatErr(1, 1e-4), rat("1.0005")) || Equalish(rat("1"), rat("1.0000001")) {
		t.Error("agreement within the estimates is judged wrongly")
	}
	if !WithinRounding(FloatErr(0.6, 1e-12), rat("0.6")) || WithinRounding(rat("0.6"), rat("0.6")) {
		t.Error("a bound inside the estimate is judged wrongly")
	}
}

func TestNearest(t *testing.T) {
	words := []string{"reachability", "observability", "assign_poles", "poles", "eigenvalues"}
	for name, want := range map[string]string{"reachibility": "reachability", "pole": "poles", "asign_poles": "assign_poles",
		"eigenvlaues": "eigenvalues", "x": "", "determinant": ""} {
		if got := Nearest(name, words); got != want {
			t.Errorf("%s: %q, want %q", name, got, want)
		}
	}
}
