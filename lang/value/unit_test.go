package value

import (
	"math"
	"math/big"
	"strings"
	"testing"
)

// The SI Brochure's tables (BIPM, 9th edition 2019, version 2.01 of December 2022),
// written down from memory: symbol, factor, base units.
var brochureDerived = []struct{ symbol, base string }{ // table 4, in base units
	{"rad", "1"}, {"sr", "1"}, {"N", "kg*m/s^2"}, {"Pa", "kg/(m*s^2)"}, {"J", "kg*m^2/s^2"}, {"W", "kg*m^2/s^3"},
	{"C", "s*A"}, {"V", "kg*m^2/(s^3*A)"}, {"F", "s^4*A^2/(kg*m^2)"}, {"Ω", "kg*m^2/(s^3*A^2)"}, {"S", "s^3*A^2/(kg*m^2)"},
	{"Wb", "kg*m^2/(s^2*A)"}, {"T", "kg/(s^2*A)"}, {"H", "kg*m^2/(s^2*A^2)"}, {"lm", "cd"}, {"lx", "cd/m^2"},
	{"Bq", "1/s"}, {"Gy", "m^2/s^2"}, {"Sv", "m^2/s^2"}, {"kat", "mol/s"}, {"Hz", "1/s"}, {"degC", "K"},
}

var brochurePrefixes = map[string]string{ // table 7
	"da": "1e1", "h": "1e2", "k": "1e3", "M": "1e6", "G": "1e9", "T": "1e12", "P": "1e15", "E": "1e18", "Z": "1e21", "Y": "1e24",
	"R": "1e27", "Q": "1e30", "d": "1e-1", "c": "1e-2", "m": "1e-3", "µ": "1e-6", "n": "1e-9", "p": "1e-12", "f": "1e-15",
	"a": "1e-18", "z": "1e-21", "y": "1e-24", "r": "1e-27", "q": "1e-30",
}

var brochureAccepted = []struct { // table 8, without Da, Np, B and dB
	symbol, scale string
	pi            int
	base          string
}{
	{"min", "60", 0, "s"}, {"h", "3600", 0, "s"}, {"d", "86400", 0, "s"}, {"au", "149597870700", 0, "m"},
	{"deg", "1/180", 1, "1"}, {"arcmin", "1/10800", 1, "1"}, {"arcsec", "1/648000", 1, "1"}, {"ha", "1e4", 0, "m^2"},
	{"L", "1e-3", 0, "m^3"}, {"l", "1e-3", 0, "m^3"}, {"t", "1e3", 0, "kg"}, {"eV", "1.602176634e-19", 0, "kg*m^2/s^2"},
	// outside the Brochure: bar (its 8th edition), turns, and the exact definitions of 1901 and 1959
	{"bar", "1e5", 0, "kg/(m*s^2)"}, {"rev", "2", 1, "1"}, {"rpm", "2/60", 1, "1/s"}, {"kgf", "9.80665", 0, "kg*m/s^2"},
	{"lbf", "4.4482216152605", 0, "kg*m/s^2"}, {"lb", "0.45359237", 0, "kg"}, {"inch", "0.0254", 0, "m"}, {"ft", "0.3048", 0, "m"},
}

func TestUnitsOfTheBrochure(t *testing.T) {
	check := func(symbol, scale string, pi int, base string) {
		t.Helper()
		u := mustUnit(t, symbol)
		want := rat(scale).Exact
		if u.Scale.Cmp(want) != 0 || u.Pi != pi || u.Dim.String() != base {
			t.Errorf("%s = %s·π^%d %s, want %s·π^%d %s", symbol, u.Scale, u.Pi, u.Dim, want, pi, base)
		}
	}
	for _, row := range brochureDerived {
		check(row.symbol, "1", 0, row.base)
		if row.symbol == "degC" {
			continue
		}
		for prefix, factor := range brochurePrefixes {
			if whole := unitTable[prefix+row.symbol]; whole == nil {
				check(prefix+row.symbol, factor, 0, row.base)
			}
		}
	}
	for prefix, factor := range brochurePrefixes {
		check(prefix+"m", factor, 0, "m")
		if whole := unitTable[prefix+"g"]; whole == nil { // kg stands in the table itself
			check(prefix+"g", new(big.Rat).Mul(rat(factor).Exact, big.NewRat(1, 1000)).RatString(), 0, "kg")
		}
	}
	for _, row := range brochureAccepted {
		check(row.symbol, row.scale, row.pi, row.base)
	}
}

func TestWholeSymbolsBeatPrefixes(t *testing.T) {
	for symbol, base := range map[string]string{"min": "s", "Pa": "kg/(m*s^2)", "cd": "cd", "d": "s", "h": "s", "mT": "kg/(s^2*A)",
		"ft": "m", "mol": "mol", "kat": "mol/s", "T": "kg/(s^2*A)", "t": "kg", "dag": "kg", "mm": "m", "um": "m", "kHz": "1/s"} {
		if got := mustUnit(t, symbol).Dim.String(); got != base {
			t.Errorf("%s has dimension %s, want %s", symbol, got, base)
		}
	}
}

func TestRefusedUnits(t *testing.T) {
	for text, want := range map[string]string{"degC/s": "degC", "m*Hz": "Hz", "Nm": "Nm is not a unit", "": "not a unit", "m/": "not a unit",
		"m//s": "not a unit", "m^": "not a unit", "m^99": "exponent", "kmin": "kmin is not a unit", "m s": "not a unit",
		"m/(s": "not a unit", strings.Repeat("m*", 150) + "m": "not a unit", "in": "not a unit", "1": ""} {
		u, err := ParseUnit(text)
		if want == "" {
			if err != nil || !u.IsNone() && u.Text != "1" {
				t.Errorf("%q: %v %v", text, u, err)
			}
			continue
		}
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: %v, want %q", shorten(text), err, want)
		}
	}
}

// Conversions of published exact definitions: inch 0.0254 m and pound 0.45359237 kg
// (1959), standard gravity 9.80665 m/s² (CGPM 1901), turns and degrees (ISO 80000-3).
func TestPublishedConversions(t *testing.T) {
	for _, c := range []struct {
		magnitude, from, to string
		want                float64
	}{
		{"3000", "rpm", "rad/s", 314.1592653589793}, {"90", "deg", "rad", 1.5707963267948966},
		{"1", "lbf", "N", 4.4482216152605}, {"1", "lbf*inch", "N*m", 0.1129848290276167},
		{"1", "kgf", "N", 9.80665}, {"1", "inch", "m", 0.0254}, {"3000", "rev/min", "rad/s", 314.1592653589793},
		{"25", "degC", "K", 298.15}, {"0", "K", "degC", -273.15}, {"1", "rad", "deg", 57.29577951308232},
	} {
		v, err := In(Quantity{rat(c.magnitude), mustUnit(t, c.from)}, mustUnit(t, c.to))
		if err != nil {
			t.Fatal(err)
		}
		got := v.(Quantity).Magnitude.Float64()
		if math.Abs(got-c.want) > 1e-15*math.Abs(c.want) {
			t.Errorf("%s %s = %.17g %s, want %.17g", c.magnitude, c.from, got, c.to, c.want)
		}
	}
	v, err := FromDecibels(Int(6))
	if err != nil || math.Abs(v.(Number).Float64()-1.9952623149688795) > 1e-15*2 {
		t.Errorf("6 dB = %v, %v", v, err)
	}
}

func TestQuantityArithmetic(t *testing.T) {
	q := func(magnitude, unit string) Quantity { return Quantity{rat(magnitude), mustUnit(t, unit)} }
	check := func(name string, v Value, err error, magnitude, unit string) {
		t.Helper()
		if err != nil {
			t.Errorf("%s: %v", name, err)
			return
		}
		got, ok := v.(Quantity)
		if n, isNumber := v.(Number); isNumber && unit == "" {
			got, ok = Quantity{n, None()}, true
		}
		if !ok || got.Magnitude.Exact == nil || got.Magnitude.Exact.Cmp(rat(magnitude).Exact) != 0 || got.Unit.Text != unit {
			t.Errorf("%s = %v, want %s %s", name, v, magnitude, unit)
		}
	}
	v, err := Add(q("1", "km"), q("5", "m"))
	check("1 km + 5 m", v, err, "1.005", "km")
	v, err = Subtract(q("90", "deg"), q("1/4", "rev"))
	check("90 deg - 1/4 rev", v, err, "0", "deg")
	v, err = Multiply(q("2", "N"), q("3", "m"))
	check("2 N * 3 m", v, err, "6", "N*m")
	v, err = Divide(q("6", "N*m"), q("2", "m"))
	check("6 N*m / 2 m", v, err, "3", "N")
	v, err = Divide(q("6", "N"), q("2", "kg"))
	check("N/kg", v, err, "3", "N/kg")
	v, err = Divide(q("3", "m"), q("2", "mm"))
	check("3 m / 2 mm", v, err, "1500", "")
	v, err = Divide(q("3000", "rpm"), q("60", "rpm"))
	check("rpm/rpm", v, err, "50", "")
	v, err = Multiply(q("0.08", "N*m*s/rad"), q("2", "rad/s"))
	check("damping", v, err, "0.16", "N*m")
	v, err = Multiply(q("2", "rad/s"), q("3", "m"))
	check("rad/s * m", v, err, "6", "m/s")
	v, err = Multiply(Int(2), q("90", "deg"))
	check("2*90 deg", v, err, "180", "deg")
	v, err = Divide(Int(1), q("4", "s"))
	check("1/(4 s)", v, err, "1/4", "1/s")
	v, err = Multiply(q("2", "kg"), q("3", "m/s^2"))
	check("kg*m/s^2", v, err, "6", "N")
	v, err = Power(q("3", "mm"), Int(2))
	check("(3 mm)^2", v, err, "9/1000000", "m^2")
	v, err = Sqrt(q("9", "m^2/s^2"))
	check("sqrt", v, err, "3", "m/s")
	v, err = Sqrt(q("16", "N^2*m^2"))
	check("sqrt N^2", v, err, "4", "N*m")
	v, err = Add(q("20", "degC"), q("5", "K"))
	check("20 degC + 5 K", v, err, "25", "degC")
	v, err = Subtract(q("20", "degC"), q("15", "degC"))
	check("degC - degC", v, err, "5", "K")
	v, err = Abs(q("-3", "m"))
	check("abs", v, err, "3", "m")
	v, err = Divide(q("400", "Hz"), q("200", "Hz"))
	check("Hz/Hz", v, err, "2", "")
	for name, operation := range map[string]func() (Value, error){
		"m + s":        func() (Value, error) { return Add(q("1", "m"), q("1", "s")) },
		"m + 1":        func() (Value, error) { return Add(q("1", "m"), Int(1)) },
		"sqrt m":       func() (Value, error) { return Sqrt(q("1", "m")) },
		"sin m":        func() (Value, error) { return Sin(q("1", "m")) },
		"exp m":        func() (Value, error) { return Exp(q("1", "m")) },
		"Hz * s":       func() (Value, error) { return Multiply(q("1", "Hz"), q("1", "s")) },
		"Hz + 1/s":     func() (Value, error) { return Add(q("1", "Hz"), q("1", "1/s")) },
		"2 * degC":     func() (Value, error) { return Multiply(Int(2), q("1", "degC")) },
		"degC + degC":  func() (Value, error) { return Add(q("1", "degC"), q("1", "degC")) },
		"rad/s in Hz":  func() (Value, error) { return In(q("1", "rad/s"), mustUnit(t, "Hz")) },
		"m in s":       func() (Value, error) { return In(q("1", "m"), mustUnit(t, "s")) },
		"[Hz]":         func() (Value, error) { return Collect([]Value{&List{Items: []Value{q("1", "Hz")}}}) },
		"m < s":        func() (Value, error) { v, err := Compare("<", q("1", "m"), q("1", "s")); return v, err },
		"m == 1":       func() (Value, error) { v, err := Equal(q("1", "m"), Int(1)); return v, err },
		"m^x":          func() (Value, error) { return Power(q("2", "m"), Float(0.5)) },
		"(-1 m^2)^0.5": func() (Value, error) { return Sqrt(q("-1", "m^2")) },
	} {
		if v, err := operation(); err == nil {
			t.Errorf("%s gave %v", name, v)
		}
	}
}

func TestComparisonAcrossUnits(t *testing.T) {
	for _, c := range []struct {
		op, a, u, b, v string
		want           bool
	}{
		{"<", "1", "m", "1.01e3", "mm", true}, {"==", "1", "km", "1000", "m", true}, {"==", "180", "deg", "1/2", "rev", true},
		{">", "1", "rad", "57", "deg", true}, {"<", "25", "degC", "299", "K", true}, {"!=", "1", "bar", "1e5", "Pa", false},
	} {
		got, err := Compare(c.op, Quantity{rat(c.a), mustUnit(t, c.u)}, Quantity{rat(c.b), mustUnit(t, c.v)})
		if err != nil || bool(got) != c.want {
			t.Errorf("%s %s %s %s %s: %v %v", c.a, c.u, c.op, c.b, c.v, got, err)
		}
	}
}

func TestFrequenciesAndRates(t *testing.T) {
	q := func(magnitude, unit string) Quantity { return Quantity{rat(magnitude), mustUnit(t, unit)} }
	number := func(shape Shape, v Value) float64 {
		t.Helper()
		out, err := Coerce(Param{Name: "w", Shape: shape}, v)
		if err != nil {
			t.Error(err)
			return math.NaN()
		}
		return out.(Number).Float64()
	}
	for _, c := range []struct{ got, want float64 }{
		{number(AFrequency, q("2", "Hz")), 4 * math.Pi}, {number(AFrequency, q("60", "rpm")), 2 * math.Pi},
		{number(AFrequency, q("1.1", "rad/s")), 1.1}, {number(AFrequency, rat("3")), 3}, {number(AFrequency, q("1", "kHz")), 2000 * math.Pi},
		{number(ARate, q("200", "Hz")), 0.005}, {number(ARate, q("5", "ms")), 0.005}, {number(ARate, q("200", "1/s")), 0.005},
		{number(ATime, q("2", "min")), 120}, {number(ATime, rat("2")), 2},
	} {
		if math.Abs(c.got-c.want) > 4e-16*c.want {
			t.Errorf("got %.17g, want %.17g", c.got, c.want)
		}
	}
	for _, c := range []struct {
		shape Shape
		v     Value
	}{{AFrequency, q("1", "s")}, {ARate, q("1", "rad/s")}, {ARate, rat("0")}, {ATime, q("-1", "s")}, {ATime, q("1", "Hz")}} {
		if out, err := Coerce(Param{Name: "w", Shape: c.shape}, c.v); err == nil {
			t.Errorf("shape %d of %v gave %v", c.shape, c.v, out)
		}
	}
}
