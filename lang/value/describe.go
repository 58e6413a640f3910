package value

import (
	"fmt"

	"gainwright/lang/diag"
)

// Describe says what a value is in the users' words, with its size: "a 2×3 matrix".
func Describe(v Value) string {
	switch x := Force(v).(type) {
	case nil:
		return "nothing"
	case Quantity:
		return "a quantity in " + unitName(x.Unit)
	case Complex:
		return "a complex number"
	case *Matrix:
		return fmt.Sprintf("a %d×%d matrix", x.rows, x.cols)
	case *Polynomial:
		if x.Variable == "" {
			return "a polynomial"
		}
		return "a polynomial in " + x.Variable
	case *Transfer:
		r, c := x.Dims()
		return fmt.Sprintf("a %d×%d transfer function", r, c)
	case *Plant:
		return "a plant with " + x.counts()
	case *Gain:
		r, c := x.Values.Dims()
		return fmt.Sprintf("a %d×%d gain", r, c)
	case *Model:
		return "the model " + x.Name
	case *List:
		return "a list of " + count(len(x.Items), "value")
	case *Function:
		return "the function " + x.Name
	}
	return "a " + string(v.Kind())
}

func (p *Plant) counts() string {
	return fmt.Sprintf("%s, %s and %s", count(p.Order(), "state"), count(p.inputCount(), "input"), count(p.outputCount(), "output"))
}

// count writes a number with its noun: "1 state", "3 states".
func count(n int, noun string) string {
	if n == 1 {
		return "1 " + noun
	}
	return fmt.Sprintf("%d %ss", n, noun)
}

// undefined is the error of an operation between kinds that have none.
func undefined(operation string, a, b Value) error {
	return diag.New(diag.Type, "%s is not defined between %s and %s", operation, Describe(a), Describe(b))
}

// undefinedFor is the error of an operation that a kind does not have.
func undefinedFor(operation string, a Value) error {
	return diag.New(diag.Type, "%s is not defined for %s", operation, Describe(a))
}

func sizeText(r, c int) string { return fmt.Sprintf("%d×%d", r, c) }

func sizesClash(operation string, a, b *Matrix) error {
	return sizesDiffer(operation, a.rows, a.cols, b.rows, b.cols)
}

func sizesDiffer(operation string, r1, c1, r2, c2 int) error {
	return diag.New(diag.Shape, "the sizes do not fit for %s: %s on the left, %s on the right", operation, sizeText(r1, c1), sizeText(r2, c2))
}
