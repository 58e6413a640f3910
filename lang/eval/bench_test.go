package eval_test

import (
	"context"
	"fmt"
	"strings"
	"testing"

	"gainwright/lang/diag"
	"gainwright/lang/eval"
)

func benchmarkText(b *testing.B, text string) {
	b.ReportAllocs()
	src := diag.NewSource("bench.gain", text)
	for b.Loop() {
		s := eval.New(eval.Options{Builtins: builtins(), Library: stdlib})
		if out := s.RunText(context.Background(), src, func(eval.Event) {}); out.Failed {
			b.Fatal("failed")
		}
	}
}

// Parse, compile and run one expression in a fresh session.
func BenchmarkOneExpression(b *testing.B) { benchmarkText(b, "(1 + 2) * 3 - 4 / 5") }

// A file of 100 statements with matrices of six rows.
func BenchmarkHundredStatements(b *testing.B) {
	var t strings.Builder
	t.WriteString("A = [[0,1,0,0,0,0],[-2,-3,1,0,0,0],[0,0,0,1,0,0],[1,0,-5,-1,0,0],[0,0,0,0,0,1],[0,0,1,0,-7,-2]]\n")
	for i := range 99 {
		fmt.Fprintf(&t, "A%d = A * A - %d * A + [[1, 0], [0, 1]][1, 1] * A\n", i, i+1)
	}
	benchmarkText(b, t.String())
}

// A loop of a million additions: the cost of one operation.
func BenchmarkLoop(b *testing.B) {
	benchmarkText(b, "[x + 1 for each x of whole_numbers(100000)]")
}

// A defined function called 22 thousand times.
func BenchmarkCalls(b *testing.B) {
	benchmarkText(b, "define f(n) = if n < 2 { n } else { f(n - 1) + f(n - 2) }\nf(20)")
}
