package value

import (
	"math/big"
	"strconv"
	"strings"

	"gainwright/lang/diag"
)

// Dimension holds the exponents of m, kg, s, A, K, mol, cd.
type Dimension [7]int8

// Unit is a unit of measurement: value in SI = (value in unit) × Scale × π^Pi + Offset.
// Only degC has an offset, and only alone.
type Unit struct {
	Text    string // as written, or derived; "" for a plain number
	Dim     Dimension
	Scale   *big.Rat
	Pi      int
	Offset  *big.Rat // nil for none
	hertz   bool     // Hz: whether 2π belongs to it depends on what it is used for
	factors []UnitFactor
}

// UnitFactor is a unit's symbol with its exponent.
type UnitFactor struct {
	Symbol   string
	Exponent int
}

// None is the unit of plain numbers.
func None() Unit { return Unit{Scale: big.NewRat(1, 1)} }

// IsNone tells whether the unit is that of plain numbers (rad and deg are not, though they have no dimension).
func (u Unit) IsNone() bool { return u.Text == "" && u.Dim == Dimension{} }

// IsCoherent tells whether the unit is one of the SI without a factor: s, N*m, rad/s, but not ms or rpm.
func (u Unit) IsCoherent() bool {
	return u.Pi == 0 && u.Offset == nil && !u.hertz && u.scale().Cmp(ratOne) == 0
}

// IsHertz tells whether the unit is Hz, with or without a prefix.
func (u Unit) IsHertz() bool { return u.hertz }

// IsPlain tells whether the dimension is that of plain numbers and angles.
func (d Dimension) IsPlain() bool { return d == Dimension{} }

// scale is Scale, 1 where a Unit was made without one.
func (u Unit) scale() *big.Rat {
	if u.Scale == nil {
		return ratOne
	}
	return u.Scale
}

// largestExponent bounds the exponents of units, well inside int8 for every base dimension.
const largestExponent = 12

func (d Dimension) times(e Dimension, exponent int) (Dimension, error) {
	for k := range d {
		sum := int(d[k]) + exponent*int(e[k])
		if sum > 4*largestExponent || sum < -4*largestExponent {
			return d, diag.New(diag.Limit, "the exponents of this unit are too large")
		}
		d[k] = int8(sum)
	}
	return d, nil
}

var baseSymbols = [7]string{"m", "kg", "s", "A", "K", "mol", "cd"}

// String writes the dimension in SI base units: "kg*m^2/s^2", "1" when plain.
func (d Dimension) String() string {
	if text := unitText(d.baseFactors()); text != "" {
		return text
	}
	return "1"
}

func (d Dimension) baseFactors() []UnitFactor {
	var factors []UnitFactor
	for _, k := range [7]int{1, 0, 2, 3, 4, 5, 6} { // kg first, as it is usually written
		if d[k] != 0 {
			factors = append(factors, UnitFactor{baseSymbols[k], int(d[k])})
		}
	}
	return factors
}

// Resolve finds the unit that symbols with exponents stand for; text is how it was written.
// Unknown symbols get the nearest known one suggested.
func Resolve(text string, factors []UnitFactor) (Unit, error) {
	u := Unit{Text: text, Scale: big.NewRat(1, 1), factors: factors}
	for _, f := range factors {
		d, prefix, err := findSymbol(f.Symbol)
		if err != nil {
			return None(), err
		}
		if d.offset != nil || d.hertz {
			if len(factors) != 1 || f.Exponent != 1 {
				return None(), standsAlone(f.Symbol, d)
			}
			u.Offset, u.hertz = d.offset, d.hertz
		}
		if f.Exponent > largestExponent || f.Exponent < -largestExponent {
			return None(), diag.New(diag.Unit, "the exponent of %s is larger than %d", f.Symbol, largestExponent)
		}
		if u.Dim, err = u.Dim.times(d.dim, f.Exponent); err != nil {
			return None(), err
		}
		factor := new(big.Rat).Mul(d.scale, prefix)
		u.Scale.Mul(u.Scale, ratPower(factor, f.Exponent))
		u.Pi += d.pi * f.Exponent
	}
	return u, nil
}

func standsAlone(symbol string, d *unitDefinition) error {
	e := diag.New(diag.Unit, "%s cannot be part of a compound unit", symbol)
	if d.hertz {
		return e.WithHelp("write rad/s for an angular frequency (2π for each cycle), or 1/s")
	}
	return e.WithHelp("write K for a difference of temperatures")
}

// ratPower gives rᵏ; callers bound k.
func ratPower(r *big.Rat, k int) *big.Rat {
	e := big.NewInt(int64(max(k, -k)))
	num := new(big.Int).Exp(r.Num(), e, nil)
	den := new(big.Int).Exp(r.Denom(), e, nil)
	if k < 0 {
		num, den = den, num
	}
	return new(big.Rat).SetFrac(num, den)
}

// ParseUnit reads a unit as written in the language and in names like "x in mm": symbols with
// whole exponents, joined by * and /, a leading 1, and parentheses round a denominator.
func ParseUnit(text string) (Unit, error) {
	malformed := func() (Unit, error) {
		return None(), diag.New(diag.Unit, "%q is not a unit", shorten(text)).WithHelp("units look like N*m, m/s^2 or kg*m^2/s")
	}
	rest := strings.TrimSpace(text)
	if len(rest) > 200 {
		return malformed()
	}
	var factors []UnitFactor
	sign, inside := 1, false
	for first := true; first || rest != ""; first = false {
		if !first {
			switch {
			case rest[0] == '*':
				if !inside {
					sign = 1
				}
			case rest[0] == '/' && !inside:
				sign = -1
			default:
				return malformed()
			}
			rest = rest[1:]
			if sign < 0 && !inside && strings.HasPrefix(rest, "(") {
				inside, rest = true, rest[1:]
			}
		}
		symbol, exponent, after, ok := unitFactor(rest)
		if !ok {
			return malformed()
		}
		if rest = after; inside && strings.HasPrefix(rest, ")") {
			inside, rest, sign = false, rest[1:], 1
		}
		if symbol != "1" {
			factors = append(factors, UnitFactor{symbol, sign * exponent})
		} else if !first && len(factors) == 0 {
			return malformed()
		}
	}
	if inside {
		return malformed()
	}
	return Resolve(strings.TrimSpace(text), factors)
}

// unitFactor cuts "s^-2" off the front of a unit's text.
func unitFactor(text string) (symbol string, exponent int, rest string, ok bool) {
	end := strings.IndexAny(text, "*/^()")
	if end < 0 {
		end = len(text)
	}
	symbol, rest = text[:end], text[end:]
	if symbol == "" || strings.ContainsAny(symbol, " \t") {
		return "", 0, "", false
	}
	if !strings.HasPrefix(rest, "^") {
		return symbol, 1, rest, true
	}
	end = 1
	for end < len(rest) && (rest[end] >= '0' && rest[end] <= '9' || end == 1 && (rest[end] == '-' || rest[end] == '+')) {
		end++
	}
	exponent, err := strconv.Atoi(rest[1:end])
	return symbol, exponent, rest[end:], err == nil && symbol != "1"
}

func shorten(text string) string {
	if runes := []rune(text); len(runes) > 40 {
		return string(runes[:40]) + "…"
	}
	return text
}

// SI is the coherent unit of the same dimension that quantities in u turn into.
func (u Unit) SI() Unit {
	if u.IsNone() {
		return None()
	}
	coherent := u.coherentFactors()
	return Unit{Text: unitText(coherent), Dim: u.Dim, Scale: big.NewRat(1, 1), factors: coherent}
}

// coherentFactors replaces each symbol by coherent ones: mm by m, rpm by rad/s, bar by Pa.
func (u Unit) coherentFactors() []UnitFactor {
	if len(u.factors) == 0 {
		return canonicalFactors(u.Dim)
	}
	var out []UnitFactor
	for _, f := range u.factors {
		d, _, err := findSymbol(f.Symbol)
		if err != nil {
			return canonicalFactors(u.Dim)
		}
		out = mergeFactors(out, d.coherent, f.Exponent)
	}
	return out
}

func mergeFactors(a, b []UnitFactor, exponent int) []UnitFactor {
	out := append([]UnitFactor(nil), a...)
next:
	for _, f := range b {
		for k := range out {
			if out[k].Symbol == f.Symbol {
				out[k].Exponent += exponent * f.Exponent
				continue next
			}
		}
		out = append(out, UnitFactor{f.Symbol, exponent * f.Exponent})
	}
	kept := out[:0]
	for _, f := range out {
		if f.Exponent != 0 {
			kept = append(kept, f)
		}
	}
	return kept
}

// combine gives the coherent unit of a product (exponent 1), a quotient (−1) or of a power when a is None.
func combineUnits(a, b Unit, exponent int) (Unit, error) {
	dim, err := a.Dim.times(b.Dim, exponent)
	if err != nil {
		return None(), err
	}
	factors := readable(mergeFactors(a.coherentFactors(), b.coherentFactors(), exponent), dim)
	return Unit{Text: unitText(factors), Dim: dim, Scale: big.NewRat(1, 1), factors: factors}, nil
}

// readable drops radians that say nothing and replaces long products by a named unit or base units.
func readable(factors []UnitFactor, dim Dimension) []UnitFactor {
	onlyTime, angle, size := true, 0, 0
	for _, f := range factors {
		if f.Symbol == "rad" {
			angle = f.Exponent
			continue
		}
		size += max(f.Exponent, -f.Exponent)
		onlyTime = onlyTime && f.Symbol == "s"
	}
	if angle > 0 && !onlyTime || angle < 0 && onlyTime {
		factors = mergeFactors(factors, []UnitFactor{{"rad", 1}}, -angle)
	}
	if size > 3 {
		return canonicalFactors(dim)
	}
	return factors
}

// canonicalFactors gives a named SI unit where there is one, else base units.
func canonicalFactors(dim Dimension) []UnitFactor {
	for _, symbol := range [...]string{"N", "Pa", "J", "W", "C", "V", "Ω", "F", "Wb", "T", "H"} {
		if unitTable[symbol].dim == dim {
			return []UnitFactor{{symbol, 1}}
		}
	}
	return dim.baseFactors()
}

// unitText writes factors: numerator first, then a solidus, with parentheses round several denominators.
func unitText(factors []UnitFactor) string {
	var over, under []string
	for _, f := range factors {
		text := f.Symbol
		if n := max(f.Exponent, -f.Exponent); n != 1 {
			text += "^" + strconv.Itoa(n)
		}
		if f.Exponent > 0 {
			over = append(over, text)
		} else {
			under = append(under, text)
		}
	}
	text := strings.Join(over, "*")
	if len(under) == 0 {
		return text
	}
	if text == "" {
		text = "1"
	}
	if len(under) == 1 {
		return text + "/" + under[0]
	}
	return text + "/(" + strings.Join(under, "*") + ")"
}
