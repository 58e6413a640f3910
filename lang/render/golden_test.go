package render

import (
	"flag"
	"fmt"
	"math"
	"math/big"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"gainwright/lang/exact"
	"gainwright/lang/value"
)

var update = flag.Bool("update", false, "rewrite the golden files")

func rat(s string) *big.Rat {
	r, ok := new(big.Rat).SetString(s)
	if !ok {
		panic("not a number: " + s)
	}
	return r
}

func num(s string) value.Number { return value.Rat(rat(s)) }

func exactRows(rows ...string) *value.Matrix {
	var data [][]*big.Rat
	for _, row := range rows {
		var line []*big.Rat
		for _, s := range strings.Fields(row) {
			line = append(line, rat(s))
		}
		data = append(data, line)
	}
	m, err := exact.FromRows(data)
	if err != nil {
		panic(err)
	}
	return value.ExactMatrix(m)
}

func poly(variable string, coefficients ...string) *value.Polynomial {
	var c []*big.Rat
	for _, s := range coefficients {
		c = append(c, rat(s))
	}
	p := exact.NewPolynomial(c...)
	return &value.Polynomial{Variable: variable, Exact: &p}
}

func signal(name, unit string) value.Signal {
	return value.Signal{Name: name, Unit: value.Unit{Text: unit, Scale: big.NewRat(1, 1)}}
}

func floatPole(re, im, err float64) value.Value {
	return value.Complex{C: complex(re, im), Err: err}
}

// craneStates and the rest are the trolley with a hanging load of the language's own example.
var craneStates = []value.Signal{signal("x", "m"), signal("v", "m/s"), signal("a", "rad"), signal("w", "rad/s")}

func crane() *value.Plant {
	return &value.Plant{
		A:       exactRows("0 1 0 0", "0 -19/240 2.86125 0", "0 0 0 1", "0 19/1440 -2.111875 0"),
		B:       exactRows("0", "1/1200", "0", "-1/7200"),
		C:       exactRows("1 0 0 0", "0 0 1 0"),
		D:       exactRows("0", "0"),
		States:  craneStates,
		Inputs:  []value.Signal{signal("F", "N")},
		Outputs: []value.Signal{signal("x", "m"), signal("a", "rad")},
	}
}

func craneGain() *value.Gain {
	sensitivity := value.FloatErr(31.4159, 0.01)
	return &value.Gain{
		Role:          "state feedback",
		Values:        exactRows("104544/109 325981/109 -20505717/1090 -838656/109"),
		RowSignals:    []value.Signal{signal("F", "N")},
		ColumnSignals: craneStates,
		Poles: []value.Value{num("-0.9"), num("-1.2"), floatPole(-0.77, 0.785557, 1e-15),
			floatPole(-0.77, -0.785557, 1e-15)},
		Sensitivity: &sensitivity,
		Method:      "Bass and Gura's formula over the rationals",
		Notes:       []string{"rounded to binary64 the gain gives the wanted poles to 1e-12"},
	}
}

func modesReport() *value.Report {
	pole := func(s string) value.Value { return num(s) }
	return &value.Report{
		Title: "4 modes",
		Columns: []string{"verdict", "moved by", "seen by", "pole [1/s]", "time constant [s]", "period [s]",
			"damping ratio"},
		Rows: [][]value.Value{
			{value.Text("integrates; moved, seen"), value.Text("F (1)"), value.Text("x (1)"), pole("0"), nil, nil, num("0")},
			{value.Text("decays; moved, seen"), value.Text("F (0.22)"), value.Text("x (0.9), a (0.0012)"),
				value.FloatErr(-0.0613217, 1e-16), value.FloatErr(16.3074, 1e-14), nil, num("1")},
			{value.Text("swings, decays slowly; moved, seen"), value.Text("F (0.71)"), value.Text("x (0.3), a (1)"),
				&value.List{Items: []value.Value{floatPole(-0.0089223, 1.45283, 1e-15), floatPole(-0.0089223, -1.45283, 1e-15)}, Pair: true},
				value.FloatErr(112.079, 1e-10), value.FloatErr(4.32479, 1e-13), value.FloatErr(0.00614122, 1e-15)},
		},
	}
}

func wideMatrix() *value.Matrix {
	rows := make([]string, 3)
	for i := range rows {
		for j := range 14 {
			rows[i] += fmt.Sprintf("%d.%d ", (i-1)*(j+3), 125*(j%3))
		}
	}
	return exactRows(rows...)
}

func hugeMatrix(n int) *value.Matrix {
	data := make([]float64, n*n)
	for k := range data {
		data[k] = math.Sin(float64(k)) * math.Pow(10, float64(k%3))
	}
	return value.FloatMatrix(n, n, data, 1e-12)
}

type sample struct {
	label string
	v     value.Value
}

func samples() []sample {
	third := num("1/3")
	short := &value.Transfer{Variable: "s", Entries: [][]value.Ratio{{{Num: poly("s", "1", "2"), Den: poly("s", "1", "3", "2")}}}}
	long := &value.Transfer{Variable: "s", Entries: [][]value.Ratio{{{Num: poly("s", "1/1200", "0", "0.00163492", "0"),
		Den: poly("s", "1", "19/240", "2.111875", "0.1294375", "0")}}}}
	period := num("1/200")
	sampledPlant := &value.Plant{A: value.FloatMatrix(2, 2, []float64{1, 0.00498, 0, 0.9917}, 1e-15),
		B: value.FloatMatrix(2, 1, []float64{1.2479e-5, 0.0049834}, 1e-17), C: exactRows("1 0"), D: exactRows("0"), Every: &period,
		States: []value.Signal{signal("position", "mm"), signal("speed", "mm/s")}, Inputs: []value.Signal{signal("current", "A")},
		Outputs: []value.Signal{signal("position", "mm")}, X0: []value.Number{num("3"), num("0")}, U0: []value.Number{num("0.25")}}
	holds := false
	return []sample{
		{"an exact decimal", num("0.1")},
		{"a cut decimal", num("0.1294375")},
		{"a short fraction", num("24/7")},
		{"a long fraction", num("104544/109")},
		{"a whole number", num("123456789")},
		{"a large whole number", num("1000000000000")},
		{"a tiny number", num("1/3000000000")},
		{"zero", num("0")},
		{"a floating number", value.Float(math.Pi)},
		{"few digits hold", value.FloatErr(31.4159, 0.07)},
		{"nothing but rounding", value.FloatErr(1e-17, 3e-16)},
		{"infinity", value.Float(math.Inf(1))},
		{"minus infinity", value.Float(math.Inf(-1))},
		{"a large floating number", value.FloatErr(1234567.8, 1e-9)},
		{"a quantity", value.Quantity{Magnitude: num("3.5"), Unit: value.Unit{Text: "mm"}}},
		{"a complex number", value.Complex{ExactRe: rat("-2"), ExactIm: rat("3")}},
		{"a floating complex number", floatPole(-0.0089223, 1.45283, 1e-15)},
		{"poles", &value.List{Items: []value.Value{num("0"), value.FloatErr(-0.061322, 1e-17), floatPole(-0.0089223, 1.45283, 1e-15),
			floatPole(-0.0089223, -1.45283, 1e-15)}}},
		{"a pair", &value.List{Items: []value.Value{value.Complex{ExactRe: rat("-2"), ExactIm: rat("3")},
			value.Complex{ExactRe: rat("-2"), ExactIm: rat("-3")}}, Pair: true}},
		{"text", value.Text("swings \"freely\"")},
		{"truth", value.Boolean(true)},
		{"an exact matrix", exactRows("0 1", "-2 -3.5")},
		{"short fractions", exactRows("1/3 2", "-5/7 0.25")},
		{"wide range", exactRows("1e-9 1 1e9", "12.5 0 -3.25e7", "0 1/3 4.567891e-6")},
		{"a complex matrix", value.FloatComplexMatrix(2, 2, []float64{1, -2.5, 0.001, 4}, []float64{0, 1.25, -10, 0}, 1e-16)},
		{"few digits of a matrix", value.FloatMatrix(2, 2, []float64{120.4567, -3.2e-5, 17, 0}, 0.02)},
		{"data as they are", value.FloatMatrix(1, 3, []float64{0.5, 0.1, -2}, 0)},
		{"a wide matrix", wideMatrix()},
		{"a huge matrix", hugeMatrix(400)},
		{"an empty matrix", exactRows()},
		{"a polynomial", poly("s", "1", "3.64", "5.524", "4.2042", "1.3068")},
		{"a cut polynomial", poly("s", "1", "19/240", "2.111875", "0.1294375", "0")},
		{"a long polynomial", poly("z", "1", "-2.25", "3.1", "-4.125", "5.5", "-6.75", "7.1", "-8.25", "9.3", "-10")},
		{"a constant polynomial", poly("s", "-3")},
		{"a short transfer function", short},
		{"a long transfer function", long},
		{"crane", crane()},
		{"sampled plant", sampledPlant},
		{"K", craneGain()},
		{"modes(crane)", modesReport()},
		{"reachability(crane)", &value.Report{Title: "every mode is moved", Fields: []value.Named{
			{Name: "rank", Value: num("4")}, {Name: "decided", Value: value.Text("exactly")},
			{Name: "missing", Value: &value.List{}}, {Name: "indices", Value: &value.List{Items: []value.Value{num("4")}}},
			{Name: "distance", Value: &value.Report{Fields: []value.Named{{Name: "low", Value: value.FloatErr(2.31e-4, 1e-9)},
				{Name: "high", Value: value.FloatErr(2.5e-4, 1e-9)}}}},
			{Name: "matrix", Value: exactRows("0 1/1200", "1/1200 -19/288000")}}}},
		{"stabilizable(P)", &value.Report{Holds: &holds, Fields: []value.Named{{Name: "because",
			Value: value.Text("the mode 0.5 grows and no input moves it")}}}},
		{"mixed", &value.List{Items: []value.Value{third, exactRows("1 2"), value.Text("end")}}},
		{"a long list", &value.List{Items: repeated(num("0.125"), 30)}},
		{"f", &value.Function{Name: "f", Params: []string{"x", "y"}, Doc: "the larger of both"}},
	}
}

func repeated(v value.Value, n int) []value.Value {
	out := make([]value.Value, n)
	for i := range out {
		out[i] = v
	}
	return out
}

func TestTerminalTextAtThreeWidths(t *testing.T) {
	for _, width := range []int{60, 80, 120} {
		var b strings.Builder
		for _, s := range samples() {
			b.WriteString(Text(s.label, s.v, nil, Options{Width: width}))
			b.WriteByte('\n')
		}
		compareGolden(t, fmt.Sprintf("width_%d.txt", width), b.String())
		for i, line := range strings.Split(b.String(), "\n") {
			if cells(line) > width {
				t.Errorf("width %d: line %d takes %d cells: %s", width, i+1, cells(line), line)
			}
			if strings.TrimRight(line, " ") != line {
				t.Errorf("width %d: line %d ends in a space", width, i+1)
			}
		}
	}
}

func compareGolden(t *testing.T, name, got string) {
	t.Helper()
	path := filepath.Join("testdata", name)
	if *update {
		if err := os.MkdirAll("testdata", 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(path, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff(string(want), got); d != "" {
		t.Errorf("%s differs (-want +got); -update rewrites it\n%s", name, d)
	}
}

func TestMentionsFindWordsOfTheTrade(t *testing.T) {
	table := []*value.Builtin{
		{Name: "sweep", Summary: "the frequency response", Doc: "gain and phase"},
		{Name: "response_of", Summary: "how it runs in time"},
		{Name: "margins", Doc: "of the response at a crossing", Params: []value.Param{{Name: "loop", Doc: "cut anywhere"}}},
	}
	for text, want := range map[string]string{"Response": "response_of sweep margins", "cut": "margins", "x": "", "zebra": ""} {
		if got := strings.Join(Mentions(table, text), " "); got != want {
			t.Errorf("%s: %q, want %q", text, got, want)
		}
	}
}
