package value

// asComplex takes any scalar; a quantity counts as its SI number, since complex numbers carry no unit.
func asComplex(v Value) (Complex, error) {
	switch x := Force(v).(type) {
	case Complex:
		return x, nil
	case Quantity:
		n, err := x.SI()
		return toComplex(n), err
	case Number:
		return toComplex(x), nil
	}
	return Complex{}, undefinedFor("complex arithmetic", v)
}

// asQuantity takes a number or a quantity.
func asQuantity(v Value) Quantity {
	if q, ok := v.(Quantity); ok {
		return q
	}
	n, _ := v.(Number)
	return toQuantity(n)
}

// scalars runs the arithmetic of the wider of two scalar kinds.
func scalars(a, b Value,
	real func(a, b Number) (Value, error),
	quantity func(a, b Quantity) (Value, error),
	wide func(a, b Complex) (Value, error)) (Value, error) {
	x, xReal := a.(Number)
	y, yReal := b.(Number)
	if xReal && yReal {
		return real(x, y)
	}
	if a.Kind() != KComplex && b.Kind() != KComplex {
		return quantity(asQuantity(a), asQuantity(b))
	}
	c, err := asComplex(a)
	if err != nil {
		return nil, err
	}
	d, err := asComplex(b)
	if err != nil {
		return nil, err
	}
	return wide(c, d)
}

func realResult(f func(a, b Number) (Number, error)) func(a, b Number) (Value, error) {
	return func(a, b Number) (Value, error) {
		n, err := f(a, b)
		return n, err
	}
}

func complexResult(f func(a, b Complex) (Complex, error)) func(a, b Complex) (Value, error) {
	return func(a, b Complex) (Value, error) {
		c, err := f(a, b)
		if err != nil {
			return nil, err
		}
		return simplify(c), nil
	}
}

func addScalars(a, b Value) (Value, error) {
	return scalars(a, b, realResult(addNumbers),
		func(a, b Quantity) (Value, error) { return addQuantities(a, b, 1) }, complexResult(addComplex))
}

func subtractScalars(a, b Value) (Value, error) {
	return scalars(a, b, realResult(subtractNumbers),
		func(a, b Quantity) (Value, error) { return addQuantities(a, b, -1) },
		complexResult(func(a, b Complex) (Complex, error) { return addComplex(a, negateComplex(b)) }))
}

func multiplyScalars(a, b Value) (Value, error) {
	return scalars(a, b, realResult(multiplyNumbers),
		func(a, b Quantity) (Value, error) { return multiplyQuantities(a, b, 1) }, complexResult(multiplyComplex))
}

func divideScalars(a, b Value) (Value, error) {
	return scalars(a, b, realResult(divideNumbers),
		func(a, b Quantity) (Value, error) { return multiplyQuantities(a, b, -1) }, complexResult(divideComplex))
}

func powerScalars(a, b Value) (Value, error) {
	if a.Kind() == KComplex || b.Kind() == KComplex {
		x, err := asComplex(a)
		if err != nil {
			return nil, err
		}
		if q, ok := b.(Quantity); ok {
			if b, err = realScalar(q); err != nil {
				return nil, err
			}
		}
		y, err := asComplex(b)
		if err != nil {
			return nil, err
		}
		return powerComplex(x, y)
	}
	exponent, err := realScalar(b)
	if err != nil {
		return nil, err
	}
	if q, ok := a.(Quantity); ok {
		return powerQuantity(q, exponent)
	}
	n, _ := a.(Number)
	return powerNumbers(n, exponent)
}
