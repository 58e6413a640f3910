package builtins_test

import (
	"context"
	"math"
	"os"
	"slices"
	"strings"
	"testing"

	"gainwright/builtins"
	"gainwright/builtins/numeric"
	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/value"
	"gainwright/stdlib"
)

// studied runs a text and gives its names; with flat the study may use plain functions.
func studied(t testing.TB, text string, flat bool) *eval.Session {
	t.Helper()
	options := eval.Options{Builtins: builtins.Table(), Library: stdlib.Files}
	if flat {
		options.Eigenvalues = func() func([]complex128, []float64) bool { return new(numeric.EigenvalueKernel).Eigenvalues }
		options.EigenvalueLimit = numeric.EigenvalueKernelLimit
	}
	session := eval.New(options)
	session.RunText(context.Background(), diag.NewSource("study", text), func(e eval.Event) {
		if e.Error != nil {
			t.Fatalf("%s\n%s", text, e.Error.Render())
		}
	})
	return session
}

func studyOf(t testing.TB, session *eval.Session, name string) *value.Study {
	t.Helper()
	v, _ := session.Lookup(name)
	s, ok := v.(*value.Study)
	if !ok {
		t.Fatalf("%s is no study", name)
	}
	return s
}

// TestStudyBesideNumPy gives NumPy the draws of the study in scripts/crane.gain: the least
// damping of every sample, the rank correlations (scipy.stats.spearmanr) and quantiles
// (numpy.quantile) must agree.
func TestStudyBesideNumPy(t *testing.T) {
	text, err := os.ReadFile("../scripts/crane.gain")
	if err != nil {
		t.Fatal(err)
	}
	session := studied(t, string(text), true)
	swing := studyOf(t, session, "swing")
	draws := make([][]float64, swing.Total())
	for k := range draws {
		draws[k] = make([]float64, len(swing.Parameters))
		swing.Draw(k, draws[k])
	}
	k, _ := session.Lookup("K")
	gain, _ := value.Force(k).(*value.Gain).Values.Floats()
	want := ask(t, []problem{{"kind": "crane study", "draws": draws, "gain": gain, "samples": swing.Samples}})[0].Scipy
	for i, v := range swing.Results[0].Values {
		if math.Abs(v-want[0][i]) > 1e-10 {
			t.Fatalf("%s: %.15g, NumPy gives %.15g", swing.SampleName(i), v, want[0][i])
		}
	}
	influence, _ := swing.Field("influence")
	for _, row := range value.Force(influence).(*value.Report).Rows {
		for j, name := range swing.ParameterNames() {
			if got := row[1].(value.Number).Float64(); string(row[0].(value.Text)) == name && math.Abs(got-want[1][j]) > 1e-12 {
				t.Errorf("influence of %s: %.15g, SciPy gives %.15g", name, got, want[1][j])
			}
		}
	}
	for j, q := range []float64{0.05, 0.5, 0.95} {
		got, err := swing.Quantile(value.Float(q))
		if err != nil || math.Abs(value.Force(got).(value.Number).Float64()-want[2][j]) > 1e-10 {
			t.Errorf("quantile %g: %v %v, NumPy gives %.15g", q, got, err, want[2][j])
		}
	}
}

// TestAxisStudyBesideNumPy gives NumPy the draws and corners of scripts/hydraulic_axis.gain,
// whose rest, units and valve curve are worked out by hand there.
func TestAxisStudyBesideNumPy(t *testing.T) {
	text, err := os.ReadFile("../scripts/hydraulic_axis.gain")
	if err != nil {
		t.Fatal(err)
	}
	session := studied(t, string(text), true)
	hold := studyOf(t, session, "hold")
	draws := make([][]float64, hold.Total())
	for k := range draws {
		draws[k] = make([]float64, len(hold.Parameters))
		hold.Draw(k, draws[k])
	}
	order := []int{}
	for _, name := range []string{"M", "E", "V", "ps", "Q", "leak", "d"} {
		order = append(order, slices.Index(hold.ParameterNames(), name))
	}
	for k, draw := range draws {
		sorted := make([]float64, len(order))
		for i, j := range order {
			sorted[i] = draw[j]
		}
		draws[k] = sorted
	}
	k, _ := session.Lookup("K")
	gain, _ := value.Force(k).(*value.Gain).Values.Floats()
	want := ask(t, []problem{{"kind": "axis study", "draws": draws, "gain": gain}})[0].Scipy[0]
	for i, v := range hold.Results[0].Values {
		if math.Abs(v-want[i]) > 1e-9 {
			t.Fatalf("%s: %.15g, NumPy gives %.15g", hold.SampleName(i), v, want[i])
		}
	}
}

// TestFlatStudiesAgreeWithTheEvaluator compares the two ways of computing samples.
func TestFlatStudiesAgreeWithTheEvaluator(t *testing.T) {
	const models = `model drive {
  given J = 0.02 kg*m^2 ± 30%, d = 0.05 N*m*s/rad ± 40%, L = 4e-3 H ± 10%
  input U in V
  state w in rad/s, i in A
  output w
  rate w = (0.4 N*m/A * i - d*w) / J
  rate i = (U - 0.6 V/A * i - 0.4 V*s/rad * w) / L
}
model tank {
  given a = 0.9 ± 8%
  input u
  state h, g
  output h
  next h = a*h + u
  next g = 0.3*h + 0.5*g
  every 2 s
}
K = assign_poles(drive, [-40 ± 30i])
Kd = assign_poles(tank, [0.2, 0.4])
define scaled(x) = 2*x + 1, "a function on the way"
`
	for _, body := range []string{
		"least_damping(closed(drive, K)) over drive",
		"slowest_decay(closed(drive, K)) over drive",
		"slowest_decay(drive) over drive",
		"least_damping(closed(tank, Kd)) over tank",
		"slowest_decay(closed(tank, Kd)) over tank",
		"scaled(slowest_decay(closed(tank, Kd))) + slowest_decay(drive) over tank, drive",
		"min(slowest_decay(closed(drive, K)), 30) over drive",
	} {
		text := models + "study q = " + body + " samples 300 seed 7 at corners\n"
		slow, fast := studyOf(t, studied(t, text, false), "q"), studyOf(t, studied(t, text, true), "q")
		for i, v := range fast.Results[0].Values {
			if w := slow.Results[0].Values[i]; math.Abs(v-w) > 1e-9*math.Abs(w)+1e-12 {
				t.Fatalf("%s, %s: %.15g by plain functions, %.15g by the evaluator", body, fast.SampleName(i), v, w)
			}
		}
	}
}

// TestDrawsStayWhatTheyWere: a model's draws stay what they were beside another model,
// and with a further parameter.
func TestDrawsStayWhatTheyWere(t *testing.T) {
	const one = `model a { given m = 2 ± 10%; input u; state x; output x; rate x = u - m*x }
model b { given m = 2 ± 10%, n = 3 ± 10%; input u; state x; output x; rate x = n*u - m*x }
model a2 { given k = 1 ± 5%, m = 2 ± 10%; input u; state x; output x; rate x = u - m*x*k/k }
`
	alone := studyOf(t, studied(t, one+"study q = slowest_decay(a) over a samples 50 seed 3", true), "q")
	beside := studyOf(t, studied(t, one+"study q = { first: slowest_decay(a), second: slowest_decay(b) } over b, a samples 80 seed 3", true), "q")
	same := 0
	for k, v := range alone.Results[0].Values {
		if v != beside.Results[0].Values[k] {
			t.Fatalf("sample %d of a: %g alone, %g beside b", k, v, beside.Results[0].Values[k])
		}
		if v == beside.Results[1].Values[k] && k > 0 {
			same++
		}
	}
	if same > 0 {
		t.Errorf("b drew the same as a in %d samples", same)
	}
}

// BenchmarkStudyFourStates is 100 000 samples of the study in scripts/crane.gain;
// testdata/references/study_timing.py times NumPy on the same.
func BenchmarkStudyFourStates(b *testing.B) {
	data, err := os.ReadFile("../scripts/crane.gain")
	if err != nil {
		b.Fatal(err)
	}
	text := strings.Replace(string(data), "samples 2000", "samples 100000", 1)
	if text == string(data) {
		b.Fatal("scripts/crane.gain has no study of 2000 samples")
	}
	for b.Loop() {
		studied(b, text, true)
	}
}

// BenchmarkStudySixStates is 100 000 samples of the least damping of a closed loop of six
// states with four parameters.
func BenchmarkStudySixStates(b *testing.B) {
	text := `model drive {
  given J1 = 0.02 ± 10%, J2 = 0.05 ± 30%, k = 400 ± 20%, d = 0.05 ± 40%
  input U
  state a, b, w, v, i, f
  output f
  rate a = w
  rate b = v
  rate w = (0.4*i - k*(a - b) - d*(w - v)) / J1
  rate v = (k*(a - b) + d*(w - v)) / J2
  rate i = (U - 0.6*i - 0.4*w)/0.004
  rate f = (v - f)*50
}
K = quadratic_gain(drive, states: diagonal([1, 100, 0.1, 0.1, 0.01, 1]), inputs: [[1]])
study x = least_damping(closed(drive, K)) over drive samples 100000
`
	b.ReportAllocs()
	for b.Loop() {
		studied(b, text, true)
	}
}
