package numeric

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// sizeOf gives the dimensions of m; a nil *mat.Dense and an empty one are 0×0.
func sizeOf(m mat.Matrix) (rows, columns int) {
	if m == nil {
		return 0, 0
	}
	if d, ok := m.(*mat.Dense); ok && d == nil {
		return 0, 0
	}
	return m.Dims()
}

// Finite errs when an entry of m is NaN or infinite, naming it with indices
// from 1: "A[2, 3] is not a finite number". An empty or nil m is finite.
func Finite(name string, m mat.Matrix) error {
	rows, columns := sizeOf(m)
	if d, ok := m.(*mat.Dense); ok && rows > 0 {
		raw := d.RawMatrix()
		for i := 0; i < rows; i++ {
			for j, v := range raw.Data[i*raw.Stride : i*raw.Stride+columns] {
				if v-v != 0 {
					return fmt.Errorf("%s[%d, %d] is not a finite number", name, i+1, j+1)
				}
			}
		}
		return nil
	}
	for i := 0; i < rows; i++ {
		for j := 0; j < columns; j++ {
			if v := m.At(i, j); math.IsNaN(v) || math.IsInf(v, 0) {
				return fmt.Errorf("%s[%d, %d] is not a finite number", name, i+1, j+1)
			}
		}
	}
	return nil
}

// Square errs when m has not as many rows as columns. 0×0 and nil are square.
func Square(name string, m mat.Matrix) error {
	if rows, columns := sizeOf(m); rows != columns {
		return fmt.Errorf("%s is %d×%d; it must be square", name, rows, columns)
	}
	return nil
}

// Shaped errs when m is not rows × columns.
func Shaped(name string, m mat.Matrix, rows, columns int) error {
	if r, c := sizeOf(m); r != rows || c != columns {
		return fmt.Errorf("%s is %d×%d; it must be %d×%d", name, r, c, rows, columns)
	}
	return nil
}

// symmetryTolerance bounds the asymmetry, relative to the largest entry, that
// is put down to rounding of the data (a few operations on decimal input).
const symmetryTolerance = 1e-12

// Symmetric errs when m is not square or differs from its transpose by more
// than rounding of data (1e-12 of its largest entry).
func Symmetric(name string, m mat.Matrix) error {
	if err := Square(name, m); err != nil {
		return err
	}
	n, _ := sizeOf(m)
	largest := 0.0
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			largest = math.Max(largest, math.Abs(m.At(i, j)))
		}
	}
	for i := 0; i < n; i++ {
		for j := i + 1; j < n; j++ {
			if u, v := m.At(i, j), m.At(j, i); math.Abs(u-v) > symmetryTolerance*largest {
				return fmt.Errorf("%s is not symmetric: %s[%d, %d] is %.6g but %s[%d, %d] is %.6g",
					name, name, i+1, j+1, u, name, j+1, i+1, v)
			}
		}
	}
	return nil
}

// squareAndFinite is the door of every routine on one square matrix.
func squareAndFinite(name string, m mat.Matrix) error {
	if err := Square(name, m); err != nil {
		return err
	}
	return Finite(name, m)
}
