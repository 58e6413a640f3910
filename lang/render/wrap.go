package render

import (
	"strings"

	"github.com/mattn/go-runewidth"
)

// cells is the width of a text on a terminal. The ambiguous characters (±, ≈, Greek) count one.
var measure = &runewidth.Condition{StrictEmojiNeutral: true}

func cells(s string) int { return measure.StringWidth(s) }

func padRight(s string, n int) string { return s + strings.Repeat(" ", max(0, n-cells(s))) }
func padLeft(s string, n int) string  { return strings.Repeat(" ", max(0, n-cells(s))) + s }

func indentAll(lines []string, n int) []string {
	pad := strings.Repeat(" ", n)
	out := make([]string, len(lines))
	for i, l := range lines {
		if l != "" {
			out[i] = pad + l
		}
	}
	return out
}

// wrapped breaks a text at spaces into lines of at most width cells; a longer word is cut.
func wrapped(text string, width int) []string {
	var lines []string
	for _, paragraph := range strings.Split(text, "\n") {
		line := ""
		for _, word := range strings.Fields(paragraph) {
			for cells(word) > width {
				if line != "" {
					lines, line = append(lines, line), ""
				}
				head := measure.Truncate(word, width, "")
				if head == "" {
					break
				}
				lines, word = append(lines, head), word[len(head):]
			}
			switch {
			case line == "":
				line = word
			case cells(line)+1+cells(word) <= width:
				line += " " + word
			default:
				lines, line = append(lines, line), word
			}
		}
		lines = append(lines, line)
	}
	return lines
}

// hanging wraps a text after a head; the following lines are indented by the head's width.
func hanging(head, text string, width int) []string {
	n := cells(head)
	lines := wrapped(text, max(width-n, 16))
	for i := range lines {
		if i == 0 {
			lines[i] = strings.TrimRight(head+lines[i], " ")
		} else {
			lines[i] = strings.Repeat(" ", n) + lines[i]
		}
	}
	return lines
}

// breakAfterOperators wraps a formula or a list so that each line but the last ends in
// an operator or a comma, where the language reads on. A text without such places is
// left to the terminal.
func breakAfterOperators(head, text string, width int) []string {
	n := cells(head)
	room := max(width-n, 16)
	var lines []string
	line := ""
	for _, piece := range breakable(text) {
		if line != "" && cells(line)+cells(strings.TrimRight(piece, " ")) > room {
			lines, line = append(lines, strings.TrimRight(line, " ")), ""
		}
		line += piece
	}
	lines = append(lines, line)
	for i := range lines {
		if i == 0 {
			lines[i] = head + lines[i]
		} else {
			lines[i] = strings.Repeat(" ", n) + lines[i]
		}
	}
	return lines
}

// breakable cuts a text after each ", ", " + " and " - ", outside quotes.
func breakable(text string) []string {
	var pieces []string
	start, quoted := 0, false
	for i := 0; i+1 < len(text); i++ {
		if text[i] == '"' {
			quoted = !quoted
		}
		if quoted || text[i+1] != ' ' {
			continue
		}
		operator := i > 0 && text[i-1] == ' ' && (text[i] == '+' || text[i] == '-')
		if text[i] == ',' || operator {
			pieces = append(pieces, text[start:i+2])
			start = i + 2
		}
	}
	return append(pieces, text[start:])
}

// oneLine makes a text harmless on a terminal: no control characters, no line ends.
func oneLine(s string) string {
	clean := strings.Map(func(r rune) rune {
		switch {
		case r == '\n' || r == '\t' || r == '\r':
			return ' '
		case r < ' ' || r == 0x7f || (r >= 0x80 && r < 0xa0):
			return '·'
		}
		return r
	}, s)
	return strings.TrimSpace(clean)
}

// shortened cuts a text to n cells with an ellipsis.
func shortened(s string, n int) string { return measure.Truncate(s, n, "…") }
