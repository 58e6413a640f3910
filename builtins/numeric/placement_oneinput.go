package numeric

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
)

// reducedGain is what acts on the reached part: rows·k is added to its first
// rows, A_reached − [k; 0] has the wanted poles.
type reducedGain struct {
	k      []float64 // inputs × reached
	method string
	// x holds the eigenvectors when the loop is diagonalizable by design: real
	// ones, and √2 times the real and imaginary parts for pairs. order lists
	// the poles they belong to, sensitivities theirs, condition is κ₂(x).
	x             []float64
	condition     float64
	sensitivities []float64
	order         []wantedPole
}

// rotation is the unitary [c, s; −s̄, c] with real c.
type rotation struct {
	c float64
	s complex128
}

// oneInput assigns all poles of the reached part through its single
// independent input.
func (t *assignment) oneInput() (*reducedGain, error) {
	r := t.reached
	out := &reducedGain{method: "one independent input: Hessenberg form, poles split off one by one (Miminis & Paige 1982)"}
	if r == 0 {
		return out, nil
	}
	out.k = hessenbergGain(r, t.a, gainOrder(t.list()))
	return out, nil
}

// gainOrder arranges the poles for the one-input method: largest first, pairs
// together, as deflation is most accurate when the far poles go first.
func gainOrder(poles []complex128) []complex128 {
	out := append([]complex128(nil), poles...)
	for i := 1; i < len(out); i++ {
		for j := i; j > 0; j-- {
			before, after := cmplx.Abs(out[j-1]), cmplx.Abs(out[j])
			if before > after || before == after && (real(out[j-1]) < real(out[j]) || real(out[j-1]) == real(out[j])) {
				break
			}
			out[j-1], out[j] = out[j], out[j-1]
		}
	}
	return out
}

// hessenbergGain returns the row k with spectrum(H − e₁·k) = poles for a real
// upper Hessenberg H (n×n) without zero below its diagonal.
//
// For each pole p the rotations P that clear the subdiagonal of H − pI from
// below make the first column of P the closed-loop eigenvector: (H − pI)·P·e₁
// is a multiple of e₁, which the gain's component along it must supply. The
// rest, PᴴHP without its first row and column, is Hessenberg again.
func hessenbergGain(n int, a []float64, poles []complex128) []float64 {
	h := make([]complex128, n*n)
	for i := 0; i < n; i++ {
		for j := max(0, i-1); j < n; j++ {
			h[i*n+j] = complex(a[i*n+j], 0)
		}
	}
	sweeps := make([][]rotation, n)
	parts := make([]complex128, n)
	push := complex(1, 0) // the input vector is push·e₁
	for step, p := range poles {
		rotations := make([]rotation, n-step) // index i: columns i−1 and i
		for i := step; i < n; i++ {
			h[i*n+i] -= p
		}
		for i := n - 1; i > step; i-- {
			g := clearing(h[i*n+i-1], h[i*n+i])
			rotations[i-step] = g
			g.columns(h, n, step, i+1, i)
			h[i*n+i-1] = 0
		}
		parts[step] = h[step*n+step] / push
		for i := n - 1; i > step; i-- {
			rotations[i-step].rows(h, n, step, i)
		}
		for i := step; i < n; i++ {
			h[i*n+i] += p
		}
		sweeps[step] = rotations
		if step+1 < n {
			// e₁ᵀ·P has the entries c and s; the input vector becomes their conjugates.
			push *= cmplx.Conj(rotations[1].s)
		}
	}
	return unrotated(n, sweeps, parts)
}

// clearing is the rotation of a column pair (x, y) ← (c·x − s̄·y, s·x + c·y) that
// clears x.
func clearing(x, y complex128) rotation {
	size := cmplx.Abs(x)
	if size == 0 {
		return rotation{c: 1}
	}
	below := cmplx.Abs(y)
	length := math.Hypot(size, below)
	if below == 0 {
		return rotation{c: 0, s: 1}
	}
	// c·x = s̄·y with c = |y|/length: s̄ = c·x/y.
	c := below / length
	return rotation{c: c, s: cmplx.Conj(complex(c, 0) * x / y)}
}

// columns applies the rotation to columns i−1 and i of rows from … to−1.
func (g rotation) columns(h []complex128, n, from, to, i int) {
	c, s, conj := complex(g.c, 0), g.s, cmplx.Conj(g.s)
	for k := from; k < to; k++ {
		x, y := h[k*n+i-1], h[k*n+i]
		h[k*n+i-1], h[k*n+i] = c*x-conj*y, s*x+c*y
	}
}

// rows applies the adjoint to rows i−1 and i, columns from step on.
func (g rotation) rows(h []complex128, n, step, i int) {
	c, s, conj := complex(g.c, 0), g.s, cmplx.Conj(g.s)
	upper, lower := h[(i-1)*n+step:i*n], h[i*n+step:(i+1)*n]
	for k := range upper {
		x, y := upper[k], lower[k]
		upper[k], lower[k] = c*x-s*y, conj*x+c*y
	}
}

// unrotated carries the gain's components back to the original coordinates:
// k ← [part, k]·Pᴴ, last sweep first.
func unrotated(n int, sweeps [][]rotation, parts []complex128) []float64 {
	k := make([]complex128, n)
	for step := n - 1; step >= 0; step-- {
		k[step] = parts[step]
		for i := step + 1; i < n; i++ {
			g := sweeps[step][i-step]
			x, y := k[i-1], k[i]
			k[i-1] = complex(g.c, 0)*x + cmplx.Conj(g.s)*y
			k[i] = complex(g.c, 0)*y - g.s*x
		}
	}
	out := make([]float64, n)
	for i, v := range k {
		out[i] = real(v)
	}
	return out
}

// perturbedRuns is how many randomly changed problems the condition estimate
// solves, relativeChange the size of the change: far above rounding and small
// enough to be linear.
const (
	perturbedRuns  = 3
	relativeChange = 0x1p-40
)

// judgeOneInput estimates the digits of the gain by solving problems whose
// [A b] differs by a random matrix of relative size 2⁻⁴⁰.
func (t *assignment) judgeOneInput(placement *Placement, reduced *reducedGain) error {
	t.judgePoles(placement)
	if t.reached == 0 || len(t.kept) > 0 {
		return nil
	}
	n := t.form.n
	reference := append([]float64(nil), reduced.k...)
	scaleRow(reference, n, 0, 1/t.form.b[0])
	size := blocksNorm(reference)
	if size == 0 {
		size = blocksNorm(t.a) / math.Abs(t.form.b[0])
	}
	order := gainOrder(t.list())
	random := rand.New(rand.NewPCG(1994, 1))
	largest := 0.0
	for run := 0; run < perturbedRuns; run++ {
		changed := newStaircase(n, 1, t.form.a, t.form.b, 0, nil, 0)
		step := relativeChange * blocksNorm(changed.a, changed.b) / float64(n)
		for _, block := range [][]float64{changed.a, changed.b} {
			for i := range block {
				block[i] += step * random.NormFloat64()
			}
		}
		if err := changed.reduce(); err != nil {
			return err
		}
		gain := hessenbergGain(n, changed.a, order)
		difference := append([]float64(nil), reference...)
		for i := range difference {
			for j, g := range gain {
				difference[i] -= g / changed.b[0] * changed.q[i*n+j]
			}
		}
		largest = math.Max(largest, blocksNorm(difference))
	}
	placement.Certificate.Condition = largest / size / relativeChange
	placement.Certificate.Digits = DigitsOf(8*machineEpsilon, placement.Certificate.Condition)
	return nil
}
