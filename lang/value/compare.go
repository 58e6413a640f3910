package value

import (
	"math"

	"gainwright/lang/diag"
)

// Equal tells whether two values are equal: exact numbers exactly, floating ones by
// value (an exact number next to a floating one is rounded to binary64 first),
// matrices, lists and polynomials entry by entry, plants by their matrices.
func Equal(a, b Value) (Boolean, error) {
	if a == nil || b == nil {
		return false, diag.New(diag.Internal, "a comparison met a value that is missing")
	}
	a, b = Force(a), Force(b)
	if joins[domains[a.Kind()]][domains[b.Kind()]] == noDomain {
		switch x := a.(type) {
		case Text:
			if y, ok := b.(Text); ok {
				return x == y, nil
			}
		case Boolean:
			if y, ok := b.(Boolean); ok {
				return x == y, nil
			}
		}
		return false, undefined("comparison", a, b)
	}
	v, err := dispatch("comparison", a, b, func(o *operations) func(a, b Value) (Value, error) { return o.equal })
	if err != nil {
		return false, err
	}
	return v.(Boolean), nil
}

// Compare carries out == != < <= > or >=. Order is defined for real numbers and for quantities of one dimension.
func Compare(op string, a, b Value) (Boolean, error) {
	switch op {
	case "==":
		return Equal(a, b)
	case "!=":
		equal, err := Equal(a, b)
		return !equal && err == nil, err
	}
	x, y, err := ordered(a, b)
	if err != nil {
		return false, err
	}
	sign, err := compareNumbers(x, y)
	if err != nil {
		return false, err
	}
	switch op {
	case "<":
		return sign < 0, nil
	case "<=":
		return sign <= 0, nil
	case ">":
		return sign > 0, nil
	case ">=":
		return sign >= 0, nil
	}
	return false, diag.New(diag.Internal, "unknown comparison %q", op)
}

// ordered brings two operands of an order comparison to numbers in one unit.
func ordered(a, b Value) (x, y Number, err error) {
	if a == nil || b == nil {
		return x, y, diag.New(diag.Internal, "a comparison met a value that is missing")
	}
	a, b = Force(a), Force(b)
	if isScalar(a) && isScalar(b) {
		if a.Kind() == KComplex || b.Kind() == KComplex {
			return x, y, diag.New(diag.Type, "order is not defined for complex numbers: %s is compared with %s", Describe(a), Describe(b)).
				WithHelp("compare real(…), imaginary(…) or abs(…)")
		}
		return comparable(asQuantity(a), asQuantity(b))
	}
	a, b = oneEntry(a), oneEntry(b)
	if isScalar(a) && isScalar(b) {
		return ordered(a, b)
	}
	return x, y, undefined("order", a, b)
}

// oneEntry gives the entry of a 1×1 matrix.
func oneEntry(v Value) Value {
	if m, ok := v.(*Matrix); ok && m.rows == 1 && m.cols == 1 {
		return m.At(0, 0)
	}
	return v
}

// comparable expresses two quantities in one unit, exactly where possible.
func comparable(a, b Quantity) (x, y Number, err error) {
	if a.Unit.Dim != b.Unit.Dim || a.Unit.hertz != b.Unit.hertz {
		return x, y, unitClash("comparing quantities of different kinds", a.Unit, b.Unit)
	}
	if a.Unit.Pi == b.Unit.Pi && a.Unit.Offset == nil && b.Unit.Offset == nil {
		if x, err = multiplyNumbers(a.Magnitude, Rat(a.Unit.scale())); err != nil {
			return x, y, err
		}
		y, err = multiplyNumbers(b.Magnitude, Rat(b.Unit.scale()))
		return x, y, err
	}
	if x, err = a.SI(); err != nil {
		return x, y, err
	}
	y, err = b.SI()
	return x, y, err
}

// compareNumbers gives the sign of a − b.
func compareNumbers(a, b Number) (int, error) {
	if a.Exact != nil && b.Exact != nil {
		return a.Exact.Cmp(b.Exact), nil
	}
	x, y := a.Float64(), b.Float64()
	switch {
	case math.IsNaN(x) || math.IsNaN(y):
		return 0, notANumber()
	case x < y:
		return -1, nil
	case x > y:
		return 1, nil
	}
	return 0, nil
}

func sameNumber(a, b Number) bool {
	sign, err := compareNumbers(a, b)
	return err == nil && sign == 0
}

// Equalish tells whether two numbers agree within the sum of their error estimates.
func Equalish(a, b Number) bool {
	if a.Exact != nil && b.Exact != nil {
		return a.Exact.Cmp(b.Exact) == 0
	}
	x, ex := a.approx()
	y, ey := b.approx()
	return x == y || math.Abs(x-y) <= ex+ey
}

// WithinRounding tells whether the outcome of a comparison between real numbers or
// quantities could be the other one within their error estimates; false for exact operands.
func WithinRounding(a, b Value) bool {
	x, y, err := ordered(a, b)
	return err == nil && !(x.Exact != nil && y.Exact != nil) && Equalish(x, y)
}

func equalScalars(a, b Value) (Value, error) {
	if a.Kind() != KComplex && b.Kind() != KComplex {
		x, y, err := comparable(asQuantity(a), asQuantity(b))
		if err != nil {
			return nil, err
		}
		return Boolean(sameNumber(x, y)), nil
	}
	c, err := asComplex(a)
	if err != nil {
		return nil, err
	}
	d, err := asComplex(b)
	if err != nil {
		return nil, err
	}
	return Boolean(sameNumber(c.RealPart(), d.RealPart()) && sameNumber(c.ImaginaryPart(), d.ImaginaryPart())), nil
}

func equalAsMatrices(a, b Value) (Value, error) {
	if x, ok := a.(*List); ok {
		if y, ok := b.(*List); ok {
			return equalLists(x, y)
		}
	}
	x, y, err := bothMatrices(a, b)
	if err != nil {
		return nil, err
	}
	return Boolean(sameMatrix(x, y)), nil
}

func equalLists(a, b *List) (Value, error) {
	if len(a.Items) != len(b.Items) {
		return Boolean(false), nil
	}
	for k := range a.Items {
		equal, err := Equal(a.Items[k], b.Items[k])
		if err != nil || !bool(equal) {
			return equal, err
		}
	}
	return Boolean(true), nil
}

func sameMatrix(a, b *Matrix) bool {
	if a.rows != b.rows || a.cols != b.cols {
		return false
	}
	if a.IsExact() && b.IsExact() {
		return a.exactRe.Equal(b.exactRe) && a.imaginary().Equal(b.imaginary())
	}
	re, im := a.Floats()
	re2, im2 := b.Floats()
	return sameSlice(re, re2) && sameSlice(im, im2)
}

// sameSlice compares entry by entry; nil counts as zeros.
func sameSlice(a, b []float64) bool {
	for k := range max(len(a), len(b)) {
		x, y := 0.0, 0.0
		if a != nil {
			x = a[k]
		}
		if b != nil {
			y = b[k]
		}
		if x != y {
			return false
		}
	}
	return true
}

func samePolynomial(p, q *Polynomial) bool {
	if p.Exact != nil && q.Exact != nil {
		return p.Exact.Equal(*q.Exact)
	}
	x, _ := p.Floats()
	y, _ := q.Floats()
	return len(x) == len(y) && sameSlice(x, y)
}

func equalAsPolynomials(a, b Value) (Value, error) {
	return polynomials("comparison", a, b, func(p, q *Polynomial) (Value, error) {
		if _, err := p.sharedVariable(q); err != nil {
			return nil, err
		}
		return Boolean(samePolynomial(p, q)), nil
	})
}

func equalAsTransfers(a, b Value) (Value, error) {
	if a.Kind() == KComplex || b.Kind() == KComplex {
		return nil, complexCoefficients("comparison", a, b)
	}
	x, err := asTransfer(a)
	if err != nil {
		return nil, err
	}
	y, err := asTransfer(b)
	if err != nil {
		return nil, err
	}
	if _, _, err := combineTime(x, y); err != nil {
		return nil, err
	}
	p, m := x.Dims()
	if p2, m2 := y.Dims(); p != p2 || m != m2 {
		return Boolean(false), nil
	}
	for i := range p {
		for j := range m {
			if !sameRatio(x.Entries[i][j], y.Entries[i][j]) {
				return Boolean(false), nil
			}
		}
	}
	return Boolean(true), nil
}

// sameRatio compares entries; exact ones are brought to lowest terms first.
func sameRatio(a, b Ratio) bool {
	if a.isExact() && b.isExact() {
		x, err1 := MakeRatio(a.Num, a.Den)
		y, err2 := MakeRatio(b.Num, b.Den)
		if err1 == nil && err2 == nil {
			a, b = x, y
		}
	}
	return samePolynomial(a.Num, b.Num) && samePolynomial(a.Den, b.Den)
}

func equalAsPlants(a, b Value) (Value, error) {
	if a.Kind() == KComplex || b.Kind() == KComplex {
		return nil, complexCoefficients("comparison", a, b)
	}
	if domains[a.Kind()] != plantDomain || domains[b.Kind()] != plantDomain {
		return nil, undefined("comparison", a, b).(*diag.Error).WithHelp("transfer(P) makes a plant comparable with a transfer function")
	}
	x, err := ToPlant(a)
	if err != nil {
		return nil, err
	}
	y, err := ToPlant(b)
	if err != nil {
		return nil, err
	}
	sameTime := x.Every == nil && y.Every == nil || x.Every != nil && y.Every != nil && sameNumber(*x.Every, *y.Every)
	return Boolean(sameTime && sameMatrix(x.A, y.A) && sameMatrix(x.B, y.B) && sameMatrix(x.C, y.C) && sameMatrix(x.D, y.D)), nil
}
