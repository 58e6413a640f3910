package builtins_test

import (
	"encoding/json"
	"fmt"
	"math"
	"math/cmplx"
	"strconv"
	"strings"

	"gainwright/lang/value"
)

// perOrder visits the fields "2", "3", … of an expectation.
func (r *caseRun) perOrder(field string, visit func(order int, raw json.RawMessage)) {
	r.Helper()
	var orders map[string]json.RawMessage
	if err := json.Unmarshal(r.c.Expect[field], &orders); err != nil {
		r.Fatal(field, err)
	}
	if len(orders) == 0 {
		r.Fatalf("%s holds no order", field)
	}
	for k, raw := range orders {
		n, err := strconv.Atoi(k)
		if err != nil {
			r.Fatal(err)
		}
		visit(n, raw)
	}
}

// printedPoles reads "-4.0530+2.3400j" as a pair.
func printedPoles(raw json.RawMessage) []complex128 {
	var texts []string
	if err := json.Unmarshal(raw, &texts); err != nil {
		panic(err)
	}
	var all []complex128
	for _, s := range texts {
		z, err := strconv.ParseComplex(strings.ReplaceAll(s, "j", "i"), 128)
		if err != nil {
			panic(err)
		}
		all = append(all, z)
		if imag(z) != 0 {
			all = append(all, cmplx.Conj(z))
		}
	}
	return all
}

func judgeBessel(r *caseRun) {
	if _, ok := r.c.Expect["polynomials"]; ok {
		r.perOrder("polynomials", func(n int, raw json.RawMessage) {
			r.ok(fmt.Sprintf("p = bessel_polynomial(%d)\nl = bessel_delay_poles(%d, delay: 1 s)", n, n))
			if got, want := numbers(r.get("p")), floats(raw); fmt.Sprint(got) != fmt.Sprint(complexes(want)) {
				r.Errorf("order %d: %v, want %v", n, got, want)
			}
		})
		r.perOrder("poles", func(n int, raw json.RawMessage) {
			r.ok(fmt.Sprintf("l = bessel_delay_poles(%d, delay: 1 s)", n))
			r.samePoles("l", pairs(raw), 1e-9)
		})
		return
	}
	r.perOrder("printed", func(n int, raw json.RawMessage) {
		r.ok(fmt.Sprintf("l = bessel_poles(%d, settling: 1 s)", n))
		got, want := numbers(r.get("l")), printedPoles(raw)
		if len(got) != len(want) {
			r.Fatalf("order %d: %v", n, got)
		}
		for _, w := range want {
			best := math.Inf(1)
			for _, g := range got {
				best = math.Min(best, cmplx.Abs(g-w))
			}
			if best > *r.c.Tolerance.Abs {
				r.Errorf("order %d: no pole within the printed digits of %v: %v", n, w, got)
			}
		}
	})
}

func judgeButterworth(r *caseRun) {
	r.perOrder("poles", func(n int, raw json.RawMessage) {
		r.ok(fmt.Sprintf("l = butterworth_poles(%d, frequency: 1)", n))
		r.samePoles("l", pairs(raw), r.rel(1e-12))
	})
}

func judgeITAE(r *caseRun) {
	r.perOrder("published_coefficients", func(n int, raw json.RawMessage) {
		r.ok(fmt.Sprintf("p = polynomial_with_roots(itae_poles(%d, frequency: 1))", n))
		got, want := numbers(r.get("p")), floats(raw)
		for i := range want {
			if cmplx.Abs(got[i]-complex(want[i], 0)) > 1e-12*10 {
				r.Errorf("order %d: coefficient %d is %v, want %v", n, i+1, got[i], want[i])
			}
		}
	})
}

// crossings reads the rows of a table of margins of one kind.
func crossings(r *caseRun, kind string) (frequencies, figures []float64) {
	report := r.get("m").(*value.Report)
	for _, row := range report.Rows {
		if row[1] != value.Text(kind) {
			continue
		}
		if real(numbers(row[0])[0]) == 0 {
			continue // the cases list crossings above 0 only
		}
		frequencies = append(frequencies, real(numbers(row[0])[0]))
		cell := row[2]
		if kind == "gain 1" {
			cell = row[3]
		}
		figures = append(figures, real(numbers(cell)[0]))
	}
	return frequencies, figures
}

func judgeMargins(r *caseRun) {
	r.ok("m = margins(polynomial($num$)/polynomial($den$))\nok = m.stable\nup = m.factor_up\ndown = m.factor_down\ndeg = m.degrees\ndelay = m.delay")
	r.truth("ok", "closed_loop_stable")
	relative := r.rel(1e-4)
	type row struct{ Omega, Factor, Degrees float64 }
	for field, kind := range map[string]string{"phase_crossovers": "phase −180°", "gain_crossovers": "gain 1"} {
		var want []row
		if err := json.Unmarshal(r.c.Expect[field], &want); err != nil {
			r.Fatal(err)
		}
		frequencies, figures := crossings(r, kind)
		if len(frequencies) != len(want) {
			r.Fatalf("%s: %v, want %v", field, frequencies, want)
		}
		for i, w := range want {
			figure := w.Factor + w.Degrees
			if math.Abs(frequencies[i]-w.Omega) > relative*w.Omega || math.Abs(figures[i]-figure) > relative*math.Abs(figure) {
				r.Errorf("%s: %g at %g, want %g at %g", field, figures[i], frequencies[i], figure, w.Omega)
			}
		}
	}
	for name, field := range map[string]string{"up": "gain_margin_up", "down": "gain_margin_down", "deg": "phase_margin_degrees", "delay": "delay_margin_seconds"} {
		raw := r.c.Expect[field]
		got := real(numbers(r.get(name))[0])
		if string(raw) == "null" {
			if (name == "up" && !math.IsInf(got, 1)) || (name == "down" && got != 0) || (name != "up" && name != "down" && !math.IsInf(got, 1)) {
				r.Errorf("%s = %g, want none", field, got)
			}
			continue
		}
		if want := floats(mustList(raw))[0]; math.Abs(got-want) > relative*math.Abs(want) {
			r.Errorf("%s = %g, want %g", field, got, want)
		}
	}
}

func judgeRounded(r *caseRun) {
	field, form := "printed_K", "A - B*printed"
	head := "A = $A$\nB = $B$\n"
	if r.has("printed_L") {
		field, form = "printed_L", "A - printed*C"
		head = "A = $A$\nC = $C$\n"
	}
	r.ok(head + "printed = $" + field + "$\nl = poles(" + form + ")")
	tolerance := r.polesRelOrSign()
	r.samePoles("l", pairs(r.c.Expect["closed_loop_poles"]), tolerance)
	r.claimAgrees(head, field)
}

// polesRelOrSign: the case about the sign convention lists the poles of A + B·K.
func (r *caseRun) polesRelOrSign() float64 {
	if _, ok := r.c.Expect["poles_with_minus"]; ok {
		r.c.Expect["closed_loop_poles"] = r.c.Expect["poles_with_minus"]
	}
	return r.polesRel(1e-6)
}

// claimAgrees claims the printed numbers of the exact or computed gain and compares the verdict and the poles they give.
func (r *caseRun) claimAgrees(head, field string) {
	r.Helper()
	var consistent *bool
	if raw, ok := r.c.Expect["consistent_with_rounding"]; ok {
		if err := json.Unmarshal(raw, &consistent); err != nil {
			r.Fatal(err)
		}
	}
	if consistent == nil || r.has("printed_L") || len(floats(r.c.Expect["exact_gain"])) == 0 {
		return
	}
	_, isSign := r.c.Expect["poles_with_minus"]
	b := strings.Count(literal(r.c.Inputs["B"]), "[") - 1
	if columns := strings.Count(strings.SplitN(literal(r.c.Inputs["B"]), "]", 2)[0], ",") + 1; columns > 1 || b == 0 {
		return // several inputs: the gain is not unique
	}
	if _, ok := r.c.Expect["sampled"]; ok {
		return
	}
	r.script(head + "K = assign_poles(A, B, @claimed_poles)\nclaim K is " + r.printed(field))
	for _, e := range r.events {
		if e.Error != nil {
			r.Fatal(e.Error.Render())
		}
		if e.Claim == nil {
			continue
		}
		if want := *consistent || isSign; e.Claim.Agrees != want && !strings.Contains(r.c.ID, "repeated") {
			r.Errorf("agrees: %v, want %v; %+v", e.Claim.Agrees, want, e.Claim.Entries)
		}
		if len(e.Claim.Poles) == 0 {
			r.Error("the claim names no poles")
		}
		var suspect []int
		if raw := r.c.Expect["suspect_entry"]; len(raw) > 0 && string(raw) != "null" {
			if err := json.Unmarshal(raw, &suspect); err != nil {
				r.Logf("suspect entry %s", raw)
			}
		}
		return
	}
	r.Error("no claim was judged")
}

// printed writes the printed gain so that its last significant digit is its last written one: 360400 to four digits is 3.604e5.
func (r *caseRun) printed(field string) string {
	var rows [][]string
	if err := json.Unmarshal(r.c.Inputs[field], &rows); err != nil {
		r.Fatal(err)
	}
	digits := int(floats(mustList(r.c.Inputs["digits"]))[0])
	for _, row := range rows {
		for j, text := range row {
			if significant := len(strings.TrimLeft(text, "-")); !strings.Contains(text, ".") && significant > digits {
				f, err := strconv.ParseFloat(text, 64)
				if err != nil {
					r.Fatal(err)
				}
				row[j] = strconv.FormatFloat(f, 'e', digits-1, 64)
			}
		}
	}
	data, err := json.Marshal(rows)
	if err != nil {
		r.Fatal(err)
	}
	return literal(data)
}

func judgeSinglePrecision(r *caseRun) {
	r.ok("A = $A$\nB = $B$\nK = assign_poles(A, B, [-1, -2, -3, -4, -5])\nm = K.values\nl = K.poles")
	r.near("m", "K_binary32", 0)
	r.samePoles("l", pairs(r.c.Expect["closed_loop_poles"]), r.polesRel(1e-6))
	for _, x := range numbers(r.get("m")) {
		if float64(float32(real(x))) != real(x) {
			r.Errorf("%v does not survive binary32", x)
		}
	}
}

func judgeUnits(r *caseRun) {
	r.ok(`u1 = si_number(3000 rpm)
u2 = si_number(90 deg)
u3 = si_number(1 lbf)
u4 = si_number(1 lbf*inch)
u5 = from_decibels(6)
u6 = si_number(1 kgf)
u7 = si_number(1 inch)`)
	want := floats(r.c.Expect["values"])
	for i, w := range want {
		if got := real(numbers(r.get(fmt.Sprintf("u%d", i+1)))[0]); math.Abs(got-w) > 4e-16*math.Abs(w) {
			r.Errorf("item %d: %.17g, want %.17g", i+1, got, w)
		}
	}
}
func judgeStep(r *caseRun) {
	r.ok("f = figures(response(plant($A$, $B$, $C$, $D$), to: \"step\"))\nf5 = figures(response(plant($A$, $B$, $C$, $D$), to: \"step\"), within: 5%)")
	report, five := r.get("f").(value.HasFields), r.get("f5").(value.HasFields)
	field := func(h value.HasFields, name string) (float64, bool) {
		v, ok := h.Field(name)
		if !ok {
			r.Fatalf("figures have no field %s", name)
		}
		n := numbers(v)
		if len(n) != 1 {
			return 0, false
		}
		return real(n[0]), true
	}
	if string(r.c.Expect["final_value"]) == "null" {
		if _, ok := field(report, "final_value"); ok {
			r.Error("a response without a final value was given one")
		}
		return
	}
	relative := r.rel(1e-3)
	check := func(h value.HasFields, name, expect string, scale float64) {
		raw, ok := r.c.Expect[expect]
		if !ok || string(raw) == "null" {
			return
		}
		want := floats(mustList(raw))[0] * scale
		got, is := field(h, name)
		if !is || math.Abs(got-want) > relative*math.Abs(want)+1e-6 {
			r.Errorf("%s = %g, want %g", name, got, want)
		}
	}
	check(report, "final_value", "final_value", 1)
	check(report, "overshoot", "overshoot_percent", 0.01)
	check(report, "overshoot_at", "peak_time", 1)
	check(report, "rise", "rise_time_10_90", 1)
	check(report, "settling", "settling_time_2pct", 1)
	check(five, "settling", "settling_time_5pct", 1)
	check(report, "undershoot", "undershoot_percent", 0.01)
}
