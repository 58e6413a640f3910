package eval_test

import (
	"context"
	"math"
	"strings"
	"testing"

	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/value"
)

// claimed runs a script whose last statement is a claim and gives its outcome.
func claimed(t *testing.T, text string) *eval.Claim {
	t.Helper()
	events, out := runText(t, session(false), text)
	if out.Failed {
		t.Fatalf("%s: %s", text, events[len(events)-1].Error.Render())
	}
	c := events[len(events)-1].Claim
	if c == nil {
		t.Fatalf("%s: no claim", text)
	}
	if out.Missed == c.Agrees {
		t.Errorf("%s: missed is %v", text, out.Missed)
	}
	return c
}

// The expected distances follow from the rule by hand: the distance from the printed number
// in units of its last place, the interval half a unit to either side, its ends included.
func TestClaimsOfNumbers(t *testing.T) {
	inf := math.Inf(1)
	for _, c := range []struct {
		text      string
		agrees    bool
		undecided bool
		units     float64
	}{
		{"claim 12.3506 is 12.350", false, false, 0.6},
		{"claim 12.3505 is 12.350", true, false, 0.5},
		{"claim 12.3494 is 12.350", false, false, 0.6},
		{"claim -18812.58 is -18810", false, false, 2.58},
		{"claim -18812.58 is -1.881e4", true, false, 0.258},
		{"claim 24/7 is 3.4286", true, false, 0.285714285714},
		{"claim 24/7 is 24/7", true, false, 0},
		{"claim 3.4286 is 24/7", false, false, inf},
		{"claim 0 is 0", true, false, 0},
		{"claim 0.0000001 is 0", false, false, inf},
		{"claim 0.04 is 0.0", true, false, 0.4},
		{"claim rounded(0, error: 1e-16) is 0", false, true, 0},
		{"claim rounded(1e-17, error: 1e-16) is 0", false, true, inf},
		{"claim rounded(0.55, error: 0.001) is 0.5", false, true, 0.5},
		{"claim rounded(0.54, error: 0.001) is 0.5", true, false, 0.4},
		{"claim rounded(0.56, error: 0.001) is 0.5", false, false, 0.6},
		{"claim 1/3 is 33%", true, false, 1.0 / 3},
		{"claim 1/3 is 34%", false, false, 2.0 / 3},
		{"claim 0.01234 m is 12.3 mm", true, false, 0.4},
		{"claim 0.01234 m is 12.1 mm", false, false, 2.4},
		{"claim 2.004 - 3i is 2.00 - 3.00i", true, false, 0.4},
		{"claim 2.004 - 3.1i is 2.00 - 3.00i", false, false, 10},
		{"claim 2 is 2.00 + 1i", false, false, 1},
	} {
		got := claimed(t, c.text)
		if got.Agrees != c.agrees || got.Undecided != c.undecided || math.Abs(got.WorstUnits-c.units) > 1e-9 && got.WorstUnits != c.units {
			t.Errorf("%s: %+v", c.text, got)
		}
		if got.Agrees != (len(got.Entries) == 0) {
			t.Errorf("%s: entries %+v", c.text, got.Entries)
		}
	}
}

func TestClaimsOfListsAndMatrices(t *testing.T) {
	for _, c := range []struct {
		text   string
		agrees bool
		at     []int
		note   string
	}{
		{"p = [-1, -2, -3]\nclaim p is [-3, -1, -2]", true, nil, ""},
		{"p = [-1, -2 ± 3i]\nclaim p is [-2 + 3i, -1, -2 - 3i]", true, nil, ""},
		// the first fit of each would leave the last without a partner
		{"p = [1.04, 1.06]\nclaim p is [1.1, 1.0]", true, nil, ""},
		{"p = [1.5, 1.2]\nclaim p is [1, 1.6]", false, []int{2}, ""},
		{"p = [-1, -2, -3]\nclaim p is [-3, -1]", false, nil, "2 values printed, 3 values computed"},
		{"claim coefficients(s^2 + 2*s + 3) is [3, 2, 1]", false, []int{1}, ""},
		{"claim coefficients(s^2 + 2*s + 3) is [1, 2, 3]", true, nil, ""},
		{"claim [[1, 2], [3, 4]] is [[1, 2], [3.00, 5]]", false, []int{2, 2}, ""},
		{"claim [[1, 2], [3, 4]] is [[1, 2]]", false, nil, "1×2, the computed one 2×2"},
		{"claim [[1, 2, 3]] is [1, 2, 3]", true, nil, ""},
		{"claim [[1], [2]] is [1, 2]", true, nil, ""},
		{"claim [[1 + 2i]] is [[1 + 2i]]", true, nil, ""},
		{"claim s^2 + 3.14*s is s^2 + 3.1*s", true, nil, ""},
		{"claim s^2 + 3.14*s is s^2 + 3.1*s + 1", false, nil, ""},
		{"claim s^2 + 3.14*s is -s^2 + 3.1*s", false, nil, ""},
		{"claim z^2 is s^2", false, nil, "in z, the printed one in s"},
		{"claim (2*s + 1)/(4*s^2 + 8) is (0.5*s + 0.25)/(s^2 + 2)", true, nil, ""},
		{"claim (2*s + 1)/(4*s^2 + 8) is (2.0*s + 1.0)/(4*s^2 + 8.0)", true, nil, ""},
		{"claim (2*s + 1)/(4*s^2 + 8) is (2.0*s + 1.0)/(4*s^2 + 8.5)", false, nil, ""},
		{"claim [[1/(s + 1), 0]] is [[1/(s + 1), 0]]", true, nil, ""},
		{"claim [[1/(s + 1), 0]] is [[1/(s + 2), 0]]", false, []int{1, 1}, ""},
	} {
		got := claimed(t, c.text)
		if got.Agrees != c.agrees {
			t.Errorf("%s: %+v", c.text, got)
			continue
		}
		if c.at != nil && (len(got.Entries) == 0 || !equal(got.Entries[0].At, c.at)) {
			t.Errorf("%s: entries %+v", c.text, got.Entries)
		}
		if !strings.Contains(strings.Join(got.Notes, " "), c.note) {
			t.Errorf("%s: notes %q", c.text, got.Notes)
		}
	}
}

func equal(a, b []int) bool {
	if len(a) != len(b) {
		return false
	}
	for i := range a {
		if a[i] != b[i] {
			return false
		}
	}
	return true
}

// The crane of the language's own description: a trolley of 1200 kg with 350 kg hanging
// from 6 m of rope, whose exact gain is [104544/109, 325981/109, -20505717/1090, -838656/109].
const crane = `A = [[0, 1, 0, 0], [0, -19/240, 2.86125, 0], [0, 0, 0, 1], [0, 19/1440, -2.111875, 0]]
B = [0, 1/1200, 0, -1/7200]
K = feedback(A, B, [[104544/109, 325981/109, -20505717/1090, -838656/109]], [-0.77 ± 0.7855571270397i, -0.9, -1.2])
`

func TestClaimOfAGain(t *testing.T) {
	c := claimed(t, crane+"claim K is [[959.1, 2991, -1.881e4, -7694]]")
	if !c.Agrees || len(c.Entries) != 0 || len(c.Poles) != 4 || len(c.Notes) != 0 {
		t.Errorf("%+v", c)
	}
	c = claimed(t, crane+"claim K is [[959.1, 2991, -18810, -7694]]")
	if c.Agrees || c.Undecided || len(c.Entries) != 1 {
		t.Fatalf("%+v", c)
	}
	e := c.Entries[0]
	if !equal(e.At, []int{1, 3}) || e.Printed != "-18810" || e.Name != "u1, x3" || math.Abs(e.Units-2.5844037) > 1e-6 {
		t.Errorf("%+v", e)
	}
	c = claimed(t, crane+"claim K is [[-959.1, 2991, -18810, -7694]]")
	if c.Agrees || !strings.Contains(strings.Join(c.Notes, " "), "unstable") {
		t.Errorf("%+v", c)
	}
}

// Poles that the printed numbers give, of a case that can be done by hand: the double
// integrator with K = [2, 3] has s² + 3s + 2.
func TestPolesOfThePrintedGain(t *testing.T) {
	c := claimed(t, "K = feedback([[0, 1], [0, 0]], [0, 1], [[2, 3]], [-1, -2])\nclaim K is [[2, 3]]")
	if !c.Agrees || len(c.Poles) != 2 || !isNumber(c.Poles[0], -2, 1) || !isNumber(c.Poles[1], -1, 1) {
		t.Errorf("%+v", c)
	}
}

// (s + 1/3)⁴ has the coefficients 4/3, 2/3, 4/27, 1/81; three digits of them scatter the
// fourfold pole by about the fourth root of the rounding.
func TestRoundingCanBeTooCoarse(t *testing.T) {
	c := claimed(t, `A = [[0, 1, 0, 0], [0, 0, 1, 0], [0, 0, 0, 1], [0, 0, 0, 0]]
K = feedback(A, [0, 0, 0, 1], [[1/81, 4/27, 2/3, 4/3]], [-1/3, -1/3, -1/3, -1/3])
claim K is [[0.0123, 0.148, 0.667, 1.33]]`)
	if !c.Agrees || len(c.Notes) != 1 || !strings.Contains(c.Notes[0], "more digits") {
		t.Errorf("%+v", c)
	}
}

// A = diag(1, 2), B = I: K = diag(2, 4) gives the poles -1 and -2, and so does diag(3, 3).
const twoInputs = "K = feedback([[1, 0], [0, 2]], [[1, 0], [0, 1]], [[2, 0], [0, 4]], [-1, -2], free: true)\n"

func TestSeveralInputsAreJudgedByThePoles(t *testing.T) {
	c := claimed(t, twoInputs+"claim K is [[2.00, 0.00], [0.00, 4.00]]")
	if !c.Agrees || len(c.Entries) != 0 || len(c.Notes) != 0 {
		t.Errorf("the gain itself: %+v", c)
	}
	c = claimed(t, twoInputs+"claim K is [[3.00, 0.50], [0.50, 3.10]]")
	if c.Agrees {
		t.Errorf("other poles: %+v", c)
	}
	c = claimed(t, twoInputs+"claim K is [[3.00, 0.00], [0.00, 3.00]]")
	if !c.Agrees || len(c.Notes) == 0 {
		t.Errorf("another gain with the same poles: %+v", c)
	}
	c = claimed(t, twoInputs+"claim K is [[3.00, 7.00], [0.00, 3.00]]")
	if !c.Agrees || len(c.Entries) != 1 || !equal(c.Entries[0].At, []int{1, 2}) || c.Entries[0].Cannot == "" {
		t.Errorf("an entry that does not move the poles: %+v", c)
	}
	c = claimed(t, twoInputs+"claim K is [[3.00, 0.00], [0.00, 3.10]]")
	if c.Agrees || len(c.Entries) != 1 || !equal(c.Entries[0].At, []int{2, 2}) || math.Abs(c.Entries[0].Units-10) > 0.5 {
		t.Fatalf("one wrong digit: %+v", c)
	}
	if n, ok := c.Entries[0].Computed.(value.Number); !ok || math.Abs(n.Float64()-3) > 0.01 {
		t.Errorf("repaired to %v", c.Entries[0].Computed)
	}
}

func TestALongClaimCanBeStopped(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	var last eval.Event
	session(false).RunText(ctx, diag.NewSource("t.gain", crane+"claim K is [[1, 2, 3, 4]]"), func(e eval.Event) { last = e })
	if last.Error == nil || last.Error.Kind != diag.Interrupted {
		t.Errorf("%+v", last)
	}
}
