package value

import (
	"math/big"
	"strings"
	"testing"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
)

// rowsOf makes the entries of a literal; the texts 0 and 1 are tokens.
func rowsOf(rows ...[]Value) [][]Entry {
	out := make([][]Entry, len(rows))
	for i, row := range rows {
		for _, v := range row {
			e := Entry{Value: v}
			if t, ok := v.(Text); ok && (t == "0" || t == "1") {
				e = Entry{Value: rat(string(t)), Zero: t == "0", One: t == "1"}
			}
			out[i] = append(out[i], e)
		}
	}
	return out
}

func TestMatrixLiterals(t *testing.T) {
	a, b := matrixOf(t, 2, 2, "0", "1", "-2", "-3"), matrixOf(t, 2, 1, "0", "1")
	literal := func(rows ...[]Value) Value {
		t.Helper()
		v, at, err := MatrixLiteral(rowsOf(rows...))
		if err != nil {
			t.Fatalf("%v at %v", err, at)
		}
		return v
	}
	size := func(v Value, r, c int) *Matrix {
		t.Helper()
		m, ok := v.(*Matrix)
		if !ok || m.rows != r || m.cols != c {
			t.Fatalf("%s, want %d×%d", Describe(v), r, c)
		}
		return m
	}
	m := size(literal([]Value{a, b}, []Value{Text("0"), Text("1")}), 3, 3)
	if m.exactRe.At(2, 2).Cmp(ratOne) != 0 || m.exactRe.At(2, 0).Sign() != 0 || m.exactRe.At(1, 2).Cmp(ratOne) != 0 {
		t.Errorf("%v", m.exactRe)
	}
	m = size(literal([]Value{Text("0"), Text("1")}, []Value{a, a}), 4, 4)
	if !m.exactRe.Slice(0, 2, 2, 4).Equal(exact.Identity(2)) || !m.exactRe.Slice(0, 2, 0, 2).IsZero() {
		t.Errorf("%v", m.exactRe)
	}
	size(literal([]Value{Text("0"), Text("1")}, []Value{Int(-2), Int(-3)}), 2, 2)
	size(literal([]Value{a, &List{Items: []Value{Int(1), Int(2)}}}), 2, 3)
	size(literal([]Value{Quantity{rat("5"), mustUnit(t, "mm")}, Text("0")}), 1, 2)
	if v := literal([]Value{Text("x"), Int(3)}, []Value{Text("y")}); v.Kind() != KList {
		t.Errorf("texts in rows gave %s", Describe(v))
	}
	s := ExactPolynomial("s", exact.PolynomialOfIntegers(1, 0))
	if v := literal([]Value{s, Text("0")}, []Value{Text("0"), Text("1")}); Describe(v) != "a 2×2 transfer function" {
		t.Errorf("%s", Describe(v))
	}
	for _, c := range []struct {
		at   [2]int
		want string
		rows [][]Value
	}{
		{[2]int{1, -1}, "row 1 has 2, row 2 has 1", [][]Value{{Int(1), Int(2)}, {Int(3)}}},
		{[2]int{1, 0}, "this block is 2×1", [][]Value{{a, a}, {b, a}}},
		{[2]int{0, 1}, "rows", [][]Value{{a, matrixOf(t, 1, 1, "1")}}},
		{[2]int{0, 1}, "1 stands for an identity block, but this block is 2×1", [][]Value{{b, Text("1")}, {Int(5), Int(7)}}},
		{[2]int{0, 0}, "the height of this block 0 is not fixed", [][]Value{{Text("0"), Text("0")}, {a, a}}},
		{[2]int{0, 1}, "conjugate pair", [][]Value{{Int(1), &List{Pair: true, Items: []Value{Int(1), Int(1)}}}}},
	} {
		v, at, err := MatrixLiteral(rowsOf(c.rows...))
		if err == nil || !strings.Contains(err.Error(), c.want) || at != c.at {
			t.Errorf("%v: %v at %v, want %q at %v", v, err, at, c.want, c.at)
		}
	}
}

func TestCollect(t *testing.T) {
	pair := must[*List](t)(ConjugatePair(Int(-2), Int(3)))
	v := must[Value](t)(Collect([]Value{Int(-1), pair, Int(-5)}))
	if l := v.(*List); len(l.Items) != 4 || l.Pair {
		t.Errorf("%v", v)
	}
	row := &List{Items: []Value{Int(1), Int(2)}}
	if v = must[Value](t)(Collect([]Value{row, row, row})); Describe(v) != "a 3×2 matrix" {
		t.Errorf("%s", Describe(v))
	}
	if v = must[Value](t)(Collect(nil)); len(v.(*List).Items) != 0 {
		t.Errorf("%v", v)
	}
	if v = must[Value](t)(Collect([]Value{pair})); len(v.(*List).Items) != 2 {
		t.Errorf("%v", v)
	}
}

func sub(low Value) Subscript { return Subscript{Low: low} }

func TestIndices(t *testing.T) {
	values := oneOfEach(t)
	a := values[KMatrix]
	plant := *values[KPlant].(*Plant)
	plant.B, plant.D = matrixOf(t, 2, 2, "0", "1", "1", "0"), zeroMatrix(1, 2)
	plant.Inputs = []Signal{{Name: "F"}, {Name: "T"}}
	gain := &Gain{Values: matrixOf(t, 1, 2, "5", "7"), RowSignals: []Signal{{Name: "F"}}, ColumnSignals: []Signal{{Name: "x"}, {Name: "v"}}}
	report := &Report{Fields: []Named{{"rank", Int(2)}}, Columns: []string{"pole", "time constant [s]"},
		Rows: [][]Value{{Int(-1), Int(1)}, {Int(-2), nil}}}
	span := func(low, high Value) Subscript { return Subscript{low, high} }
	for _, c := range []struct {
		name string
		v    Value
		subs []Subscript
		want string // a description or a number
	}{
		{"entry", a, []Subscript{sub(Int(2)), sub(Int(1))}, "-2"},
		{"range", a, []Subscript{span(Int(1), Int(2)), sub(Int(2))}, "a 2×1 matrix"},
		{"item", values[KList], []Subscript{sub(Int(2))}, "2"},
		{"items", values[KList], []Subscript{span(Int(1), Int(2))}, "a list of 2 values"},
		{"vector", matrixOf(t, 3, 1, "4", "5", "6"), []Subscript{sub(Int(3))}, "6"},
		{"channel by name", &plant, []Subscript{sub(Text("y")), sub(Text("T"))}, "a plant with 2 states, 1 input and 1 output"},
		{"channels", &plant, []Subscript{sub(Text("y")), span(Int(1), Int(2))}, "a plant with 2 states, 2 inputs and 1 output"},
		{"gain by name", gain, []Subscript{sub(Text("F")), sub(Text("v"))}, "7"},
		{"transfer", values[KTransfer], []Subscript{sub(Int(1)), sub(Int(1))}, "a 1×1 transfer function"},
		{"cell", report, []Subscript{sub(Int(1)), sub(Text("time constant"))}, "1"},
		{"row", report, []Subscript{sub(Int(2))}, "a list of 2 values"},
		{"field", report, []Subscript{sub(Text("rank"))}, "2"},
		{"list of indices", a, []Subscript{sub(&List{Items: []Value{Int(2), Int(1)}}), sub(Int(1))}, "a 2×1 matrix"},
	} {
		v, _, err := Index(c.v, c.subs)
		if err != nil {
			t.Errorf("%s: %v", c.name, err)
			continue
		}
		got := Describe(v)
		if n, ok := v.(Number); ok {
			got = brief(n)
		}
		if got != c.want {
			t.Errorf("%s: %s, want %s", c.name, got, c.want)
		}
	}
	for _, c := range []struct {
		v    Value
		subs []Subscript
		at   int
		want string
	}{
		{a, []Subscript{sub(Int(3)), sub(Int(1))}, 0, "no row 3: they are numbered from 1 to 2"},
		{a, []Subscript{sub(Int(1)), sub(Int(0))}, 1, "no column 0"},
		{a, []Subscript{sub(Int(1))}, -1, "takes two indices"},
		{a, []Subscript{sub(Int(1)), sub(rat("1.5"))}, 1, "whole number"},
		{a, []Subscript{span(Int(2), Int(1)), sub(Int(1))}, 0, "backwards"},
		{&plant, []Subscript{sub(Text("y")), sub(Text("f"))}, 1, `no input named "f"`},
		{values[KList], []Subscript{sub(Int(9))}, 0, "no item 9"},
		{Text("abc"), []Subscript{sub(Int(1))}, -1, "cannot be indexed"},
		{values[KReport], []Subscript{sub(Int(1))}, -1, "fields, not rows"},
	} {
		_, at, err := Index(c.v, c.subs)
		if err == nil || at != c.at || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%v at %d, want %q at %d", err, at, c.want, c.at)
		}
	}
}

func TestFields(t *testing.T) {
	for kind, v := range oneOfEach(t) {
		owner, ok := v.(HasFields)
		if !ok {
			if _, err := Field(v, "x"); err == nil {
				t.Errorf("%s has a field x", kind)
			}
			continue
		}
		for _, name := range owner.FieldNames() {
			if field, err := Field(v, name); err != nil || isNil(field) {
				t.Errorf("%s.%s: %v %v", kind, name, field, err)
			}
		}
	}
	plant := oneOfEach(t)[KPlant]
	_, err := Field(plant, "state")
	if e, ok := err.(*diag.Error); !ok || e.Kind != diag.Name || e.Help != "did you mean states?" {
		t.Errorf("%v", err)
	}
	report := &Report{Columns: []string{"pole", "time constant [s]"}, Rows: [][]Value{{Int(-1), Int(1)}, {Int(-2), nil}},
		Fields: []Named{{"distance", Later(func() Value { return Int(3) })}}}
	if v, err := Field(report, "time_constant"); err != nil || len(v.(*List).Items) != 2 {
		t.Errorf("%v %v", v, err)
	}
	if v, err := Field(report, "distance"); err != nil || !sameNumber(v.(Number), Int(3)) {
		t.Errorf("%v %v", v, err)
	}
}

func TestCoercions(t *testing.T) {
	values := oneOfEach(t)
	for _, c := range []struct {
		shape Shape
		v     Value
		want  string // a description, or the error's text
	}{
		{ASquare, matrixOf(t, 2, 3, "1", "2", "3", "4", "5", "6"), "A needs a square matrix; it is 2×3"},
		{AMatrix, Int(3), "a 1×1 matrix"}, {AMatrix, values[KList], "a 2×1 matrix"}, {AMatrix, values[KGain], "a 1×2 matrix"},
		{AMatrix, Text("x"), "A needs a matrix; it is a text"},
		{AVector, matrixOf(t, 1, 2, "1", "2"), "a 2×1 matrix"}, {AVector, values[KMatrix], "A needs a column of numbers; it is a 2×2 matrix"},
		{AWhole, rat("2.5"), "A needs a whole number; it is 2.5"}, {AWhole, Int(3), "a number"},
		{AReal, Quantity{rat("90"), mustUnit(t, "deg")}, "a number"}, {AReal, matrixOf(t, 1, 1, "7"), "a number"},
		{AReal, values[KQuantity], "A needs a plain number; it is in N*m"},
		{APolynomial, Int(3), "a polynomial"}, {ASystem, values[KModel], "a plant with 2 states, 1 input and 1 output"},
		{ASystem, values[KTransfer], "a plant with 2 states, 1 input and 1 output"},
		{ATransfer, values[KPlant], "a 1×1 transfer function"},
		{PoleList, Int(-1), "a list of 1 value"},
		{PoleList, Complex{ExactRe: ratOne, ExactIm: big.NewRat(2, 1)}, "the complex pole 1 + 2i comes without its conjugate"},
		{AChoice, Text("robst"), `A needs one of "robust", "ackermann"; it is "robst"`}, {AChoice, Text("robust"), "a text"},
		{NameList, Text("x"), "a list of 1 value"}, {ABoolean, Int(1), "A needs true or false; it is 1"},
		{AGain, values[KMatrix], "a 2×2 matrix"}, {AList, values[KMatrix], "a list of 2 values"},
	} {
		v, err := Coerce(Param{Name: "A", Shape: c.shape, Choices: []string{"robust", "ackermann"}}, c.v)
		got := ""
		if err != nil {
			got = err.Error()
		} else {
			got = Describe(v)
		}
		if got != c.want {
			t.Errorf("shape %d of %s: %s, want %s", c.shape, Describe(c.v), got, c.want)
		}
	}
}
