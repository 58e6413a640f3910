package builtins_test

import (
	"context"
	"fmt"
	"math/rand/v2"
	"strings"
	"testing"

	"gainwright/builtins"
	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/stdlib"
)

func runAll(b *testing.B, text string) {
	b.Helper()
	for b.Loop() {
		session := eval.New(eval.Options{Builtins: builtins.Table(), Library: stdlib.Files})
		session.RunText(context.Background(), diag.NewSource("bench", text), func(e eval.Event) {
			if e.Error != nil {
				b.Fatal(e.Error.Render())
			}
		})
	}
}

// BenchmarkHundredStatements designs 33 gains for a plant of six states, with their polynomials and a requirement each.
func BenchmarkHundredStatements(b *testing.B) {
	var text strings.Builder
	text.WriteString("P = plant([[0,1,0,0,0,0],[-2.1,-0.3,1.1,0,0,0],[0,0,0,1,0,0],[1.1,0,-3.3,-0.2,1.2,0],[0,0,0,0,0,1],[0,0,1.4,0,-1.7,-0.25]], [[0],[1],[0],[0],[0],[0.5]], [[1,0,0,0,0,0]])\n")
	for i := range 33 {
		fmt.Fprintf(&text, "K%d = assign_poles(P, [-1 ± %d.5i, -2 ± 1i, -%d, -4])\n", i, i%7+1, i+3)
		fmt.Fprintf(&text, "characteristic_polynomial(closed(P, K%d))\nrequire least_damping(closed(P, K%d)) > 0.05\n", i, i)
	}
	runAll(b, text.String())
}

// BenchmarkExactGain finds exact ranks and gains of plants with entries of one decimal.
func BenchmarkExactGain(b *testing.B) {
	for _, n := range []int{10, 20, 30} {
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			r := rand.New(rand.NewPCG(1, uint64(n)))
			rows := func(n, m int) string {
				var all []string
				for range n {
					var row []string
					for range m {
						row = append(row, fmt.Sprintf("%g", float64(r.IntN(19)-9)/10))
					}
					all = append(all, "["+strings.Join(row, ", ")+"]")
				}
				return "[" + strings.Join(all, ", ") + "]"
			}
			var poles []string
			for k := range n {
				poles = append(poles, fmt.Sprint(-float64(k+1)/4))
			}
			runAll(b, "A = "+rows(n, n)+"\nB = "+rows(n, 1)+"\nreachability(A, B).rank\nassign_poles(A, B, ["+strings.Join(poles, ", ")+"]).values[1, 1]\n")
		})
	}
}
