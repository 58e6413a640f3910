package syntax

import (
	"strings"
	"unicode"
	"unicode/utf8"

	"golang.org/x/text/unicode/norm"

	"gainwright/lang/diag"
)

const unitExponent = 99 // no unit has a power beyond it

// unitScan reads one unit. Whether its symbols exist is not judged here.
//
//	unit   = factor { ("*" | "·" | "/") factor }      no blanks inside
//	factor = symbol [exponent] | "1" (first only, before "/") | "(" unit ")" (after "/" only)
type unitScan struct {
	s       *scanner
	factors []UnitFactor
	divided bool // a / stands before, at this level
}

// unitAt reads the unit that begins at the scanner's position; nil, with the position
// unchanged, if none begins there.
func (s *scanner) unitAt() *Unit {
	start := s.pos
	u := &unitScan{s: s}
	if !u.read() {
		s.pos = start
		return nil
	}
	return &Unit{Text: s.text[start:s.pos], Factors: u.factors, Span: diag.Span{Start: start, End: s.pos}}
}

// unitAfterNumber reads the unit of the number that ends at the scanner's position. A
// word of the language, a name that cannot be a symbol and a call are no units.
func (s *scanner) unitAfterNumber() *Unit {
	start := s.pos
	s.inlineBlank()
	if s.pos == start || !s.unitBegins() {
		s.pos = start
		return nil
	}
	if unit := s.unitAt(); unit != nil {
		return unit
	}
	s.pos = start
	return nil
}

// inlineBlank passes blanks within a line.
func (s *scanner) inlineBlank() {
	for s.pos < s.end {
		r, size := s.rune(s.pos)
		if r != '\t' && !unicode.Is(unicode.Zs, r) {
			return
		}
		s.pos += size
	}
}

// unitBegins tells whether what stands here reads as a unit: letters alone, or 1/ and letters.
func (s *scanner) unitBegins() bool {
	pos := s.pos
	if strings.HasPrefix(s.text[pos:s.end], "1/") {
		pos += 2
	}
	word, next := s.letters(pos)
	if word == "" || afterNumber[norm.NFKC.String(word)] && pos == s.pos {
		return false
	}
	return next != '(' && next != ':' && (next == transposed || !isNamePart(next))
}

// letters gives the run of letters at an offset and the character after it.
func (s *scanner) letters(pos int) (word string, next rune) {
	start := pos
	for {
		r, size := s.rune(pos)
		if !isNameStart(r) || r == '_' {
			return s.text[start:pos], r
		}
		pos += size
	}
}

func (u *unitScan) read() bool {
	s := u.s
	switch {
	case s.at("1/"):
		if word, _ := s.letters(s.pos + 2); word == "" {
			return false
		}
		s.pos++
	case s.at("%"):
		s.pos++
		u.factors = append(u.factors, UnitFactor{Symbol: "%", Exponent: 1, Span: diag.Span{Start: s.pos - 1, End: s.pos}})
		return true
	case !u.symbol(1):
		return false
	}
	for u.factor() {
	}
	return true
}

// factor reads "*symbol" or "/symbol"; an operator before anything else ends the unit.
func (u *unitScan) factor() bool {
	s := u.s
	start := s.pos
	r, size := s.rune(s.pos)
	if r != '*' && r != '/' && r != '·' && r != '⋅' {
		return false
	}
	sign := 1
	if r == '/' {
		sign = -1
	}
	s.pos += size
	if sign < 0 && s.at("(") && u.group() {
		u.divided = true
		return true
	}
	if !u.symbol(sign) {
		s.pos = start
		return false
	}
	if sign > 0 && u.divided {
		s.fail(diag.Syntax, diag.Span{Start: start, End: s.pos}, "bring the factor before the /, or put the divisor in parentheses: N*s/m, N/(m*s); a product with a name needs blanks: 3 m * x",
			"a unit with a product after its / can be read in two ways")
	}
	u.divided = u.divided || sign < 0
	return true
}

// group reads "(kg*K)" after a /; anything else in the parentheses is no unit.
func (u *unitScan) group() bool {
	s := u.s
	start := s.pos
	s.pos++
	inner := &unitScan{s: s}
	if !inner.symbol(1) {
		s.pos = start
		return false
	}
	for inner.factor() {
	}
	if !s.at(")") {
		s.pos = start
		return false
	}
	s.pos++
	for _, f := range inner.factors {
		f.Exponent = -f.Exponent
		u.factors = append(u.factors, f)
	}
	return true
}

// symbol reads a symbol with its exponent.
func (u *unitScan) symbol(sign int) bool {
	s := u.s
	start := s.pos
	word, next := s.letters(start)
	if word == "" || next == '_' || next >= '0' && next <= '9' || isSubscriptOrPrime(next) || unicode.Is(unicode.M, next) {
		return false
	}
	s.pos += len(word)
	if next == '(' {
		s.fail(diag.Syntax, diag.Span{Start: start, End: s.pos}, "a product after a unit needs blanks: 2 m * "+word+"(…)", "%s stands where a unit is read", word)
	}
	exponent := u.exponent()
	u.factors = append(u.factors, UnitFactor{
		Symbol: norm.NFKC.String(word), Exponent: sign * exponent,
		Span: diag.Span{Start: start, End: s.pos},
	})
	return true
}

const raised = "⁰¹²³⁴⁵⁶⁷⁸⁹"

// exponent reads ^2, ^-1, ², ⁻¹; 1 if none stands here.
func (u *unitScan) exponent() int {
	s := u.s
	start := s.pos
	sign, value, digits := 1, 0, 0
	if s.at("^") {
		s.pos++
		if s.at("-") || s.at("−") {
			_, size := s.rune(s.pos)
			sign, s.pos = -1, s.pos+size
		}
		for ; s.digitAt(s.pos); s.pos++ {
			value, digits = min(10*value+int(s.text[s.pos]-'0'), unitExponent+1), digits+1
		}
	} else {
		if s.at("⁻") {
			sign, s.pos = -1, s.pos+len("⁻")
		}
		for {
			r, size := s.rune(s.pos)
			i := strings.IndexRune(raised, r)
			if r < 0 || i < 0 {
				break
			}
			value, digits = min(10*value+utf8.RuneCountInString(raised[:i]), unitExponent+1), digits+1
			s.pos += size
		}
		if s.pos == start {
			return 1
		}
	}
	span := diag.Span{Start: start, End: max(s.pos, start+1)}
	switch {
	case digits == 0 || s.at(".") && s.digitAt(s.pos+1):
		s.fail(diag.Syntax, span, "m^2, m^-1 or m²; a power of a quantity needs parentheses: (2 m)^n", "the exponent of a unit is a whole number")
	case value > unitExponent:
		s.fail(diag.Limit, span, "", "the exponent of a unit is beyond ±%d", unitExponent)
	}
	return sign * value
}

// ParseUnit reads a unit alone, as in "rad/s". Spans count from the text's start.
func ParseUnit(text string) (*Unit, error) {
	s := &scanner{src: diag.NewSource("unit", text), text: text, end: len(text)}
	var unit *Unit
	err := guarded(func() {
		unit = s.unitAt()
		if unit == nil || s.pos != s.end {
			s.fail(diag.Unit, diag.Span{Start: s.pos, End: len(text)}, "a unit is written like N*m/rad, m/s^2 or 1/s, without blanks", "%q is no unit", text)
		}
	})
	if err != nil {
		return nil, err.err
	}
	return unit, nil
}

// guarded runs a scan or a parse and gives the error it met, nil for none.
func guarded(run func()) (failure *bailout) {
	defer func() {
		switch r := recover().(type) {
		case nil:
		case bailout:
			failure = &r
		default:
			panic(r)
		}
	}()
	run()
	return nil
}
