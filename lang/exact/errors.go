package exact

import (
	"errors"
	"fmt"
)

// LargestBits bounds the bit length of a numerator or denominator that an
// operation may produce.
const LargestBits = 1_000_000

var (
	// ErrTooLarge says that a result would exceed LargestBits in one entry.
	ErrTooLarge = errors.New("the exact result would need numbers of more than a million bits")
	// ErrSingular says that a square matrix has determinant zero.
	ErrSingular = errors.New("the matrix is singular: its determinant is exactly zero")
	// ErrInconsistent says that a linear system has no solution.
	ErrInconsistent = errors.New("the equations contradict each other: there is no solution")
	// ErrZeroDivision says that a number, polynomial or rational function was divided by zero.
	ErrZeroDivision = errors.New("division by zero")
	// ErrNegativePower says that a polynomial was raised to a negative power.
	ErrNegativePower = errors.New("a negative power of a polynomial is not a polynomial")
)

// SizeError says that the shapes of two operands do not fit an operation.
// Second is absent (-1, -1) when one operand is at fault by itself.
type SizeError struct {
	Operation    string
	FirstRows    int
	FirstColumns int
	OtherRows    int
	OtherColumns int
}

// Error names the operation and the shapes.
func (e *SizeError) Error() string {
	if e.OtherRows < 0 {
		return fmt.Sprintf("%s is not defined for a matrix of size %d×%d", e.Operation, e.FirstRows, e.FirstColumns)
	}
	return fmt.Sprintf("%s: a matrix of size %d×%d does not fit one of size %d×%d",
		e.Operation, e.FirstRows, e.FirstColumns, e.OtherRows, e.OtherColumns)
}

// UnderdeterminedError says that a linear system has more than one solution:
// Particular is one of them, and any combination of the columns of Kernel may
// be added to each of its columns.
type UnderdeterminedError struct {
	Particular *Matrix
	Kernel     *Matrix
}

// Error says how many directions are free.
func (e *UnderdeterminedError) Error() string {
	_, free := e.Kernel.Dims()
	if free == 1 {
		return "the equations have more than one solution: one direction is free"
	}
	return fmt.Sprintf("the equations have more than one solution: %d directions are free", free)
}

func sizeError(operation string, a, b *Matrix) error {
	if b == nil {
		return &SizeError{operation, a.rows, a.cols, -1, -1}
	}
	return &SizeError{operation, a.rows, a.cols, b.rows, b.cols}
}
