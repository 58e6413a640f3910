package builtins_test

import (
	"context"
	"strings"
	"testing"

	"gainwright/builtins"
	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/value"
	"gainwright/stdlib"
)

// carriage is an invented model; statements about it begin in line 8.
const carriage = `model carriage {
  given m = 2 kg ± 10%, k = 50 N/m ± 20%, bare = 0 N/m
  input F in N
  state x in m, v in m/s
  output x; rate x = v
  rate v = (F - k*x - bare*x)/m
}
`

// TestVariedModelsRefuse checks what bad sensitivities, schedules and studies are told, and where.
func TestVariedModelsRefuse(t *testing.T) {
	for _, c := range []struct {
		text   string
		column int
		says   string
	}{
		{"sensitivity(2 + 3) over carriage", 13, "does not reach carriage"},
		{"sensitivity(carriage.A) over carriage", 13, "a number stands here"},
		{"sensitivity(stabilizable(carriage)) over carriage", 13, "true or false"},
		{"sensitivity(carriage.given.m, 2) over carriage", 1, "takes one number"},
		{"sensitivity(carriage.given.m) over cariage", 36, "cariage is not known"},
		{"sensitivity(carriage.given.m) over carriage samples 5", 31, "no samples"},
		{"sensitivity(carriage.given.m) over carriage, carriage", 46, "named twice"},
		{"schedule t = assign_poles(carriage, [-1, -2]) over carriage.n from 1 kg to 2 kg in 3 steps", 61, "no parameter n"},
		{"schedule t = assign_poles(carriage, [-1, -2]) over carriage.m from 1 kg to 2 m in 3 steps", 76, "m is in kg, and this is in m"},
		{"schedule t = assign_poles(carriage, [-1, -2]) over carriage.m from 1 to 2 kg in 3 steps", 68, "no unit"},
		{"schedule t = assign_poles(carriage, [-1, -2]) over carriage.m from 1 kg to 1 kg in 3 steps", 76, "same value"},
		{"schedule t = assign_poles(carriage, [-1, -2]) over carriage.m from 1 kg to 2 kg in 1 steps", 84, "whole number from 2"},
		{"schedule t = assign_poles(carriage, [-1, -2]) over carriage.m from -1 kg to 1 kg in 3 steps", 52, "at m 0 kg"},
		{"schedule t = assign_poles(carriage, [-1]) over carriage.m from 1 kg to 2 kg in 3 steps", 37, "at m 1 kg: 1 pole for 2 states"},
		{"schedule t = 3 over carriage.m from 1 kg to 2 kg in 3 steps", 14, "does not reach carriage"},
		{"schedule t = carriage over carriage.m from 1 kg to 2 kg in 3 steps", 14, "a gain, a matrix or a number"},
		{"schedule t = carriage.given.m over carriage.m from 1 kg to 2 kg in 3 steps\nt.at(3 kg)", 6, "outside the schedule"},
		{"schedule t = carriage.given.m over carriage.m from 1 kg to 2 kg in 3 steps\nt.at(1 m)", 6, "m is in kg, and this is in m"},
		{"study t = 3 over carriage", 11, "does not reach carriage"},
		{"study t = carriage.A over carriage", 11, "a number stands here"},
		{"study t = carriage.given.m over carriage samples 0", 50, "whole number from 1"},
		{"study t = carriage.given.m over carriage samples 2.5", 50, "whole number from 1"},
		{"study t = carriage.given.m over m", 33, "m is not known"},
		{"P = plant([[1]], [[1]])\nstudy t = slowest_decay(P) over P", 33, "a model stands here"},
	} {
		session := eval.New(eval.Options{Builtins: builtins.Table(), Library: stdlib.Files})
		var got *diag.Error
		session.RunText(context.Background(), diag.NewSource("varied", carriage+c.text), func(e eval.Event) {
			if e.Error != nil {
				got = e.Error
			}
		})
		if got == nil {
			t.Errorf("%s: not refused", c.text)
			continue
		}
		line, column := got.Source.Position(got.Span.Start)
		if want := 8 + strings.Count(c.text, "\n"); line != want || column != c.column || !strings.Contains(got.Message, c.says) {
			t.Errorf("%s:\n%d:%d wanted with %q\n%s", c.text, want, c.column, c.says, got.Render())
		}
	}
}

// TestSensitivityLeavesOutWhatCannotBeTaken: a parameter at zero without a tolerance is told apart.
func TestSensitivityLeavesOutWhatCannotBeTaken(t *testing.T) {
	session := eval.New(eval.Options{Builtins: builtins.Table(), Library: stdlib.Files})
	var shown eval.Event
	session.RunText(context.Background(), diag.NewSource("varied", carriage+"sensitivity(-carriage.A[2, 1]) over carriage"), func(e eval.Event) {
		if e.Error != nil {
			t.Fatal(e.Error.Render())
		}
		if e.Shown != nil {
			shown = e
		}
	})
	text := ""
	for _, n := range notesOf(shown) {
		text += n
	}
	if !strings.Contains(text, "bare: its nominal value is zero and it has no tolerance") {
		t.Errorf("the note is missing: %q", text)
	}
}

func notesOf(e eval.Event) []string {
	if e.Shown == nil {
		return nil
	}
	r, ok := e.Shown.Value.(*value.Report)
	if !ok {
		return nil
	}
	return r.Notes
}

// TestASampleTimeThatIsTakenIsSaid: a function of z without one is taken at 1 s where that matters.
func TestASampleTimeThatIsTakenIsSaid(t *testing.T) {
	for text, said := range map[string]bool{
		"margins(0.1/(z - 0.5)).degrees": true, "slowest_decay(0.1/(z - 0.5))": true, "poles(0.1/(z - 0.5))": false,
		"slowest_decay(timed(0.1/(z - 0.5), every: 2 s))": false, "slowest_decay(1/(s + 2))": false,
	} {
		notes := 0
		eval.New(eval.Options{Builtins: builtins.Table(), Library: stdlib.Files}).RunText(context.Background(), diag.NewSource("untimed", text), func(e eval.Event) {
			if e.Error != nil {
				t.Error(e.Error.Render())
			}
			if strings.Contains(e.Note, "1 s is taken") {
				notes++
			}
		})
		if (notes == 1) != said {
			t.Errorf("%s: %d notes", text, notes)
		}
	}
}
