package render

import (
	"fmt"
	"strings"

	"gainwright/lang/value"
)

// Reference is the reference page in Markdown: the words of the language, then the
// built-ins by family, then the library.
func Reference(table []*value.Builtin, library []*value.Function) string {
	var b strings.Builder
	b.WriteString("# Reference\n\nEvery word of the language, from the table that the program itself reads. ")
	b.WriteString("This page is written by `gainwright explain --all --markdown`.\n")
	b.WriteString(referenceStatements())
	for _, c := range chapters(table) {
		fmt.Fprintf(&b, "\n## %s\n", chapterTitle(c.family))
		for _, w := range c.words {
			b.WriteString(referenceEntry(w))
		}
	}
	if len(library) > 0 {
		b.WriteString("\n## Written in the language itself\n")
	}
	b.WriteString(ReferenceEntries(nil, library))
	return b.String()
}

// ReferenceEntries are the entries of some words alone.
func ReferenceEntries(table []*value.Builtin, library []*value.Function) string {
	var b strings.Builder
	for _, w := range table {
		b.WriteString(referenceEntry(w))
	}
	for _, f := range library {
		fmt.Fprintf(&b, "\n### `%s`\n\n`%s(%s)`\n\n%s\n", f.Name, f.Name, strings.Join(f.Params, ", "), markdownText(f.Doc))
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
