package syntax

import (
	"fmt"
	"strings"
	"unicode/utf8"

	"gainwright/lang/diag"
)

func (p *parser) fail(kind diag.Kind, span diag.Span, help, format string, args ...any) {
	p.scan.fail(kind, span, help, format, args...)
}

// failHere refuses a token. At the end of a line the place is where the last token
// ended. It notes whether more text could mend it, and names the bracket left open.
func (p *parser) failHere(t token, help, format string, args ...any) {
	span := t.span
	if t.ends() {
		span = diag.Span{Start: p.prev.span.End, End: p.prev.span.End}
	}
	err := diag.New(diag.Syntax, format, args...).At(span).In(p.file.Source)
	err.Help = help
	if n := len(p.open); n > 0 {
		o := p.open[n-1]
		line, column := p.file.Source.Position(o.span.Start)
		if here, _ := p.file.Source.Position(span.Start); here != line || t.kind == tokenEnd {
			if help != "" {
				err.Help += "; "
			}
			err.Help += fmt.Sprintf("%s of line %d, column %d is not closed", o.sign, line, column)
		}
	}
	panic(bailout{err: err, atEnd: t.kind == tokenEnd && p.unfinished()})
}

// unfinished tells whether the text so far goes on in another line.
func (p *parser) unfinished() bool {
	if len(p.open) > 0 {
		return true
	}
	if p.prev.kind == tokenSign {
		return strings.Contains(" + - * / ^ ± == != < <= > >= , ", " "+p.prev.text+" ")
	}
	return p.prev.word("and") || p.prev.word("or") || p.prev.word("not")
}

// written is the source text of a place on one line, cut if long.
func (p *parser) written(span diag.Span) string {
	text := strings.Join(strings.Fields(p.scan.text[span.Start:span.End]), " ")
	if utf8.RuneCountInString(text) > 40 {
		text = string([]rune(text)[:37]) + "…"
	}
	return text
}

// describe names a token in a sentence.
func describe(t token) string {
	switch t.kind {
	case tokenEnd:
		return "the end of the text"
	case tokenNewline:
		return "the line's end"
	case tokenQuote:
		return "the text in quotes"
	case tokenNumber:
		return "the number " + shortened(t.text)
	}
	return t.text
}

func (p *parser) expect(sign, form string) {
	if t := p.peek(); !t.is(sign) {
		p.unexpectedIn(t, sign, form)
	}
	p.take()
}

func (p *parser) expectWord(word, form string) {
	if t := p.peek(); !t.word(word) {
		p.unexpectedIn(t, word, form)
	}
	p.take()
}

// expectOpen demands an opening bracket and leaves it to be entered.
func (p *parser) expectOpen(sign, form string) {
	if t := p.peek(); !t.is(sign) {
		p.unexpectedIn(t, sign, form)
	}
}

func (p *parser) unexpectedIn(t token, wanted, form string) {
	p.failHere(t, form, "%q is expected before %s", wanted, describe(t))
}

// newName reads a name that is bound or referred to here.
func (p *parser) newName(what string) Ident {
	t := p.peek()
	switch {
	case t.kind == tokenWord && reserved[t.text]:
		p.fail(diag.Syntax, t.span, "", "%s is a word of the language and cannot be a name", t.text)
	case t.kind != tokenWord:
		p.failHere(t, "", "%s is expected before %s", what, describe(t))
	}
	p.take()
	return Ident{Name: t.text, Span: t.span}
}

// quoted reads a text in quotes.
func (p *parser) quoted(what, form string) string {
	t := p.peek()
	if t.kind != tokenQuote {
		p.failHere(t, form, "%s is expected before %s", what, describe(t))
	}
	p.take()
	return t.text
}

// refuseAssignment refuses = after anything but a name.
func (p *parser) refuseAssignment(x Expr) {
	if !p.raw(0).is("=") {
		return
	}
	help := "equality is =="
	switch e := x.(type) {
	case *Call:
		help = "a function is written define f(x) = …; equality is =="
	case *Index, *Field:
		help = "values do not change; bind a new one to a name; equality is =="
	case *List:
		help = "one name a line; parts are read by L[i]; equality is =="
	case *Name:
		help = e.Name + " is bound by " + e.Name + " = … without parentheses; equality is =="
	}
	p.fail(diag.Syntax, p.raw(0).span, help, "= binds one name, which stands alone before it")
}

// missingOperand refuses a token where a value should begin.
func (p *parser) missingOperand(t token) {
	after := p.written(p.prev.span)
	switch {
	case t.ends() && p.prev.is("="):
		p.failHere(t, "the value begins on the line of its =", "a value is missing after =")
	case t.ends() && p.prev.kind == tokenEnd:
		p.failHere(t, "", "a value is missing")
	case t.ends():
		p.failHere(t, "", "a value is missing after %s", after)
	case len(p.open) == 0 && (t.is(")") || t.is("]") || t.is("}")):
		p.failHere(t, "", "%s closes nothing", t.text)
	case t.kind == tokenWord:
		p.failHere(t, p.reservedHelp(t.text), "a value is missing before %s", t.text)
	case t.is("%"):
		p.failHere(t, "per cent follows a number; a comment starts with #", "%% stands where a value is expected")
	case t.is("{"):
		p.failHere(t, "lists are written [a, b]; parentheses are ( )", "{ begins no value")
	case t.is(":") || t.is("]") && p.holds(insideIndex):
		p.failHere(t, "a whole row is row(A, i), a whole column column(A, j)", "an index is missing before %s", t.text)
	case t.is("+"):
		p.failHere(t, "a value has no plus sign of its own: leave it out", "a value is missing before +")
	case t.is(";") && p.holds(insideList):
		p.refuseSemicolon(t)
	}
	p.failHere(t, "", "a value is missing before %s", t.text)
}

// reservedHelp says where a word of the language belongs.
func (p *parser) reservedHelp(word string) string {
	switch word {
	case "not":
		return "not looser than comparisons: put (not …) in parentheses"
	case "in":
		return "a value is shown in a unit by EXPR in UNIT"
	case "is":
		return "claim EXPR is LITERAL"
	case "else":
		return "if C { A } else { B }"
	case "for":
		return "[E for each x of L where C]"
	}
	return ""
}

func (p *parser) holds(what inside) bool {
	return len(p.open) > 0 && p.open[len(p.open)-1].holds == what
}

// unexpected refuses a token after a complete value.
func (p *parser) unexpected(t token) {
	switch {
	case t.ends():
		if n := len(p.open); n > 0 {
			p.failHere(t, "", "%s is missing at the end", closing(p.open[n-1].sign))
		}
		p.failHere(t, "", "the line ends too early")
	case t.kind == tokenWord:
		p.unexpectedWord(t)
	case t.kind == tokenNumber, t.kind == tokenQuote, t.is("("), t.is("["):
		p.missingOperator(t)
	}
	switch t.text {
	case "=":
		if p.holds(insideCall) {
			p.failHere(t, "an argument is named by a colon: name: value; equality is ==", "= stands inside a call")
		}
		p.failHere(t, "equality is ==", "= stands inside an expression")
	case ")", "]", "}":
		p.unexpectedClosing(t)
	case ";":
		p.refuseSemicolon(t)
	case ",":
		help := "a list is written [a, b]"
		if text := p.scan.text; t.span.Start > 0 && t.span.End < len(text) && isDigit(text[t.span.Start-1]) && isDigit(text[t.span.End]) {
			help = "decimals are written with a point: 1.5"
		}
		p.failHere(t, help, "a comma stands only between entries, arguments and the parts of some statements")
	case ":":
		p.failHere(t, "a range of subscripts is A[1..3, 2]; a named argument f(name: value)", ": has no meaning here")
	case "..":
		p.failHere(t, "A[1..3, 2]", "a range stands only as a subscript")
	case "%":
		p.failHere(t, "per cent follows a number, as in 5%; a comment starts with #", "%% has no meaning here")
	case "{":
		p.failHere(t, "if C { A } else { B }; model NAME { … }; diagram NAME { … }", "{ has no meaning here")
	case ".":
		p.failHere(t, "as in K.poles", "a number or a text has no fields")
	}
	p.failHere(t, "", "%s has no meaning here", t.text)
}

func closing(sign string) string {
	switch sign {
	case "(":
		return ")"
	case "[":
		return "]"
	}
	return "}"
}

func (p *parser) unexpectedClosing(t token) {
	if n := len(p.open); n > 0 {
		o := p.open[n-1]
		line, column := p.file.Source.Position(o.span.Start)
		p.fail(diag.Syntax, t.span, fmt.Sprintf("%s of line %d, column %d is not closed", o.sign, line, column),
			"%s is missing before %s", closing(o.sign), t.text)
	}
	p.failHere(t, "", "%s closes nothing", t.text)
}

func (p *parser) refuseSemicolon(t token) {
	if p.holds(insideList) || p.holds(insideIndex) {
		p.failHere(t, "entries are separated by commas, rows are lists: [[1, 2], [3, 4]]", "; separates no entries")
	}
	p.failHere(t, "a statement has a line of its own; values are shown unless they are bound to a name", "; has no meaning here")
}

func isDigit(c byte) bool { return '0' <= c && c <= '9' }
