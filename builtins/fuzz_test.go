package builtins_test

import (
	"context"
	"os"
	"path/filepath"
	"testing"
	"time"

	"gainwright/builtins"
	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/figure"
	"gainwright/lang/render"
	"gainwright/stdlib"
)

// FuzzLanguage runs arbitrary text with all built-ins, shows what comes out in every form,
// and draws it: no panic, no internal error, in bounded time.
func FuzzLanguage(f *testing.F) {
	for _, b := range builtins.Table() {
		for _, x := range b.Examples {
			f.Add(x.Input)
		}
	}
	files, _ := filepath.Glob("../scripts/*.gain")
	for _, file := range files {
		text, err := os.ReadFile(file)
		if err != nil {
			f.Fatal(err)
		}
		if len(text) < 3000 {
			f.Add(string(text))
		}
	}
	for _, text := range []string{
		carriage + "sensitivity(slowest_decay(carriage)) over carriage",
		carriage + "schedule t = assign_poles(carriage, [-1, -2]) over carriage.m from 1 kg to 3 kg in 3 steps\nt\nt.at(1.5 kg)",
		carriage + "study q = { a: least_damping(carriage), b: carriage.given.m } over carriage samples 20 at corners\nq\nq.a\nrequire q.a > 0",
		"S = sampled(plant([[0,1],[-4,-1.2]],[[0],[1]],[[4,0]]), every: 100 ms)\npole_map(S, damping: 0.5)\nresponse(S)\nfigures(response(S))",
	} {
		f.Add(text)
	}
	f.Fuzz(func(t *testing.T, text string) {
		if len(text) > 4000 {
			return
		}
		ctx, cancel := context.WithTimeout(context.Background(), time.Second)
		defer cancel()
		session := eval.New(eval.Options{Builtins: builtins.Table(), Library: stdlib.Files, Interactive: true,
			Limits: eval.Limits{Steps: 100_000, Bytes: 64 << 20, Depth: 100, Time: 300 * time.Millisecond}})
		src := diag.NewSource("fuzz.gain", text)
		begin := time.Now()
		session.RunText(ctx, src, func(e eval.Event) {
			if e.Error != nil && e.Error.Kind == diag.Internal {
				t.Errorf("%s (%v)", e.Error.Render(), e.Error.Cause)
			}
			render.JSON(e, src)
			if e.Shown != nil {
				render.Text(e.Text, e.Shown.Value, e.Shown.In, render.Options{Width: 60, Drawing: figure.Terminal})
				render.SheetOf(e.Text, e.Shown.Value, e.Shown.In, render.Options{})
				if d, ok := figure.Draw(e.Shown.Value); ok {
					d.SVG("f")
				}
			}
			render.VerdictOf(e, render.Options{})
		})
		if took := time.Since(begin); took > 10*time.Second {
			t.Errorf("took %v", took)
		}
	})
}
