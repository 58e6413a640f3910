package numeric

import "math"

// balanceLimit bounds the exponents of state scales, so that products of two
// scales and an entry stay finite.
const balanceLimit = 200

// symplecticBalance finds powers of two d such that the Hamiltonian matrix
//
//	[ A  −G ]
//	[−Q  −Aᵀ]
//
// has rows and columns of like size after x = D·x̃, that is after A → D⁻¹AD,
// G → D⁻¹GD⁻¹, Q → DQD. Absolute values of the n×n row-major arguments count;
// they are not changed. The same scales serve the symplectic pencil.
//
// P. Benner, Symplectic balancing of Hamiltonian matrices, SIAM J. Sci. Comput.
// 22, 2001 (the scaling step, with the 1-norm and a uniform scale first).
func symplecticBalance(n int, a, g, q []float64) []float64 {
	a, g, q = absolute(a), absolute(g), absolute(q)
	exponents := make([]int, n)
	if top, bottom := largestOf(g), largestOf(q); top > 0 && bottom > 0 {
		uniform := int(math.Round((math.Log2(top) - math.Log2(bottom)) / 4))
		for i := range exponents {
			rescaleState(n, i, uniform, exponents, a, g, q)
		}
	}
	for sweep := 0; sweep < 20; sweep++ {
		changed := false
		for i := 0; i < n; i++ {
			if shift := stateShift(n, i, a, g, q); shift != 0 && abs(exponents[i]+shift) <= balanceLimit {
				rescaleState(n, i, shift, exponents, a, g, q)
				changed = true
			}
		}
		if !changed {
			break
		}
	}
	scale := make([]float64, n)
	for i, e := range exponents {
		scale[i] = math.Ldexp(1, e)
	}
	return scale
}

func abs(i int) int {
	if i < 0 {
		return -i
	}
	return i
}

// stateShift proposes by which power of two to rescale state i, 0 when the gain
// in norm is under 5 %. A state without weight (or without drive) is measured
// against its own rate, so that its scale does not run away.
func stateShift(n, i int, a, g, q []float64) int {
	var column, row float64
	for j := 0; j < n; j++ {
		if j != i {
			column += a[j*n+i] + q[i*n+j]
			row += a[i*n+j] + g[i*n+j]
		}
	}
	qi, gi, own := q[i*n+i], g[i*n+i], 0.0
	top, bottom := row+gi, column+qi
	if top == 0 || bottom == 0 {
		own = a[i*n+i]
		top, bottom = top+own, bottom+own
	}
	if top == 0 || bottom == 0 || top-top != 0 || bottom-bottom != 0 {
		return 0
	}
	shift := int(math.Round((math.Log2(top) - math.Log2(bottom)) / 2))
	for ; shift != 0; shift /= 2 {
		f := math.Ldexp(1, shift)
		if own+column*f+row/f+qi*f*f+gi/f/f < 0.95*(own+column+row+qi+gi) {
			return shift
		}
	}
	return 0
}

// rescaleState applies x_i = 2^shift·x̃_i to the three matrices.
func rescaleState(n, i, shift int, exponents []int, a, g, q []float64) {
	if shift == 0 {
		return
	}
	exponents[i] += shift
	f := math.Ldexp(1, shift)
	for j := 0; j < n; j++ {
		a[i*n+j] /= f
		a[j*n+i] *= f
		g[i*n+j] /= f
		g[j*n+i] /= f
		q[i*n+j] *= f
		q[j*n+i] *= f
	}
}
