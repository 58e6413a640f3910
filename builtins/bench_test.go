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

// BenchmarkResponse is a step response of 10 000 points for a plant of six states.
func BenchmarkResponse(b *testing.B) {
	benchmarkCall(b, sixStates, `response(P, to: "step", until: 40 s, points: 10000)`)
}

// BenchmarkSweep is a frequency response of 500 points for a plant of 200 states.
func BenchmarkSweep(b *testing.B) {
	var rows []string
	for i := range 100 {
		row := make([]string, 200)
		for j := range row {
			row[j] = "0"
		}
		row[2*i+1] = "1"
		rows = append(rows, "["+strings.Join(row, ",")+"]")
		for j := range row {
			row[j] = fmt.Sprintf("%.4f", 0.002*float64((i*7+j*13)%11-5))
		}
		row[2*i], row[2*i+1] = fmt.Sprintf("-%d", i+1), fmt.Sprintf("-0.%02d", i%90+1)
		rows = append(rows, "["+strings.Join(row, ",")+"]")
	}
	text := "A = " + strings.ReplaceAll("["+strings.Join(rows, ",\n")+"]", "0.0000", "0.0001") + "\nP = plant(A, row(identity(200), 2)ᵀ, row(identity(200), 1))\n"
	benchmarkCall(b, text, "sweep(P, from: 0.1 rad/s, to: 30 rad/s, points: 500)")
}

const sixStates = "P = plant([[0,1,0,0,0,0],[-2.1,-0.3,1.1,0,0,0],[0,0,0,1,0,0],[1.1,0,-3.3,-0.2,1.2,0],[0,0,0,0,0,1],[0,0,1.4,0,-1.7,-0.25]], [[0],[1],[0],[0],[0],[0.5]], [[1,0,0,0,0,0]])\n"

// benchmarkCall times one statement in a session that ran the text before.
func benchmarkCall(b *testing.B, text, call string) {
	b.Helper()
	session := eval.New(eval.Options{Builtins: builtins.Table(), Library: stdlib.Files, Interactive: true})
	run := func(text string) {
		session.RunText(context.Background(), diag.NewSource("bench", text), func(e eval.Event) {
			if e.Error != nil {
				b.Fatal(e.Error.Render())
			}
		})
	}
	run(text)
	for b.Loop() {
		run("r = " + call)
	}
}
