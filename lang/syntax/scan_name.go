package syntax

import (
	"unicode"
	"unicode/utf8"

	"golang.org/x/text/unicode/norm"

	"gainwright/lang/diag"
)

const nameLength = 256 // bytes; enough for any name a person reads

// transposed is the raised T. It is a letter in Unicode but an operator here.
const transposed = 'ᵀ'

func isNameStart(r rune) bool {
	return r == '_' || r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' ||
		r >= utf8.RuneSelf && r != transposed && unicode.IsLetter(r)
}

func isNamePart(r rune) bool {
	return isNameStart(r) || isSubscriptOrPrime(r) || r >= '0' && r <= '9' ||
		r >= utf8.RuneSelf && (unicode.Is(unicode.M, r) || unicode.Is(unicode.Nd, r))
}

func isSubscriptOrPrime(r rune) bool {
	return r >= '₀' && r <= '₉' || r >= '′' && r <= '‴'
}

// name scans a name or a word of the language. Its identity is the NFKC form, so x₁ and
// x1 are one name, and so are the micro sign and the Greek letter.
func (s *scanner) name(t *token) {
	start := s.pos
	ascii := true
	for s.pos < s.end {
		if c := s.text[s.pos]; c < utf8.RuneSelf {
			if !isNamePart(rune(c)) {
				break
			}
			s.pos++
			continue
		}
		r, size := s.rune(s.pos)
		if !isNamePart(r) {
			break
		}
		ascii = false
		s.pos += size
	}
	written := s.text[start:s.pos]
	span := diag.Span{Start: start, End: s.pos}
	if len(written) > nameLength {
		s.fail(diag.Limit, span, "", "a name is longer than %d bytes", nameLength)
	}
	t.kind, t.text = tokenWord, written
	if ascii {
		return
	}
	folded := norm.NFKC.String(written)
	for _, r := range folded {
		if !isNamePart(r) {
			s.fail(diag.Syntax, span, "this letter stands for several characters in Unicode; use plain letters", "%s cannot be a name", written)
		}
	}
	t.text = folded
}

// ValidName gives a name as the language stores it (NFKC), and whether the text is one
// name that can be bound.
func ValidName(text string) (string, bool) {
	s := &scanner{src: diag.NewSource("", text), text: text, end: len(text)}
	valid := false
	var t token
	err := guarded(func() {
		if r := s.peekRune(); r < 0 || !isNameStart(r) {
			return
		}
		s.name(&t)
		valid = s.pos == s.end && !reserved[t.text]
	})
	return t.text, valid && err == nil
}

// reserved words cannot be names: they stand between values, where a name could too.
var reserved = map[string]bool{
	"and": true, "or": true, "not": true, "if": true, "else": true, "for": true,
	"in": true, "is": true, "true": true, "false": true,
}

// afterNumber are the words that may follow a number without being its unit.
var afterNumber = map[string]bool{
	"and": true, "or": true, "not": true, "if": true, "else": true, "for": true, "in": true, "is": true,
	"where": true, "of": true, "each": true, "to": true, "from": true, "over": true, "at": true,
	"samples": true, "seed": true, "range": true, "every": true, "find": true, "steps": true,
	"model": true, "true": true, "false": true,
	"given": true, "input": true, "state": true, "output": true, "let": true, "rate": true, "next": true, "around": true,
}
