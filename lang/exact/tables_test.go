package exact

import (
	"fmt"
	"testing"
)

func rowsOf(t *RouthTable) (out []string) {
	for _, row := range t.Rows {
		out = append(out, NewPolynomial(row.Entries...).String())
	}
	return out
}

// Worked by hand after the scheme; the first two are of the kind every textbook
// prints, the last is the shifted-row case.
func TestRouthTablesWorkedByHand(t *testing.T) {
	for _, c := range []struct {
		p                 Polynomial
		rows              []string
		changes           []RowChange
		right, left, axis int
	}{
		{PolynomialOfIntegers(1, 2, 3, 4, 5),
			[]string{"(1, 3, 5)", "(2, 4)", "(1, 5)", "(-6)", "(5)"},
			make([]RowChange, 5), 2, 2, 0},
		// (s + 1)(s − 1)(s² + 25)(s + 2): the row of s³ vanishes under 2s⁴ + 48s² − 50.
		{PolynomialOfIntegers(1, 2, 24, 48, -25, -50),
			[]string{"(1, 24, -25)", "(2, 48, -50)", "(8, 96)", "(24, -50)", "(338/3)", "(-50)"},
			[]RowChange{Regular, Regular, FromDerivative, Regular, Regular, Regular}, 1, 2, 2},
		// The row of s² is (0, 2, 1): moved left once and subtracted it becomes (−2, 1, 1).
		{PolynomialOfIntegers(1, 1, 1, 1, 2, 0, 1),
			[]string{"(1, 1, 2, 1)", "(1, 1, 0)", "(-2, 1, 1)", "(3/2, 1/2)", "(5/3, 1)", "(-2/5)", "(1)"},
			[]RowChange{Regular, Regular, Shifted, Regular, Regular, Regular, Regular}, 4, 2, 0},
	} {
		table, err := NewRouthTable(c.p)
		if err != nil {
			t.Fatal(err)
		}
		if table.Right != c.right || table.Left != c.left || table.Axis != c.axis {
			t.Errorf("%v: right %d, left %d, axis %d", c.p, table.Right, table.Left, table.Axis)
		}
		if fmt.Sprint(rowsOf(table)) != fmt.Sprint(c.rows) {
			t.Errorf("%v: rows %v, want %v", c.p, rowsOf(table), c.rows)
		}
		for k, row := range table.Rows {
			if row.Change != c.changes[k] || (row.Note() == "") != (row.Change == Regular) {
				t.Errorf("%v: row %d is %v, %q", c.p, k, row.Change, row.Note())
			}
			if row.Change == FromDerivative && !row.Auxiliary.Equal(PolynomialOfIntegers(2, 0, 48, 0, -50)) {
				t.Errorf("%v: auxiliary polynomial %v", c.p, row.Auxiliary)
			}
		}
	}
}

// z⁴ − 1.2z³ + 0.07z² + 0.3z − 0.08 = (z − 0.8)(z + 0.5)(z − 0.5)(z − 0.4),
// worked by hand: b = (−0.9936, 1.176, −0.0756, −0.204) and so on.
func TestJuryTableWorkedByHand(t *testing.T) {
	p := NewPolynomial(frac(1, 1), frac(-12, 10), frac(7, 100), frac(3, 10), frac(-8, 100))
	if !p.Equal(PolynomialWithRoots(frac(8, 10), frac(-5, 10), frac(5, 10), frac(4, 10))) {
		t.Fatal("the factors do not multiply out")
	}
	table, err := NewJuryTable(p)
	if err != nil {
		t.Fatal(err)
	}
	want := []Polynomial{
		NewPolynomial(frac(-8, 100), frac(3, 10), frac(7, 100), frac(-12, 10), frac(1, 1)),
		NewPolynomial(frac(-9936, 10000), frac(1176, 1000), frac(-756, 10000), frac(-204, 1000)),
		NewPolynomial(frac(94562496, 100000000), frac(-11838960, 10000000), frac(31502016, 100000000)),
	}
	if len(table.Rows) != len(want) || len(table.Conditions) != 5 || !table.Stable() || table.Inside != 4 {
		t.Fatalf("%d rows, %d conditions, %d roots inside", len(table.Rows), len(table.Conditions), table.Inside)
	}
	for k, row := range table.Rows {
		if !NewPolynomial(row.Entries...).Equal(want[k]) {
			t.Errorf("row %d: %v, want %v", k, NewPolynomial(row.Entries...), want[k])
		}
		for j, x := range row.Reversed {
			if x.Cmp(row.Entries[len(row.Entries)-1-j]) != 0 {
				t.Errorf("row %d is not reversed", k)
			}
		}
	}
	for _, condition := range table.Conditions {
		if !condition.Holds {
			t.Errorf("%s fails with %v and %v", condition.Text, condition.Left, condition.Right)
		}
	}
}

// Rows of a long table are shortened by positive factors only.
func TestLongJuryTablesStayShort(t *testing.T) {
	p := decimalPolynomial(24, 3)
	table, err := NewJuryTable(p)
	if err != nil {
		t.Fatal(err)
	}
	shortened := 0
	for _, row := range table.Rows {
		if row.Divisor != nil {
			shortened++
			if row.Divisor.Sign() <= 0 {
				t.Errorf("divisor %v", row.Divisor)
			}
		}
		for _, x := range row.Entries {
			if ratBits(x) > 20_000 {
				t.Fatalf("an entry of %d bits", ratBits(x))
			}
		}
	}
	if shortened == 0 || table.Inside+table.On+table.Outside != 24 {
		t.Errorf("%d rows shortened, %d %d %d roots", shortened, table.Inside, table.On, table.Outside)
	}
}
