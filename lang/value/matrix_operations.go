package value

import (
	"math"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
)

// asMatrix takes a matrix, the values of a gain, a scalar (1×1) or a list of scalars (a column).
func asMatrix(v Value) (*Matrix, error) {
	switch x := Force(v).(type) {
	case *Matrix:
		return x, nil
	case *Gain:
		return x.Values, nil
	case *List:
		return listColumn(x)
	case Number, Complex, Quantity:
		return scalarsMatrix(1, 1, []Value{x})
	}
	return nil, diag.New(diag.Type, "a matrix is needed; this is %s", Describe(v))
}

// listColumn takes a list of scalars as a column.
func listColumn(l *List) (*Matrix, error) {
	for k, item := range l.Items {
		if domains[item.Kind()] != scalarDomain {
			return nil, diag.New(diag.Type, "a list counts as a column when all its items are numbers; item %d is %s", k+1, Describe(item))
		}
	}
	return scalarsMatrix(len(l.Items), 1, l.Items)
}

// columnOf makes a column of numbers.
func columnOf(v []Number) (*Matrix, error) {
	items := make([]Value, len(v))
	for k, n := range v {
		items[k] = n
	}
	return scalarsMatrix(len(v), 1, items)
}

// scalarsMatrix makes a matrix of r·c scalars, row-major; quantities enter as SI numbers.
func scalarsMatrix(r, c int, items []Value) (*Matrix, error) {
	isExact, entries := true, make([]Complex, len(items))
	for k, item := range items {
		var err error
		if entries[k], err = asComplex(item); err != nil {
			return nil, err
		}
		isExact = isExact && entries[k].ExactRe != nil
	}
	if err := CheckSize(r, c, isExact); err != nil {
		return nil, err
	}
	if isExact {
		re, im := exact.NewMatrix(r, c), exact.NewMatrix(r, c)
		for k, e := range entries {
			re.Set(k/c, k%c, e.ExactRe)
			im.Set(k/c, k%c, e.ExactIm)
		}
		return ExactComplexMatrix(re, im), nil
	}
	re, im, worst := make([]float64, r*c), make([]float64, r*c), 0.0
	for k, e := range entries {
		x, err := e.approx()
		re[k], im[k], worst = real(x), imag(x), max(worst, err)
		if math.IsNaN(re[k]) || math.IsInf(re[k], 0) || math.IsNaN(im[k]) || math.IsInf(im[k], 0) {
			return nil, diag.New(diag.Numerical, "entry [%d, %d] of the matrix is not a finite number", k/c+1, k%c+1)
		}
	}
	return FloatComplexMatrix(r, c, re, im, worst), nil
}

func isScalar(v Value) bool { return domains[v.Kind()] == scalarDomain }

// bothMatrices converts two operands.
func bothMatrices(a, b Value) (x, y *Matrix, err error) {
	if x, err = asMatrix(a); err != nil {
		return nil, nil, err
	}
	y, err = asMatrix(b)
	return x, y, err
}

func addAsMatrices(a, b Value) (Value, error) {
	x, y, err := bothMatrices(a, b)
	if err != nil {
		return nil, err
	}
	if (x.rows != y.rows || x.cols != y.cols) && isScalar(a) != isScalar(b) {
		other := x
		if isScalar(a) {
			other = y
		}
		e := diag.New(diag.Shape, "%s and %s are not added: one has a single entry, the other is %s", Describe(a), Describe(b), sizeText(other.rows, other.cols))
		if other.rows == other.cols {
			return nil, e.WithHelp("c*identity(%d) adds to the diagonal, filled(c, rows: %d, columns: %d) to every entry", other.rows, other.rows, other.cols)
		}
		return nil, e.WithHelp("filled(c, rows: %d, columns: %d) adds to every entry", other.rows, other.cols)
	}
	return orError(addMatrices(x, y))
}

func subtractAsMatrices(a, b Value) (Value, error) {
	negative, err := Negate(b)
	if err != nil {
		return nil, err
	}
	return addAsMatrices(a, negative)
}

func multiplyAsMatrices(a, b Value) (Value, error) {
	if isScalar(b) {
		a, b = b, a
	}
	if !isScalar(a) {
		x, y, err := bothMatrices(a, b)
		if err != nil {
			return nil, err
		}
		out, err := multiplyMatrices(x, y)
		if err != nil {
			return nil, err
		}
		return named(out, x.Rows, y.Columns), nil
	}
	factor, err := asComplex(a)
	if err != nil {
		return nil, err
	}
	m, err := asMatrix(b)
	if err != nil {
		return nil, err
	}
	out, err := scaleMatrix(m, factor)
	if err != nil {
		return nil, err
	}
	return named(out, m.Rows, m.Columns), nil
}

func divideAsMatrices(a, b Value) (Value, error) {
	if !isScalar(b) {
		y, err := asMatrix(b)
		if err != nil {
			return nil, err
		}
		if y.rows != 1 || y.cols != 1 {
			return nil, matrixDivisor(a, b)
		}
		b = y.At(0, 0)
	}
	if isScalar(a) {
		return divideScalars(a, b)
	}
	inverse, err := divideScalars(Int(1), b)
	if err != nil {
		return nil, err
	}
	return multiplyAsMatrices(a, inverse)
}

// matrixDivisor is the error of a division by a matrix.
func matrixDivisor(a, b Value) error {
	return undefined("division", a, b).(*diag.Error).WithHelp("write A * B^-1, or solve(B, A) for B^-1 * A")
}

func powerAsMatrix(a, b Value) (Value, error) {
	m, err := asMatrix(a)
	if err != nil {
		return nil, err
	}
	k, err := wholeExponent(a, b)
	if err != nil {
		return nil, err
	}
	return orError(powerMatrix(m, k))
}
