package syntax

import (
	"strings"
	"unicode"
	"unicode/utf8"

	"gainwright/lang/diag"
)

// tokenKind sorts tokens; punctuation and operators are told apart by their text.
type tokenKind uint8

const (
	tokenEnd     tokenKind = iota // of the text or of a notebook's block
	tokenNewline                  // one or more line ends, comments between them included
	tokenWord                     // a name or a word of the language, NFKC-normalised
	tokenNumber                   // digits, without sign, i, per cent or unit
	tokenQuote                    // a quoted text; token.text is its value
	tokenSign                     // an operator or punctuation in its plain spelling
	tokenUnit                     // a unit, only made on the parser's demand
)

// token is one token with its place.
type token struct {
	kind        tokenKind
	text        string
	span        diag.Span
	spaceBefore bool // a blank, a line end or the text's start stands before it
	imaginary   bool // of a number
}

// is tells whether the token is this operator or punctuation.
func (t token) is(sign string) bool { return t.kind == tokenSign && t.text == sign }

// word tells whether the token is this word.
func (t token) word(w string) bool { return t.kind == tokenWord && t.text == w }

// ends tells whether the token ends a line or the text.
func (t token) ends() bool { return t.kind == tokenNewline || t.kind == tokenEnd }

// scanner cuts a text into tokens on demand, so that an error late in a file does not
// hide the statements before it.
type scanner struct {
	src      *diag.Source
	text     string // src.Text, or a copy of equal length in which all but code is blank
	pos, end int
	comments []diag.Span
	long     int // decimal digits spent on unusually long numbers
	charged  int // end of the last one
}

// bailout carries a syntax error from the place it is found to the statement loop.
type bailout struct {
	err   *diag.Error
	atEnd bool // more text could mend it
}

func (s *scanner) fail(kind diag.Kind, span diag.Span, help, format string, args ...any) {
	err := diag.New(kind, format, args...).At(span).In(s.src)
	err.Help = help
	panic(bailout{err: err})
}

// next gives the token at the scanner's position.
func (s *scanner) next() token {
	if newline := s.skipBlank(); newline.kind == tokenNewline {
		return newline
	}
	t := token{span: diag.Span{Start: s.pos, End: s.pos}, spaceBefore: s.blankBefore(s.pos)}
	if s.pos >= s.end {
		t.kind = tokenEnd
		return t
	}
	r, size := s.rune(s.pos)
	switch {
	case r >= '0' && r <= '9':
		s.number(&t)
	case r == '"':
		s.quote(&t)
	case isNameStart(r):
		s.name(&t)
	default:
		s.sign(&t, r, size)
	}
	t.span.End = s.pos
	return t
}

// blankBefore tells whether a blank, a line end or nothing stands before the offset.
func (s *scanner) blankBefore(pos int) bool {
	r, _ := utf8.DecodeLastRuneInString(s.text[:pos])
	return pos == 0 || unicode.IsSpace(r) || r == '\ufeff'
}

// blankAt tells whether a blank, a line end or nothing stands at the offset.
func (s *scanner) blankAt(pos int) bool {
	r, _ := utf8.DecodeRuneInString(s.text[pos:s.end])
	return pos >= s.end || unicode.IsSpace(r)
}

// skipBlank passes blanks and comments. If it meets a line end it passes all blank
// lines and gives one newline token.
func (s *scanner) skipBlank() token {
	var newline token
	for s.pos < s.end {
		c := s.text[s.pos]
		switch {
		case c == ' ' || c == '\t':
			s.pos++
		case c == '\n' || c == '\r' && s.pos+1 < s.end && s.text[s.pos+1] == '\n':
			if newline.kind == tokenEnd {
				newline = token{kind: tokenNewline, span: diag.Span{Start: s.pos, End: s.pos + 1}}
			}
			s.pos++
		case c == '#':
			s.comment()
		case c >= utf8.RuneSelf:
			r, size := s.rune(s.pos)
			if !unicode.Is(unicode.Zs, r) && !(r == '\ufeff' && s.pos == 0) {
				return newline
			}
			s.pos += size
		default:
			return newline
		}
	}
	return newline
}

// comment passes a comment up to the line's end and keeps its place for the tidy printer.
func (s *scanner) comment() {
	start := s.pos
	for s.pos < s.end && s.text[s.pos] != '\n' {
		if s.text[s.pos] < utf8.RuneSelf {
			s.pos++
			continue
		}
		_, size := s.rune(s.pos)
		s.pos += size
	}
	span := diag.Span{Start: start, End: s.pos}
	if n := len(s.comments); n == 0 || s.comments[n-1].Start < start {
		s.comments = append(s.comments, span)
	}
}

// rune decodes a character and refuses bytes that are not UTF-8, and the invisible
// characters that make a text read otherwise than it runs.
func (s *scanner) rune(pos int) (rune, int) {
	if pos >= s.end {
		return -1, 0
	}
	r, size := utf8.DecodeRuneInString(s.text[pos:s.end])
	span := diag.Span{Start: pos, End: pos + size}
	if r == utf8.RuneError && size == 1 {
		s.fail(diag.Syntax, span, "save the file as UTF-8",
			"byte %d of the text (0x%02X) is not UTF-8", pos+1, s.text[pos])
	}
	if r >= 0x202a && r <= 0x202e || r >= 0x2066 && r <= 0x2069 {
		s.fail(diag.Syntax, span, "such characters can make a text look different from what is computed: delete it",
			"an invisible character that turns the reading direction (U+%04X)", r)
	}
	return r, size
}

// peekRune gives the character at the scanner's position, or -1 at the end.
func (s *scanner) peekRune() rune {
	r, _ := s.rune(s.pos)
	return r
}

// quote scans "…".
func (s *scanner) quote(t *token) {
	t.kind = tokenQuote
	start := s.pos
	s.pos++
	var b strings.Builder
	for {
		r, size := s.rune(s.pos)
		switch r {
		case -1, '\n':
			stop := start + len(strings.TrimRight(s.text[start:s.pos], " \t\r"))
			s.fail(diag.Syntax, diag.Span{Start: start, End: stop}, "a text ends with \" on the line it starts; write \\n for a line break in it",
				"the text has no closing quote")
		case '"':
			s.pos++
			t.text = b.String()
			return
		case '\\':
			s.escape(&b)
		default:
			b.WriteRune(r)
			s.pos += size
		}
	}
}

func (s *scanner) escape(b *strings.Builder) {
	start := s.pos
	s.pos++
	r, size := s.rune(s.pos)
	switch r {
	case '"', '\\':
		b.WriteRune(r)
	case 'n':
		b.WriteByte('\n')
	case -1, '\n', '\r':
		return // the caller reports the missing quote
	default:
		s.fail(diag.Syntax, diag.Span{Start: start, End: s.pos + size}, `after \ stands one of " \ n; a backslash itself is written \\`,
			`\%c has no meaning in a text`, r)
	}
	s.pos += size
}

// spellings of operators and punctuation, longer ones first
var signs = []struct{ written, plain string }{
	{"+/-", "±"}, {"..", ".."}, {"==", "=="}, {"!=", "!="}, {"<=", "<="}, {">=", ">="},
	{"±", "±"}, {"≤", "<="}, {"≥", ">="}, {"≠", "!="}, {"−", "-"}, {"ᵀ", "ᵀ"},
	{"+", "+"}, {"-", "-"}, {"*", "*"}, {"/", "/"}, {"^", "^"}, {"<", "<"}, {">", ">"}, {"=", "="},
	{"(", "("}, {")", ")"}, {"[", "["}, {"]", "]"}, {"{", "{"}, {"}", "}"},
	{",", ","}, {";", ";"}, {":", ":"}, {".", "."}, {"%", "%"},
}

// sign scans an operator or punctuation.
func (s *scanner) sign(t *token, r rune, size int) {
	rest := s.text[s.pos:s.end]
	s.refuseHabit(rest)
	if r == '.' && len(rest) > 1 && rest[1] >= '0' && rest[1] <= '9' {
		s.fail(diag.Syntax, diag.Span{Start: s.pos, End: s.pos + 1}, "write 0"+leadingDigits(rest)+" for the number; a field has a name", "a number does not start with a point")
	}
	for _, sign := range signs {
		if strings.HasPrefix(rest, sign.written) {
			t.kind, t.text = tokenSign, sign.plain
			s.pos += len(sign.written)
			return
		}
	}
	s.refuseCharacter(r, size)
}

func leadingDigits(text string) string {
	n := 1
	for n < len(text) && n < 12 && text[n] >= '0' && text[n] <= '9' {
		n++
	}
	return text[:n]
}
