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
		{"model", "model NAME { given …; input …; state …; output …; rate x = …; around rest }",
			"A plant from its equations. given NAME = VALUE ± TOLERANCE is a parameter (several with commas between), and the tolerance may be in per cent; " +
				"input, state and output declare signals, each with in UNIT and range R; let NAME = EXPRESSION names a part; rate x = EXPRESSION " +
				"is the rate of each state, or next x = EXPRESSION with every 5 ms. around rest finds a point of rest; " +
				"around x = 0.2 m sets the point; find F after it solves for what is named. Units are checked in every " +
				"equation, and the matrices come from exact differentiation. The model is used as a plant; crane.given.M and crane.A are fields."},
		{"diagram", "diagram NAME { input r; e = r - y; u = H * e; y = P * u; output y, u }",
			"A plant wired from systems by signal equations: systems multiply signals. Algebraic loops are solved when they have one " +
				"solution, and refused by the names of their signals otherwise; sample times must agree."},
		{"study", "study NAME = EXPRESSION over MODEL, … samples N seed N at corners",
			"What a number comes to when the parameters of models vary within their tolerances. Only the models named after over are " +
				"replaced by their samples, in the expression and in the functions it calls; a name bound before keeps its value, so a gain " +
				"designed at the nominal parameters stays what it was. Each sample finds its operating point anew. A draw is uniform between " +
				"the tolerance's ends, and a hash of seed, sample number, model and parameter alone; sample 0 is the nominal one. 1000 samples " +
				"and seed 1 are taken unless given; at corners adds the samples with every parameter at an end of its tolerance, at most 2^16. " +
				"Several numbers share their samples: study swing = { damping: …, decay: … } over …, then swing.damping. Fields: smallest and largest, " +
				"each with value, at and sample; median and quantile(q), of the drawn samples; failed, values, draws, parameters, and influence, " +
				"the rank correlation of each parameter with the number. A requirement on a study must hold for every sample, corners included, and a " +
				"failed sample makes it missed. When none of the drawn samples misses, it says how large a part of the distribution can miss all the same, at 95 %. " +
				"gainwright FILE --part 3/16 computes one share of every study and writes it; gainwright merge PART… joins them and runs the file with them."},
		{"sensitivity", "sensitivity(EXPRESSION) over MODEL, …",
			"The relative change of a number for one per cent more of each parameter, at the nominal parameters, strongest first, and what it comes to " +
				"over the parameter's tolerance. It may be bound to a name; its columns are fields, as in w.change_per_percent[1]. Each change finds the operating point anew. " +
				"Central differences at three steps, extrapolated twice (Richardson 1911); the digits shown are those that the steps agree on. " +
				"For a parameter whose nominal value is zero, one per cent of the half-width of its tolerance is taken; when the number itself is zero, its change is given in its own unit."},
		{"schedule", "schedule NAME = EXPRESSION over MODEL.PARAMETER from A to B in N steps",
			"A gain, a matrix or a number at N evenly spaced values of a parameter, ends included, with a check of what straight lines between " +
				"them give: in the middle of each interval the interpolated gain closes the loop of the model there (of an observer, the loop of its error), and its least damping and " +
				"slowest decay stand beside those at the nodes; an interval in which they fall is named. Of what closes no loop the table shows how far the interpolated value is from the true one. " +
				"Only the model named is replaced. Fields: least_damping and slowest_decay, the smallest of all rows; nodes; values, a row a node; and at(x), which interpolates as a controller would."},
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
