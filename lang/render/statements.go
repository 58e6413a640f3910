package render

import "strings"

// Statement is a word of the language that is no function: how it is written and what it does.
type Statement struct{ Word, Form, Text string }

// Statements are explained beside the built-ins, and open the reference page.
func Statements() []Statement {
	return []Statement{
		{"require", `require CONDITION, "why"`,
			"A requirement. It is met or missed, and both sides of a comparison are shown; the text may be left out. " +
				"A missed one does not stop the file, but the run ends with exit status 1. If the bound lies inside the " +
				"value's own uncertainty, the requirement is met and marked \"within rounding\"."},
		{"claim", "claim EXPRESSION is LITERAL",
			"A printed number under review. Each number stands for the interval that its last written digit leaves: " +
				"12.350 ± 0.0005, -18810 ± 0.5, -1.881e4 ± 5, ends included; a fraction or a bare 0 demands equality. " +
				"Complex numbers go by parts, lists of poles as sets. A claim that disagrees, or that the computed " +
				"value's own uncertainty leaves undecided, ends the run with exit status 1."},
		{"define", `define NAME(x, y) = EXPRESSION, "what it gives"`,
			"A function. It may call itself; the depth is bounded."},
		{"use", `use "file.gain"`,
			"Runs another file once, relative to this one and never outside the folder that the run started in. Its names come along."},
		{"in", "EXPRESSION in UNIT",
			"Shows a value in a unit, such as speed in rpm."},
		{"for", "[EXPRESSION for each NAME of LIST where CONDITION]",
			"A list made from another; where may be left out."},
		{"if", "if CONDITION { A } else { B }",
			"One of two values; the other is not worked out."},
		{"digits", "1/3 ≈ 0.33333",
			"How values are shown. \"=\" stands before a value exactly when the printed text is the value, \"≈\" where digits " +
				"were cut or the value was never exact; \"exact kept\" beside it says that exact(v) gives the whole of it. " +
				"Five significant digits are shown unless show N digits or --digits ask for others, and fewer where fewer " +
				"hold, which a remark says. A matrix, a list and a table carry one sign for all their numbers. A fraction " +
				"with a denominator of at most two digits is shown as one where its decimals have no end."},
	}
}

// StatementNamed finds a statement by its word.
func StatementNamed(word string) (Statement, bool) {
	for _, s := range Statements() {
		if s.Word == word {
			return s, true
		}
	}
	return Statement{}, false
}

// ExplainStatement writes what a word of the language does.
func ExplainStatement(s Statement, o Options) string {
	e := explanation{o: o}
	e.add(s.Form)
	e.para("", s.Text)
	return e.String()
}

func referenceStatements() string {
	var b strings.Builder
	b.WriteString("\n## Words of the language\n")
	for _, s := range Statements() {
		b.WriteString("\n### `" + s.Word + "`\n\n    " + s.Form + "\n\n" + markdownText(s.Text) + "\n")
	}
	return b.String()
}
