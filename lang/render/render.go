// Package render writes values and events: as text for a terminal and as JSON, one
// object a line.
//
// [Options] say how wide, with how many digits, with or without colour. [Text] lays one
// value out; a [Printer] writes the events of a run in order; [JSON] turns an event into
// a line. Nothing here computes: a value that cannot be shown in the unit asked for is
// shown in its own.
//
// # The signs
//
// A value stands after "=" exactly when the printed text is the value, and after "≈"
// when digits were cut or the value was never exact. "exact kept" beside "≈" says that
// the cut value is held exactly and that exact(v) shows it. A matrix, a list and a table
// carry one sign for all their numbers. Whole numbers that are exact are printed in full
// up to fifteen digits; an exact number without an end in decimals is printed as a
// fraction where its denominator has at most two digits.
//
// A floating number is printed with no more digits than hold, and a remark says how many
// when that is fewer than asked for. One that is smaller than its own uncertainty is
// printed as 0 after "≈".
package render

import (
	"strings"

	"gainwright/lang/value"
)

// DefaultDigits is how many significant digits are shown unless asked otherwise.
const DefaultDigits = 5

// DefaultWidth is used where no terminal tells its own.
const DefaultWidth = 80

// narrowest layout that still works; smaller terminals wrap by themselves
const narrowest = 40

// Options say how to write.
type Options struct {
	Width  int  // in terminal cells; DefaultWidth when 0
	Digits int  // significant digits; DefaultDigits when 0
	Colour bool // only ever beside words that say the same
	InFull bool // no abridging of large matrices
	// Fractions shows every exact number as a fraction.
	Fractions bool
	// Drawing draws a response or a study in lines of at most width cells; nil for none.
	Drawing func(v value.Value, width int) []string
}

func (o Options) width() int {
	if o.Width <= 0 {
		return DefaultWidth
	}
	return max(o.Width, narrowest)
}

func (o Options) digits() int {
	if o.Digits <= 0 {
		return DefaultDigits
	}
	return o.Digits
}

// narrower gives the options for something indented by n cells.
func (o Options) narrower(n int) Options {
	o.Width = max(o.width()-n, narrowest)
	return o
}

// sign is how a printed text relates to its value.
type sign int

const (
	exactly   sign = iota // the text is the value
	keptExact             // digits were cut, the exact value is kept
	roughly               // the value is floating
	unsigned              // texts, truth values: nothing to say
)

// both is the sign of two things printed together.
func (s sign) both(t sign) sign {
	if s == unsigned {
		return t
	}
	if t == unsigned {
		return s
	}
	return max(s, t)
}

func (s sign) String() string {
	if s == exactly || s == unsigned {
		return "="
	}
	return "≈"
}

// laid is a value laid out: one line that follows the sign, or a block below it.
type laid struct {
	sign    sign
	inline  string   // set when the value goes on the line of its label
	word    string   // of a block: what stands after the sign
	title   string   // of a block: what it is
	lines   []string // of a block
	remarks []string // short: beside the value where there is room
	notes   []string // sentences: below it
}

func (l *laid) isBlock() bool { return l.lines != nil }

// remark joins what is to be said beside the sign.
func (l *laid) remark() string {
	parts := l.remarks
	if l.sign == keptExact {
		parts = append([]string{"exact kept"}, parts...)
	}
	return strings.Join(parts, ", ")
}

// Text lays a value out under a label (the expression that gave it, or a name); in is
// the unit asked for, or nil. The text ends with a newline.
func Text(label string, v value.Value, in *value.Unit, o Options) string {
	l := layValue(v, in, o)
	return strings.Join(labelled(label, l, o), "\n") + "\n"
}

// Inline is a value on one line without a sign, as in a sentence; large values are
// described by kind and size.
func Inline(v value.Value, o Options) string {
	text, _ := inlineValue(v, o)
	return text
}

// labelled puts the label, the sign and the value together.
func labelled(label string, l laid, o Options) []string {
	var lines []string
	head := label
	switch {
	case label != "" && l.sign == unsigned && l.isBlock() && l.word == "":
		head += ":"
	case label != "":
		head += " " + l.sign.String()
	default:
		if l.sign != unsigned {
			head = l.sign.String()
		}
	}
	if l.word != "" {
		head = strings.TrimLeft(head+" "+l.word, " ")
	}
	if l.isBlock() {
		lines = append(lines, blockHead(head, l, o)...)
		lines = append(lines, indentAll(l.lines, 2)...)
	} else {
		lines = append(lines, inlineHead(head, l, o)...)
	}
	for _, n := range l.notes {
		lines = append(lines, hanging("  note: ", n, o.width())...)
	}
	return lines
}

func blockHead(head string, l laid, o Options) []string {
	beside := l.title
	if r := l.remark(); r != "" {
		beside = strings.TrimLeft(beside+"  ("+r+")", " ")
	}
	if beside == "" {
		return []string{head}
	}
	if cells(head)+2+cells(beside) <= o.width() {
		return []string{strings.TrimLeft(head+"  "+beside, " ")}
	}
	return append([]string{head}, hanging("  ", beside, o.width())...)
}

func inlineHead(head string, l laid, o Options) []string {
	text := l.inline
	remark := ""
	if r := l.remark(); r != "" {
		remark = "  (" + r + ")"
	}
	one := strings.TrimLeft(head+" "+text+remark, " ")
	if cells(one) <= o.width() {
		return []string{one}
	}
	var lines []string
	if cells(head)+1+cells(text) <= o.width() {
		lines = []string{head + " " + text}
	} else if cells(head) <= o.width()/3 && cells(head) > 0 {
		lines = breakAfterOperators(head+" ", text, o.width())
	} else {
		if head != "" {
			lines = []string{head}
		}
		lines = append(lines, breakAfterOperators("  ", text, o.width())...)
	}
	last := len(lines) - 1
	if remark != "" && cells(lines[last])+cells(remark) <= o.width() {
		lines[last] += remark
	} else if remark != "" {
		lines = append(lines, remark)
	}
	return lines
}
