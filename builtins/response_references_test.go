package builtins_test

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"gainwright/lang/value"
)

// times are n even instants from 0 to end.
func times(n int, end float64) []float64 {
	out := make([]float64, n)
	for k := range out {
		out[k] = end * float64(k) / float64(n-1)
	}
	return out
}

// signalOf is a signal of a response by its role and place.
func signalOf(t *testing.T, r *value.Response, role string, place int) []float64 {
	t.Helper()
	for _, s := range r.Signals {
		if s.Role == role {
			if place == 0 {
				return s.Values
			}
			place--
		}
	}
	t.Fatalf("the response has no such %s", role)
	return nil
}

func responseOf(t *testing.T, text, name string) *value.Response {
	t.Helper()
	r, ok := bound(t, text, name).(*value.Response)
	if !ok {
		t.Fatalf("%s is no response", name)
	}
	return r
}

// closeTo compares a signal within a part of its largest value.
func closeTo(t *testing.T, what string, got, want []float64, part float64) {
	t.Helper()
	if len(got) != len(want) {
		t.Errorf("%s: %d values, %d in the reference", what, len(got), len(want))
		return
	}
	size, worst, at := 0.0, 0.0, 0
	for k, w := range want {
		size = math.Max(size, math.Abs(w))
		if d := math.Abs(got[k] - w); !(d <= worst) {
			worst, at = d, k
		}
	}
	if !(worst <= part*size) {
		t.Errorf("%s: off by %.2e of %.3g, at value %d", what, worst/size, size, at+1)
	}
}

const (
	third      = "P = plant([[0, 1, 0], [0, 0, 1], [-6, -11.2, -1.8]], [[0], [0], [1]], [[6, 2, 0], [0, 1, 0]])\n"
	thirdStart = "[0.3, -1, 2]"
)

// TestLinearResponsesBesideSciPy compares drives and starts with SciPy's integrator DOP853
// at a tolerance of 2e-13; 1e-8 of the largest value is asked for.
func TestLinearResponsesBesideSciPy(t *testing.T) {
	a := [][]float64{{0, 1, 0}, {0, 0, 1}, {-6, -11.2, -1.8}}
	b := [][]float64{{0}, {0}, {1}}
	c := [][]float64{{6, 2, 0}, {0, 1, 0}}
	runs := []struct{ drive, call string }{
		{"step", `response(P, to: "step", until: 6 s, points: 61)`},
		{"ramp", `response(P, to: "ramp", until: 6 s, points: 61)`},
		{"none", `response(P, from: ` + thirdStart + `, until: 6 s, points: 61)`},
		{"sine", `response(P, to: wave, until: 6 s, points: 61)`},
	}
	var problems []problem
	for _, r := range runs {
		start := []float64{0, 0, 0}
		if r.drive == "none" {
			start = []float64{0.3, -1, 2}
		}
		problems = append(problems, problem{"kind": "motion", "A": a, "B": b, "C": c, "drive": r.drive, "start": start, "times": times(61, 6)})
	}
	for k, want := range ask(t, problems) {
		text := third + "define wave(t) = sin(3*t)*exp(-t/4), \"a wave\"\nr = " + runs[k].call
		r := responseOf(t, text, "r")
		for place := range c {
			closeTo(t, fmt.Sprintf("%s, output %d", runs[k].drive, place+1), signalOf(t, r, "output", place), want.Scipy[place], 1e-8)
		}
	}
}

// TestHeldLawBesideSciPy compares a sampled observer and gain, whose input is limited, on an
// unstable continuous plant with the same moved by SciPy's matrix exponential.
func TestHeldLawBesideSciPy(t *testing.T) {
	text := `P = plant([[0, 1], [4, -0.5]], [[0], [2]], [[1, 0]])
S = sampled(P, every: 50 ms)
K = assign_poles(S, [0.8 ± 0.1i])
L = observer_gain(S, [0.3, 0.4])
r = response(P, gain: K, observer: L, every: 50 ms, limit: 2, from: [0.4, 0], until: 3 s, points: 241)
`
	gain := func(name string) [][]float64 {
		g, ok := bound(t, text, name).(*value.Gain)
		if !ok {
			t.Fatal(name)
		}
		rows, cols := g.Values.Dims()
		f, _ := g.Values.Floats()
		out := make([][]float64, rows)
		for i := range out {
			out[i] = f[i*cols : (i+1)*cols]
		}
		return out
	}
	want := ask(t, []problem{{"kind": "held law", "A": [][]float64{{0, 1}, {4, -0.5}}, "B": [][]float64{{0}, {2}}, "C": [][]float64{{1, 0}},
		"K": gain("K"), "L": gain("L"), "every": 0.05, "limit": 2, "start": []float64{0.4, 0}, "times": times(241, 3)}})[0].Scipy
	r := responseOf(t, text, "r")
	closeTo(t, "the output", signalOf(t, r, "output", 0), want[0], 1e-8)
	if len(r.Stays) == 0 {
		t.Error("the input is never at its limit, so that the limit is not tested")
	}
}

// TestOwnEquationsBesideSciPy compares runs of models' own equations with SciPy's DOP853.
func TestOwnEquationsBesideSciPy(t *testing.T) {
	const pendulum = `model pendulum {
  input torque
  state a range 3, w range 9
  rate a = w
  rate w = torque - 9.81*sin(a) - 0.3*w
  output a
  around rest
}
`
	const vessels = `model vessels {
  input feed
  state upper, lower
  rate upper = 0.02*(1 + feed - sqrt(max(upper, 0)))
  rate lower = 0.02*sqrt(max(upper, 0)) - 0.03*lower
  output lower
  around upper = 1, lower = 2/3
}
`
	cases := []struct {
		equations, text string
		start           []float64
		offset          []float64 // of the operating point
		end, part       float64
	}{
		{"pendulum", pendulum + "r = response(pendulum, from: [2.8, 0], until: 8 s, points: 81, nonlinear: true)", []float64{2.8, 0}, []float64{0, 0}, 8, 1e-8},
		{"pushed pendulum", pendulum + "r = response(pendulum, to: 4, from: [0.2, 0], until: 8 s, points: 81, nonlinear: true)", []float64{0.2, 0}, []float64{0, 0}, 8, 1e-8},
		{"limited pendulum", pendulum + "r = response(pendulum, gain: [[12, 5]], limit: 6, from: [2.5, 1], until: 5 s, points: 81, nonlinear: true)", []float64{2.5, 1}, []float64{0, 0}, 5, 1e-8},
		{"vessels", vessels + "r = response(vessels, from: [0.5, -0.6], until: 300 s, points: 81, nonlinear: true)", []float64{1.5, 2./3 - 0.6}, []float64{1, 2. / 3}, 300, 1e-8},
	}
	var problems []problem
	for _, c := range cases {
		problems = append(problems, problem{"kind": "own equations", "equations": c.equations, "start": c.start, "times": times(81, c.end)})
	}
	for k, want := range ask(t, problems) {
		c := cases[k]
		r := responseOf(t, c.text, "r")
		for place := range 2 {
			wanted := append([]float64{}, want.Scipy[place]...)
			for i := range wanted {
				wanted[i] -= c.offset[place]
			}
			got := signalOf(t, r, "state", place)
			closeTo(t, fmt.Sprintf("%s, state %d", c.equations, place+1), got, wanted, c.part)
		}
	}
}

// TestMarginsBesideMpmath compares every crossing with mpmath's roots on the frequency
// response, to 1e-10.
func TestMarginsBesideMpmath(t *testing.T) {
	loops := []struct {
		text     string
		num, den []any
		extra    problem
	}{
		{"10*(s + 2)/(s*(s + 1)*(s^2 + 0.1*s + 9))", []any{10, 20}, []any{1, "1.1", "9.1", 9, 0}, nil},
		{"400*(s^2 + 0.2*s + 25)/(s*(s + 8)*(s^2 + 0.05*s + 60))", []any{400, 80, 10000}, []any{1, "8.05", "60.4", 480, 0}, nil},
		{"-6/((s - 1)*(s + 4))*(1 - s/20)*(-1)", []any{"-0.3", 6}, []any{1, 3, -4}, nil},
		{"5*(s + 1)/(s^2*(s/10 + 1)^2)", []any{5, 5}, []any{"0.01", "0.2", 1, 0, 0}, nil},
		{"(0.733*s^3 + 0.0101*s^2 + 105*s + 1.17)/(s^6 + 150*s^5 + 9750*s^4 + 246000*s^3 + 513000*s^2 + 584*s + 452)",
			[]any{"0.733", "0.0101", 105, "1.17"}, []any{1, 150, 9750, 246000, 513000, 584, 452}, nil}, // steep at its resonances
		{"every 50 ms: 0.02*(z + 0.9)/((z - 1)*(z - 0.7))", []any{"0.02", "0.018"}, []any{1, "-1.7", "0.7"}, problem{"every": 0.05, "to": 62.8}},
	}
	var problems []problem
	for _, l := range loops {
		p := problem{"kind": "margins", "num": l.num, "den": l.den, "from": 0.01, "to": 1000}
		for k, v := range l.extra {
			p[k] = v
		}
		problems = append(problems, p)
	}
	for k, want := range ask(t, problems) {
		text := "m = margins(" + loops[k].text + ")\n"
		if after, sampled := strings.CutPrefix(loops[k].text, "every 50 ms: "); sampled {
			text = "m = margins(timed(" + after + ", every: 50 ms))\n"
		}
		m, ok := bound(t, text, "m").(*value.Report)
		if !ok {
			t.Fatal("margins give no report")
		}
		gains, phases := want.Scipy[0], want.Scipy[1]
		number := func(v value.Value) float64 {
			switch x := value.Force(v).(type) {
			case value.Number:
				return x.Float64()
			case value.Quantity:
				return x.Magnitude.Float64()
			}
			return math.NaN()
		}
		rows := 0
		for _, row := range m.Rows {
			w := number(row[0])
			if w < problems[k]["from"].(float64) || w > 0.9999*floatIn(problems[k]["to"]) {
				continue
			}
			rows++
			list, column := gains, 3
			if strings.HasPrefix(string(row[1].(value.Text)), "phase") {
				list, column = phases, 2
			}
			nearest, off := math.NaN(), math.Inf(1)
			for i := 0; i < len(list); i += 2 {
				if d := math.Abs(list[i] - w); d < off {
					off, nearest = d, list[i+1]
				}
			}
			if off > 1e-10*w {
				t.Errorf("%s: the crossing at %.12g is %.2e off mpmath's", loops[k].text, w, off)
			}
			if got := number(row[column]); !(math.Abs(got-nearest) <= 1e-9*math.Max(1, math.Abs(nearest))) {
				t.Errorf("%s: at %.6g the margin is %.12g, mpmath gives %.12g", loops[k].text, w, got, nearest)
			} else if claimed, held := claims(row[column])[0].digits, digitsOf(math.Abs(got-nearest)/math.Abs(nearest)); math.Min(claimed, 15) > held+1 {
				t.Errorf("%s: at %.6g the margin claims %.1f digits, %.1f hold", loops[k].text, w, claimed, held)
			}
		}
		if all := (len(gains) + len(phases)) / 2; rows != all || all == 0 {
			t.Errorf("%s: %d crossings, mpmath finds %d: %v %v", loops[k].text, rows, all, gains, phases)
		}
	}
}

func floatIn(v any) float64 {
	switch x := v.(type) {
	case float64:
		return x
	case int:
		return float64(x)
	}
	return math.NaN()
}
