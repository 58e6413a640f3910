package syntax

import (
	"strings"
	"unicode"
	"unicode/utf8"

	"gainwright/lang/diag"
)

// habits are spellings that other notations use; each gets the word of this language.
var habits = []struct{ written, help string }{
	{"&&", "both conditions: and"},
	{"||", "either condition: or"},
	{"**", "powers are written ^"},
	{".*", "entry by entry: hadamard(A, B)"},
	{"./", "entry by entry: hadamard(A, B), [1/x for each x of L]"},
	{".^", "entry by entry: [x^2 for each x of L]"},
	{"//", "a comment starts with #"},
	{"/*", "a comment starts with #"},
	{"<>", "unequal is written !="},
	{"=<", "at most is written <="},
	{"=>", "at least is written >="},
	{":=", "a name is bound by ="},
	{"+=", "a name is bound once; bind a new one by ="},
	{"-=", "a name is bound once; bind a new one by ="},
	{"*=", "a name is bound once; bind a new one by ="},
	{"->", "a function is written define f(x) = …"},
	{"++", "write + once"},
}

// refuseHabit fails on a spelling that has another one here.
func (s *scanner) refuseHabit(rest string) {
	for _, h := range habits {
		if strings.HasPrefix(rest, h.written) {
			s.fail(diag.Syntax, diag.Span{Start: s.pos, End: s.pos + len(h.written)}, h.help, "%s is no operator", h.written)
		}
	}
}

// characterHelp says what to write instead of a character that has no meaning.
var characterHelp = map[rune]string{
	'&':  "both conditions: and",
	'|':  "the magnitude is abs(x); either condition: or",
	'!':  "a condition is turned over by not; unequal is written !=",
	'~':  "a condition is turned over by not; unequal is written !=",
	'×':  "products are written *",
	'·':  "products are written *",
	'⋅':  "products are written *",
	'∙':  "products are written *",
	'÷':  "quotients are written /",
	'√':  "the root is sqrt(x)",
	'∞':  "there is no literal for infinity",
	'°':  "degrees are deg, degrees Celsius degC",
	'“':  `texts stand between straight quotes: "…"`,
	'”':  `texts stand between straight quotes: "…"`,
	'„':  `texts stand between straight quotes: "…"`,
	'«':  `texts stand between straight quotes: "…"`,
	'\\': "a linear system is solved by solve(A, b)",
	'–':  "the minus sign is -",
	'—':  "the minus sign is -",
	'‐':  "the minus sign is -",
	'∆':  "the Greek capital is Δ (U+0394)",
	'$':  "names are made of letters, digits and _",
	'@':  "names are made of letters, digits and _",
	'?':  "a choice is written if C { A } else { B }",
	'`':  "this looks like a Markdown notebook: its name should end in .md",
}

// refuseCharacter fails on a character that starts no token.
func (s *scanner) refuseCharacter(r rune, size int) {
	span := diag.Span{Start: s.pos, End: s.pos + size}
	switch {
	case r == '\'' || r == '’' || r == '‘':
		s.refuseApostrophe(r, span)
	case r == '…':
		s.fail(diag.Syntax, span, "a statement goes on after an open ( or [, a trailing operator or a trailing comma", "… has no meaning here")
	case strings.ContainsRune("²³¹⁰⁴⁵⁶⁷⁸⁹⁻⁺", r):
		s.fail(diag.Syntax, span, "powers of values are written x^2; raised digits stand in units only", "%c has no meaning here", r)
	case r == '\r':
		s.fail(diag.Syntax, span, "lines end with a line feed", "a carriage return inside a line")
	case r < ' ' || r == 0x7f || unicode.IsControl(r):
		s.fail(diag.Syntax, span, "delete it", "a control character (U+%04X)", r)
	case unicode.Is(unicode.Cf, r):
		s.fail(diag.Syntax, span, "delete it", "an invisible character (U+%04X)", r)
	case unicode.Is(unicode.Nd, r):
		s.fail(diag.Syntax, span, "numbers are written with the digits 0 to 9", "%c is no digit of a number", r)
	case unicode.Is(unicode.M, r):
		s.fail(diag.Syntax, span, "a combining mark stands after a letter", "a combining mark without a letter (U+%04X)", r)
	}
	s.fail(diag.Syntax, span, characterHelp[r], "%c has no meaning here", r)
}

// refuseApostrophe tells a transposition from a text.
func (s *scanner) refuseApostrophe(r rune, span diag.Span) {
	before, _ := utf8.DecodeLastRuneInString(s.text[:s.pos])
	if isNamePart(before) || before == ')' || before == ']' || before == '.' {
		s.fail(diag.Syntax, span, "transpose is Aᵀ or transpose(A); a prime in a name is ′", "%c is no operator", r)
	}
	s.fail(diag.Syntax, span, `texts stand between straight double quotes: "…"`, "%c has no meaning here", r)
}
