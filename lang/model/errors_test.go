package model

import (
	"fmt"
	"strings"
	"testing"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// Every refusal names what is wrong and stands at its place: at is the text under the caret.
func TestRefusals(t *testing.T) {
	outer := &constants{names: map[string]value.Value{"A": value.IdentityMatrix(2), "big": value.Text("no")}}
	outer.define(t, "define f(x) = f(x) + 1\ndefine plus3(q) = q + 3 s")
	many := "model p {\n" + strings.Repeat("given k = 2 1/s\n", 1)
	for i := range 10_000 {
		many += fmt.Sprintf("state x%d in m\n", i)
	}
	for _, x := range []struct{ name, text, at, message, help string }{
		{"no equation", "model p { state x in m, v in m/s\nrate x = v }", "v", "the state v has no equation", "write rate v"},
		{"state twice", "model p { state x in m, x in m\nrate x = 0 }", "x", "x is declared twice", "line 1"},
		{"deep clash", "model p {\ngiven m = 2 kg\ngiven k = 3 N/m\nstate x in m, v in m/s\nrate x = v\nrate v = -(k*x*(2 + m*(3 m/s^2 + k*x)))/m }", "k*x", "3 m/s^2 is in m/s^2, k*x is in N", "1/kg"},
		{"loop", "model p {\nstate x in m\nlet a = b + 1\nlet b = c*2\nlet c = a\nrate x = 0\n}", "a", "a → b → c → a", ""},
		{"no rest", "model p {\ngiven g = 9.81 m/s^2\nstate x in m, v in m/s\nrate x = v\nrate v = g\naround rest\n}", "around rest", "rate v = 9.81 m/s^2 at x = 0 m, v = 0 m/s", "depends on nothing"},
		{"no rest, nonlinear", "model p {\nstate x\nrate x = 1 + x^2\naround rest\n}", "around rest", "rate x = 1", ""},
		{"zero nominal", "model p {\ngiven o = 0 m ± 5%\nstate x in m\nrate x = (o - x)/1 s\n}", "5%", "per cent of its nominal value, and that is zero", "± 0.1 m"},
		{"ten thousand states", many + "\n}", "x400", "at most 400 states", ""},
		{"division by zero", "model p {\nstate x in m\nrate x = (1 m^2/s)/x\n}", "(1 m^2/s)/x", "division by zero", "x is zero there"},
		{"unknown name", "model p {\nstate speed in m/s\ngiven drag = 3 1/s\nrate speed = -dragg*speed\n}", "dragg", "dragg is not known", "drag"},
		{"unknown state", "model p {\nstate speed in m/s\nrate sped = 0\nrate speed = 0\n}", "sped", "no state sped", "speed"},
		{"rate of a given", "model p {\nstate x\ngiven k = 1\nrate k = 0\nrate x = 0\n}", "k", "k is a given, not a state", ""},
		{"every without next", "model p {\nstate x in m\nevery 5 ms\nrate x = 0\n}", "every 5 ms", "every belongs to a sampled model", "sampled("},
		{"next without every", "model p {\nstate x in m\nnext x = x\n}", "next x = x", "needs the sample time", "every 5 ms"},
		{"both", "model p {\nstate x in m, y in m\nevery 5 ms\nrate x = 0\nnext y = y\n}", "next y = y", "either rates or next values", ""},
		{"unknown output", "model p {\nstate height in m\noutput heigth\nrate height = 0\n}", "heigth", "the output heigth is no state", "height"},
		{"unknown unit", "model p {\nstate x in kN*mq\nrate x = 0\n}", "mq", "mq is not a unit", ""},
		{"rate without a unit", "model p {\nstate x in m\nrate x = 2\n}", "2", "has no unit, and it must be in m/s", "its rate is in m/s"},
		{"rate twice", "model p {\nstate x\nrate x = 2\nrate x = 3\n}", "x", "rate x is given twice", "line 3"},
		{"sine of metres", "model p {\nstate x in m\nrate x = sin(x)*1 m/s\n}", "x", "sin takes an angle or a plain number; x is in m", ""},
		{"unknown function", "model p {\nstate x\nrate x = sqrtt(x)\n}", "sqrtt", "no function", "sqrt"},
		{"infinite slope", "model p {\nstate x\nrate x = sqrt(x)\n}", "sqrt(x)", "slope is infinite", ""},
		{"no real value", "model p {\nstate x\nrate x = sqrt(x - 1)\n}", "sqrt(x - 1)", "is not a real number at this point", ""},
		{"logarithm", "model p {\nstate x\nrate x = log(x)\n}", "log(x)", "logarithm of zero", ""},
		{"hertz", "model p {\nstate x in m\ngiven f = 50 Hz\nrate x = x*f\n}", "50 Hz", "Hz does not say whether 2π", "rad/s"},
		{"around in another unit", "model p {\nstate x in m\nrate x = x/1 s\naround x = 3 s\n}", "3 s", "declared in m, and the value is in s", ""},
		{"around without a unit", "model p {\nstate x in m\nrate x = x/1 s\naround x = 3\n}", "3", "has no unit", "3 m"},
		{"degrees without a unit", "model p {\nstate a in deg\nrate a = 0\naround a = 30\n}", "30", "has no unit", "30 deg, or 30 rad"},
		{"around an output", "model p {\nstate x\noutput y = 2*x\nrate x = 0\naround y = 2\n}", "y", "y is an output and follows", ""},
		{"around a given", "model p {\nstate x\ngiven k = 1\nrate x = 0\naround k = 2\n}", "k", "k is a given", "line 3"},
		{"find what is given", "model p {\nstate x\nrate x = x\naround x = 2 find x\n}", "x", "cannot be solved for", ""},
		{"find what does nothing", "model p {\nstate x, y\nrate x = x\nrate y = 1\naround x = 2 find y\n}", "around x = 2 find y", "no rate depends on y", ""},
		{"celsius added", "model p {\nstate T in degC\nrate T = (T + 5 degC)/1 s\n}", "5 degC", "point on a scale", "in K"},
		{"per cent of celsius", "model p {\ngiven Ta = 20 degC ± 5%\nstate T in degC\nrate T = (Ta - T)/1 s\n}", "5%", "per cent of a temperature", "± 2 K"},
		{"condition", "model p {\nstate a\nrate a = if a { 1 } else { 2 }\n}", "a", "a number stands where a condition", ""},
		{"truth", "model p {\nstate a\nrate a = 1 + (a > 2)\n}", "(a > 2)", "a condition stands where a number", ""},
		{"branches", "model p {\nstate a in m\nrate a = if a > 1 m { 1 m/s } else { 2 s }\n}", "2 s", "the branches of the if", ""},
		{"matrix", "model p {\nstate a\nrate a = A*a\n}", "A", "A is a 2×2 matrix", "A[1, 2]"},
		{"text", "model p {\nstate a\nrate a = big*a\n}", "big", "big is a text", ""},
		{"recursion", "model p {\nstate a\nrate a = f(a)\n}", "f", "f calls itself", "called in line 3"},
		{"clash in a function", "model p {\nstate a in m\nrate a = plus3(a)/1 s\n}", "3 s", "q is in m, 3 s is in s", ""},
		{"arguments", "model p {\nstate a\nrate a = limit(a, 1)\n}", "limit(a, 1)", "limit takes 3 arguments", "limit(u, low, high)"},
		{"low above high", "model p {\nstate a\nrate a = limit(a, 2, 1)\n}", "limit(a, 2, 1)", "lower bound of limit is above", ""},
		{"interpolate plain", "model p {\nstate a in m\nrate a = interpolate([[0, 1], [1, 3]], a)*1 m/s\n}", "a", "first column has no unit; a is in m", "interpolate(valve, p/1 bar)"},
		{"table twice", "model p {\nstate a\nrate a = interpolate([[0, 1], [0, 3]], a)\n}", "[[0, 1], [0, 3]]", "two rows", ""},
		{"table with a model's name", "model p {\nstate a\nrate a = interpolate([[0, a], [1, 3]], a)\n}", "a", "belongs to the model", ""},
		{"a given of a given", "model p {\ngiven m = 2 kg\ngiven J = m*3\nstate a\nrate a = a\n}", "m", "does not follow m", "let J"},
		{"exponent with a unit", "model p {\nstate a\ngiven n = 2 m\nrate a = a^n\n}", "n", "an exponent has no unit", ""},
		{"root of metres", "model p {\nstate a\ngiven n = 2 m\nrate a = n^(1/7)\n}", "(1/7)", "has no unit", ""},
		{"open exponent of metres", "model p {\nstate a\ngiven n = 2 m\nrate a = n^a\n}", "n", "a power that is not fixed", "reference value"},
		{"called product", "model p {\nstate a, b\nrate a = a(b + 1)\nrate b = 0\n}", "a", "a is a state of the model and cannot be called", "a*(…)"},
		{"negative range", "model p {\nstate a range -1\nrate a = 0\n}", "-1", "must be positive", ""},
		{"range in another unit", "model p {\nstate a in m range 3 s\nrate a = 0\n}", "3 s", "declared in m", ""},
		{"no states", "model p {\ninput u\n}", "p", "has no states", ""},
		{"output in another unit", "model p {\nstate a in m\noutput b in s = 2*a\nrate a = 0\n}", "2*a", "declared in s, and its right side is in m", ""},
		{"two arounds", "model p {\nstate a\nrate a = a\naround rest\naround a = 1\n}", "around a = 1", "around stands twice", "line 4"},
	} {
		m, err := build(t, x.text, outer)
		if err == nil {
			t.Errorf("%s was accepted: %+v", x.name, m.Value().Notes)
			continue
		}
		if !strings.Contains(err.Message, x.message) || !strings.Contains(err.Help, x.help) {
			t.Errorf("%s: %q, help %q; want %q, help %q", x.name, err.Message, err.Help, x.message, x.help)
		}
		if err.Source == nil {
			t.Errorf("%s has no place", x.name)
		} else if at := err.Source.Text[err.Span.Start:err.Span.End]; at != x.at {
			t.Errorf("%s: the caret stands under %q, not %q", x.name, at, x.at)
		}
		if err.Kind == diag.Internal {
			t.Errorf("%s: %v", x.name, err)
		}
	}
}
