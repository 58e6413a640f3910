package syntax

// unexpectedWord refuses a word after a complete value.
func (p *parser) unexpectedWord(t token) {
	switch t.text {
	case "in":
		p.failHere(t, "EXPR in UNIT", "in UNIT stands only at the end of a statement that shows a value")
	case "is":
		p.failHere(t, "claim EXPR is LITERAL", "is belongs to a claim")
	case "else":
		p.failHere(t, "if C { A } else { B }", "else without its if")
	case "for":
		p.failHere(t, "[E for each x of L where C]", "for each stands after the only element of a list")
	case "not":
		p.failHere(t, "put (not …) in parentheses", "not stands only at the start of a condition")
	case "over":
		p.failHere(t, studyForm, "over belongs to a study, a schedule or sensitivity(…)")
	}
	p.missingOperator(t)
}

// wordHelp is the form of a statement or item whose first word was read as a name.
var wordHelp = map[string]string{
	"given":    "given NAME = VALUE stands in model NAME { … }",
	"input":    "input … stands in model NAME { … } or diagram NAME { … }",
	"output":   "output … stands in model NAME { … } or diagram NAME { … }",
	"state":    "state … stands in model NAME { … }",
	"let":      "let stands in model NAME { … }; elsewhere write NAME = EXPR",
	"rate":     "rate NAME = EXPR stands in model NAME { … }",
	"next":     "next NAME = EXPR stands in model NAME { … }",
	"around":   "around … stands in model NAME { … }",
	"every":    "every T stands in model NAME { … }",
	"use":      `use "file.gain"`,
	"model":    "model NAME { … }",
	"diagram":  "diagram NAME { … }",
	"study":    studyForm,
	"schedule": scheduleForm,
	"define":   `define f(x, y) = EXPR, "what it gives"`,
}

// missingOperator refuses two values side by side.
func (p *parser) missingOperator(t token) {
	before, after := p.written(p.prev.span), p.written(t.span)
	product := "a product is written " + before + " * " + after
	if p.prev.kind == tokenSign || t.kind == tokenSign {
		product = "a product is written with *"
	}
	if t.kind == tokenWord && p.prev.kind != tokenNumber {
		product += "; a unit stands only after a number"
	}
	form := ""
	if p.prev.kind == tokenWord {
		form = wordHelp[p.prev.text]
	}
	switch {
	case p.prev.is("}"):
		p.failHere(t, "", "a line's end is missing after }")
	case form != "":
		p.failHere(t, form, "an operator is missing between %s and %s", before, after)
	case t.kind == tokenWord && p.holds(insideBody) && wordHelp[t.text] != "":
		p.failHere(t, "each item has its own line, or stands after ;", "%s begins another item", t.text)
	case p.holds(insideList):
		p.failHere(t, "entries are separated by commas, rows are lists: [[1, 2], [3, 4]]", "a comma or an operator is missing between %s and %s", before, after)
	case p.holds(insideIndex), p.holds(insideCall):
		p.failHere(t, "", "a comma or an operator is missing between %s and %s", before, after)
	case t.kind == tokenQuote:
		p.failHere(t, "", "an operator is missing before the text in quotes")
	case p.prev.is("%"):
		p.failHere(t, product+"; % is per cent", "an operator is missing between %s and %s", before, after)
	}
	p.failHere(t, product, "an operator is missing between %s and %s", before, after)
}
