package eval

import (
	"errors"
	"fmt"
	"strings"

	"gainwright/lang/diag"
)

// count writes "1 argument", "3 arguments".
func count(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return fmt.Sprintf("%d %ss", n, what)
}

// placedAt gives an error a span, on a copy, unless it has one.
func placedAt(err error, span diag.Span) error {
	var known *diag.Error
	if errors.As(err, &known) {
		c := *known
		return c.At(span)
	}
	return err
}

// oneLine joins the lines of a source text, without comments and needless blanks.
func oneLine(text string) string {
	var b strings.Builder
	quoted, blank := false, false
	for i := 0; i < len(text); i++ {
		c := text[i]
		switch {
		case quoted && c == '\\' && i+1 < len(text):
			b.WriteByte(c)
			i++
			b.WriteByte(text[i])
			continue
		case c == '"':
			quoted = !quoted
		case !quoted && c == '#':
			for i+1 < len(text) && text[i+1] != '\n' {
				i++
			}
			continue
		case !quoted && (c == ' ' || c == '\t' || c == '\n' || c == '\r'):
			blank = b.Len() > 0
			continue
		}
		if blank {
			b.WriteByte(' ')
			blank = false
		}
		b.WriteByte(c)
	}
	return b.String()
}
