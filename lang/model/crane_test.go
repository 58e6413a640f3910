package model

import (
	"math"
	"strings"
	"testing"

	"gainwright/lang/value"
)

const crane = `model crane {
  given M = 1200 kg ± 5%              # trolley
  given m = 350 kg ± 40%              # hanging vat
  given l = 6 m ± 30%                 # rope
  given c = 95 N*s/m ± 20%            # rolling friction
  given g = 9.81 m/s^2
  input  F in N range 3000
  state  x in m range 10, v in m/s range 2, a in rad range 0.1, w in rad/s range 0.2
  output x, a
  let d = M + m*sin(a)^2
  rate x = v
  rate v = (F - c*v + m*sin(a)*(l*w^2 + g*cos(a))) / d
  rate a = w
  rate w = -(cos(a)*(F - c*v + m*l*w^2*sin(a)) + (M + m)*g*sin(a)) / (l*d)
  around rest
}`

// six states: the crane with a drive (first order) and a filter in front of it
const crane6 = `model crane {
  given M = 1200 kg ± 5%
  given m = 350 kg ± 40%
  given l = 6 m ± 30%
  given c = 95 N*s/m ± 20%
  given g = 9.81 m/s^2
  given T1 = 50 ms
  given T2 = 0.2 s
  input  u in N range 3000
  state  x in m range 10, v in m/s range 2, a in rad range 0.1, w in rad/s range 0.2, F in N range 3000, r in N range 3000
  output x, a
  let d = M + m*sin(a)^2
  rate x = v
  rate v = (F - c*v + m*sin(a)*(l*w^2 + g*cos(a))) / d
  rate a = w
  rate w = -(cos(a)*(F - c*v + m*l*w^2*sin(a)) + (M + m)*g*sin(a)) / (l*d)
  rate F = (r - F)/T1
  rate r = (u - r)/T2
  around rest
}`

// fractions writes an exact matrix row by row.
func fractions(t *testing.T, m *value.Matrix) string {
	t.Helper()
	if !m.IsExact() {
		t.Fatal("the matrix is floating")
	}
	rows, cols := m.Dims()
	lines := make([]string, rows)
	for i := range rows {
		parts := make([]string, cols)
		for j := range cols {
			parts[j] = m.Exact().At(i, j).RatString()
		}
		lines[i] = strings.Join(parts, " ")
	}
	return strings.Join(lines, "; ")
}

// The fractions were derived by hand from the linearised crane equations and checked with
// sympy 1.11.
func TestCraneGivesItsFractions(t *testing.T) {
	p := mustBuild(t, crane).Value().Plant
	for _, x := range []struct {
		name string
		m    *value.Matrix
		want string
	}{
		{"A", p.A, "0 1 0 0; 0 -19/240 2289/800 0; 0 0 0 1; 0 19/1440 -3379/1600 0"},
		{"B", p.B, "0; 1/1200; 0; -1/7200"},
		{"C", p.C, "1 0 0 0; 0 0 1 0"},
		{"D", p.D, "0; 0"},
	} {
		if got := fractions(t, x.m); got != x.want {
			t.Errorf("%s = %s, want %s", x.name, got, x.want)
		}
	}
	if p.A.Rows[1] != "rate v [m/s^2]" || p.A.Columns[2] != "a [rad]" || p.B.Columns[0] != "F [N]" || p.C.Rows[1] != "a [rad]" {
		t.Errorf("rows %v, columns %v", p.A.Rows, p.A.Columns)
	}
}

func TestCraneNamesWhatIsFree(t *testing.T) {
	v := mustBuild(t, crane).Value()
	free, ok := v.Field("free")
	if !ok || free != value.Text("x is free; A and B do not depend on it") {
		t.Errorf("free: %v", free)
	}
	given, _ := v.Field("given")
	m, err := value.Field(given, "M")
	if err != nil {
		t.Fatal(err)
	}
	if q := m.(value.Quantity); q.Unit.Text != "kg" || q.Magnitude.Exact.RatString() != "1200" {
		t.Errorf("given.M is %v", q)
	}
}

func TestCraneProgramAgreesWithTheExactMatrices(t *testing.T) {
	m := mustBuild(t, crane)
	compareFlat(t, m)
	// and at a corner of the tolerances, where both are computed anew
	values := []value.Number{value.Int(1140), value.Int(210), m.Givens[2].High(), m.Givens[3].High(), m.Givens[4].Nominal}
	other, err := m.With(values)
	if err != nil {
		t.Fatal(err)
	}
	flat := m.Program().NewFlat()
	if err := m.Program().Evaluator().Linearise([]float64{1140, 210, 7.8, 114, 9.81}, flat); err != nil {
		t.Fatal(err)
	}
	compareMatrix(t, "A", other.Value().Plant.A, flat.A)
	compareMatrix(t, "B", other.Value().Plant.B, flat.B)
}

// compareFlat runs the program at the nominal parameters and compares with the exact path.
func compareFlat(t *testing.T, m *Model) {
	t.Helper()
	p := m.Value().Plant
	flat := m.Program().NewFlat()
	if err := m.Program().Evaluator().Linearise(m.Program().Nominal(), flat); err != nil {
		t.Fatalf("%s: %v", m.Name, err)
	}
	compareMatrix(t, m.Name+" A", p.A, flat.A)
	compareMatrix(t, m.Name+" B", p.B, flat.B)
	compareMatrix(t, m.Name+" C", p.C, flat.C)
	compareMatrix(t, m.Name+" D", p.D, flat.D)
	compareNumbers(t, m.Name+" y₀", p.Y0, flat.Y0)
}

func compareMatrix(t *testing.T, name string, m *value.Matrix, flat []float64) {
	t.Helper()
	re, _ := m.Floats()
	largest := 0.0
	for _, x := range re {
		largest = math.Max(largest, math.Abs(x))
	}
	for k, x := range re {
		// The program rounds at every step; the exact path once, or with its error estimate.
		if tol := 1e-13*(math.Abs(x)+1e-3*largest) + 8*m.Err; math.Abs(x-flat[k]) > tol || math.IsNaN(flat[k]) {
			t.Errorf("%s: entry %d is %.17g exactly and %.17g in the program (error estimate %g)", name, k, x, flat[k], m.Err)
		}
	}
}

func compareNumbers(t *testing.T, name string, want []value.Number, got []float64) {
	t.Helper()
	for k, n := range want {
		if x := n.Float64(); math.Abs(x-got[k]) > 1e-12*math.Max(1, math.Abs(x))+8*n.ErrorEstimate() {
			t.Errorf("%s: entry %d is %.17g and %.17g", name, k, x, got[k])
		}
	}
}

func TestLineariseAllocatesNothing(t *testing.T) {
	p := mustBuild(t, crane6).Program()
	e, flat, values := p.Evaluator(), p.NewFlat(), p.Nominal()
	x, u, out := make([]float64, 6), make([]float64, 1), make([]float64, 6)
	if n := testing.AllocsPerRun(100, func() {
		values[0] += 0.1
		if e.Linearise(values, flat) != nil {
			t.Error("no rest")
		}
		e.Rates(x, u, out)
		e.Outputs(x, u, out)
	}); n != 0 {
		t.Errorf("%v allocations a run", n)
	}
}

func BenchmarkLineariseSixStates(b *testing.B) {
	p := mustBuild(b, crane6).Program()
	e, flat, values := p.Evaluator(), p.NewFlat(), p.Nominal()
	for b.Loop() {
		values[0] += 1e-6
		if err := e.Linearise(values, flat); err != nil {
			b.Fatal(err)
		}
	}
}
