package value

import (
	"math/big"
	"strings"

	"gainwright/lang/diag"
)

// Coerce converts an argument to what the parameter's Shape asks for, or says what was
// expected and what came.
func Coerce(p Param, v Value) (Value, error) {
	v = Force(v)
	if f, ok := coercions[p.Shape]; ok {
		out, err := f(p, v)
		if err != nil {
			if e, ok := err.(*diag.Error); ok && e.Param == "" {
				return nil, e.For(p.Name)
			}
			return nil, err
		}
		return out, nil
	}
	return nil, diag.New(diag.Internal, "the parameter %s has an unknown shape", p.Name)
}

var coercions map[Shape]func(p Param, v Value) (Value, error)

func init() {
	coercions = map[Shape]func(p Param, v Value) (Value, error){
		Anything:    func(_ Param, v Value) (Value, error) { return v, nil },
		AReal:       coerceReal,
		AWhole:      coerceWhole,
		ANumber:     coerceNumber,
		AQuantity:   coerceQuantity,
		AFrequency:  coerceFrequency,
		ATime:       coerceTime,
		ARate:       coerceRate,
		AMatrix:     coerceMatrix,
		ASquare:     coerceSquare,
		AVector:     coerceVector,
		APolynomial: coercePolynomial,
		ASystem:     coerceSystem,
		ATransfer:   coerceTransfer,
		PoleList:    coercePoles,
		AList:       coerceList,
		AText:       coerceText,
		AChoice:     coerceChoice,
		ABoolean:    coerceBoolean,
		NameList:    coerceNames,
		AGain:       coerceGain,
		AFunction:   coerceFunction,
	}
}

// needs is the error "order needs a whole number; it is 2.5".
func needs(p Param, what string, v Value) *diag.Error {
	came := Describe(v)
	if n, ok := v.(Number); ok {
		came = brief(n)
	}
	return diag.New(diag.Type, "%s needs %s; it is %s", p.Name, what, came)
}

// needsUnit is the error of a quantity with the wrong dimension.
func needsUnit(p Param, what string, q Quantity) *diag.Error {
	return diag.New(diag.Unit, "%s needs %s; it is in %s", p.Name, what, unitName(q.Unit))
}

func coerceReal(p Param, v Value) (Value, error) {
	switch x := v.(type) {
	case Number:
		return x, nil
	case Quantity:
		if x.Unit.Dim.IsPlain() {
			n, err := x.SI()
			return n, err
		}
		return nil, needsUnit(p, "a plain number", x)
	case *Matrix:
		if n, ok := oneEntry(x).(Number); ok {
			return n, nil
		}
	}
	return nil, needs(p, "a real number", v)
}

func coerceWhole(p Param, v Value) (Value, error) {
	out, err := coerceReal(p, v)
	if err != nil {
		if _, isUnit := v.(Quantity); isUnit {
			return nil, err
		}
		return nil, needs(p, "a whole number", v)
	}
	if n := out.(Number); !n.IsWhole() {
		return nil, needs(p, "a whole number", out)
	}
	return out, nil
}

func coerceNumber(p Param, v Value) (Value, error) {
	v = oneEntry(v)
	if c, ok := v.(Complex); ok {
		return c, nil
	}
	if out, err := coerceReal(p, v); err == nil {
		return out, nil
	} else if _, isUnit := v.(Quantity); isUnit {
		return nil, err
	}
	return nil, needs(p, "a number, real or complex", v)
}

// coerceQuantity gives the SI value of a quantity of dimension p.Dim; plain numbers are taken as SI.
func coerceQuantity(p Param, v Value) (Value, error) {
	q, ok := v.(Quantity)
	if !ok {
		if out, err := coerceReal(p, v); err == nil {
			return out, nil
		}
		return nil, needs(p, "a quantity in "+p.Dim.String(), v)
	}
	if q.Unit.Dim != p.Dim {
		return nil, needsUnit(p, "a quantity in "+p.Dim.String(), q)
	}
	n, err := q.SI()
	return n, err
}

var perSecond = Dimension{2: -1}

// coerceFrequency gives an angular frequency in rad/s; a cycle of Hz counts 2π.
func coerceFrequency(p Param, v Value) (Value, error) {
	q, ok := v.(Quantity)
	if !ok {
		if out, err := coerceReal(p, v); err == nil {
			return out, nil
		}
		return nil, needs(p, "a frequency in rad/s or Hz", v)
	}
	if q.Unit.Dim != perSecond {
		return nil, needsUnit(p, "a frequency in rad/s or Hz", q)
	}
	if !q.Unit.hertz {
		n, err := q.SI()
		return n, err
	}
	n, err := multiplyNumbers(q.Magnitude, Rat(new(big.Rat).Mul(big.NewRat(2, 1), q.Unit.scale())))
	if err != nil {
		return nil, err
	}
	n, err = timesPi(n, 1)
	return n, err
}

func coerceTime(p Param, v Value) (Value, error) {
	out, err := coerceSeconds(p, v, "a time in s")
	if err != nil {
		return nil, err
	}
	if n := out.(Number); n.Sign() <= 0 {
		return nil, diag.New(diag.Type, "%s needs a positive time; it is %s s", p.Name, brief(n))
	}
	return out, nil
}

func coerceSeconds(p Param, v Value, what string) (Value, error) {
	q, ok := v.(Quantity)
	if !ok {
		if out, err := coerceReal(p, v); err == nil {
			return out, nil
		}
		return nil, needs(p, what, v)
	}
	if q.Unit.Dim != Second().Dim {
		return nil, needsUnit(p, what, q)
	}
	n, err := q.SI()
	return n, err
}

// coerceRate gives a sample time in s: a time as it is, a rate in Hz or 1/s by its inverse.
func coerceRate(p Param, v Value) (Value, error) {
	q, ok := v.(Quantity)
	if !ok || q.Unit.Dim != perSecond {
		out, err := coerceSeconds(p, v, "a sample time in s or a rate in Hz")
		if err != nil {
			return nil, err
		}
		if n := out.(Number); n.Sign() <= 0 {
			return nil, diag.New(diag.Type, "%s needs a positive sample time; it is %s s", p.Name, brief(n))
		}
		return out, nil
	}
	if !q.Unit.hertz {
		for _, f := range q.Unit.coherentFactors() {
			if f.Symbol == "rad" {
				return nil, needsUnit(p, "a sample time in s or a rate in Hz", q)
			}
		}
		q.Unit.hertz = true
	}
	rate, err := multiplyNumbers(q.Magnitude, Rat(q.Unit.scale()))
	if err != nil {
		return nil, err
	}
	if rate.Sign() <= 0 {
		return nil, diag.New(diag.Type, "%s needs a positive rate; it is %s %s", p.Name, brief(q.Magnitude), q.Unit.Text)
	}
	period, err := divideNumbers(Int(1), rate)
	return period, err
}

func coerceMatrix(p Param, v Value) (Value, error) {
	if l, ok := v.(*List); ok && l.Pair {
		return nil, needs(p, "a matrix", v).WithHelp("a conjugate pair belongs to a list of poles")
	}
	m, err := asMatrix(v)
	if err != nil {
		e := needs(p, "a matrix", v)
		if l, ok := v.(*List); ok {
			if cause, ok := err.(*diag.Error); ok && len(l.Items) > 0 {
				e = e.WithHelp("%s", cause.Message)
			}
		}
		return nil, e
	}
	return m, nil
}

func coerceSquare(p Param, v Value) (Value, error) {
	out, err := coerceMatrix(p, v)
	if err != nil {
		return nil, needs(p, "a square matrix", v)
	}
	if m := out.(*Matrix); m.rows != m.cols {
		return nil, diag.New(diag.Shape, "%s needs a square matrix; it is %s", p.Name, sizeText(m.rows, m.cols))
	}
	return out, nil
}

func coerceVector(p Param, v Value) (Value, error) {
	out, err := coerceMatrix(p, v)
	if err != nil {
		return nil, needs(p, "a column of numbers", v)
	}
	m := out.(*Matrix)
	switch {
	case m.cols == 1:
		return m, nil
	case m.rows == 1:
		return transposeMatrix(m), nil
	}
	return nil, diag.New(diag.Shape, "%s needs a column of numbers; it is a %s matrix", p.Name, sizeText(m.rows, m.cols))
}

func coercePolynomial(p Param, v Value) (Value, error) {
	if t, ok := v.(*Transfer); ok {
		r, c := t.Dims()
		if r == 1 && c == 1 && t.Entries[0][0].Den.Degree() == 0 {
			return t.Entries[0][0].Num, nil
		}
		return nil, needs(p, "a polynomial", v).WithHelp("the denominator depends on %s", t.Variable)
	}
	q, err := asPolynomial(oneEntry(v))
	if err != nil {
		e := needs(p, "a polynomial", v)
		if v.Kind() == KList || v.Kind() == KMatrix {
			e = e.WithHelp("polynomial(…) makes one of its coefficients, highest power first")
		}
		return nil, e
	}
	return q, nil
}

func coerceSystem(p Param, v Value) (Value, error) {
	switch x := v.(type) {
	case *Plant:
		return x, nil
	case *Model, *Transfer:
		return orError(ToPlant(x))
	}
	e := needs(p, "a plant or another system", v)
	if v.Kind() == KMatrix {
		e = e.WithHelp("plant(A, B, C) makes one of matrices")
	}
	return nil, e
}

func coerceTransfer(p Param, v Value) (Value, error) {
	switch v.(type) {
	case *Transfer, *Plant, *Model, *Polynomial, *Matrix, *Gain, Number, Quantity:
		return orError(ToTransfer(v))
	}
	return nil, needs(p, "a transfer function or another system", v)
}

func coerceList(p Param, v Value) (Value, error) {
	if l, ok := v.(*List); ok {
		return l, nil
	}
	items, err := Elements(v)
	if err != nil {
		return nil, needs(p, "a list", v)
	}
	return &List{Items: items}, nil
}

func coerceText(p Param, v Value) (Value, error) {
	if t, ok := v.(Text); ok {
		return t, nil
	}
	return nil, needs(p, "a quoted text", v)
}

func coerceChoice(p Param, v Value) (Value, error) {
	t, ok := v.(Text)
	if !ok {
		return nil, needs(p, "one of "+quotedChoices(p.Choices), v)
	}
	for _, choice := range p.Choices {
		if choice == string(t) {
			return t, nil
		}
	}
	e := diag.New(diag.Name, "%s needs one of %s; it is %q", p.Name, quotedChoices(p.Choices), shorten(string(t)))
	if near := Nearest(string(t), p.Choices); near != "" {
		e = e.WithHelp("did you mean %q?", near)
	}
	return nil, e
}

func quotedChoices(choices []string) string {
	if len(choices) == 0 {
		return "the choices"
	}
	return `"` + strings.Join(choices, `", "`) + `"`
}

func coerceBoolean(p Param, v Value) (Value, error) {
	switch x := v.(type) {
	case Boolean:
		return x, nil
	case *Report:
		if x.Holds != nil {
			return Boolean(*x.Holds), nil
		}
	}
	return nil, needs(p, "true or false", v)
}

func coerceNames(p Param, v Value) (Value, error) {
	if t, ok := v.(Text); ok {
		return &List{Items: []Value{t}}, nil
	}
	l, ok := v.(*List)
	if !ok {
		return nil, needs(p, "a list of quoted names", v)
	}
	for k, item := range l.Items {
		if _, ok := item.(Text); !ok {
			return nil, diag.New(diag.Type, "%s needs a list of quoted names; item %d is %s", p.Name, k+1, Describe(item))
		}
	}
	return l, nil
}

func coerceGain(p Param, v Value) (Value, error) {
	if g, ok := v.(*Gain); ok {
		return g, nil
	}
	out, err := coerceMatrix(p, v)
	if err != nil {
		return nil, needs(p, "a gain or a matrix", v)
	}
	return out, nil
}

func coerceFunction(p Param, v Value) (Value, error) {
	if f, ok := v.(*Function); ok {
		return f, nil
	}
	return nil, needs(p, "a function", v)
}
