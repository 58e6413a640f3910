package syntax

import (
	"fmt"
	"math/big"
	"strings"

	"gainwright/lang/diag"
)

// Bounds on literals. They are met before anything is computed, so that a short text
// cannot ask for a number that fills the memory.
const (
	numberDigits   = 10_000
	numberExponent = 10_000
	ordinaryDigits = 64        // a literal shorter than this costs nothing of the file's share
	longDigits     = 2_000_000 // digits that all longer literals of one file may have together
)

// number scans digits, point and exponent, and a closing i. What follows must not touch it.
func (s *scanner) number(t *token) {
	t.kind = tokenNumber
	start := s.pos
	s.digits()
	if s.at(".") && !s.at("..") {
		if !s.digitAt(s.pos + 1) {
			s.refuseEndPoint(start)
		}
		s.pos++
		s.digits()
	}
	mantissa := s.pos - start
	exponent := s.exponent(start)
	t.text = s.text[start:s.pos]
	if r := s.peekRune(); r == 'i' {
		next, _ := s.rune(s.pos + 1)
		if !isNamePart(next) {
			t.imaginary = true
			s.pos++
		}
	}
	s.refuseTouching(start, t)
	s.charge(start, mantissa, exponent)
}

func (s *scanner) digits() {
	for s.digitAt(s.pos) {
		s.pos++
	}
}

func (s *scanner) digitAt(pos int) bool {
	return pos < s.end && s.text[pos] >= '0' && s.text[pos] <= '9'
}

func (s *scanner) at(prefix string) bool { return strings.HasPrefix(s.text[s.pos:s.end], prefix) }

func (s *scanner) refuseEndPoint(start int) {
	written := s.text[start:s.pos]
	help := "write " + written + ".0 or " + written
	if len(written) > 12 {
		help = ""
	}
	if s.pos+1 < s.end && strings.ContainsRune("*/^", rune(s.text[s.pos+1])) {
		help = "write " + written + " " + string(s.text[s.pos+1]) + " …; entry by entry: hadamard(A, B)"
	}
	s.fail(diag.Syntax, diag.Span{Start: s.pos, End: s.pos + 1}, help, "a number does not end with a point")
}

// exponent scans e-3 if it is there and gives its magnitude.
func (s *scanner) exponent(start int) int {
	if !s.at("e") && !s.at("E") {
		return 0
	}
	digits := s.pos + 1
	if digits < s.end && (s.text[digits] == '+' || s.text[digits] == '-') {
		digits++
	}
	if !s.digitAt(digits) {
		return 0 // "2e" is refused as a number that touches a letter
	}
	s.pos = digits
	magnitude := 0
	for s.digitAt(s.pos) {
		magnitude = min(10*magnitude+int(s.text[s.pos]-'0'), numberExponent+1)
		s.pos++
	}
	if magnitude > numberExponent {
		s.fail(diag.Limit, diag.Span{Start: start, End: s.pos}, "", "the exponent is beyond ±%d", numberExponent)
	}
	return magnitude
}

func (s *scanner) refuseTouching(start int, t *token) {
	r := s.peekRune()
	if r == '.' && s.digitAt(s.pos+1) {
		s.fail(diag.Syntax, diag.Span{Start: s.pos, End: s.pos + 1}, "", "a number has one point at most, and none in its exponent")
	}
	if r < 0 || !isNamePart(r) {
		return
	}
	number := s.text[start:s.pos]
	from := s.pos
	for s.pos < s.end && s.pos < from+40 {
		next, size := s.rune(s.pos)
		if !isNamePart(next) {
			break
		}
		s.pos += size
	}
	letters := s.text[from:s.pos]
	span := diag.Span{Start: from, End: s.pos}
	if letters == "j" || letters == "J" || letters == "I" {
		s.fail(diag.Syntax, span, "the imaginary unit is i, as in "+shortened(t.text)+"i", "%s touches the number", letters)
	}
	help := fmt.Sprintf("a unit stands after a space: %s %s; a product needs its sign: %s*%s", shortened(number), letters, shortened(number), letters)
	s.fail(diag.Syntax, span, help, "%s touches the number", letters)
}

func shortened(text string) string {
	if len(text) > 20 {
		return text[:17] + "…"
	}
	return text
}

// charge refuses literals that are too long, one by one and together.
func (s *scanner) charge(start, mantissa, exponent int) {
	span := diag.Span{Start: start, End: s.pos}
	if mantissa > numberDigits {
		s.fail(diag.Limit, span, "", "a number of more than %d digits", numberDigits)
	}
	if n := mantissa + exponent; n > ordinaryDigits && start >= s.charged {
		s.long, s.charged = s.long+n, s.pos
		if s.long > longDigits {
			s.fail(diag.Limit, span, "", "the long numbers of this text have more than %d digits together", longDigits)
		}
	}
}

// decimal gives the exact value of a scanned number.
func decimal(text string) *big.Rat {
	value, ok := new(big.Rat).SetString(text)
	if !ok {
		panic("a scanned number must be readable: " + text)
	}
	return value
}
