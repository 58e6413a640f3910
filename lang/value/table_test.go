package value

import (
	"math/big"
	"strings"
	"testing"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
)

// stub stands for a kind whose type lives in another package.
type stub Kind

func (s stub) Kind() Kind { return Kind(s) }

// oneOfEach gives a value of every kind.
func oneOfEach(t *testing.T) map[Kind]Value {
	t.Helper()
	a := matrixOf(t, 2, 2, "0", "1", "-2", "-3")
	p := &Plant{A: a, B: matrixOf(t, 2, 1, "0", "1"), C: matrixOf(t, 1, 2, "1", "0"), D: zeroMatrix(1, 1),
		States: DefaultSignals("x", 2), Inputs: DefaultSignals("u", 1), Outputs: DefaultSignals("y", 1)}
	s := ExactPolynomial("s", exact.PolynomialOfIntegers(1, 0))
	g, err := RatioTransfer(s, ExactPolynomial("s", exact.PolynomialOfIntegers(1, 3, 2)))
	if err != nil {
		t.Fatal(err)
	}
	return map[Kind]Value{
		KNumber: rat("3/2"), KComplex: Complex{ExactRe: big.NewRat(1, 1), ExactIm: big.NewRat(2, 1)},
		KQuantity: Quantity{rat("2"), mustUnit(t, "N*m")}, KMatrix: a, KPolynomial: s, KTransfer: g, KPlant: p,
		KGain: &Gain{Values: matrixOf(t, 1, 2, "1", "2")}, KList: &List{Items: []Value{rat("1"), rat("2")}},
		KText: Text("a"), KBoolean: Boolean(true), KReport: &Report{}, KStudy: &Study{Samples: 2, Results: []StudyResult{{Values: []float64{1, 2}}}}, KResponse: stub(KResponse),
		KFunction: &Function{Name: "f"}, KModel: &Model{Name: "crane", Plant: p},
	}
}

func rat(text string) Number {
	r, ok := new(big.Rat).SetString(text)
	if !ok {
		panic(text)
	}
	return Rat(r)
}

func mustUnit(t *testing.T, text string) Unit {
	t.Helper()
	u, err := ParseUnit(text)
	if err != nil {
		t.Fatalf("%s: %v", text, err)
	}
	return u
}

func matrixOf(t *testing.T, r, c int, entries ...string) *Matrix {
	t.Helper()
	items := make([]Value, len(entries))
	for k, e := range entries {
		items[k] = rat(e)
	}
	m, err := scalarsMatrix(r, c, items)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

func isNil(v Value) bool {
	switch x := v.(type) {
	case nil:
		return true
	case *Matrix:
		return x == nil
	case *Polynomial:
		return x == nil
	case *Transfer:
		return x == nil
	case *Plant:
		return x == nil
	case *List:
		return x == nil
	}
	return false
}

// Every pair of kinds gives a result or an error for users; where the kinds themselves
// are at fault the error names both.
func TestEveryPairOfKinds(t *testing.T) {
	binary := map[string]func(a, b Value) (Value, error){
		"Add": Add, "Subtract": Subtract, "Multiply": Multiply, "Divide": Divide, "Power": Power, "PlusMinus": PlusMinus,
		"Equal":  func(a, b Value) (Value, error) { v, err := Equal(a, b); return v, err },
		"Less":   func(a, b Value) (Value, error) { v, err := Compare("<", a, b); return v, err },
		"Differ": func(a, b Value) (Value, error) { v, err := Compare("!=", a, b); return v, err },
	}
	values := oneOfEach(t)
	if len(values) != 16 {
		t.Fatalf("%d kinds are covered", len(values))
	}
	for name, operate := range binary {
		for ka, a := range values {
			for kb, b := range values {
				v, err := operate(a, b)
				if err == nil {
					if isNil(v) {
						t.Errorf("%s(%s, %s) gave neither value nor error", name, ka, kb)
					}
					continue
				}
				e, ok := err.(*diag.Error)
				if !ok || e.Message == "" || e.Kind == diag.Internal {
					t.Errorf("%s(%s, %s): %v", name, ka, kb, err)
					continue
				}
				if v != nil && !isNil(v) && v != Value(Boolean(false)) {
					t.Errorf("%s(%s, %s) gave a value and an error", name, ka, kb)
				}
				if domains[ka] == noDomain || domains[kb] == noDomain {
					if !strings.Contains(e.Message, wordOf(a)) || !strings.Contains(e.Message, wordOf(b)) {
						t.Errorf("%s(%s, %s) does not name both kinds: %s", name, ka, kb, e.Message)
					}
				}
				if strings.Contains(e.Message, "value.") || strings.Contains(e.Message, "*") && !strings.Contains(e.Message, "N*m") {
					t.Errorf("%s(%s, %s) shows an inner name: %s", name, ka, kb, e.Message)
				}
			}
		}
	}
}

func wordOf(v Value) string {
	if v.Kind() == KTransfer {
		return "transfer function"
	}
	return string(v.Kind())
}

func TestUnaryOperationsOfEveryKind(t *testing.T) {
	for kind, v := range oneOfEach(t) {
		for name, operate := range map[string]func(Value) (Value, error){"Negate": Negate, "Transpose": Transpose,
			"Sqrt": Sqrt, "Exp": Exp, "Log": Log, "Sin": Sin, "Atan": Atan, "Abs": Abs, "Floor": Floor, "Real": Real, "Conjugate": Conjugate,
			"Argument": Argument, "Decibels": Decibels, "Floating": Floating, "Exactly": Exactly} {
			out, err := operate(v)
			if err == nil && isNil(out) || err != nil && !isNil(out) {
				t.Errorf("%s(%s) = %v, %v", name, kind, out, err)
			}
			if err != nil {
				if e, ok := err.(*diag.Error); !ok || e.Kind == diag.Internal {
					t.Errorf("%s(%s): %v", name, kind, err)
				}
			}
		}
	}
}

func TestEveryShapeMeetsEveryKind(t *testing.T) {
	values := oneOfEach(t)
	for shape := Anything; shape <= AFunction; shape++ {
		p := Param{Name: "x", Shape: shape, Choices: []string{"one", "two"}}
		for kind, v := range values {
			out, err := Coerce(p, v)
			if err == nil {
				if isNil(out) {
					t.Errorf("shape %d of %s gave nothing", shape, kind)
				}
				continue
			}
			if e, ok := err.(*diag.Error); !ok || e.Kind == diag.Internal || e.Param != "x" {
				t.Errorf("shape %d of %s: %v", shape, kind, err)
			}
		}
	}
}

// A value that is to be shown as fractions, or was deferred, counts as the value it is.
func TestMarkedValuesAreValues(t *testing.T) {
	for kind, v := range oneOfEach(t) {
		for name, marked := range map[string]Value{"fractions": AsFraction(v), "deferred": Later(func() Value { return v })} {
			for operation, f := range map[string]func(v Value) (Value, error){
				"add":      func(v Value) (Value, error) { return Add(v, v) },
				"multiply": func(v Value) (Value, error) { return Multiply(v, rat("2")) },
				"divide":   func(v Value) (Value, error) { return Divide(rat("2"), v) },
				"power":    func(v Value) (Value, error) { return Power(v, rat("2")) },
				"pair":     func(v Value) (Value, error) { return PlusMinus(v, v) },
				"equal":    func(v Value) (Value, error) { b, err := Equal(v, v); return b, err },
				"less":     func(v Value) (Value, error) { b, err := Compare("<", v, v); return b, err },
				"negate":   Negate, "transpose": Transpose, "abs": Abs, "real": Real, "floating": Floating, "sin": Sin, "sqrt": Sqrt,
				"collect": func(v Value) (Value, error) { return Collect([]Value{v, v}) },
				"row":     func(v Value) (Value, error) { m, _, err := MatrixLiteral([][]Entry{{{Value: v}}}); return m, err },
				"plant":   func(v Value) (Value, error) { p, err := ToPlant(v); return p, err },
			} {
				want, err1 := f(v)
				got, err2 := f(marked)
				if (err1 == nil) != (err2 == nil) || err1 == nil && (got.Kind() != want.Kind() || Describe(got) != Describe(want)) {
					t.Errorf("%s of %s %s: %v (%v), want %v (%v)", operation, name, kind, got, err2, want, err1)
				}
			}
		}
	}
}
