package eval_test

import (
	"context"
	"math"
	"math/big"
	"strings"
	"testing"
	"testing/fstest"
	"time"

	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/exact"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// builtins is a small invented table: enough to call, to fail and to misbehave.
func builtins() []*value.Builtin {
	number := value.Param{Name: "x", Shape: value.AReal}
	return []*value.Builtin{
		{Name: "pi", Func: func(*value.Call) (value.Value, error) { return value.Pi(), nil }},
		{Name: "sqrt", Params: []value.Param{number}, Func: root},
		{Name: "total", Params: []value.Param{{Name: "of", Shape: value.ANumber, Variadic: true}}, Func: total},
		{Name: "scaled", Params: []value.Param{number, {Name: "by", Shape: value.AReal, Named: true, Optional: true}, {Name: "kind", Shape: value.AChoice, Choices: []string{"plain", "double"}, Named: true, Optional: true}}, Func: scaled},
		{Name: "boom", Params: []value.Param{number}, Func: func(*value.Call) (value.Value, error) { panic("deliberate") }},
		{Name: "nothing", Params: []value.Param{number}, Func: func(*value.Call) (value.Value, error) { return nil, nil }},
		{Name: "refuse", Params: []value.Param{number, {Name: "poles", Shape: value.AList}}, Func: func(*value.Call) (value.Value, error) {
			return nil, value.Errf(diag.Numerical, "poles", "the mode at 3 cannot be moved")
		}},
		{Name: "wait", Params: []value.Param{number}, Func: func(c *value.Call) (value.Value, error) { <-c.Context.Done(); return nil, c.Context.Err() }},
		{Name: "deaf", Params: []value.Param{number}, Func: func(c *value.Call) (value.Value, error) { time.Sleep(2 * time.Second); return value.Int(0), nil }},
		{Name: "ones", Params: []value.Param{{Name: "n", Shape: value.AWhole}}, Func: ones},
		{Name: "whole_numbers", Params: []value.Param{{Name: "n", Shape: value.AWhole}}, Func: wholeNumbers},
		{Name: "frequency_of", Params: []value.Param{{Name: "frequency", Shape: value.AFrequency, Named: true}}, Func: func(c *value.Call) (value.Value, error) { return c.Number("frequency"), nil }},
		{Name: "twice", Params: []value.Param{{Name: "f", Shape: value.AFunction}, number}, Func: twice},
		{Name: "rounded", Params: []value.Param{number, {Name: "error", Shape: value.AReal, Named: true}}, Func: func(c *value.Call) (value.Value, error) {
			return value.FloatErr(c.Number("x").Float64(), c.Number("error").Float64()), nil
		}},
		{Name: "remark", Params: []value.Param{{Name: "text", Shape: value.AText}}, Func: func(c *value.Call) (value.Value, error) { c.Note(c.Text("text", "")); return value.Int(0), nil }},
		{Name: "stable", Params: []value.Param{number}, Func: stable},
		{Name: "feedback", Params: []value.Param{{Name: "A", Shape: value.ASquare}, {Name: "B", Shape: value.AMatrix}, {Name: "K", Shape: value.AMatrix}, {Name: "poles", Shape: value.PoleList}, {Name: "free", Shape: value.ABoolean, Named: true, Optional: true}}, Func: feedback},
		{Name: "coefficients", Params: []value.Param{{Name: "p", Shape: value.APolynomial}}, Func: coefficients},
	}
}

func root(c *value.Call) (value.Value, error) {
	x := c.Number("x").Float64()
	if x < 0 {
		return nil, value.Errf(diag.Numerical, "x", "the root of a negative number")
	}
	return value.Float(math.Sqrt(x)), nil
}

func total(c *value.Call) (value.Value, error) {
	var sum value.Value = value.Int(0)
	for _, v := range c.List("of").Items {
		var err error
		if sum, err = value.Add(sum, v); err != nil {
			return nil, err
		}
	}
	return sum, nil
}

func scaled(c *value.Call) (value.Value, error) {
	factor := value.Int(1)
	if c.Has("by") {
		factor = c.Number("by")
	}
	if c.Text("kind", "plain") == "double" {
		factor = value.Int(2)
	}
	return value.Multiply(c.Number("x"), factor)
}

func ones(c *value.Call) (value.Value, error) {
	n, _ := c.Number("n").Whole()
	if err := c.Charge(int64(n) * 8); err != nil {
		return nil, err
	}
	data := make([]float64, n)
	for i := range data {
		data[i] = 1
	}
	return value.FloatMatrix(n, 1, data, 0), nil
}

func wholeNumbers(c *value.Call) (value.Value, error) {
	n, _ := c.Number("n").Whole()
	if err := c.Charge(int64(n) * 96); err != nil {
		return nil, err
	}
	list := &value.List{}
	for i := range n {
		list.Items = append(list.Items, value.Int(i+1))
	}
	return list, nil
}

func twice(c *value.Call) (value.Value, error) {
	fn := c.Args["f"].(*value.Function)
	once, err := c.Apply(fn, c.Number("x"))
	if err != nil {
		return nil, err
	}
	return c.Apply(fn, once)
}

func stable(c *value.Call) (value.Value, error) {
	holds := c.Number("x").Sign() < 0
	return &value.Report{Title: "stable", Holds: &holds, Fields: []value.Named{{Name: "because", Value: value.Text("the mode at 1 grows")}}}, nil
}

func feedback(c *value.Call) (value.Value, error) {
	a, b := c.Matrix("A"), c.Matrix("B")
	n, _ := a.Dims()
	_, inputs := b.Dims()
	p := &value.Plant{A: a, B: b, C: value.ExactMatrix(exact.Identity(n)), D: value.ExactMatrix(exact.NewMatrix(n, inputs))}
	g := &value.Gain{Role: "state feedback", Values: c.Matrix("K"), Plant: p, Wanted: c.List("poles").Items, Free: c.Truth("free")}
	for i := range n {
		g.ColumnSignals = append(g.ColumnSignals, value.Signal{Name: "x" + string(rune('1'+i))})
	}
	for i := range inputs {
		g.RowSignals = append(g.RowSignals, value.Signal{Name: "u" + string(rune('1'+i))})
	}
	return g, nil
}

func coefficients(c *value.Call) (value.Value, error) {
	list := &value.List{}
	for _, x := range c.Polynomial("p").Exact.Coefficients() {
		list.Items = append(list.Items, value.Rat(x))
	}
	return list, nil
}

var stdlib = fstest.MapFS{
	"powers.gain": {Data: []byte("# of numbers\ndefine cubed(x) = x * squared(x), \"x to the third\"\ndefine squared(x) = x^2, \"x to the second\"\ndefine inverted(x) = 1/x, \"one over x\"\nanswer = squared(6) + 6\n")},
	"spoilt.gain": {Data: []byte("define uses_unknown(x) = x + not_there\n")},
}

func session(interactive bool) *eval.Session {
	return eval.New(eval.Options{Builtins: builtins(), Library: stdlib, Interactive: interactive})
}

// runText runs a script and gives its events.
func runText(t testing.TB, s *eval.Session, text string) ([]eval.Event, eval.Outcome) {
	t.Helper()
	var events []eval.Event
	out := s.RunText(context.Background(), diag.NewSource("test.gain", text), func(e eval.Event) { events = append(events, e) })
	return events, out
}

// failure gives the error of a script that must fail.
func failure(t testing.TB, s *eval.Session, text string) *diag.Error {
	t.Helper()
	events, out := runText(t, s, text)
	if !out.Failed || len(events) == 0 || events[len(events)-1].Error == nil {
		t.Fatalf("no error: %s", text)
	}
	return events[len(events)-1].Error
}

// caret gives the text that an error points at.
func caret(e *diag.Error) string {
	if e.Source == nil {
		return "(no source)"
	}
	return e.Source.Text[e.Span.Start:min(e.Span.End, len(e.Source.Text))]
}

func shown(t testing.TB, s *eval.Session, text string) value.Value {
	t.Helper()
	events, out := runText(t, s, text)
	if out.Failed {
		t.Fatalf("%s: %s", text, events[len(events)-1].Error.Render())
	}
	for i := len(events) - 1; i >= 0; i-- {
		if events[i].Shown != nil {
			return events[i].Shown.Value
		}
	}
	t.Fatalf("nothing shown: %s", text)
	return nil
}

func isNumber(v value.Value, num, den int64) bool {
	n, ok := v.(value.Number)
	return ok && n.Exact != nil && n.Exact.Cmp(big.NewRat(num, den)) == 0
}

func statements(t testing.TB, text string) (*diag.Source, []syntax.Statement) {
	t.Helper()
	src := diag.NewSource("prompt", text)
	file, err := syntax.Parse(src)
	if err != nil {
		t.Fatal(err)
	}
	return src, file.Statements
}

func atPrompt(t testing.TB, s *eval.Session, text string) eval.Outcome {
	t.Helper()
	src, all := statements(t, text)
	var out eval.Outcome
	for _, st := range all {
		out = s.RunStatement(context.Background(), src, st, func(eval.Event) {})
	}
	return out
}

func contains(text string, parts ...string) bool {
	for _, p := range parts {
		if !strings.Contains(text, p) {
			return false
		}
	}
	return true
}

const soon = 5 * time.Second
