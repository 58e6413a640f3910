package render

import (
	"sort"
	"strings"

	"gainwright/lang/value"
)

// Explain writes what the table knows of a built-in, for a terminal.
func Explain(b *value.Builtin, o Options) string {
	e := explanation{o: o}
	for _, s := range signatures(b) {
		e.add(s)
	}
	e.para("", b.Summary)
	e.blank()
	e.params(allParams(b))
	e.para(padRight("gives", e.column)+"  ", b.Result)
	for _, p := range strings.Split(strings.TrimSpace(b.Doc), "\n\n") {
		e.blank()
		e.para("  ", strings.Join(strings.Fields(p), " "))
	}
	for _, x := range b.Examples {
		e.blank()
		e.example(x)
	}
	e.list("Refuses", b.Errors)
	e.blank()
	if b.Source != "" && b.Source != "definition" {
		e.para("Source    ", b.Source)
	}
	if len(b.SeeAlso) > 0 {
		e.para("See also  ", strings.Join(b.SeeAlso, ", "))
	}
	return e.String()
}

// ExplainFunction writes what is known of a function made in the language.
func ExplainFunction(f *value.Function, o Options) string {
	e := explanation{o: o}
	e.add(f.Name + "(" + strings.Join(f.Params, ", ") + ")")
	if f.Doc != "" {
		e.para("", strings.Join(strings.Fields(f.Doc), " "))
	}
	return e.String()
}

// Overview lists all words with their summaries, family after family.
func Overview(table []*value.Builtin, library []*value.Function, o Options) string {
	e := explanation{o: o}
	w := 0
	for _, b := range table {
		w = max(w, cells(b.Name))
	}
	w = min(w, 26)
	for _, chapter := range chapters(table) {
		e.blank()
		e.add(chapterTitle(chapter.family))
		for _, b := range chapter.words {
			e.para("  "+padRight(b.Name, w)+"  ", b.Summary)
		}
	}
	e.blank()
	e.add("Words of the language")
	for _, s := range Statements() {
		e.add("  " + padRight(s.Word, w) + "  " + s.Form)
	}
	if len(library) > 0 {
		e.blank()
		e.add("Written in the language itself")
		for _, f := range library {
			first, _, _ := strings.Cut(f.Doc, "\n")
			e.para("  "+padRight(f.Name, w)+"  ", first)
		}
	}
	return e.String()
}

type explanation struct {
	o      Options
	column int
	text   []string
}

func (e *explanation) add(lines ...string) { e.text = append(e.text, lines...) }

func (e *explanation) blank() {
	if n := len(e.text); n > 0 && e.text[n-1] != "" {
		e.add("")
	}
}

func (e *explanation) para(head, text string) {
	if text != "" {
		e.add(hanging(head, text, min(e.o.width(), 96))...)
	}
}

func (e *explanation) String() string {
	return strings.TrimRight(strings.Join(e.text, "\n"), "\n") + "\n"
}

func (e *explanation) params(params []value.Param) {
	e.column = 7
	for _, p := range params {
		e.column = max(e.column, 2+cells(paramName(p)))
	}
	for _, p := range params {
		e.para(padRight("  "+paramName(p), e.column)+"  ", paramText(p))
	}
}

func (e *explanation) example(x value.Example) {
	for _, l := range strings.Split(x.Input, "\n") {
		e.add("  » " + l)
	}
	for _, l := range strings.Split(strings.TrimRight(x.Output, "\n"), "\n") {
		e.add(strings.TrimRight("    "+l, " "))
	}
}

func (e *explanation) list(head string, items []string) {
	if len(items) == 0 {
		return
	}
	e.blank()
	e.add(head)
	for _, i := range items {
		e.para("  · ", i)
	}
}

// signatures are the ways of calling, as written.
func signatures(b *value.Builtin) []string {
	if len(b.Params) == 0 && len(b.Bare) == 0 {
		return []string{b.Name}
	}
	var out []string
	for _, params := range [][]value.Param{b.Params, b.Bare} {
		if len(params) > 0 {
			out = append(out, b.Name+"("+argumentsText(params)+")")
		}
	}
	return out
}

func argumentsText(params []value.Param) string {
	parts := make([]string, 0, len(params))
	for _, p := range params {
		switch {
		case p.Named:
			parts = append(parts, p.Name+": …")
		case p.Variadic:
			parts = append(parts, p.Name+", …")
		default:
			parts = append(parts, p.Name)
		}
	}
	return strings.Join(parts, ", ")
}

// allParams are the parameters of both forms, each once.
func allParams(b *value.Builtin) []value.Param {
	seen := map[string]bool{}
	var out []value.Param
	for _, p := range append(append([]value.Param{}, b.Params...), b.Bare...) {
		if !seen[p.Name] {
			seen[p.Name] = true
			out = append(out, p)
		}
	}
	return out
}

func paramName(p value.Param) string {
	if p.Named {
		return p.Name + ":"
	}
	return p.Name
}

func paramText(p value.Param) string {
	parts := []string{}
	if p.Doc != "" {
		parts = append(parts, strings.TrimRight(p.Doc, "."))
	}
	if w := shapeWords(p); w != "" && len(p.Choices) == 0 && (p.Doc == "" || saysUnit(p.Shape)) {
		parts = append(parts, w)
	}
	if len(p.Choices) > 0 {
		choices := make([]string, len(p.Choices))
		for i, c := range p.Choices {
			choices[i] = `"` + c + `"`
		}
		parts = append(parts, "one of "+strings.Join(choices, ", "))
	}
	switch {
	case p.Default != "":
		parts = append(parts, p.Default+" unless given")
	case p.Optional:
		parts = append(parts, "may be left out")
	}
	return strings.Join(parts, "; ")
}

// saysUnit tells whether the words of a shape say more than what an argument is.
func saysUnit(s value.Shape) bool {
	return s == value.AFrequency || s == value.ATime || s == value.ARate || s == value.PoleList
}

func shapeWords(p value.Param) string {
	switch p.Shape {
	case value.AReal:
		return "a real number"
	case value.AWhole:
		return "a whole number"
	case value.ANumber:
		return "a number, real or complex"
	case value.AQuantity:
		return "a quantity"
	case value.AFrequency:
		return "a frequency, in rad/s unless it has a unit"
	case value.ATime:
		return "a time, in s unless it has a unit"
	case value.ARate:
		return "a sample time (5 ms) or rate (200 Hz)"
	case value.AMatrix:
		return "a matrix"
	case value.ASquare:
		return "a square matrix"
	case value.AVector:
		return "a vector"
	case value.APolynomial:
		return "a polynomial"
	case value.ASystem:
		return "a system"
	case value.ATransfer:
		return "a transfer function or another system"
	case value.PoleList:
		return "a list of poles, conjugates complete"
	case value.AList:
		return "a list"
	case value.AText:
		return "a text"
	case value.ABoolean:
		return "true or false"
	case value.NameList:
		return "a list of names"
	case value.AGain:
		return "a gain or a matrix"
	case value.AFunction:
		return "a function"
	}
	return ""
}

type chapter struct {
	family string
	words  []*value.Builtin
}

// chapters keeps the table's order of families, and orders the words in each by name.
func chapters(table []*value.Builtin) []chapter {
	var out []chapter
	at := map[string]int{}
	for _, b := range table {
		k, ok := at[b.Family]
		if !ok {
			k = len(out)
			at[b.Family] = k
			out = append(out, chapter{family: b.Family})
		}
		out[k].words = append(out[k].words, b)
	}
	for _, c := range out {
		sort.Slice(c.words, func(i, j int) bool { return c.words[i].Name < c.words[j].Name })
	}
	return out
}

// chapterTitle says in words what a family is for; a new family shows under its own name.
func chapterTitle(family string) string {
	titles := map[string]string{
		"matrix":     "Numbers, lists and matrices",
		"polynomial": "Polynomials and stability tables",
		"system":     "Systems",
		"reach":      "What inputs move and outputs see",
		"gain":       "Gains",
		"sampling":   "Sampled systems",
		"response":   "Responses in time",
		"frequency":  "Frequency",
		"study":      "Tolerances and studies",
		"files":      "Files",
	}
	if t, ok := titles[family]; ok {
		return t
	}
	return strings.ToUpper(family[:min(1, len(family))]) + family[min(1, len(family)):]
}
