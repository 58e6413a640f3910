package render

import (
	"fmt"
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
	if w := shapeWords(p); w != "" && len(p.Choices) == 0 {
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

// Reference is the reference page in Markdown.
func Reference(table []*value.Builtin, library []*value.Function) string {
	var b strings.Builder
	b.WriteString("# Reference\n\nEvery word of the language, from the table that the program itself reads. ")
	b.WriteString("This page is written by `gainwright explain --all --markdown`.\n")
	for _, c := range chapters(table) {
		fmt.Fprintf(&b, "\n## %s\n", chapterTitle(c.family))
		for _, w := range c.words {
			b.WriteString(referenceEntry(w))
		}
	}
	if len(library) > 0 {
		b.WriteString("\n## Written in the language itself\n")
		for _, f := range library {
			fmt.Fprintf(&b, "\n### `%s`\n\n`%s(%s)`\n\n%s\n", f.Name, f.Name, strings.Join(f.Params, ", "), markdownText(f.Doc))
		}
	}
	return b.String()
}

func referenceEntry(w *value.Builtin) string {
	var b strings.Builder
	fmt.Fprintf(&b, "\n### `%s`\n\n%s.\n\n", w.Name, strings.TrimRight(markdownText(w.Summary), "."))
	for _, s := range signatures(w) {
		fmt.Fprintf(&b, "    %s\n", s)
	}
	b.WriteString("\n")
	if params := allParams(w); len(params) > 0 {
		b.WriteString("| argument | what it is |\n|---|---|\n")
		for _, p := range params {
			fmt.Fprintf(&b, "| `%s` | %s |\n", paramName(p), strings.ReplaceAll(markdownText(paramText(p)), "|", "\\|"))
		}
		b.WriteString("\n")
	}
	fmt.Fprintf(&b, "Gives %s.\n", strings.TrimRight(markdownText(w.Result), "."))
	if doc := strings.TrimSpace(w.Doc); doc != "" {
		fmt.Fprintf(&b, "\n%s\n", markdownText(doc))
	}
	for _, x := range w.Examples {
		fmt.Fprintf(&b, "\n```\n%s\n", promptLines(x.Input))
		if out := strings.TrimRight(x.Output, "\n"); out != "" {
			fmt.Fprintf(&b, "%s\n", out)
		}
		b.WriteString("```\n")
	}
	if len(w.Errors) > 0 {
		b.WriteString("\nRefuses:\n\n")
		for _, e := range w.Errors {
			fmt.Fprintf(&b, "- %s\n", markdownText(e))
		}
	}
	if w.Source != "" && w.Source != "definition" {
		fmt.Fprintf(&b, "\nSource: %s\n", markdownText(w.Source))
	}
	if len(w.SeeAlso) > 0 {
		fmt.Fprintf(&b, "\nSee also: `%s`\n", strings.Join(w.SeeAlso, "`, `"))
	}
	return b.String()
}

func promptLines(input string) string {
	return "» " + strings.ReplaceAll(input, "\n", "\n» ")
}

// markdownText keeps what Markdown would read as markup from being so read.
func markdownText(s string) string {
	return strings.NewReplacer("*", `\*`, "_", `\_`, "<", "&lt;", "[", `\[`, "]", `\]`).Replace(s)
}

type explainJSON struct {
	Name     string        `json:"name"`
	Family   string        `json:"family"`
	Summary  string        `json:"summary"`
	Calls    []string      `json:"calls"`
	Params   []paramJSON   `json:"arguments"`
	Result   string        `json:"result"`
	Doc      string        `json:"doc"`
	Examples []exampleJSON `json:"examples"`
	Errors   []string      `json:"refuses"`
	Source   string        `json:"source"`
	SeeAlso  []string      `json:"see_also"`
}

type paramJSON struct {
	Name     string   `json:"name"`
	Named    bool     `json:"named"`
	Optional bool     `json:"optional"`
	Default  string   `json:"default,omitempty"`
	Choices  []string `json:"choices,omitempty"`
	Shape    string   `json:"shape,omitempty"`
	Doc      string   `json:"doc"`
}

type exampleJSON struct {
	Input  string `json:"input"`
	Output string `json:"output"`
}

// ExplainJSON is a built-in as one line of JSON.
func ExplainJSON(b *value.Builtin) []byte {
	out := explainJSON{Name: b.Name, Family: b.Family, Summary: b.Summary, Calls: signatures(b), Params: []paramJSON{},
		Result: b.Result, Doc: b.Doc, Examples: []exampleJSON{}, Errors: append([]string{}, b.Errors...),
		Source: b.Source, SeeAlso: append([]string{}, b.SeeAlso...)}
	for _, p := range allParams(b) {
		out.Params = append(out.Params, paramJSON{p.Name, p.Named, p.Optional, p.Default, p.Choices, shapeWords(p), p.Doc})
	}
	for _, x := range b.Examples {
		out.Examples = append(out.Examples, exampleJSON(x))
	}
	return encode(out)
}

// ExplainFunctionJSON is a function of the library as one line of JSON.
func ExplainFunctionJSON(f *value.Function) []byte {
	return encode(functionJSON{"function", f.Name, append([]string{}, f.Params...), f.Doc})
}
