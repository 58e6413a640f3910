package value

import (
	"gainwright/lang/diag"
)

// asPolynomial takes a polynomial or a real scalar; quantities count as SI numbers.
func asPolynomial(v Value) (*Polynomial, error) {
	switch x := v.(type) {
	case *Polynomial:
		return x, nil
	case Number:
		return ConstantPolynomial("", x), nil
	case Quantity:
		n, err := x.SI()
		return ConstantPolynomial("", n), err
	}
	return nil, diag.New(diag.Type, "polynomials have real coefficients; %s cannot be one", Describe(v))
}

// polynomials runs an operation on two operands as polynomials. A complex operand is refused by kind.
func polynomials(name string, a, b Value, f func(p, q *Polynomial) (Value, error)) (Value, error) {
	if a.Kind() == KComplex || b.Kind() == KComplex {
		return nil, complexCoefficients(name, a, b)
	}
	p, err := asPolynomial(a)
	if err != nil {
		return nil, err
	}
	q, err := asPolynomial(b)
	if err != nil {
		return nil, err
	}
	return f(p, q)
}

func complexCoefficients(name string, a, b Value) error {
	e := undefined(name, a, b).(*diag.Error)
	return e.WithHelp("polynomials, transfer functions and plants have real coefficients; at(p, x) takes a complex x")
}

func addAsPolynomials(a, b Value) (Value, error) {
	return polynomials("addition", a, b, func(p, q *Polynomial) (Value, error) { return orError(addPolynomials(p, q)) })
}

func subtractAsPolynomials(a, b Value) (Value, error) {
	return polynomials("subtraction", a, b, func(p, q *Polynomial) (Value, error) {
		return orError(addPolynomials(p, negatePolynomial(q)))
	})
}

func multiplyAsPolynomials(a, b Value) (Value, error) {
	return polynomials("multiplication", a, b, func(p, q *Polynomial) (Value, error) { return orError(multiplyPolynomials(p, q)) })
}

func divideAsPolynomials(a, b Value) (Value, error) {
	return polynomials("division", a, b, func(p, q *Polynomial) (Value, error) {
		if q.IsZero() {
			return nil, divisionByZero()
		}
		if q.Degree() == 0 {
			inverse, err := divideNumbers(Int(1), q.Coefficients()[0])
			if err != nil {
				return nil, err
			}
			return orError(scalePolynomial(p, inverse))
		}
		return orError(RatioTransfer(p, q))
	})
}

func powerAsPolynomial(a, b Value) (Value, error) {
	k, err := wholeExponent(a, b)
	if err != nil {
		return nil, err
	}
	p, err := asPolynomial(a)
	if err != nil {
		return nil, err
	}
	if k >= 0 {
		return orError(powerPolynomial(p, k))
	}
	if p.IsZero() {
		return nil, divisionByZero()
	}
	den, err := powerPolynomial(p, -k)
	if err != nil {
		return nil, err
	}
	if den.Degree() == 0 {
		return divideAsPolynomials(Int(1), den)
	}
	return orError(RatioTransfer(ConstantPolynomial(p.Variable, Int(1)), den))
}

// asTransfer takes a transfer function or a constant or polynomial as one; plants are not converted here.
func asTransfer(v Value) (*Transfer, error) {
	switch x := v.(type) {
	case *Transfer:
		return x, nil
	case Number, Quantity, *Polynomial:
		p, err := asPolynomial(v)
		if err != nil {
			return nil, err
		}
		return &Transfer{Variable: p.Variable, Entries: [][]Ratio{{{p, ConstantPolynomial(p.Variable, Int(1))}}}}, nil
	case *Matrix, *Gain, *List:
		m, err := asMatrix(v)
		if err != nil {
			return nil, err
		}
		if m.IsComplex() {
			return nil, diag.New(diag.Type, "transfer functions have real coefficients; this matrix is complex")
		}
		t := staticTransfer(m, nil)
		if g, ok := v.(*Gain); ok {
			t.Outputs, t.Inputs = g.RowSignals, g.ColumnSignals
		}
		return t, nil
	}
	return nil, diag.New(diag.Type, "a transfer function is needed; this is %s", Describe(v))
}

func transfers(name string, a, b Value, f func(x, y *Transfer) (*Transfer, error)) (Value, error) {
	if a.Kind() == KComplex || b.Kind() == KComplex {
		return nil, complexCoefficients(name, a, b)
	}
	x, err := asTransfer(a)
	if err != nil {
		return nil, err
	}
	y, err := asTransfer(b)
	if err != nil {
		return nil, err
	}
	return orError(f(x, y))
}

func addAsTransfers(a, b Value) (Value, error) {
	return transfers("addition", a, b, addTransfers)
}

func subtractAsTransfers(a, b Value) (Value, error) {
	return transfers("subtraction", a, b, func(x, y *Transfer) (*Transfer, error) { return addTransfers(x, negateTransfer(y)) })
}

func multiplyAsTransfers(a, b Value) (Value, error) {
	return transfers("multiplication", a, b, multiplyTransfers)
}

func divideAsTransfers(a, b Value) (Value, error) {
	if p, m := channels(b); domains[b.Kind()] == matrixDomain && (p != 1 || m != 1) {
		return nil, matrixDivisor(a, b)
	}
	return transfers("division", a, b, func(x, y *Transfer) (*Transfer, error) {
		if p, m := y.Dims(); p != 1 || m != 1 {
			return nil, diag.New(diag.Type, "division by a transfer function of size %s is not defined", sizeText(p, m)).WithHelp("write G1 * G2^-1")
		}
		inverse, err := invertRatio(y.Entries[0][0])
		if err != nil {
			return nil, err
		}
		return multiplyTransfers(x, &Transfer{Variable: y.Variable, Every: y.Every, Entries: [][]Ratio{{inverse}}})
	})
}

func powerAsTransfer(a, b Value) (Value, error) {
	k, err := wholeExponent(a, b)
	if err != nil {
		return nil, err
	}
	t, err := asTransfer(a)
	if err != nil {
		return nil, err
	}
	return orError(powerTransfer(t, k))
}

// systems runs an operation on plants; a transfer function that is not proper (it
// differentiates) cannot be a plant, so the operation then runs on transfer functions.
func systems(name string, a, b Value, onPlants func(x, y *Plant) (*Plant, error), onTransfers func(a, b Value) (Value, error)) (Value, error) {
	if a.Kind() == KComplex || b.Kind() == KComplex {
		return nil, complexCoefficients(name, a, b)
	}
	if isImproper(a) || isImproper(b) {
		return throughTransfers(a, b, onTransfers)
	}
	x, err := ToPlant(a)
	if err != nil {
		return nil, err
	}
	y, err := ToPlant(b)
	if err != nil {
		return nil, err
	}
	return orError(onPlants(x, y))
}

// throughTransfers runs an operation on the transfer functions of both operands.
func throughTransfers(a, b Value, operation func(a, b Value) (Value, error)) (Value, error) {
	x, err := ToTransfer(a)
	if err != nil {
		return nil, err
	}
	y, err := ToTransfer(b)
	if err != nil {
		return nil, err
	}
	return operation(x, y)
}

func isImproper(v Value) bool {
	switch x := v.(type) {
	case *Polynomial:
		return x.Degree() > 0
	case *Transfer:
		for _, row := range x.Entries {
			for _, e := range row {
				if e.Num.Degree() > e.Den.Degree() {
					return true
				}
			}
		}
	}
	return false
}

func addAsPlants(a, b Value) (Value, error) {
	return systems("addition", a, b, parallelPlants, addAsTransfers)
}

func subtractAsPlants(a, b Value) (Value, error) {
	return systems("subtraction", a, b, func(x, y *Plant) (*Plant, error) {
		negative, err := negatePlant(y)
		if err != nil {
			return nil, err
		}
		return parallelPlants(x, negative)
	}, subtractAsTransfers)
}

func multiplyAsPlants(a, b Value) (Value, error) {
	for _, operands := range [...][2]Value{{a, b}, {b, a}} {
		if n, err := scalarOf(operands[0]); err == nil {
			p, err := ToPlant(operands[1])
			if err != nil {
				return nil, err
			}
			return orError(scalePlant(p, n))
		}
	}
	return systems("multiplication", a, b, seriesPlants, multiplyAsTransfers)
}

// scalarOf takes a number or a quantity at its SI value.
func scalarOf(v Value) (Number, error) {
	switch x := v.(type) {
	case Number:
		return x, nil
	case Quantity:
		return x.SI()
	}
	return Number{}, undefinedFor("scaling", v)
}

func divideAsPlants(a, b Value) (Value, error) {
	if a.Kind() == KComplex || b.Kind() == KComplex {
		return nil, complexCoefficients("division", a, b)
	}
	if n, err := scalarOf(b); err == nil {
		inverse, err := divideNumbers(Int(1), n)
		if err != nil {
			return nil, err
		}
		return multiplyAsPlants(a, inverse)
	}
	if p, m := channels(b); p != 1 || m != 1 {
		return nil, diag.New(diag.Type, "division is by numbers and by systems with one input and one output; %s is divided by %s", Describe(a), Describe(b)).
			WithHelp("write P1 * P2^-1")
	}
	if isImproper(a) || isImproper(b) {
		return throughTransfers(a, b, divideAsTransfers)
	}
	q, err := ToPlant(b)
	if err != nil {
		return nil, err
	}
	inverse, err := invertPlant(q)
	if err != nil {
		return nil, err
	}
	return multiplyAsPlants(a, inverse)
}

// channels gives outputs and inputs of what acts as a system.
func channels(v Value) (outputs, inputs int) {
	switch x := v.(type) {
	case *Plant:
		return x.outputCount(), x.inputCount()
	case *Model:
		return x.Plant.outputCount(), x.Plant.inputCount()
	case *Transfer:
		return x.Dims()
	case *Gain:
		return x.Values.Dims()
	case *Matrix:
		return x.Dims()
	case *List:
		return len(x.Items), 1
	}
	return 1, 1
}

func powerAsPlant(a, b Value) (Value, error) {
	k, err := wholeExponent(a, b)
	if err != nil {
		return nil, err
	}
	p, err := ToPlant(a)
	if err != nil {
		return nil, err
	}
	return orError(powerPlant(p, k))
}
