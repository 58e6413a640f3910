package value

import (
	"math/big"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
)

// Order is the number of states.
func (p *Plant) Order() int { return p.A.rows }

func (p *Plant) inputCount() int  { return p.D.cols }
func (p *Plant) outputCount() int { return p.D.rows }

// IsExact tells whether all four matrices are exact.
func (p *Plant) IsExact() bool {
	return p.A.IsExact() && p.B.IsExact() && p.C.IsExact() && p.D.IsExact()
}

// isStatic tells whether the plant is a constant gain that fits any sample time.
func (p *Plant) isStatic() bool { return p.A.rows == 0 && p.Every == nil }

// DefaultSignals makes n names from a letter: the letter alone when n is 1, else u1, u2, ….
func DefaultSignals(letter string, n int) []Signal {
	out := make([]Signal, n)
	for k := range out {
		out[k] = Signal{Name: letter, Unit: None()}
		if n > 1 {
			out[k].Name += Int(k + 1).Exact.RatString()
		}
	}
	return out
}

// zeroMatrix gives an exact matrix of zeros.
func zeroMatrix(r, c int) *Matrix { return ExactMatrix(exact.NewMatrix(r, c)) }

// staticPlant takes a constant gain as a plant without states.
func staticPlant(d *Matrix, inputs, outputs []Signal) *Plant {
	if inputs == nil {
		inputs = namesOr(d.Columns, "u", d.cols)
	}
	if outputs == nil {
		outputs = namesOr(d.Rows, "y", d.rows)
	}
	return &Plant{A: zeroMatrix(0, 0), B: zeroMatrix(0, d.cols), C: zeroMatrix(d.rows, 0), D: d,
		Inputs: inputs, Outputs: outputs, States: []Signal{}}
}

func namesOr(names []string, letter string, n int) []Signal {
	out := DefaultSignals(letter, n)
	if len(names) == n {
		for k, name := range names {
			out[k].Name = name
		}
	}
	return out
}

// joinBlocks puts a grid of matrices together: exact when all are. Sizes have been checked.
func joinBlocks(grid [][]*Matrix) (*Matrix, error) {
	rows, cols, isExact := 0, 0, true
	for i, row := range grid {
		rows += row[0].rows
		for _, block := range row {
			if i == 0 {
				cols += block.cols
			}
			isExact = isExact && block.IsExact()
		}
	}
	if err := CheckSize(rows, cols, isExact); err != nil {
		return nil, err
	}
	if isExact {
		return joinExact(grid, rows, cols), nil
	}
	re, im, worst := make([]float64, rows*cols), make([]float64, rows*cols), 0.0
	i0 := 0
	for _, row := range grid {
		j0 := 0
		for _, block := range row {
			x, y, err := block.floatsErr()
			for i := range block.rows {
				copy(re[(i0+i)*cols+j0:], x[i*block.cols:(i+1)*block.cols])
				if y != nil {
					copy(im[(i0+i)*cols+j0:], y[i*block.cols:(i+1)*block.cols])
				}
			}
			worst = max(worst, err)
			j0 += block.cols
		}
		i0 += row[0].rows
	}
	return FloatComplexMatrix(rows, cols, re, im, worst), nil
}

func joinExact(grid [][]*Matrix, rows, cols int) *Matrix {
	re, im := exact.NewMatrix(rows, cols), exact.NewMatrix(rows, cols)
	i0 := 0
	for _, row := range grid {
		j0 := 0
		for _, block := range row {
			for i := range block.rows {
				for j := range block.cols {
					re.Set(i0+i, j0+j, block.exactRe.At(i, j))
					if block.exactIm != nil {
						im.Set(i0+i, j0+j, block.exactIm.At(i, j))
					}
				}
			}
			j0 += block.cols
		}
		i0 += row[0].rows
	}
	return ExactComplexMatrix(re, im)
}

// sharedEvery finds the sample time of a combination.
func sharedEvery(a, b *Plant) (*Number, error) {
	switch {
	case a.isStatic():
		return b.Every, nil
	case b.isStatic():
		return a.Every, nil
	case a.Every == nil && b.Every == nil:
		return nil, nil
	case a.Every != nil && b.Every != nil && sameNumber(*a.Every, *b.Every):
		return a.Every, nil
	}
	return nil, sampleTimesDiffer(a.Every, b.Every)
}

// declared tells whether a signal's unit was given.
func (s Signal) declared() bool { return !s.Unit.IsNone() }

// unitFactors gives, for each pair of signals, by what a number in the unit of from is
// multiplied to be in the unit of to; nil when all are 1. Undeclared units fit any.
func unitFactors(from, to []Signal, relation string) (*Matrix, error) {
	factors, different := make([]Number, len(from)), false
	for k := range factors {
		factors[k] = Int(1)
		if k >= len(to) || !from[k].declared() || !to[k].declared() {
			continue
		}
		f, t := from[k].Unit, to[k].Unit
		if f.Dim != t.Dim {
			return nil, diag.New(diag.Unit, "the units do not fit: %s is in %s, %s %s is in %s",
				from[k].Name, unitName(f), relation, to[k].Name, unitName(t))
		}
		n, err := timesPi(Rat(new(big.Rat).Quo(f.scale(), t.scale())), f.Pi-t.Pi)
		if err != nil {
			return nil, err
		}
		factors[k] = n
		different = different || !sameNumber(n, Int(1))
	}
	if !different {
		return nil, nil
	}
	return diagonalMatrix(factors), nil
}

// diagonalMatrix puts numbers on the diagonal.
func diagonalMatrix(entries []Number) *Matrix {
	n := len(entries)
	isExact := true
	for _, e := range entries {
		isExact = isExact && e.Exact != nil
	}
	if isExact {
		m := exact.NewMatrix(n, n)
		for k, e := range entries {
			m.Set(k, k, e.Exact)
		}
		return ExactMatrix(m)
	}
	data, worst := make([]float64, n*n), 0.0
	for k, e := range entries {
		f, err := e.approx()
		data[k*n+k], worst = f, max(worst, err)
	}
	return FloatMatrix(n, n, data, worst)
}

// algebra carries out a chain of matrix operations and keeps the first error.
type algebra struct{ err error }

func (x *algebra) product(factors ...*Matrix) *Matrix {
	out := factors[0]
	for _, f := range factors[1:] {
		if x.err != nil {
			return out
		}
		out, x.err = multiplyMatrices(out, f)
	}
	return out
}

func (x *algebra) sum(a, b *Matrix) *Matrix {
	if x.err != nil {
		return a
	}
	var out *Matrix
	out, x.err = addMatrices(a, b)
	return out
}

func (x *algebra) join(grid [][]*Matrix) *Matrix {
	if x.err != nil {
		return grid[0][0]
	}
	var out *Matrix
	out, x.err = joinBlocks(grid)
	return out
}

// seriesPlants gives a·b: u → b → a → y. States of a come first.
func seriesPlants(a, b *Plant) (*Plant, error) {
	if a.inputCount() != b.outputCount() {
		return nil, diag.New(diag.Shape, "the channels do not fit: the right system has %s, the left one %s",
			count(b.outputCount(), "output"), count(a.inputCount(), "input"))
	}
	every, err := sharedEvery(a, b)
	if err != nil {
		return nil, err
	}
	factors, err := unitFactors(b.Outputs, a.Inputs, "but it drives")
	if err != nil {
		return nil, err
	}
	var x algebra
	aB, aD := a.B, a.D
	if factors != nil {
		aB, aD = x.product(aB, factors), x.product(aD, factors)
	}
	out := &Plant{Every: every, Inputs: b.Inputs, Outputs: a.Outputs,
		A: x.join([][]*Matrix{{a.A, x.product(aB, b.C)}, {zeroMatrix(b.Order(), a.Order()), b.A}}),
		B: x.join([][]*Matrix{{x.product(aB, b.D)}, {b.B}}),
		C: x.join([][]*Matrix{{a.C, x.product(aD, b.C)}}),
		D: x.product(aD, b.D)}
	if x.err != nil {
		return nil, x.err
	}
	out.States = uniqueSignals(a.States, b.States)
	return out, seriesPoint(out, a, b, factors)
}

// seriesPoint joins operating points.
func seriesPoint(out, a, b *Plant, factors *Matrix) error {
	out.X0 = joinPoint(a.X0, b.X0, a.Order(), b.Order())
	out.U0, out.Y0 = b.U0, a.Y0
	var err error
	switch {
	case b.isStatic() && a.U0 != nil:
		out.U0 = nil
		if !allZero(a.U0) {
			out.Notes = append(out.Notes, "the operating point of the input is not carried through the gain in front")
		}
	case a.isStatic() && b.Y0 != nil:
		out.Y0, err = applyTo(a.D, b.Y0)
	case a.U0 != nil || b.Y0 != nil:
		from, problem := applyTo(factors, b.Y0)
		if problem != nil {
			return problem
		}
		if !samePoint(from, a.U0) {
			out.Notes = append(out.Notes, "the operating points differ where the systems join: "+
				"the right system's output does not rest where the left system's input does")
		}
	}
	return err
}

// applyTo multiplies a vector of numbers by a matrix; nil matrices and vectors stay what they are.
func applyTo(m *Matrix, v []Number) ([]Number, error) {
	if m == nil || v == nil {
		return v, nil
	}
	column, err := columnOf(v)
	if err != nil {
		return nil, err
	}
	product, err := multiplyMatrices(m, column)
	if err != nil {
		return nil, err
	}
	out := make([]Number, product.rows)
	for k := range out {
		out[k], _ = product.At(k, 0).(Number)
	}
	return out, nil
}

func allZero(v []Number) bool {
	for _, n := range v {
		if !n.IsZero() {
			return false
		}
	}
	return true
}

// samePoint compares operating points; nil is zero.
func samePoint(a, b []Number) bool {
	if a == nil || b == nil {
		return allZero(a) && allZero(b)
	}
	for k := range min(len(a), len(b)) {
		if !Equalish(a[k], b[k]) {
			return false
		}
	}
	return true
}

func joinPoint(a, b []Number, n, m int) []Number {
	if a == nil && b == nil {
		return nil
	}
	out := make([]Number, 0, n+m)
	for _, part := range [...]struct {
		values []Number
		size   int
	}{{a, n}, {b, m}} {
		for k := range part.size {
			if k < len(part.values) {
				out = append(out, part.values[k])
			} else {
				out = append(out, Int(0))
			}
		}
	}
	return out
}

// uniqueSignals joins names; a later one that is taken gets a subscript: x, x₂, x₃.
func uniqueSignals(a, b []Signal) []Signal {
	out := append(append(make([]Signal, 0, len(a)+len(b)), a...), b...)
	taken := map[string]bool{}
	for k := range out {
		name := out[k].Name
		for next := 2; taken[out[k].Name]; next++ {
			out[k].Name = name + subscript(next)
		}
		taken[out[k].Name] = true
	}
	return out
}

// subscript writes a whole number in subscript digits.
func subscript(n int) string {
	text := ""
	for ; n > 0; n /= 10 {
		text = string(rune('₀'+n%10)) + text
	}
	return text
}
