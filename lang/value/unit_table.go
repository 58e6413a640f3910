package value

import (
	"math/big"
	"sort"
	"strings"
	"sync"

	"gainwright/lang/diag"
)

// unitDefinition is one symbol of the table: a unit is scale × π^pi of the coherent unit.
type unitDefinition struct {
	dim      Dimension
	scale    *big.Rat
	pi       int
	offset   *big.Rat
	prefixes bool
	hertz    bool
	coherent []UnitFactor // the coherent unit that arithmetic turns it into
}

// The SI units and the units accepted beside them: BIPM, The International System of
// Units, 9th edition 2019, tables 2, 4 and 8; inch, foot and pound: international yard
// and pound agreement 1959; standard gravity 9.80665 m/s²: 3rd CGPM 1901. A unit is a
// number times a product of earlier symbols, so each definition reads as published.
var unitTable = buildUnits()

func buildUnits() map[string]*unitDefinition {
	t := map[string]*unitDefinition{}
	for k, symbol := range baseSymbols {
		var dim Dimension
		dim[k] = 1
		t[symbol] = &unitDefinition{dim: dim, scale: ratOne, prefixes: symbol != "kg",
			coherent: []UnitFactor{{symbol, 1}}}
	}
	// Coherent units keep their own symbol in products.
	for _, row := range [...][2]string{
		{"rad", ""}, {"sr", ""}, {"N", "kg*m/s^2"}, {"Pa", "N/m^2"}, {"J", "N*m"}, {"W", "J/s"},
		{"C", "A*s"}, {"V", "W/A"}, {"F", "C/V"}, {"Ω", "V/A"}, {"ohm", "V/A"}, {"S", "A/V"},
		{"Wb", "V*s"}, {"T", "Wb/m^2"}, {"H", "Wb/A"}, {"lm", "cd*sr"}, {"lx", "lm/m^2"},
		{"Bq", "1/s"}, {"Gy", "J/kg"}, {"Sv", "J/kg"}, {"kat", "mol/s"},
	} {
		d := define(t, "1", 0, row[1])
		d.prefixes, d.coherent = true, []UnitFactor{{row[0], 1}}
		t[row[0]] = d
	}
	t["ohm"].coherent = t["Ω"].coherent
	t["Hz"] = &unitDefinition{dim: Dimension{2: -1}, scale: ratOne, prefixes: true, hertz: true,
		coherent: []UnitFactor{{"s", -1}}}
	t["degC"] = &unitDefinition{dim: Dimension{4: 1}, scale: ratOne, offset: big.NewRat(27315, 100),
		coherent: []UnitFactor{{"K", 1}}}
	for _, row := range [...]struct {
		symbol, number string
		pi             int
		of             string
		prefixes       bool
	}{
		{"g", "1/1000", 0, "kg", true},
		{"min", "60", 0, "s", false}, {"h", "3600", 0, "s", false}, {"d", "86400", 0, "s", false},
		{"deg", "1/180", 1, "rad", false}, {"arcmin", "1/10800", 1, "rad", false}, {"arcsec", "1/648000", 1, "rad", false},
		{"rev", "2", 1, "rad", false}, {"rpm", "1/30", 1, "rad/s", false},
		{"L", "1/1000", 0, "m^3", true}, {"l", "1/1000", 0, "m^3", true},
		{"ha", "10000", 0, "m^2", false}, {"t", "1000", 0, "kg", false}, {"bar", "100000", 0, "Pa", true},
		{"au", "149597870700", 0, "m", false}, {"eV", "1602176634/10000000000000000000000000000", 0, "J", true},
		{"inch", "0.0254", 0, "m", false}, {"ft", "0.3048", 0, "m", false}, {"lb", "0.45359237", 0, "kg", false},
		{"lbf", "4.4482216152605", 0, "N", false}, {"kgf", "9.80665", 0, "N", false},
	} {
		d := define(t, row.number, row.pi, row.of)
		d.prefixes = row.prefixes
		t[row.symbol] = d
	}
	return t
}

// define makes number × π^pi × a product of symbols that stand in t already.
func define(t map[string]*unitDefinition, number string, pi int, of string) *unitDefinition {
	scale, _ := new(big.Rat).SetString(number)
	d := &unitDefinition{scale: scale, pi: pi}
	for text, sign := of, 1; text != ""; {
		symbol, exponent, rest, _ := unitFactor(text)
		exponent *= sign
		if symbol != "1" {
			d.coherent = append(d.coherent, UnitFactor{symbol, exponent})
			for k, e := range t[symbol].dim {
				d.dim[k] += int8(exponent) * e
			}
		}
		sign = 1
		if strings.HasPrefix(rest, "/") {
			sign = -1
		}
		text = strings.TrimLeft(rest, "*/")
	}
	return d
}

// The prefixes of the SI Brochure's table 7 (ronna, quetta, ronto, quecto: 27th CGPM 2022); u stands for µ.
var prefixPowers = map[string]int{
	"Q": 30, "R": 27, "Y": 24, "Z": 21, "E": 18, "P": 15, "T": 12, "G": 9, "M": 6, "k": 3, "h": 2, "da": 1,
	"d": -1, "c": -2, "m": -3, "µ": -6, "μ": -6, "u": -6, "n": -9, "p": -12, "f": -15, "a": -18, "z": -21,
	"y": -24, "r": -27, "q": -30,
}

// findSymbol looks a symbol up: a whole symbol before a prefix with a symbol.
func findSymbol(symbol string) (*unitDefinition, *big.Rat, error) {
	if symbol == "\u2126" { // the ohm sign, in text that was not normalised
		symbol = "Ω"
	}
	if d, ok := unitTable[symbol]; ok {
		return d, ratOne, nil
	}
	for prefix, power := range prefixPowers {
		if d := unitTable[strings.TrimPrefix(symbol, prefix)]; d != nil && strings.HasPrefix(symbol, prefix) && d.prefixes {
			return d, ratPower(big.NewRat(10, 1), power), nil
		}
	}
	e := diag.New(diag.Unit, "%s is not a unit", shorten(symbol))
	switch symbol {
	case "in", "″":
		return nil, nil, e.WithHelp("an inch is written inch; in is a word of the language")
	case "%":
		return nil, nil, e.WithHelp("per cent follows a number: 5%%")
	}
	if near := Nearest(symbol, unitSymbols()); near != "" {
		return nil, nil, e.WithHelp("did you mean %s?", near)
	}
	return nil, nil, e
}

// unitSymbols lists what is offered for an unknown symbol: all whole ones and the usual prefixed ones.
var unitSymbols = sync.OnceValue(func() []string {
	var out []string
	for symbol, d := range unitTable {
		out = append(out, symbol)
		if d.prefixes {
			for _, prefix := range [...]string{"k", "M", "G", "m", "µ", "n"} {
				out = append(out, prefix+symbol)
			}
		}
	}
	sort.Strings(out)
	return out
})

// UnitSymbols lists the symbols of units without prefixes, sorted, for completion and the reference.
func UnitSymbols() []string {
	out := make([]string, 0, len(unitTable))
	for symbol := range unitTable {
		out = append(out, symbol)
	}
	sort.Strings(out)
	return out
}
