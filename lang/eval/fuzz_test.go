package eval_test

import (
	"context"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"gainwright/lang/diag"
	"gainwright/lang/eval"
)

// Arbitrary text is parsed and evaluated without a panic, in bounded time and memory, and
// what it says names no Go type.
func FuzzEvaluate(f *testing.F) {
	files, _ := filepath.Glob("testdata/*.gain")
	for _, path := range files {
		text, err := os.ReadFile(path)
		if err != nil {
			f.Fatal(err)
		}
		for _, line := range strings.Split(string(text), "\n") {
			f.Add(line)
		}
	}
	for _, text := range []string{
		strings.Repeat("(", 10_000), strings.Repeat("[", 10_000), strings.Repeat("-", 10_000) + "1",
		strings.Repeat("1+", 3_000) + "1", "1" + strings.Repeat("ᵀ", 3_000), strings.Repeat("not ", 5_000) + "true",
		"define f(x) = f(f(x))\nf(1)", "9^9^9^9", "(s + 1)^9999", "[[x for each x of whole_numbers(1000)] for each y of whole_numbers(1000)]",
		"A = ones(3000)\nA * Aᵀ * A * Aᵀ", "1e999999999", "0.1^99999", "x = [1, [2, [3, [4]]]]\nx[1..9]", "use \"use.gain\"",
		"claim [1, 2] is [[1, 2], [3]]", "claim s is s^99999", "model m {\n}", "require [1] == [[1]]", "[-2 ± 3i][1..2, 1]",
		"claim feedback([[0, 1], [0, 0]], [[0], [1]], [[2, 3]], [-1, -2]) is [[2.01, 3]]",
	} {
		f.Add(text)
	}
	f.Fuzz(func(t *testing.T, text string) {
		if len(text) > 20_000 {
			return
		}
		ctx, cancel := context.WithTimeout(context.Background(), time.Second)
		defer cancel()
		s := eval.New(eval.Options{
			Builtins: builtins(), Library: stdlib, Interactive: true,
			Limits: eval.Limits{Steps: 200_000, Bytes: 64 << 20, Depth: 100, Time: 500 * time.Millisecond},
		})
		start := time.Now()
		s.RunText(ctx, diag.NewSource("fuzz.gain", text), func(e eval.Event) {
			if e.Error == nil {
				return
			}
			e.Error.Render()
			expected := strings.Contains(text, "boom") || strings.Contains(text, "nothing")
			if e.Error.Kind == diag.Internal && !expected {
				t.Errorf("%s (%v)", e.Error.Render(), e.Error.Cause)
			}
		})
		if took := time.Since(start); took > 10*time.Second {
			t.Errorf("took %v", took)
		}
	})
}
