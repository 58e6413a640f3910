package builtins_test

import (
	"encoding/json"
	"fmt"
	"math"
	"math/cmplx"
	"strings"

	"gainwright/lang/value"
)

func judgeCharacteristic(r *caseRun) {
	r.ok("A = $A$\np = characteristic_polynomial(A)\nl = poles(A)")
	r.near("p", "coefficients", 0)
	r.samePoles("l", pairs(r.c.Expect["poles"]), 1e-10)
}

func judgeReachability(r *caseRun) {
	r.ok("A = $A$\nB = $B$\nq = reachability(A, B)\nrank_q = q.rank\nmissing = q.missing\nindices = q.indices\nok = stabilizable(A, B).holds\nhow = q.decided")
	r.near("rank_q", "rank", 0)
	r.samePoles("missing", pairs(r.c.Expect["unreachable_modes"]), 1e-14)
	r.truth("ok", "stabilizable")
	if r.get("how") != value.Text("exactly") {
		r.Error("not decided exactly")
	}
	if _, ok := r.c.Expect["controllability_indices"]; ok {
		r.near("indices", "controllability_indices", 0)
		r.ok("A = $A$\nB = $B$\nr1 = reachability(A, column(B, 1)).rank\nr2 = reachability(A, column(B, 2)).rank")
		r.near("r1", "rank_input_1", 0)
		r.near("r2", "rank_input_2", 0)
	}
}

func judgeObservability(r *caseRun) {
	r.ok("A = $A$\nC = $C$\nq = observability(A, C)\nrank_q = q.rank\nmissing = q.missing\nok = detectable(A, C).holds")
	r.near("rank_q", "rank", 0)
	r.samePoles("missing", pairs(r.c.Expect["unobservable_modes"]), 1e-14)
	r.truth("ok", "detectable")
}

func judgeKalmanSplit(r *caseRun) {
	r.ok(`P = plant($A$, $B$, $C$)
q = kalman_split(P)
sizes = [q.moved_and_seen.size, q.moved_only.size, q.seen_only.size, q.neither.size]
p1 = q.moved_and_seen.poles
p2 = q.moved_only.poles
p3 = q.seen_only.poles
p4 = q.neither.poles
G = transfer(P)
same = transfer(minimal(P)) - G == 0/(s + 1)
num = G.numerator
den = G.denominator`)
	var modes map[string][]float64
	if err := json.Unmarshal(r.c.Expect["modes"], &modes); err != nil {
		r.Fatal(err)
	}
	for name, field := range map[string]string{"p1": "reachable_observable", "p2": "reachable_unobservable", "p3": "unreachable_observable", "p4": "unreachable_unobservable"} {
		got := numbers(r.get(name))
		if len(got) != len(modes[field]) {
			r.Fatalf("%s: %v, want %v", field, got, modes[field])
		}
		for i, w := range modes[field] {
			if got[i] != complex(w, 0) || !isExactValue(r.get(name)) {
				r.Errorf("%s: %v, want %v", field, got[i], w)
			}
		}
	}
	for i, x := range numbers(r.get("sizes")) {
		field := []string{"reachable_observable", "reachable_unobservable", "unreachable_observable", "unreachable_unobservable"}[i]
		if x != complex(floats(r.c.Expect[field])[0], 0) {
			r.Errorf("size of %s is %v", field, x)
		}
	}
}

func judgeBassGura(r *caseRun) {
	r.ok(`A = $A$
B = $B$
K = assign_poles(A, B, @poles)
K2 = assign_poles(A, B, @poles, method: "ackermann")
open = characteristic_polynomial(A)
loop = characteristic_polynomial(A - B*K.values)
det = determinant(reachability(A, B).matrix)`)
	r.near("K", "K", 0)
	r.near("K2", "K", 0)
	r.near("open", "open_loop_polynomial", 0)
	r.near("loop", "desired_polynomial", 0)
	r.near("det", "reachability_determinant", 0)
}

func judgeFixedMode(r *caseRun) {
	var possible bool
	if err := json.Unmarshal(r.c.Expect["possible"], &possible); err != nil {
		r.Fatal(err)
	}
	if !possible {
		message := r.refusal("K = assign_poles($A$, $B$, @poles)")
		if !strings.Contains(message, "-0.5") {
			r.Errorf("the refusal does not name the mode: %s", message)
		}
		return
	}
	r.ok("A = $A$\nB = $B$\nK = assign_poles(A, B, @poles)\nloop = characteristic_polynomial(A - B*K.values)")
	r.near("loop", "closed_loop_polynomial", 0)
	r.near("K", "K_minimum_norm", 0)
}

func judgeSeveralInputs(r *caseRun) {
	r.ok("A = $A$\nB = $B$\nK = assign_poles(A, B, @poles)\nl = poles(A - B*floating(K.values))\nkappa = K.sensitivity\nopen = poles(A)")
	r.samePoles("l", pairs(r.c.Expect["closed_loop_poles"]), r.polesRel(1e-6))
	r.samePoles("open", pairs(r.c.Expect["open_loop_poles"]), 1e-8)
	if raw, ok := r.c.Expect["example_gain_eigenvector_condition"]; ok {
		if kappa := real(numbers(r.get("kappa"))[0]); kappa > 1.05*floats(raw)[0] {
			r.Errorf("sensitivity %g is worse than the example's %s", kappa, raw)
		}
	}
}

func judgeObserver(r *caseRun) {
	r.ok("A = $A$\nC = $C$\nL = observer_gain(A, C, @poles)\nerr = characteristic_polynomial(A - L.values*C)")
	r.near("L", "L", 0)
	r.near("err", "error_polynomial", 0)
}

func judgeReducedObserver(r *caseRun) {
	r.ok("O = reduced_observer(plant($A$, filled(0, rows: 3, columns: 1), $C$), @poles)\nL = O.gain\nerr = characteristic_polynomial(O)")
	r.near("L", "L", 0)
	r.near("err", "error_polynomial", 0)
}

func judgeIntegral(r *caseRun) {
	r.ok(`P = with_integrators(plant($A$, $B$, $C$), ["y"])
K = assign_poles(P, @poles)
Kx = K[1, 1..2]
Ki = K[1, 3]
loop = characteristic_polynomial(closed(P, K))
follows = static_gain(closed(P, K))["y", "r_y"] == 1`)
	r.near("Kx", "K", 0)
	r.near("Ki", "Ki", 0)
	r.near("loop", "closed_loop_polynomial", 0)
	if r.get("follows") != value.Boolean(true) {
		r.Error("the integrator does not follow")
	}
}

func judgePrefilter(r *caseRun) {
	r.ok("P = plant($A$, $B$, $C$)\nK = assign_poles(P, @poles)\nN = reference_gain(P, K)\ng = static_gain(closed(P, K, N))")
	r.near("K", "K", 0)
	r.near("N", "N", 0)
	r.near("g", "dc_gain", 0)
}

func judgeRiccati(r *caseRun) {
	plant := "P = plant($A$, $B$)"
	if strings.HasPrefix(r.c.Function, "discrete") {
		plant = "P = plant($A$, $B$, every: 1)"
	}
	cross := ""
	if r.has("N") {
		cross = ", cross: $N$"
	}
	text := plant + "\nK = quadratic_gain(P, states: $Q$, inputs: $R$" + cross + ")\nX = K.cost\nl = K.poles\nm = K.values"
	if raw, ok := r.c.Expect["stabilising_solution_exists"]; ok && string(raw) == "false" {
		message := r.refusal(text)
		if !strings.Contains(message, "0") {
			r.Errorf("the refusal does not name the mode: %s", message)
		}
		return
	}
	r.ok(text)
	if _, ok := r.c.Expect["X"]; ok {
		r.near("X", "X", r.rel(1e-8))
	}
	if raw, ok := r.c.Expect["X_corner_1n"]; ok {
		x := r.get("X").(*value.Matrix)
		_, n := x.Dims()
		if got := real(numbers(x.At(0, n-1))[0]); math.Abs(got-floats(mustList(raw))[0]) > 1e-10 {
			r.Errorf("X[1, n] = %g", got)
		}
	}
	r.near("m", "K", r.rel(1e-8))
	r.samePoles("l", pairs(r.c.Expect["closed_loop_poles"]), r.polesRel(1e-8))
}

func mustList(raw json.RawMessage) json.RawMessage {
	return json.RawMessage("[" + string(raw) + "]")
}

func judgeKalmanGain(r *caseRun) {
	sampled := ""
	if strings.HasPrefix(r.c.Function, "discrete") {
		sampled = ", every: 1"
	}
	text := "P = plant($A$, filled(0, rows: 2, columns: 1), $C$" + sampled + ")\nL = kalman_gain(P, process: $W$, measurement: $V$)\nX = L.cost\nl = L.poles\nm = L.values"
	if sampled != "" {
		text += "\nF = kalman_gain(P, process: $W$, measurement: $V$, form: \"current\")"
	}
	r.ok(text)
	r.near("X", "P", r.rel(1e-8))
	r.samePoles("l", pairs(r.c.Expect["error_poles"]), r.polesRel(1e-8))
	if sampled != "" {
		r.near("m", "L_predictor", r.rel(1e-8))
		r.near("F", "L_filter", r.rel(1e-8))
		return
	}
	r.near("m", "L", r.rel(1e-8))
}

// judgeCompensator also checks the bounds of the loop factor m by the closed loop's characteristic polynomial at the bound.
func judgeCompensator(r *caseRun) {
	r.ok(`P = plant($A$, $B$, $C$)
K = quadratic_gain(P, states: $Q$, inputs: $R$)
L = kalman_gain(P, process: $W$, measurement: $V$)
Kv = K.values
Lv = L.values
H = compensator(P, gain: [[10, 10]], observer: [[10], [10]])
up = coefficients(characteristic_polynomial(closed(P*(101/100), H)))[5]
down = coefficients(characteristic_polynomial(closed(P*(23/25), H)))[4]`)
	r.near("Kv", "K", 1e-9)
	r.near("Lv", "L", 1e-9)
	for _, name := range []string{"up", "down"} {
		if v := r.get(name); numbers(v)[0] != 0 || !isExactValue(v) {
			r.Errorf("the coefficient that decides (%s) is %v at the bound, not 0", name, v)
		}
	}
}

func judgeHold(r *caseRun) {
	r.ok("P = sampled(plant($A$, $B$), every: $T$)\nA = P.A\nB = P.B")
	r.near("A", "Ad", r.rel(1e-12))
	r.near("B", "Bd", r.rel(1e-12))
	if raw, ok := r.c.Expect["Bd_11_relative_tolerance"]; ok {
		got, want := real(numbers(r.get("B"))[0]), floats(r.c.Expect["Bd"])[0]
		if math.Abs(got-want) > floats(mustList(raw))[0]*want {
			r.Errorf("Bd[1, 1] = %g, want %g", got, want)
		}
	}
}

func judgeHeldTransfer(r *caseRun) {
	r.ok("P = sampled(realize(polynomial($num$)/polynomial($den$)), every: $T$)\nG = transfer(P)\nn = G.numerator\nd = G.denominator\nz0 = transmission_zeros(P)")
	tolerance := r.rel(1e-10)
	r.near("n", "num", tolerance)
	r.near("d", "den", tolerance)
	r.samePoles("z0", pairs(r.c.Expect["zeros"]), 1e-8)
}

func judgeLostBySampling(r *caseRun) {
	r.ok("P = plant($A$, $B$)\nq = reachability(P).rank\nS = sampled(P, every: pi)\nA = S.A\nB = S.B\nqs = reachability(S).rank")
	r.near("q", "continuous_rank", 0)
	if got := numbers(r.get("qs"))[0]; real(got) != floats(mustList(r.c.Expect["sampled_rank"]))[0] {
		r.Errorf("sampled rank %v", got)
	}
	r.near("A", "Ad", 1e-12)
	r.near("B", "Bd", 1e-12)
	warned := false
	for _, e := range r.events {
		warned = warned || strings.Contains(e.Note, "sample time")
	}
	if !warned {
		r.Error("no note warns of the sample time")
	}
}

func judgeSampledCost(r *caseRun) {
	r.ok(`P = plant($A$, $B$)
w = sampled_weights(P, every: $T$, states: $Q$, inputs: $R$)
Q = w.states
N = w.cross
R = w.inputs
K = quadratic_gain(sampled(P, every: $T$), states: $Q$, inputs: $R$, cost: "continuous")
l = K.poles`)
	r.near("Q", "Qd", r.rel(1e-9))
	r.near("N", "Nd", r.rel(1e-9))
	r.near("R", "Rd", r.rel(1e-9))
	r.near("K", "K", r.rel(1e-9))
	r.samePoles("l", pairs(r.c.Expect["closed_loop_poles"]), r.polesRel(1e-9))
}

func judgeSampledNoise(r *caseRun) {
	r.ok("W = sampled_noise(plant($A$, filled(0, rows: 2, columns: 1)), every: $T$, process: $W$)")
	r.near("W", "Wd", 1e-12)
}

func judgeExponential(r *caseRun) {
	r.ok("E = exponential($A$)")
	r.near("E", "expA", r.rel(1e-12))
}

func judgeTransfer(r *caseRun) {
	r.ok("G = transfer(plant($A$, $B$, $C$, $D$))\nP = characteristic_polynomial($A$)")
	var want [][]struct {
		Num, Den json.RawMessage
	}
	if err := json.Unmarshal(r.c.Expect["reduced"], &want); err != nil {
		r.Fatal(err)
	}
	g := r.get("G").(*value.Transfer)
	for i, row := range want {
		for j, w := range row {
			for what, pair := range map[string]struct {
				p   *value.Polynomial
				raw json.RawMessage
			}{"numerator": {g.Entries[i][j].Num, w.Num}, "denominator": {g.Entries[i][j].Den, w.Den}} {
				got, want := numbers(pair.p), floats(pair.raw)
				if fmt.Sprint(got) != fmt.Sprint(complexes(want)) || !isExactValue(pair.p) {
					r.Errorf("%s [%d, %d] = %v, want %v", what, i+1, j+1, got, want)
				}
			}
		}
	}
}

func complexes(f []float64) []complex128 {
	out := make([]complex128, len(f))
	for i, x := range f {
		out[i] = complex(x, 0)
	}
	return out
}

func judgeZeros(r *caseRun) {
	r.ok("P = plant($A$, $B$, $C$, $D$)\nz0 = transmission_zeros(P)\nz1 = transmission_zeros(similar(P, floating(identity(size($A$)[1]))))")
	r.samePoles("z0", pairs(r.c.Expect["zeros"]), r.rel(1e-8))
	r.samePoles("z1", pairs(r.c.Expect["zeros"]), math.Max(1e-8, r.rel(1e-8)))
}

func judgeHankel(r *caseRun) {
	r.ok("P = plant($A$, $B$, $C$)\nh = hankel_singular_values(P)\nW = reachability(P).gramian\nM = observability(P).gramian")
	r.near("W", "reachability_gramian", r.rel(1e-9))
	r.near("M", "observability_gramian", r.rel(1e-9))
	got, want := numbers(r.get("h")), floats(r.c.Expect["hankel_singular_values"])
	for i := range want {
		if cmplx.Abs(got[i]-complex(want[i], 0)) > r.rel(1e-9)*want[i] {
			r.Errorf("value %d = %v, want %v", i+1, got[i], want[i])
		}
	}
}

func judgeLyapunov(r *caseRun) {
	sampled := "true"
	var equation string
	if raw, ok := r.c.Inputs["equation"]; ok {
		if err := json.Unmarshal(raw, &equation); err != nil {
			r.Fatal(err)
		}
	}
	if !strings.Contains(equation, "- X") && !strings.HasPrefix(equation, "X = A X A'") {
		r.Fatalf("an equation that is not known: %q", equation)
	}
	r.ok("X = lyapunov($A$, $Q$, sampled: " + sampled + ")")
	r.near("X", "X", r.rel(1e-12))
}

func judgeDistance(r *caseRun) {
	r.ok("d = reachability($A$, $B$).distance\nlow = d.low\nhigh = d.high\nz0 = d.at")
	low, high := real(numbers(r.get("low"))[0]), real(numbers(r.get("high"))[0])
	want := floats(mustList(r.c.Expect["distance"]))[0]
	if low > want*(1+1e-3) || high < want*(1-1e-3) || high > 1.1*low {
		r.Errorf("bracket [%g, %g], want %g inside and within 10 %%", low, high, want)
	}
	if high > want*(1+1e-3) {
		r.Errorf("the upper bound %g is not the distance %g", high, want)
	}
}
