package model

import "math"

// run executes instructions. Truth is 1 and 0; both branches of an if are computed and
// one is selected, so a value that does not exist in the other does no harm.
func (e *Evaluator) run(steps []instruction) {
	r := e.registers
	for k := range steps {
		i := &steps[k]
		a := r[i.a]
		switch i.operation {
		case opAdd:
			r[i.out] = a + r[i.b]
		case opSubtract:
			r[i.out] = a - r[i.b]
		case opMultiply:
			r[i.out] = a * r[i.b]
		case opDivide:
			r[i.out] = a / r[i.b]
		case opNegate:
			r[i.out] = -a
		case opSquare:
			r[i.out] = a * a
		case opCube:
			r[i.out] = a * a * a
		case opInverse:
			r[i.out] = 1 / a
		case opSqrt:
			r[i.out] = math.Sqrt(a)
		case opSin:
			r[i.out] = math.Sin(a)
		case opCos:
			r[i.out] = math.Cos(a)
		default:
			r[i.out] = e.rare(i, a)
		}
	}
}

// rare executes the instructions that need more than a line, or stand seldom.
func (e *Evaluator) rare(i *instruction, a float64) float64 {
	b, c := e.registers[i.b], e.registers[i.c]
	switch i.operation {
	case opPower:
		return math.Pow(a, i.exponent)
	case opPowerOf:
		return math.Pow(a, b)
	case opExp:
		return math.Exp(a)
	case opLog:
		return math.Log(a)
	case opLog10:
		return math.Log10(a)
	case opTan:
		return math.Tan(a)
	case opAsin:
		return math.Asin(a)
	case opAcos:
		return math.Acos(a)
	case opAtan:
		return math.Atan(a)
	case opAtan2:
		return math.Atan2(a, b)
	case opAbs:
		return math.Abs(a)
	case opSign:
		return signOf(a)
	case opMin:
		if a <= b {
			return a
		}
		return b
	case opMax:
		if a >= b {
			return a
		}
		return b
	case opLimit:
		switch {
		case a < b:
			return b
		case a > c:
			return c
		}
		return a
	case opInterpolate:
		return e.p.tables[i.index].at(a)
	case opSlope:
		return e.p.tables[i.index].slope(a)
	case opSelect:
		if a != 0 {
			return b
		}
		return c
	}
	return truthOf(i.operation, a, b)
}

func signOf(a float64) float64 {
	switch {
	case a > 0:
		return 1
	case a < 0:
		return -1
	}
	return a // 0, or NaN
}

func truthOf(o operation, a, b float64) float64 {
	t := false
	switch o {
	case opLess:
		t = a < b
	case opAtMost:
		t = a <= b
	case opEqual:
		t = a == b
	case opUnequal:
		t = a != b
	case opAnd:
		t = a != 0 && b != 0
	case opOr:
		t = a != 0 || b != 0
	case opNot:
		t = a == 0
	}
	if t {
		return 1
	}
	return 0
}
