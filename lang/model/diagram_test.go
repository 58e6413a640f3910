package model

import (
	"strings"
	"testing"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

func wired(t testing.TB, text string, names map[string]value.Value) (*value.Plant, *diag.Error) {
	t.Helper()
	source := diag.NewSource("diagram.gain", text)
	file, err := syntax.Parse(source)
	if err != nil {
		t.Fatalf("%v\n%s", err, text)
	}
	return BuildDiagram(source, file.Statements[0].(*syntax.Diagram), &constants{names: names})
}

func mustWire(t testing.TB, text string, names map[string]value.Value) *value.Plant {
	t.Helper()
	p, err := wired(t, text, names)
	if err != nil {
		t.Fatal(err.Render())
	}
	return p
}

// ratio makes a transfer function of whole coefficients, highest power first.
func ratio(t testing.TB, variable string, num, den []int64) *value.Transfer {
	t.Helper()
	g, err := value.RatioTransfer(value.ExactPolynomial(variable, exact.PolynomialOfIntegers(num...)), value.ExactPolynomial(variable, exact.PolynomialOfIntegers(den...)))
	if err != nil {
		t.Fatal(err)
	}
	return g
}

// sameTransfer compares one channel with a ratio of polynomials, exactly.
func sameTransfer(t *testing.T, p *value.Plant, output, input int, num, den []int64) {
	t.Helper()
	g, err := value.ToTransfer(p)
	if err != nil {
		t.Fatal(err)
	}
	want := ratio(t, g.Variable, num, den)
	if same, err := value.Equal(&value.Transfer{Variable: g.Variable, Entries: [][]value.Ratio{{g.Entries[output][input]}}}, want); err != nil || !bool(same) {
		t.Errorf("channel %d, %d is %v, not %v (%v)", output, input, g.Entries[output][input], want.Entries[0][0], err)
	}
}

// y/r = PH/(1 + PH) and u/r = H/(1 + PH) with P = 1/(s + 2), H = (s + 1)/s: by hand
// (s + 1)/(s² + 3s + 1) and (s + 1)(s + 2)/(s² + 3s + 1).
func TestLoopOfTwoSystems(t *testing.T) {
	names := map[string]value.Value{"P": ratio(t, "s", []int64{1}, []int64{1, 2}), "H": ratio(t, "s", []int64{1, 1}, []int64{1, 0})}
	p := mustWire(t, "diagram servo { input r, d; e = r - y; u = H * e; y = P * (u + d); output y, u }", names)
	sameTransfer(t, p, 0, 0, []int64{1, 1}, []int64{1, 3, 1})
	sameTransfer(t, p, 1, 0, []int64{1, 3, 2}, []int64{1, 3, 1})
	sameTransfer(t, p, 0, 1, []int64{1, 0}, []int64{1, 3, 1})
	if p.States[0].Name != "x_H" || p.States[1].Name != "x_P" || p.Title != "diagram servo" || len(p.Notes) != 0 {
		t.Errorf("states %v, title %q, notes %v", p.States, p.Title, p.Notes)
	}
}

// The order of the lines does not matter, and one system may stand twice.
func TestOneSystemTwice(t *testing.T) {
	names := map[string]value.Value{"P": ratio(t, "s", []int64{1}, []int64{1, 2})}
	p := mustWire(t, "diagram chain { input u; y = 3 * P * m; m = P * u; output y, m }", names)
	sameTransfer(t, p, 0, 0, []int64{3}, []int64{1, 4, 4})
	sameTransfer(t, p, 1, 0, []int64{1}, []int64{1, 2})
	if p.States[0].Name == p.States[1].Name {
		t.Errorf("two states are called %s", p.States[0].Name)
	}
}

func plantOf(t testing.TB, a, b, c [][]int64) *value.Plant {
	t.Helper()
	matrix := func(rows [][]int64) *value.Matrix {
		var flat []int64
		for _, r := range rows {
			flat = append(flat, r...)
		}
		m, err := exact.FromIntegers(len(rows), len(rows[0]), flat...)
		if err != nil {
			t.Fatal(err)
		}
		return value.ExactMatrix(m)
	}
	n, inputs, outputs := len(a), len(b[0]), len(c)
	return &value.Plant{A: matrix(a), B: matrix(b), C: matrix(c), D: value.ExactMatrix(exact.NewMatrix(outputs, inputs)),
		States: value.DefaultSignals("x", n), Inputs: value.DefaultSignals("u", inputs), Outputs: value.DefaultSignals("y", outputs)}
}

// A plant of two channels: y1 = 1/(s+1) u1, y2 = 1/(s+2) u2, decoupled; the loop closes
// the first with the second's output. By hand y1/r = 1/(s+1) · 1/(1 + 1/((s+1)(s+2))).
func TestSignalsWithSeveralComponents(t *testing.T) {
	p := plantOf(t, [][]int64{{-1, 0}, {0, -2}}, [][]int64{{1, 0}, {0, 1}}, [][]int64{{1, 0}, {0, 1}})
	w := mustWire(t, `diagram two { input r; y = P * [r - y["y2"], y[1]]; output y }`, map[string]value.Value{"P": p})
	sameTransfer(t, w, 0, 0, []int64{1, 2}, []int64{1, 3, 3})
	sameTransfer(t, w, 1, 0, []int64{1}, []int64{1, 3, 3})
	if w.Outputs[0].Name != "y.y1" || w.Outputs[1].Name != "y.y2" {
		t.Errorf("outputs %v", w.Outputs)
	}
}

func TestAlgebraicLoops(t *testing.T) {
	p := mustWire(t, "diagram loop { input r; e = r - y; y = 2 * e; output y }", nil)
	if got := fractions(t, p.D); got != "2/3" {
		t.Errorf("y = %s r, want 2/3", got)
	}
	if len(p.Notes) != 1 || !strings.Contains(p.Notes[0], "e → y → e was solved") {
		t.Errorf("notes %v", p.Notes)
	}
	// through the direct term of a system: H = (s + 2)/(s + 1) round itself
	h := ratio(t, "s", []int64{1, 2}, []int64{1, 1})
	p = mustWire(t, "diagram loop { input r; y = H * (r - y); output y }", map[string]value.Value{"H": h})
	sameTransfer(t, p, 0, 0, []int64{1, 2}, []int64{2, 3})
}

// Units are turned into one another at every joint: 0.01 V/rpm on a signal in rpm, and the
// sum of a signal in rpm with one in rev/min's SI.
func TestUnitsAtJoints(t *testing.T) {
	p := plantOf(t, [][]int64{{-1}}, [][]int64{{1}}, [][]int64{{1}})
	unit := func(text string) value.Unit {
		u, err := value.ParseUnit(text)
		if err != nil {
			t.Fatal(err)
		}
		return u
	}
	p.Inputs[0].Unit, p.Outputs[0].Unit = unit("N"), unit("mm")
	names := map[string]value.Value{"P": p}
	w := mustWire(t, "diagram joint { input r in cm; e = r - y; u = 3 N/m * e; y = P * u; output y in m, e, u }", names)
	// in mm: A = −1 − 3 N/m · 1e-3 m/mm; B for r in cm: 3 · 1e-2; e in cm: r − 0.1 y; u in N
	if got := fractions(t, w.A); got != "-1003/1000" {
		t.Errorf("A = %s", got)
	}
	if got := fractions(t, w.B); got != "3/100" {
		t.Errorf("B = %s", got)
	}
	if got := fractions(t, w.C); got != "1/1000; -1/10; -3/1000" {
		t.Errorf("C = %s", got)
	}
	if w.Outputs[1].Unit.Text != "cm" || w.Outputs[2].Unit.Text != "N" {
		t.Errorf("outputs %v", w.Outputs)
	}
}

func TestSampleTimes(t *testing.T) {
	every := value.Rat(half)
	sampled := plantOf(t, [][]int64{{0}}, [][]int64{{1}}, [][]int64{{1}})
	sampled.Every = &every
	delay := ratio(t, "z", []int64{1}, []int64{1, 0})
	w := mustWire(t, "diagram d { input r; e = r - m; y = P * e; m = Z * y; output y }", map[string]value.Value{"P": sampled, "Z": delay})
	if w.Every == nil || w.Every.Exact.Cmp(half) != 0 {
		t.Errorf("every %v", w.Every)
	}
	// P = 1/z, m = y/z: y/r = (1/z)/(1 + 1/z²) = z/(z² + 1)
	sameTransfer(t, w, 0, 0, []int64{1, 0}, []int64{1, 0, 1})
}

func TestDiagramRefusals(t *testing.T) {
	continuous := plantOf(t, [][]int64{{-1}}, [][]int64{{1}}, [][]int64{{1}})
	sampled := plantOf(t, [][]int64{{0}}, [][]int64{{1}}, [][]int64{{1}})
	every := value.Rat(half)
	sampled.Every = &every
	inNewton := plantOf(t, [][]int64{{-1}}, [][]int64{{1}}, [][]int64{{1}})
	newton, _ := value.ParseUnit("N")
	inNewton.Inputs[0].Unit, inNewton.Inputs[0].Name = newton, "F"
	names := map[string]value.Value{"P": continuous, "Q": sampled, "N": inNewton, "D": ratio(t, "s", []int64{1, 0}, []int64{1}), "T": value.Text("no"),
		"Z": ratio(t, "z", []int64{1}, []int64{1, 0}), "W": plantOf(t, [][]int64{{-1}}, [][]int64{{1, 1}}, [][]int64{{1}})}
	for _, x := range []struct{ name, text, at, message, help string }{
		{"ill-posed", "diagram d { input r; e = r + y; y = 1 * e; output y }", "e", "the algebraic loop e → y → e has no solution", "opens it"},
		{"sample times", "diagram d { input r; y = P * r; z2 = Q * y; output z2 }", "Q", "P is continuous, Q is sampled every 0.5 s", "sampled("},
		{"delay in continuous time", "diagram d { input r; y = P * r; z2 = Z * y; output z2 }", "Z", "is in z, and the diagram is continuous", ""},
		{"joint", "diagram d { input r in m; y = N * r; output y }", "r", "the input F of N is in N, and what it joins is in m", "* e"},
		{"sum", "diagram d { input r in m, q in s; e = r - q; output e }", "q", "r is in m, q is in s", ""},
		{"unknown signal", "diagram d { input ref; e = ref - y; output e }", "y", "there is no signal y", "ref"},
		{"unknown output", "diagram d { input ref; e = ref; output ee, err }", "ee", "there is no signal ee", ""},
		{"two signals", "diagram d { input a, b; e = a * b; output e }", "*", "two signals are multiplied", "model"},
		{"power", "diagram d { input a; e = a ^ 2; output e }", "^", "^ has no place", "model"},
		{"function", "diagram d { input a; e = sin(a); output e }", "sin(a)", "a diagram adds signals", "model"},
		{"constant", "diagram d { input a; e = a - 3; output e }", "3", "3 is a constant", "input d"},
		{"bare system", "diagram d { input a; e = a - P; output e }", "P", "P is no signal", "H * e"},
		{"from the right", "diagram d { input a; e = a * P; output e }", "P", "multiplies a signal from the left", "P * a"},
		{"differentiator", "diagram d { input a; e = D * a; output e }", "D", "differentiates", ""},
		{"text", "diagram d { input a; e = T * a; output e }", "T", "a system, a matrix or a number multiplies", ""},
		{"sizes", "diagram d { input a; e = W * a; output e }", "a", "W takes 2 signals, and a has 1 component", ""},
		{"sum of sizes", "diagram d { input a; v = [a, a]; e = v - a; output e }", "a", "different sizes", ""},
		{"twice", "diagram d { input a; e = a; e = a; output e }", "e", "defined twice", ""},
		{"no output", "diagram d { input a; e = a }", "d", "has no output", ""},
		{"component", `diagram d { input a; v = [a, a]; e = v["b"]; output e }`, `"b"`, "no component", "a"},
		{"index", "diagram d { input a; v = [a, a]; e = v[3]; output e }", "3", "2 components", ""},
		{"itself", "diagram d { input a; e = e; output e }", "e", "has no solution", ""},
	} {
		p, err := wired(t, x.text, names)
		if err == nil {
			t.Errorf("%s was accepted: %v", x.name, p.Notes)
			continue
		}
		if !strings.Contains(err.Message, x.message) || !strings.Contains(err.Help, x.help) {
			t.Errorf("%s: %q, help %q; want %q, help %q", x.name, err.Message, err.Help, x.message, x.help)
		}
		if err.Source == nil {
			t.Errorf("%s has no place", x.name)
		} else if at := err.Source.Text[err.Span.Start:err.Span.End]; at != x.at {
			t.Errorf("%s: the caret stands under %q, not %q", x.name, at, x.at)
		}
	}
}
