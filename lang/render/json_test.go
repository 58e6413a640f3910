package render

import (
	"encoding/json"
	"math"
	"math/big"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/value"
)

func TestValuesAsJSON(t *testing.T) {
	period := num("0.005")
	holds := true
	for _, c := range []struct {
		v    value.Value
		want string
	}{
		{num("0.1"), `{"kind":"number","real":0.1,"exact":"1/10"}`},
		{num("0"), `{"kind":"number","real":0,"exact":"0"}`},
		{value.FloatErr(2.5, 0.001), `{"kind":"number","real":2.5,"digits":3}`},
		{value.Float(math.Inf(1)), `{"kind":"number","real":"infinity","digits":15}`},
		{value.Float(math.Inf(-1)), `{"kind":"number","real":"-infinity","digits":15}`},
		{value.Number{F: math.Copysign(0, -1)}, `{"kind":"number","real":0,"digits":0}`},
		{value.Complex{ExactRe: rat("-2"), ExactIm: rat("1/2")},
			`{"kind":"complex","real":-2,"imaginary":0.5,"exact":"-2","exact_imaginary":"1/2"}`},
		{floatPole(-1, 2, 1e-10), `{"kind":"complex","real":-1,"imaginary":2,"digits":10}`},
		{value.Quantity{Magnitude: num("3.5"), Unit: value.Unit{Text: "mm"}},
			`{"kind":"quantity","real":3.5,"unit":"mm","exact":"7/2"}`},
		{exactRows("1/3 -2"), `{"kind":"matrix","size":[1,2],"real":[[0.3333333333333333,-2]],"exact":[["1/3","-2"]]}`},
		{value.FloatMatrix(2, 1, []float64{100, 0}, 0.01), `{"kind":"matrix","size":[2,1],"real":[[100],[0]],"digits":4}`},
		{value.FloatComplexMatrix(1, 1, []float64{1}, []float64{-1}, 1e-6),
			`{"kind":"matrix","size":[1,1],"real":[[1]],"imaginary":[[-1]],"digits":6}`},
		{exactRows(), `{"kind":"matrix","size":[0,0],"real":[],"exact":[]}`},
		{poly("s", "1", "3.64", "5.524"), `{"kind":"polynomial","variable":"s","real":[1,3.64,5.524],"exact":["1","91/25","1381/250"]}`},
		{&value.Polynomial{Variable: "z", F: []float64{1, 0.5}, Err: 1e-8}, `{"kind":"polynomial","variable":"z","real":[1,0.5],"digits":8}`},
		{&value.Transfer{Variable: "z", Every: &period, Entries: [][]value.Ratio{{{Num: poly("z", "1"), Den: poly("z", "1", "-1/2")}}}},
			`{"kind":"transfer","variable":"z","every":0.005,"numerator":[[{"real":[1],"exact":["1"]}]],"denominator":[[{"real":[1,-0.5],"exact":["1","-1/2"]}]]}`},
		{&value.List{}, `{"kind":"list","items":[]}`},
		{&value.List{Items: []value.Value{num("1"), value.Text("a<b")}},
			`{"kind":"list","items":[{"kind":"number","real":1,"exact":"1"},{"kind":"text","text":"a<b"}]}`},
		{value.Boolean(false), `{"kind":"boolean","true":false}`},
		{&value.Report{Title: "t", Holds: &holds, Fields: []value.Named{{Name: "zeta", Value: num("1")}, {Name: "alpha", Value: value.Text("x")}},
			Columns: []string{"a"}, Rows: [][]value.Value{{nil}, {num("2")}}},
			`{"kind":"report","title":"t","holds":true,"fields":{"zeta":{"kind":"number","real":1,"exact":"1"},"alpha":{"kind":"text","text":"x"}},"table":{"columns":["a"],"rows":[[null],[{"kind":"number","real":2,"exact":"2"}]]}}`},
		{value.Rat(new(big.Rat).SetInt(new(big.Int).Exp(big.NewInt(10), big.NewInt(400), nil))),
			`{"kind":"number","real":1.0000000000000000e+400,"exact":"1` + strings.Repeat("0", 400) + `"}`},
	} {
		got := strings.TrimSuffix(string(encode(valueJSON(c.v))), "\n")
		if d := cmp.Diff(c.want, got); d != "" {
			t.Errorf("%v:\n%s", c.v, d)
		}
		if !json.Valid([]byte(got)) {
			t.Errorf("%v: %s is not JSON", c.v, got)
		}
	}
}

func TestGainAndPlantAsJSON(t *testing.T) {
	var gain struct {
		Kind          string
		Size          []int
		Real          [][]float64
		Exact         [][]string
		Rows, Columns []string
		Digits        *int
	}
	if err := json.Unmarshal(encode(valueJSON(craneGain())), &gain); err != nil {
		t.Fatal(err)
	}
	if gain.Kind != "gain" || gain.Exact[0][0] != "104544/109" || gain.Rows[0] != "F [N]" || gain.Columns[2] != "a [rad]" || gain.Digits != nil {
		t.Errorf("the gain reads %+v", gain)
	}
	var plant map[string]any
	if err := json.Unmarshal(encode(valueJSON(crane())), &plant); err != nil {
		t.Fatal(err)
	}
	if plant["kind"] != "plant" || plant["A"].(map[string]any)["kind"] != "matrix" || plant["states"].([]any)[1] != "v [m/s]" {
		t.Errorf("the plant reads %v", plant)
	}
	if _, ok := plant["every"]; ok {
		t.Error("a continuous plant has a sample time")
	}
}

func TestEventsAsJSON(t *testing.T) {
	main := diag.NewSource("design.gain", "K\nx = 1\nfoo(\n")
	other := diag.NewSource("part.gain", "K\n")
	failure := diag.New(diag.Name, "foo is not known").In(main).At(diag.Span{Start: 8, End: 11}).WithHelp("is floor meant?")
	inf := math.Inf(1)
	for _, c := range []struct {
		e    eval.Event
		want string
	}{
		{eval.Event{Source: main, Line: 1, Text: "K", Shown: &eval.Shown{Value: num("2")}},
			`{"line":1,"source":"K","value":{"kind":"number","real":2,"exact":"2"}}`},
		{eval.Event{Source: other, Line: 1, Text: "K", Shown: &eval.Shown{Value: num("2")}},
			`{"file":"part.gain","line":1,"source":"K","value":{"kind":"number","real":2,"exact":"2"}}`},
		{eval.Event{Source: main, Line: 2, Text: "x = 1", Bound: &eval.Bound{Name: "x", Value: num("1")}}, ``},
		{eval.Event{Source: main, Line: 3, Error: failure}, `{"line":3,"column":1,"error":{"message":"foo is not known","hint":"is floor meant?"}}`},
		{eval.Event{Source: main, Line: 2, Note: "x is small"}, `{"line":2,"note":"x is small"}`},
		{eval.Event{Source: main, Line: 2, Text: "x >= 0.6", Requirement: &eval.Requirement{Met: true, Left: value.Number{F: 0.71},
			Right: num("0.6"), Op: ">=", Why: "why"}},
			`{"line":2,"requirement":{"source":"x >= 0.6","met":true,"left":0.71,"operator":">=","right":0.6,"why":"why"}}`},
		{eval.Event{Source: main, Line: 2, Text: "K is [1, 2]", Claim: &eval.Claim{Agrees: true, WorstUnits: 0.25}},
			`{"line":2,"claim":{"source":"K is [1, 2]","agrees":true,"undecided":false,"worst_units":0.25,"entries":[]}}`},
		{eval.Event{Source: main, Line: 2, Text: "K is [1, 2]", Claim: &eval.Claim{WorstUnits: inf, Entries: []eval.ClaimEntry{
			{At: []int{1, 3}, Printed: "-18810", Computed: num("-18812.58"), Units: 2.58}, {Printed: "0", Computed: num("1"), Units: inf}}}},
			`{"line":2,"claim":{"source":"K is [1, 2]","agrees":false,"undecided":false,"worst_units":"infinity","entries":[{"at":[1,3],"printed":"-18810","computed":-18812.58,"units":2.58},{"at":[],"printed":"0","computed":1,"units":"infinity"}]}}`},
	} {
		got := strings.TrimSuffix(string(JSON(c.e, main)), "\n")
		if d := cmp.Diff(c.want, got); d != "" {
			t.Error(d)
		}
	}
}
