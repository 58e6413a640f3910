package render

import (
	"math"
	"strings"
	"testing"

	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/value"
)

func event(text string) eval.Event { return eval.Event{Text: text, Line: 1} }

func printedEvents() []eval.Event {
	src := diag.NewSource("sheet.gain", "A = [[0, 1], [2, 3]]\nB = [[1, 2, 3]]\nA * B\n")
	met, missed, rounding, plain := event("least_damping(closed(P, K)) >= 0.6"),
		event("swing >= 0.45"), event("x <= 1"), event("stabilizable(P)")
	met.Requirement = &eval.Requirement{Met: true, Left: num("0.7"), Right: num("0.6"), Op: ">=", Why: "swing decays well"}
	missed.Requirement = &eval.Requirement{Left: num("0.4499999"), Right: num("0.45"), Op: ">="}
	rounding.Requirement = &eval.Requirement{Met: true, WithinRounding: true, Left: value.FloatErr(1, 1e-9), Right: num("1"), Op: "<="}
	plain.Requirement = &eval.Requirement{Because: "the mode 0.5 grows and no input moves it"}
	agrees, disagrees, undecided := event("K is [[959.1, 2991]]"), event("K is [[959.1, -18810]]"), event("p is 12.35")
	agrees.Claim = &eval.Claim{Agrees: true, WorstUnits: 0.2}
	disagrees.Claim = &eval.Claim{WorstUnits: 2.58, Entries: []eval.ClaimEntry{
		{At: []int{1, 3}, Name: "F [N], a [rad]", Printed: "-18810", Computed: num("-18812.5844"), Units: 2.58},
		{At: []int{1, 4}, Printed: "24/7", Computed: num("3.5"), Units: math.Inf(1)}},
		Poles: []value.Value{floatPole(-0.77, 0.78, 1e-15), floatPole(-0.77, -0.78, 1e-15)},
		Notes: []string{"the printed gain moves no pole by more than 0.1 %"}}
	undecided.Claim = &eval.Claim{Undecided: true, WorstUnits: 0.5, Entries: []eval.ClaimEntry{
		{Printed: "12.35", Computed: value.FloatErr(12.355, 0.002), Units: 0.5, Cannot: "its uncertainty straddles the end of the interval"}}}
	shown, block, bound, note, failed := event("1/3"), event("A"), event("x = 2"), event(""), event("A * B")
	shown.Shown = &eval.Shown{Value: num("1/3")}
	block.Shown = &eval.Shown{Value: exactRows("0 1", "2 3")}
	bound.Bound = &eval.Bound{Name: "x", Value: num("2")}
	note.Note = "1/100 s is 1/(100 s); 0.01 s is meant perhaps, and this sentence is long enough for a second line"
	failed.Error = diag.New(diag.Shape, "a 2×2 matrix times a 1×3 matrix").In(src).At(diag.Span{Start: 39, End: 40}).WithHelp("the columns of the left must be the rows of the right")
	return []eval.Event{shown, block, bound, met, missed, rounding, plain, agrees, disagrees, undecided, note, failed}
}

func TestPrinterLooksAsExpected(t *testing.T) {
	var b strings.Builder
	for _, p := range []*Printer{{Bindings: true}, {}, {OnlyVerdicts: true}, {Bindings: true, Options: Options{Colour: true, Width: 60}}} {
		p.Out = &b
		for _, e := range printedEvents() {
			p.Event(e)
		}
		b.WriteString("\n==========\n\n")
	}
	compareGolden(t, "events.txt", strings.ReplaceAll(b.String(), "\x1b", "<ESC>"))
}

func TestColourOnlyAddsToWords(t *testing.T) {
	var plain, coloured strings.Builder
	a, b := Printer{Out: &plain}, Printer{Out: &coloured, Options: Options{Colour: true}}
	for _, e := range printedEvents() {
		a.Event(e)
		b.Event(e)
	}
	text := coloured.String()
	for _, code := range []string{"\x1b[31m", "\x1b[32m", "\x1b[33m", "\x1b[2m", "\x1b[0m"} {
		text = strings.ReplaceAll(text, code, "")
	}
	if text != plain.String() {
		t.Errorf("the coloured text differs in more than colour:\n%s", text)
	}
	if coloured.String() == plain.String() {
		t.Error("nothing is coloured")
	}
}

func TestControlCharactersNeverReachTheTerminal(t *testing.T) {
	var b strings.Builder
	p := Printer{Out: &b}
	e := event("\"\x1b[31m\"")
	e.Shown = &eval.Shown{Value: value.Text("\x1b[2J\x07bell")}
	p.Event(e)
	n := event("")
	n.Note = "\x1b]0;title\x07"
	p.Event(n)
	if strings.ContainsAny(b.String(), "\x1b\x07") {
		t.Errorf("a control character was printed: %q", b.String())
	}
}
