package report

import (
	"html/template"
	"strings"

	"gainwright/lang/diag"
)

// row is a piece of the text with what the run said about it; or prose.
type row struct {
	Prose   template.HTML // of a notebook
	Comment []paragraph   // of a script
	Lead    bool          // the script's first comment
	Code    []codePart
	First   int // line of the code
	Results []Result
	NotRun  bool
}

// codePart is a stretch of code of one look.
type codePart struct{ Class, Text string }

// statementRows cuts a text of code, [from, to) of the source, into rows: each statement
// with results has its own, those between share one.
func (d *Document) statementRows(from, to, firstStatement, count int, text func(from, to int) string) []row {
	var rows []row
	start := from
	pending := from
	flush := func(until int) {
		if code := text(pending, until); strings.TrimSpace(code) != "" {
			rows = append(rows, d.codeRow(code, pending, pending >= d.reached && d.reached < len(d.run.Source.Text)))
		}
		pending = until
	}
	for i := firstStatement; i < firstStatement+count; i++ {
		span := d.file.Statements[i].Extent()
		end := lineEnd(d.run.Source.Text, span.End, to)
		if i+1 < firstStatement+count {
			// Statements may share a line.
			end = min(end, max(d.file.Statements[i+1].Extent().Start, span.End))
		}
		if len(d.results[i]) > 0 {
			begin := lineStart(d.run.Source.Text, span.Start, start)
			flush(begin)
			r := d.codeRow(text(begin, end), begin, false)
			r.Results = d.results[i]
			rows = append(rows, r)
			pending = end
		}
		start = end
	}
	flush(to)
	return rows
}

func lineEnd(text string, at, to int) int {
	if k := strings.IndexByte(text[at:to], '\n'); k >= 0 {
		return at + k + 1
	}
	return to
}

func lineStart(text string, at, from int) int {
	if k := strings.LastIndexByte(text[from:max(at, from)], '\n'); k >= 0 {
		return from + k + 1
	}
	return from
}

func (d *Document) codeRow(code string, offset int, notRun bool) row {
	var trimmed string
	blank := 0
	for rest := code; ; {
		line, after, found := strings.Cut(rest, "\n")
		if !found || strings.TrimSpace(line) != "" {
			trimmed = rest
			break
		}
		blank, rest = blank+1, after
	}
	line, _ := d.run.Source.Position(offset)
	return row{Code: coloured(strings.TrimRight(trimmed, " \t\r\n")), First: line + blank, NotRun: notRun}
}

// scriptRows are a script's rows; comments that stand alone become prose.
func (d *Document) scriptRows() []row {
	src := d.run.Source
	rows := d.statementRows(0, len(src.Text), 0, len(d.file.Statements), func(from, to int) string { return src.Text[from:to] })
	var out []row
	for _, r := range rows {
		out = append(out, splitComments(r)...)
	}
	if len(out) > 0 && len(out[0].Comment) > 0 && out[0].First == 1 {
		out[0].Lead = true
	}
	return out
}

// splitComments takes the comments at the margin out of a row, where no statement is open.
func splitComments(r row) []row {
	var text strings.Builder
	for _, p := range r.Code {
		text.WriteString(p.Text)
	}
	lines := strings.Split(text.String(), "\n")
	var out []row
	var code []string
	first := r.First
	codeFirst := first
	depth := 0
	flushCode := func() {
		joined := strings.TrimRight(strings.Join(code, "\n"), " \t\r\n")
		if strings.TrimSpace(joined) != "" {
			out = append(out, row{Code: coloured(joined), First: codeFirst, NotRun: r.NotRun})
		}
		code = nil
	}
	for i := 0; i < len(lines); i++ {
		if depth == 0 && strings.HasPrefix(lines[i], "#") {
			flushCode()
			begin := i
			for i < len(lines) && strings.HasPrefix(lines[i], "#") {
				i++
			}
			out = append(out, row{Comment: paragraphs(lines[begin:i]), First: first + begin})
			i--
			continue
		}
		if len(code) == 0 {
			if strings.TrimSpace(lines[i]) == "" {
				continue
			}
			codeFirst = first + i
		}
		depth = max(0, depth+opened(lines[i]))
		code = append(code, lines[i])
	}
	flushCode()
	if len(r.Results) > 0 {
		if n := len(out); n > 0 && out[n-1].Code != nil {
			out[n-1].Results = r.Results
		} else {
			out = append(out, row{First: r.First, Results: r.Results})
		}
	}
	return out
}

// opened is how many more brackets a line opens than it closes.
func opened(line string) int {
	n, quoted := 0, false
	for i := 0; i < len(line); i++ {
		switch c := line[i]; {
		case quoted && c == '\\':
			i++
		case c == '"':
			quoted = !quoted
		case quoted:
		case c == '#':
			return n
		case c == '(' || c == '[' || c == '{':
			n++
		case c == ')' || c == ']' || c == '}':
			n--
		}
	}
	return n
}

// paragraph is a piece of a comment; one whose lines are indented keeps them.
type paragraph struct {
	Text string
	Kept bool
}

// paragraphs joins comment lines; an empty comment begins another paragraph.
func paragraphs(lines []string) []paragraph {
	var out []paragraph
	var open []string
	kept := false
	end := func() {
		if len(open) > 0 {
			out = append(out, paragraph{strings.Join(open, "\n"), kept})
		}
		open = nil
	}
	for _, l := range lines {
		l = strings.TrimRight(strings.TrimLeft(l, "#"), " \t\r")
		isIndented := strings.HasPrefix(l, "  ") || strings.HasPrefix(l, " \t")
		if l = strings.TrimPrefix(l, " "); strings.TrimSpace(l) == "" {
			end()
			continue
		}
		if isIndented != kept {
			end()
		}
		kept = isIndented
		open = append(open, l)
	}
	end()
	return out
}

var statementWords = []string{"require", "claim", "define", "model", "diagram", "study", "schedule", "use", "given",
	"input", "state", "output", "let", "rate", "next", "around", "every"}

// coloured marks comments, texts and the words that begin statements.
func coloured(code string) []codePart {
	var parts []codePart
	add := func(class, text string) {
		if text != "" {
			parts = append(parts, codePart{class, text})
		}
	}
	for line := range strings.Lines(code) {
		body := strings.TrimLeft(line, " \t")
		add("", line[:len(line)-len(body)])
		word, _, found := strings.Cut(body, " ")
		if found {
			for _, w := range statementWords {
				if w == strings.TrimSpace(word) && !strings.HasPrefix(strings.TrimLeft(body[len(word):], " "), "=") {
					add("word", word)
					body = body[len(word):]
					break
				}
			}
		}
		from := 0
		for i := 0; i < len(body); i++ {
			switch body[i] {
			case '"':
				add("", body[from:i])
				end := closing(body, i)
				add("quoted", body[i:end])
				from, i = end, end-1
			case '#':
				add("", body[from:i])
				add("comment", body[i:])
				from, i = len(body), len(body)
			}
		}
		add("", body[from:])
	}
	return parts
}

func closing(s string, from int) int {
	for i := from + 1; i < len(s); i++ {
		switch s[i] {
		case '\\':
			i++
		case '"':
			return i + 1
		}
	}
	return len(s)
}

// sourceBetween joins the parts of a block's lines that lie in [from, to).
func sourceBetween(src *diag.Source, lines []diag.Span, from, to int) string {
	var b strings.Builder
	for _, l := range lines {
		a, z := max(l.Start, from), min(l.End, to)
		if a < z {
			b.WriteString(src.Text[a:z])
		}
	}
	return b.String()
}
