package numeric

import "math"

// stateSpace holds the four matrices of a system row by row: a is n×n, b n×m,
// c p×n, d p×m. Pieces that a question does not need have m or p equal to 0.
type stateSpace struct {
	n, m, p    int
	a, b, c, d []float64
}

// systemScaling holds powers of two: x = diag(states)·x̂, u = diag(inputs)·û,
// ŷ = diag(outputs)·y.
type systemScaling struct {
	states, inputs, outputs []float64
}

// scalingSweeps bounds the balancing iteration; a few sweeps settle it, more
// than twenty were never seen.
const scalingSweeps = 60

// largestScaleExponent keeps products of two scale factors inside binary64.
const largestScaleExponent = 400

// balanced scales states, inputs and outputs of s in place by powers of two, so
// that the row and the column of each state are about as long as each other and
// every column of [B; D] and row of [C D] is about as long as A's
// scale-invariant size. No rounding happens, and a change of units of
// states, inputs or outputs leaves the balanced system nearly as it was.
//
// E. E. Osborne, J. ACM 7, 1960, with the diagonal counted (R. James,
// J. Langou, B. Lowery, arXiv:1401.5766, 2014), which keeps rounding noise in a
// block that ought to vanish from being scaled up.
func (s *stateSpace) balanced() systemScaling {
	scale := systemScaling{states: unitScales(s.n), inputs: unitScales(s.m), outputs: unitScales(s.p)}
	target := s.invariantSize()
	for sweep := 0; sweep < scalingSweeps; sweep++ {
		changed := false
		for i := 0; i < s.n; i++ {
			if f := s.stateFactor(i, target, scale.states[i]); f != 1 {
				s.scaleState(i, f)
				scale.states[i] *= f
				changed = true
			}
		}
		for j := 0; j < s.m; j++ {
			length := math.Hypot(columnLength(s.b, s.n, s.m, j), columnLength(s.d, s.p, s.m, j))
			if f := powerFactor(target, length, scale.inputs[j]); f != 1 {
				scaleColumn(s.b, s.n, s.m, j, f)
				scaleColumn(s.d, s.p, s.m, j, f)
				scale.inputs[j] *= f
				changed = true
			}
		}
		for i := 0; i < s.p; i++ {
			length := math.Hypot(rowLength(s.c, s.n, i), rowLength(s.d, s.m, i))
			if f := powerFactor(target, length, scale.outputs[i]); f != 1 {
				scaleRow(s.c, s.n, i, f)
				scaleRow(s.d, s.m, i, f)
				scale.outputs[i] *= f
				changed = true
			}
		}
		if !changed {
			break
		}
	}
	return scale
}

// invariantSize is a size of A that no scaling of the states changes: the
// largest |a_ii| or √|a_ij·a_ji|; 1 when all of them vanish.
func (s *stateSpace) invariantSize() float64 {
	size := 0.0
	for i := 0; i < s.n; i++ {
		size = math.Max(size, math.Abs(s.a[i*s.n+i]))
		for j := i + 1; j < s.n; j++ {
			size = math.Max(size, math.Sqrt(math.Abs(s.a[i*s.n+j]))*math.Sqrt(math.Abs(s.a[j*s.n+i])))
		}
	}
	if size == 0 {
		return 1
	}
	return size
}

// stateFactor is the power of two by which state i should be scaled next; now
// is its scale so far.
func (s *stateSpace) stateFactor(i int, target, now float64) float64 {
	row := math.Hypot(rowLength(s.a, s.n, i), rowLength(s.b, s.m, i))
	column := math.Hypot(columnLength(s.a, s.n, s.n, i), columnLength(s.c, s.p, s.n, i))
	switch {
	case row == 0 && column == 0:
		return 1
	case column == 0:
		return powerFactor(row, target, now)
	case row == 0:
		return powerFactor(target, column, now)
	}
	return powerFactor(math.Sqrt(row), math.Sqrt(column), now)
}

// powerFactor rounds above/below to a power of two. It is 1 when either
// vanishes, when the ratio is within a factor 2 of 1 and when the total scale
// would leave the safe range.
func powerFactor(above, below, now float64) float64 {
	if above == 0 || below == 0 {
		return 1
	}
	exponent := math.Round(math.Log2(above) - math.Log2(below))
	if math.Abs(exponent) < 1 || math.Abs(exponent+math.Log2(now)) > largestScaleExponent {
		return 1
	}
	return math.Ldexp(1, int(exponent))
}

// scaleState puts x_i = f·x̂_i.
func (s *stateSpace) scaleState(i int, f float64) {
	scaleColumn(s.a, s.n, s.n, i, f)
	scaleColumn(s.c, s.p, s.n, i, f)
	scaleRow(s.a, s.n, i, 1/f)
	scaleRow(s.b, s.m, i, 1/f)
}

// spread is the ratio of the largest to the smallest state scale.
func (scale systemScaling) spread() float64 {
	low, high := math.Inf(1), 0.0
	for _, f := range scale.states {
		low, high = math.Min(low, f), math.Max(high, f)
	}
	if high == 0 {
		return 1
	}
	return high / low
}

func unitScales(n int) []float64 {
	v := make([]float64, n)
	for i := range v {
		v[i] = 1
	}
	return v
}

func rowLength(m []float64, columns, i int) float64 {
	sum, scale := 0.0, 0.0
	for _, v := range m[i*columns : i*columns+columns] {
		scale = math.Max(scale, math.Abs(v))
	}
	if scale == 0 {
		return 0
	}
	for _, v := range m[i*columns : i*columns+columns] {
		sum += (v / scale) * (v / scale)
	}
	return scale * math.Sqrt(sum)
}

func columnLength(m []float64, rows, columns, j int) float64 {
	sum, scale := 0.0, 0.0
	for i := 0; i < rows; i++ {
		scale = math.Max(scale, math.Abs(m[i*columns+j]))
	}
	if scale == 0 {
		return 0
	}
	for i := 0; i < rows; i++ {
		v := m[i*columns+j] / scale
		sum += v * v
	}
	return scale * math.Sqrt(sum)
}

func scaleRow(m []float64, columns, i int, f float64) {
	row := m[i*columns : i*columns+columns]
	for j := range row {
		row[j] *= f
	}
}

func scaleColumn(m []float64, rows, columns, j int, f float64) {
	for i := 0; i < rows; i++ {
		m[i*columns+j] *= f
	}
}

// blocksNorm is the Frobenius norm of several blocks taken together.
func blocksNorm(blocks ...[]float64) float64 {
	scale := 0.0
	for _, block := range blocks {
		for _, v := range block {
			scale = math.Max(scale, math.Abs(v))
		}
	}
	if scale == 0 {
		return 0
	}
	sum := 0.0
	for _, block := range blocks {
		for _, v := range block {
			sum += (v / scale) * (v / scale)
		}
	}
	return scale * math.Sqrt(sum)
}
