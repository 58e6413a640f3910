package exact

import (
	"math/big"
	"math/rand/v2"
	"testing"
)

// randomStabilityPolynomial multiplies small factors with known root places,
// many on the axis, mirrored or at zero, so that singular tables are frequent.
func randomStabilityPolynomial(random *rand.Rand) (p Polynomial, right, left, axis int) {
	p = PolynomialOfIntegers([]int64{-3, -1, 1, 2}[random.IntN(4)])
	small := func() int64 { return random.Int64N(3) + 1 }
	for range 1 + random.IntN(5) {
		a, b := small(), small()
		switch random.IntN(7) {
		case 0:
			p, left = p.Mul(PolynomialOfIntegers(1, a)), left+1
		case 1:
			p, right = p.Mul(PolynomialOfIntegers(1, -a)), right+1
		case 2:
			p, axis = p.Mul(PolynomialOfIntegers(1, 0)), axis+1
		case 3:
			p, axis = p.Mul(PolynomialOfIntegers(1, 0, a)), axis+2
		case 4:
			p, left = p.Mul(PolynomialOfIntegers(1, 2*a, a*a+b)), left+2
		case 5:
			p, right = p.Mul(PolynomialOfIntegers(1, -2*a, a*a+b)), right+2
		case 6:
			p, left, right = p.Mul(PolynomialOfIntegers(1, 0, 0, 0, a)), left+2, right+2
		}
	}
	return p, right, left, axis
}

func TestRouthCountsMatchKnownRoots(t *testing.T) {
	random := rand.New(rand.NewPCG(3, 4))
	shifted, derived := 0, 0
	for range 4000 {
		p, right, left, axis := randomStabilityPolynomial(random)
		table, err := NewRouthTable(p)
		if err != nil {
			t.Fatal(err)
		}
		if table.Right != right || table.Left != left || table.Axis != axis {
			t.Fatalf("%v: right %d left %d axis %d, want %d %d %d", p, table.Right, table.Left, table.Axis, right, left, axis)
		}
		for _, row := range table.Rows {
			switch row.Change {
			case Shifted:
				shifted++
			case FromDerivative:
				derived++
			}
		}
	}
	if shifted < 100 || derived < 100 {
		t.Errorf("only %d shifted and %d derived rows were met", shifted, derived)
	}
}

func TestJuryCountsMatchKnownRoots(t *testing.T) {
	random := rand.New(rand.NewPCG(5, 6))
	for range 2000 {
		p, right, left, axis := randomStabilityPolynomial(random)
		// w = (z − 1)/(z + 1) maps the inside of the circle to the left half-plane.
		q := Polynomial{}
		power := Constant(ratOne)
		plus, minus := PolynomialOfIntegers(1, 1), PolynomialOfIntegers(1, -1)
		for k := p.Degree(); k >= 0; k-- {
			q = q.Mul(minus).Add(power.Scale(p.c[k]))
			power = power.Mul(plus)
		}
		// A root w = 1 goes to infinity: the degree drops.
		outside := right - (p.Degree() - q.Degree())
		table, err := NewJuryTable(q)
		if err != nil {
			t.Fatal(err)
		}
		if table.Inside != left || table.On != axis || table.Outside != outside {
			t.Fatalf("%v: inside %d on %d outside %d, want %d %d %d", q, table.Inside, table.On, table.Outside, left, axis, outside)
		}
		stable := true
		for _, c := range table.Conditions {
			stable = stable && c.Holds
		}
		if q.Degree() >= 1 && stable != (table.On == 0 && table.Outside == 0) {
			t.Fatalf("%v: the conditions say %v, the counts say %v", q, stable, table.Stable())
		}
	}
}

func TestSturmCountsMatchKnownRoots(t *testing.T) {
	random := rand.New(rand.NewPCG(8, 9))
	for range 300 {
		distinct := map[int64]bool{}
		p := PolynomialOfIntegers(1, 0, random.Int64N(5)+1)
		for range random.IntN(6) {
			r := random.Int64N(11) - 5
			distinct[r] = true
			p = p.Mul(PolynomialOfIntegers(1, -r))
		}
		low, high := random.Int64N(7)-5, random.Int64N(7)
		want, all := 0, len(distinct)
		for r := range distinct {
			if low < r && r <= high {
				want++
			}
		}
		if got := p.RealRootsBetween(big.NewRat(low, 1), big.NewRat(high, 1)); low < high && got != want {
			t.Errorf("%v in (%d, %d]: %d, want %d", p, low, high, got, want)
		}
		if got := p.RealRootsBetween(nil, nil); got != all {
			t.Errorf("%v: %d real roots, want %d", p, got, all)
		}
	}
}
