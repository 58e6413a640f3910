package value

import (
	"math/big"

	"gainwright/lang/diag"
)

// domain is the arithmetic in which an operation on two kinds takes place.
type domain int

const (
	noDomain         domain = iota
	scalarDomain            // number, complex, quantity
	matrixDomain            // matrix, gain, list of numbers
	polynomialDomain        // polynomial
	transferDomain          // transfer
	plantDomain             // plant, model
	domainCount
)

// domains sorts the kinds; kinds that are absent have no arithmetic.
var domains = map[Kind]domain{
	KNumber: scalarDomain, KComplex: scalarDomain, KQuantity: scalarDomain,
	KMatrix: matrixDomain, KGain: matrixDomain, KList: matrixDomain,
	KPolynomial: polynomialDomain, KTransfer: transferDomain,
	KPlant: plantDomain, KModel: plantDomain,
}

// joins gives the domain that holds both operands. Matrices and polynomials meet in
// matrices of rational functions.
var joins = [domainCount][domainCount]domain{
	scalarDomain:     {scalarDomain: scalarDomain, matrixDomain: matrixDomain, polynomialDomain: polynomialDomain, transferDomain: transferDomain, plantDomain: plantDomain},
	matrixDomain:     {scalarDomain: matrixDomain, matrixDomain: matrixDomain, polynomialDomain: transferDomain, transferDomain: transferDomain, plantDomain: plantDomain},
	polynomialDomain: {scalarDomain: polynomialDomain, matrixDomain: transferDomain, polynomialDomain: polynomialDomain, transferDomain: transferDomain, plantDomain: plantDomain},
	transferDomain:   {scalarDomain: transferDomain, matrixDomain: transferDomain, polynomialDomain: transferDomain, transferDomain: transferDomain, plantDomain: plantDomain},
	plantDomain:      {scalarDomain: plantDomain, matrixDomain: plantDomain, polynomialDomain: plantDomain, transferDomain: plantDomain, plantDomain: plantDomain},
}

// operations are the binary operations of one domain.
type operations struct {
	add, subtract, multiply, divide, power, equal func(a, b Value) (Value, error)
}

var table [domainCount]operations

func init() {
	table = [domainCount]operations{
		scalarDomain:     {addScalars, subtractScalars, multiplyScalars, divideScalars, powerScalars, equalScalars},
		matrixDomain:     {addAsMatrices, subtractAsMatrices, multiplyAsMatrices, divideAsMatrices, powerAsMatrix, equalAsMatrices},
		polynomialDomain: {addAsPolynomials, subtractAsPolynomials, multiplyAsPolynomials, divideAsPolynomials, powerAsPolynomial, equalAsPolynomials},
		transferDomain:   {addAsTransfers, subtractAsTransfers, multiplyAsTransfers, divideAsTransfers, powerAsTransfer, equalAsTransfers},
		plantDomain:      {addAsPlants, subtractAsPlants, multiplyAsPlants, divideAsPlants, powerAsPlant, equalAsPlants},
	}
}

func dispatch(name string, a, b Value, pick func(*operations) func(a, b Value) (Value, error)) (Value, error) {
	if a == nil || b == nil {
		return nil, diag.New(diag.Internal, "%s met a value that is missing", name)
	}
	a, b = Force(a), Force(b)
	joined := joins[domains[a.Kind()]][domains[b.Kind()]]
	if joined == noDomain {
		return nil, undefined(name, a, b)
	}
	v, err := pick(&table[joined])(a, b)
	if err != nil {
		return nil, err
	}
	return v, nil
}

// Add gives a + b.
func Add(a, b Value) (Value, error) {
	return dispatch("addition", a, b, func(o *operations) func(a, b Value) (Value, error) { return o.add })
}

// Subtract gives a − b.
func Subtract(a, b Value) (Value, error) {
	return dispatch("subtraction", a, b, func(o *operations) func(a, b Value) (Value, error) { return o.subtract })
}

// Multiply gives a · b: the matrix product for matrices, series (right one first) for systems.
func Multiply(a, b Value) (Value, error) {
	return dispatch("multiplication", a, b, func(o *operations) func(a, b Value) (Value, error) { return o.multiply })
}

// Divide gives a / b; b is a scalar, a polynomial or a one-by-one system.
func Divide(a, b Value) (Value, error) {
	return dispatch("division", a, b, func(o *operations) func(a, b Value) (Value, error) { return o.divide })
}

// Power gives a ^ b. Exponents of matrices, polynomials and systems are whole.
func Power(a, b Value) (Value, error) {
	if a == nil || b == nil || domains[a.Kind()] == noDomain || domains[b.Kind()] != scalarDomain {
		if a == nil || b == nil {
			return nil, diag.New(diag.Internal, "a power met a value that is missing")
		}
		return nil, undefined("a power", a, b)
	}
	a, b = Force(a), Force(b)
	v, err := table[domains[a.Kind()]].power(a, b)
	if err != nil {
		return nil, err
	}
	return v, nil
}

// Negate gives −a.
func Negate(a Value) (Value, error) {
	switch x := Force(a).(type) {
	case Number:
		return negateNumber(x), nil
	case Complex:
		return negateComplex(x), nil
	case Quantity:
		return negateQuantity(x), nil
	case *Polynomial:
		return negatePolynomial(x), nil
	case *Transfer:
		return negateTransfer(x), nil
	case *Plant:
		return orError(negatePlant(x))
	case *Model:
		return orError(negatePlant(x.Plant))
	case *List:
		return negateList(x)
	case *Matrix, *Gain:
		m, err := asMatrix(x)
		if err != nil {
			return nil, err
		}
		return named(negateMatrix(m), m.Rows, m.Columns), nil
	}
	return nil, undefinedFor("negation", a)
}

// negateList negates each item; a pair stays a pair.
func negateList(l *List) (Value, error) {
	out := &List{Items: make([]Value, len(l.Items)), Pair: l.Pair}
	for k, item := range l.Items {
		var err error
		if out.Items[k], err = Negate(item); err != nil {
			return nil, err
		}
	}
	return out, nil
}

// orError keeps a nil pointer from becoming a value that is not nil.
func orError[T any, P interface {
	*T
	Value
}](p P, err error) (Value, error) {
	if err != nil {
		return nil, err
	}
	return p, nil
}

func named(m *Matrix, rows, columns []string) *Matrix {
	m.Rows, m.Columns = rows, columns
	return m
}

// Transpose gives aᵀ: of complex matrices without conjugation; of a plant the dual system.
func Transpose(a Value) (Value, error) {
	switch x := Force(a).(type) {
	case Number, Complex, Quantity, *Polynomial:
		return x, nil
	case *Transfer:
		return transposeTransfer(x), nil
	case *Plant:
		return transposePlant(x), nil
	case *Model:
		return transposePlant(x.Plant), nil
	case *Matrix, *Gain, *List:
		m, err := asMatrix(x)
		if err != nil {
			return nil, err
		}
		return transposeMatrix(m), nil
	}
	return nil, undefinedFor("the transpose", a)
}

// PlusMinus gives a ± b for an imaginary b: the conjugate pair a + b, a − b with its real quadratic.
func PlusMinus(a, b Value) (Value, error) {
	if domains[a.Kind()] != scalarDomain || domains[b.Kind()] != scalarDomain {
		return nil, undefined("±", a, b)
	}
	a, b = Force(a), Force(b)
	im, ok := b.(Complex)
	if !ok {
		return nil, diag.New(diag.Type, "the right side of ± is real; a tolerance belongs to `given`").
			WithHelp("a conjugate pair has an imaginary right side: -2 ± 3i")
	}
	if !im.RealPart().IsZero() {
		return nil, diag.New(diag.Type, "the right side of ± must be purely imaginary, as in -2 ± 3i")
	}
	re, err := realScalar(a)
	if err != nil {
		return nil, diag.New(diag.Type, "the left side of ± must be a real number; it is %s", Describe(a))
	}
	return ConjugatePair(re, im.ImaginaryPart())
}

// ConjugatePair gives the list of re + i·im and re − i·im, sharing s² − 2·re·s + re² + im².
func ConjugatePair(re, im Number) (*List, error) {
	b, err := multiplyNumbers(Int(-2), re)
	if err != nil {
		return nil, err
	}
	square, err := multiplyNumbers(re, re)
	if err != nil {
		return nil, err
	}
	other, err := multiplyNumbers(im, im)
	if err != nil {
		return nil, err
	}
	c, err := addNumbers(square, other)
	if err != nil {
		return nil, err
	}
	quadratic, err := PolynomialOf("s", []Number{Int(1), b, c})
	if err != nil {
		return nil, err
	}
	return pairOf(re, im, quadratic), nil
}

func pairOf(re, im Number, quadratic *Polynomial) *List {
	first, ok := MakeComplex(re, im).(Complex)
	if !ok {
		return &List{Items: []Value{re, re}, Pair: true}
	}
	first.Quadratic = quadratic
	return &List{Items: []Value{first, conjugate(first)}, Pair: true}
}

// PairFromQuadratic gives the complex roots of s² + b·s + c as a pair that keeps the
// quadratic; real roots come as a pair of numbers. Exact where the root of the discriminant is.
func PairFromQuadratic(b, c Number) (*List, error) {
	quadratic, err := PolynomialOf("s", []Number{Int(1), b, c})
	if err != nil {
		return nil, err
	}
	half := Rat(big.NewRat(-1, 2))
	re, err := multiplyNumbers(b, half)
	if err != nil {
		return nil, err
	}
	square, err := multiplyNumbers(re, re)
	if err != nil {
		return nil, err
	}
	discriminant, err := subtractNumbers(square, c)
	if err != nil {
		return nil, err
	}
	size := discriminant
	if size.Sign() < 0 {
		size = negateNumber(size)
	}
	v, err := powerNumbers(size, Rat(big.NewRat(1, 2)))
	if err != nil {
		return nil, err
	}
	root := v.(Number)
	if discriminant.Sign() < 0 {
		return pairOf(re, root, quadratic), nil
	}
	x, err1 := addNumbers(re, root)
	y, err2 := subtractNumbers(re, root)
	if err1 != nil || err2 != nil {
		return nil, overflow()
	}
	return &List{Items: []Value{x, y}, Pair: true}, nil
}

// wholeExponent reads the exponent of a matrix, a polynomial or a system.
func wholeExponent(a, b Value) (int, error) {
	n, err := realScalar(b)
	if err == nil && n.IsWhole() {
		k, ok := n.Whole()
		if !ok {
			return 0, diag.New(diag.Limit, "the exponent is too large")
		}
		return k, nil
	}
	return 0, diag.New(diag.Type, "%s has whole powers only; the exponent is %s", Describe(a), exponentText(b))
}

func exponentText(b Value) string {
	if n, ok := b.(Number); ok {
		return brief(n)
	}
	return Describe(b)
}

// realScalar takes a number or a dimensionless quantity.
func realScalar(v Value) (Number, error) {
	switch x := Force(v).(type) {
	case Number:
		return x, nil
	case Quantity:
		if x.Unit.Dim.IsPlain() {
			return x.SI()
		}
		return Number{}, diag.New(diag.Unit, "a plain number is needed; this one is in %s", unitName(x.Unit))
	}
	return Number{}, diag.New(diag.Type, "a real number is needed; this is %s", Describe(v))
}
