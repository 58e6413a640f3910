package render

import (
	"fmt"
	"io"
	"math"
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/value"
)

// Printer writes the events of a run as text. A value that takes several lines is set
// apart by empty lines.
type Printer struct {
	Out     io.Writer
	Options Options
	// Bindings shows what a binding bound, as at the prompt.
	Bindings bool
	// OnlyVerdicts leaves out shown values and notes, as gainwright check does.
	OnlyVerdicts bool

	wrote     bool // something was written
	wasBlock  bool // the last thing written was set apart
	firstFail error
}

// the words of verdicts stand in a column of this many cells
const verdictCells = 11

// Event writes one event. A failure to write is kept and given by Err.
func (p *Printer) Event(e eval.Event) {
	lines, block := p.lines(e)
	if len(lines) == 0 {
		return
	}
	var b strings.Builder
	if p.wrote && (block || p.wasBlock) {
		b.WriteByte('\n')
	}
	for _, l := range lines {
		b.WriteString(strings.TrimRight(l, " "))
		b.WriteByte('\n')
	}
	p.wrote, p.wasBlock = true, block
	if _, err := io.WriteString(p.Out, b.String()); err != nil && p.firstFail == nil {
		p.firstFail = err
	}
}

// Apart makes the next event stand directly below what is on the screen, as after a prompt.
func (p *Printer) Apart() { p.wrote, p.wasBlock = false, false }

// Err is the first failure to write.
func (p *Printer) Err() error { return p.firstFail }

func (p *Printer) lines(e eval.Event) (lines []string, block bool) {
	o := p.Options
	switch {
	case e.Shown != nil && !p.OnlyVerdicts:
		if text, ok := e.Shown.Value.(value.Text); ok && e.Text == quoted(string(text)) {
			// A text alone is a heading.
			return wrapped(oneLine(string(text)), o.width()), true
		}
		l := layValue(e.Shown.Value, e.Shown.In, o)
		lines = labelled(oneLine(e.Text), l, o)
		return p.tintNotes(lines), len(lines) > 1
	case e.Bound != nil && p.Bindings:
		lines = labelled(e.Bound.Name, layValue(e.Bound.Value, nil, o), o)
		return p.tintNotes(lines), len(lines) > 1
	case e.Requirement != nil:
		return p.requirement(e, e.Requirement), false
	case e.Claim != nil:
		return p.claim(e, e.Claim), false
	case e.Error != nil:
		return p.failure(e.Error), true
	case e.Note != "" && !p.OnlyVerdicts:
		return p.tintAll(faint, hanging(padRight("note", verdictCells), oneLine(e.Note), o.width())), false
	}
	return nil, false
}

// verdict starts a line with its word; only the word is coloured.
func (p *Printer) verdict(word, text string, c colour) []string {
	lines := hanging(padRight(word, verdictCells), oneLine(text), p.Options.width())
	lines[0] = p.tint(c, word) + strings.TrimPrefix(lines[0], word)
	return lines
}

// under adds a sentence below a verdict.
func (p *Printer) under(text string) []string {
	return hanging(strings.Repeat(" ", verdictCells), oneLine(text), p.Options.width())
}

func (p *Printer) requirement(e eval.Event, r *eval.Requirement) []string {
	v := VerdictOf(e, p.Options)
	c := green
	switch {
	case r.NotJudged:
		c = faint
	case !r.Met:
		c = red
	}
	lines := p.verdict(v.Word, v.Text, c)
	if len(v.Below) > 0 {
		lines = append(lines, p.under(strings.Join(v.Below, "; "))...)
	}
	return lines
}

func firstOf(texts ...string) string {
	for _, t := range texts {
		if t != "" {
			return t
		}
	}
	return ""
}

// unpadded is a number's text without the zeros that only say how many digits hold.
func unpadded(text string) string {
	if strings.ContainsAny(text, "e ") || !strings.Contains(text, ".") {
		return text
	}
	return strings.TrimSuffix(strings.TrimRight(text, "0"), ".")
}

func (p *Printer) claim(e eval.Event, c *eval.Claim) []string {
	v := VerdictOf(e, p.Options)
	tint := green
	switch v.Word {
	case "undecided":
		tint = yellow
	case "disagrees":
		tint = red
	}
	lines := p.verdict(v.Word, v.Text, tint)
	for _, entry := range v.Below {
		lines = append(lines, p.under(entry)...)
	}
	if len(c.Poles) > 0 {
		o := p.Options
		text, _ := listText(&value.List{Items: c.Poles}, o)
		lines = append(lines, p.under("the printed numbers give the poles")...)
		lines = append(lines, breakAfterOperators(strings.Repeat(" ", verdictCells+2), strings.Trim(text, "[]"), o.width())...)
	}
	for _, n := range c.Notes {
		lines = append(lines, p.under(n)...)
	}
	return lines
}

func hasDisagreement(c *eval.Claim) bool {
	for _, e := range c.Entries {
		if e.Cannot == "" {
			return true
		}
	}
	return false
}

// claimEntry says what was printed, what was computed and how far apart they are.
func claimEntry(e eval.ClaimEntry) string {
	where := e.Name
	if where == "" && len(e.At) > 0 {
		parts := make([]string, len(e.At))
		for i, k := range e.At {
			parts[i] = fmt.Sprint(k)
		}
		where = "[" + strings.Join(parts, ", ") + "]"
	}
	if e.Part != "" {
		where = strings.TrimSpace(where + " " + e.Part + " part")
	}
	if where != "" {
		where += ": "
	}
	text := where + "printed " + e.Printed
	if e.Computed != nil {
		text += ", computed " + Inline(e.Computed, Options{Digits: claimDigits(e)})
	}
	if e.Cannot != "" {
		return text + "; cannot be judged: " + e.Cannot
	}
	if math.IsInf(e.Units, 0) {
		return text + "; equality was printed"
	}
	return text + "; off by " + unitsText(e.Units) + " of its last place"
}

// claimDigits shows two digits more of the computed value than were printed.
func claimDigits(e eval.ClaimEntry) int {
	n := 0
	mantissa, _, _ := strings.Cut(strings.ToLower(e.Printed), "e")
	for _, r := range strings.TrimLeft(mantissa, "-+0. ") {
		if r >= '0' && r <= '9' {
			n++
		}
	}
	return min(max(n+2, DefaultDigits), 17)
}

func (p *Printer) failure(err *diag.Error) []string {
	lines := strings.Split(strings.TrimRight(err.Render(), "\n"), "\n")
	lines[0] = p.tint(red, lines[0])
	return lines
}

type colour string

const (
	red    colour = "31"
	green  colour = "32"
	yellow colour = "33"
	faint  colour = "2"
)

func (p *Printer) tint(c colour, s string) string {
	if !p.Options.Colour || s == "" {
		return s
	}
	return "\x1b[" + string(c) + "m" + s + "\x1b[0m"
}

func (p *Printer) tintAll(c colour, lines []string) []string {
	for i := range lines {
		lines[i] = p.tint(c, lines[i])
	}
	return lines
}

// tintNotes makes the notes below a value quiet.
func (p *Printer) tintNotes(lines []string) []string {
	note := false
	for i, l := range lines {
		note = strings.HasPrefix(l, "  note: ") || note && strings.HasPrefix(l, "        ")
		if note {
			lines[i] = p.tint(faint, l)
		}
	}
	return lines
}

// Failure writes an error that belongs to no run, such as a missing file.
func (p *Printer) Failure(err *diag.Error) {
	p.Event(eval.Event{Error: err})
}

func unitsText(units float64) string {
	if units == 1 {
		return "1 unit"
	}
	return fmt.Sprintf("%.3g units", units)
}
