package value

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"strings"
	"testing"

	"gainwright/lang/exact"
)

func randomPlant(t *testing.T, r *rand.Rand, n, m, p int) *Plant {
	t.Helper()
	return &Plant{A: randomMatrix(t, r, n, n, false), B: randomMatrix(t, r, n, m, false), C: randomMatrix(t, r, p, n, false),
		D: randomMatrix(t, r, p, m, false), States: DefaultSignals("x", n), Inputs: DefaultSignals("u", m), Outputs: DefaultSignals("y", p)}
}

// Arithmetic of plants agrees with that of their transfer functions, exactly.
func TestPlantsAgreeWithTransferFunctions(t *testing.T) {
	r := rand.New(rand.NewPCG(19, 23))
	value := must[Value](t)
	transfer := func(v Value) *Transfer { return must[*Transfer](t)(ToTransfer(v)) }
	same := func(name string, a, b Value) {
		t.Helper()
		if equal, err := Equal(transfer(a), transfer(b)); err != nil || !bool(equal) {
			t.Errorf("%s differs (%v)", name, err)
		}
	}
	for range 4 {
		a, b := randomPlant(t, r, 2, 2, 2), randomPlant(t, r, 1, 2, 2)
		k := randomMatrix(t, r, 2, 2, false)
		same("series", value(Multiply(a, b)), value(Multiply(transfer(a), transfer(b))))
		same("parallel", value(Add(a, b)), value(Add(transfer(a), transfer(b))))
		same("difference", value(Subtract(a, b)), value(Subtract(transfer(a), transfer(b))))
		same("negative", value(Negate(a)), value(Negate(transfer(a))))
		same("matrix in front", value(Multiply(k, a)), value(Multiply(k, transfer(a))))
		same("matrix behind", value(Multiply(a, k)), value(Multiply(transfer(a), k)))
		same("scaled", value(Multiply(rat("2/3"), a)), value(Multiply(transfer(a), rat("2/3"))))
		same("mixed", value(Multiply(transfer(a), b)), value(Multiply(a, transfer(b))))
		same("dual", value(Transpose(a)), value(Transpose(transfer(a))))
		same("inverse", value(Power(a, Int(-1))), value(Power(transfer(a), Int(-1))))
		same("cube", value(Power(b, Int(3))), value(Multiply(b, value(Multiply(b, b)))))
		same("sum with a matrix", value(Add(a, k)), value(Add(transfer(a), k)))
		same("realised", must[*Plant](t)(ToPlant(transfer(a))), a)
		one, other := randomPlant(t, r, 2, 1, 1), randomPlant(t, r, 1, 1, 1)
		same("quotient", value(Divide(one, other)), value(Divide(transfer(one), transfer(other))))
		same("reciprocal", value(Divide(Int(1), other)), value(Divide(Int(1), transfer(other))))
	}
}

// The resolvent as a matrix of rational functions: (s·I − A)⁻¹·(s·I − A) = I.
func TestResolventByArithmetic(t *testing.T) {
	value := must[Value](t)
	a := matrixOf(t, 2, 2, "0", "1", "-2", "-3")
	s := ExactPolynomial("s", exact.PolynomialOfIntegers(1, 0))
	pencil := value(Subtract(value(Multiply(s, IdentityMatrix(2))), a))
	inverse := value(Power(pencil, Int(-1))).(*Transfer)
	if !inverse.Entries[0][0].Den.Exact.Equal(exact.PolynomialOfIntegers(1, 3, 2)) ||
		!inverse.Entries[0][0].Num.Exact.Equal(exact.PolynomialOfIntegers(1, 3)) ||
		!inverse.Entries[1][0].Num.Exact.Equal(exact.PolynomialOfIntegers(-2)) {
		t.Errorf("%v over %v", inverse.Entries[0][0].Num.Exact, inverse.Entries[0][0].Den.Exact)
	}
	if equal, err := Equal(value(Multiply(inverse, pencil)), IdentityMatrix(2)); err != nil || !bool(equal) {
		t.Errorf("the product is no identity (%v)", err)
	}
}

func TestRationalFunctionsAreReduced(t *testing.T) {
	value := must[Value](t)
	s := Value(ExactPolynomial("s", exact.PolynomialOfIntegers(1, 0)))
	plus := func(v Value, n int) Value { return value(Add(v, Int(n))) }
	g := value(Divide(plus(s, 2), value(Multiply(plus(s, 2), plus(s, 3))))).(*Transfer)
	if g.Entries[0][0].Den.Degree() != 1 {
		t.Errorf("denominator %v", g.Entries[0][0].Den.Exact)
	}
	z := Value(ExactPolynomial("z", exact.PolynomialOfIntegers(1, 0)))
	if v, err := Add(s, z); err == nil {
		t.Errorf("s + z = %v", v)
	}
	if v, err := Multiply(g, z); err == nil {
		t.Errorf("G(s)·z = %v", v)
	}
	if v, err := Multiply(plus(s, 1), rat("1/2")); err != nil || v.Kind() != KPolynomial {
		t.Errorf("%v %v", v, err)
	}
	mass := Quantity{rat("1200"), mustUnit(t, "kg")}
	if v := value(Divide(Int(1), value(Multiply(mass, s)))).(*Transfer); v.Entries[0][0].Num.Exact.Coefficient(0).Cmp(rat("1/1200").Exact) != 0 {
		t.Errorf("1/(m·s) = %v", v.Entries[0][0].Num.Exact)
	}
}

func TestSampleTimesMustAgree(t *testing.T) {
	r := rand.New(rand.NewPCG(29, 31))
	a, b := randomPlant(t, r, 1, 1, 1), randomPlant(t, r, 1, 1, 1)
	a.Every, b.Every = ptr(rat("0.005")), ptr(rat("0.01"))
	_, err := Multiply(a, b)
	if err == nil || !strings.Contains(err.Error(), "0.005 s") || !strings.Contains(err.Error(), "0.01 s") {
		t.Errorf("%v", err)
	}
	b.Every = nil
	if _, err = Add(a, b); err == nil || !strings.Contains(err.Error(), "continuous") {
		t.Errorf("%v", err)
	}
	b.Every = ptr(Number{F: 0.005})
	if v, err := Add(a, b); err != nil || v.(*Plant).Every == nil {
		t.Errorf("%v", err)
	}
	if v, err := Multiply(Int(2), a); err != nil || v.(*Plant).Every == nil {
		t.Errorf("%v", err)
	}
	timed := &Transfer{Variable: "z", Every: ptr(rat("0.02")), Entries: [][]Ratio{{constantRatio("z", Int(1))}}}
	if v, err := Multiply(timed, a); err == nil {
		t.Errorf("20 ms times 5 ms gave %v", v)
	}
}

func TestUnitsWhereSystemsJoin(t *testing.T) {
	r := rand.New(rand.NewPCG(37, 41))
	a, b := randomPlant(t, r, 1, 1, 1), randomPlant(t, r, 1, 1, 1)
	b.Outputs = []Signal{{Name: "travel", Unit: mustUnit(t, "mm")}}
	a.Inputs = []Signal{{Name: "position", Unit: mustUnit(t, "m")}}
	joined := must[Value](t)(Multiply(a, b)).(*Plant)
	direct := must[*Transfer](t)(ToTransfer(a))
	direct.Inputs = nil
	other := must[*Transfer](t)(ToTransfer(b))
	want := must[Value](t)(Multiply(rat("1/1000"), must[Value](t)(Multiply(direct, other))))
	if same, err := Equal(must[*Transfer](t)(ToTransfer(joined)), want); err != nil || !bool(same) {
		t.Errorf("millimetres are not converted (%v)", err)
	}
	if joined.States[1].Name != "x₂" {
		t.Errorf("the states are %q and %q", joined.States[0].Name, joined.States[1].Name)
	}
	a.Inputs[0].Unit = mustUnit(t, "N")
	_, err := Multiply(a, b)
	if err == nil || !strings.Contains(err.Error(), "mm") || !strings.Contains(err.Error(), "is in N") {
		t.Errorf("%v", err)
	}
	b.Outputs[0].Unit = None()
	if _, err := Multiply(a, b); err != nil {
		t.Errorf("an undeclared unit fits any: %v", err)
	}
	_, err = Multiply(randomPlant(t, r, 1, 3, 1), b)
	if err == nil || !strings.Contains(err.Error(), "1 output") || !strings.Contains(err.Error(), "3 inputs") {
		t.Errorf("%v", err)
	}
}

func TestOperatingPoints(t *testing.T) {
	r := rand.New(rand.NewPCG(43, 47))
	a, b := randomPlant(t, r, 1, 1, 1), randomPlant(t, r, 2, 1, 1)
	b.U0, b.X0, b.Y0 = []Number{Int(4)}, []Number{Int(1), Int(2)}, []Number{Int(3)}
	p := must[Value](t)(Multiply(a, b)).(*Plant)
	if len(p.X0) != 3 || !sameNumber(p.X0[2], Int(2)) || !sameNumber(p.U0[0], Int(4)) || len(p.Notes) != 1 {
		t.Errorf("%v %v %v", p.X0, p.U0, p.Notes)
	}
	a.U0, a.Y0 = []Number{Int(3)}, []Number{Int(7)}
	if p = must[Value](t)(Multiply(a, b)).(*Plant); len(p.Notes) != 0 || !sameNumber(p.Y0[0], Int(7)) {
		t.Errorf("%v %v", p.Y0, p.Notes)
	}
	if p = must[Value](t)(Multiply(Int(2), b)).(*Plant); !sameNumber(p.Y0[0], Int(6)) {
		t.Errorf("%v", p.Y0)
	}
	a.U0 = []Number{Int(4)}
	if p = must[Value](t)(Add(a, b)).(*Plant); len(p.Notes) != 0 || !sameNumber(p.Y0[0], Int(10)) || !sameNumber(p.U0[0], Int(4)) {
		t.Errorf("%v %v %v", p.U0, p.Y0, p.Notes)
	}
}

func TestImproperFactors(t *testing.T) {
	value := must[Value](t)
	r := rand.New(rand.NewPCG(53, 59))
	p := randomPlant(t, r, 2, 1, 1)
	s := ExactPolynomial("s", exact.PolynomialOfIntegers(2, 3))
	if v := value(Multiply(s, p)); v.Kind() != KTransfer {
		t.Errorf("(2 s + 3)·P is a %s", v.Kind())
	}
	if _, err := ToPlant(s); err == nil || !strings.Contains(err.Error(), "degree 1") {
		t.Errorf("%v", err)
	}
}

// The transfer function of a floating plant is that of its binary64 values: at s = 2i it
// agrees with a direct solve, and its coefficients stay within their error estimates of
// the exact plant's.
func TestFloatingConversions(t *testing.T) {
	r := rand.New(rand.NewPCG(61, 67))
	for range 10 {
		p := randomPlant(t, r, 4, 1, 1)
		f := must[Value](t)(Floating(p)).(*Plant)
		want, got := must[*Transfer](t)(ToTransfer(p)), must[*Transfer](t)(ToTransfer(f))
		if got.IsExact() {
			t.Fatal("a floating plant gave an exact transfer function")
		}
		compare := func(exactPart, part *Polynomial) {
			t.Helper()
			w, _ := exactPart.Floats()
			if len(w) != len(part.F) {
				t.Fatalf("degree %d, want %d", part.Degree(), exactPart.Degree())
			}
			for k := range w {
				if math.Abs(w[k]-part.F[k]) > part.Err {
					t.Errorf("coefficient %d is off by %g, estimate %g", k, w[k]-part.F[k], part.Err)
				}
			}
		}
		compare(want.Entries[0][0].Num, got.Entries[0][0].Num)
		compare(want.Entries[0][0].Den, got.Entries[0][0].Den)
		back := must[*Plant](t)(ToPlant(got))
		again := must[*Transfer](t)(ToTransfer(back))
		at := func(g *Transfer) complex128 {
			return evaluate(g.Entries[0][0].Num, 2i) / evaluate(g.Entries[0][0].Den, 2i)
		}
		if gap := cmplx.Abs(at(again) - at(want)); gap > 1e-9*cmplx.Abs(at(want)) {
			t.Errorf("G(2i) is off by %g", gap)
		}
	}
	large := &Plant{A: FloatMatrix(150, 150, make([]float64, 150*150), 0), B: zeroMatrix(150, 1), C: zeroMatrix(1, 150), D: zeroMatrix(1, 1)}
	if _, err := ToTransfer(large); err == nil {
		t.Error("150 states were converted")
	}
}

func evaluate(p *Polynomial, x complex128) complex128 {
	f, _ := p.Floats()
	sum := complex(0, 0)
	for _, c := range f {
		sum = sum*x + complex(c, 0)
	}
	return sum
}
