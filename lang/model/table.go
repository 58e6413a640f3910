package model

import (
	"math/big"
	"sort"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// table is a characteristic of two columns, in the units of its columns' heads. Between
// its points it is a straight line; beyond its ends it keeps the end's value.
type table struct {
	xUnit, yUnit value.Unit
	x, y         []amount // in SI, x ascending
	slopes       []amount // of each piece
	fx, fy, fs   []float64
}

const mostTablePoints = 100_000

// tableOf reads a matrix of two columns or a report's table of two columns of numbers.
func tableOf(v value.Value) (*table, error) {
	t := &table{xUnit: value.None(), yUnit: value.None()}
	var xs, ys []value.Value
	switch v := value.Force(v).(type) {
	case *value.Matrix:
		rows, cols := v.Dims()
		if cols != 2 {
			return nil, diag.New(diag.Shape, "a table to interpolate has two columns; this is %s", value.Describe(v))
		}
		for i := range rows {
			xs, ys = append(xs, v.At(i, 0)), append(ys, v.At(i, 1))
		}
	case *value.Report:
		if len(v.Columns) != 2 {
			return nil, diag.New(diag.Shape, "a table to interpolate has two columns; this one has %d", len(v.Columns))
		}
		for k, unit := range [...]*value.Unit{&t.xUnit, &t.yUnit} {
			u, err := headUnit(v.Columns[k])
			if err != nil {
				return nil, err
			}
			*unit = u
		}
		for _, row := range v.Rows {
			if len(row) != 2 || row[0] == nil || row[1] == nil {
				return nil, diag.New(diag.Shape, "the table has an empty cell")
			}
			xs, ys = append(xs, row[0]), append(ys, row[1])
		}
	default:
		return nil, diag.New(diag.Type, "interpolate takes a table of two columns; this is %s", value.Describe(v))
	}
	if len(xs) > mostTablePoints {
		return nil, diag.New(diag.Limit, "a table to interpolate has at most %d points", mostTablePoints)
	}
	return t, t.fill(xs, ys)
}

// headUnit reads the unit in a column's head: "flow [L/min]".
func headUnit(head string) (value.Unit, error) {
	for i := len(head) - 1; i >= 0; i-- {
		if head[i] == '[' && head[len(head)-1] == ']' {
			return value.ParseUnit(head[i+1 : len(head)-1])
		}
	}
	return value.None(), nil
}

func (t *table) fill(xs, ys []value.Value) error {
	if len(xs) < 2 {
		return diag.New(diag.Shape, "a table to interpolate has at least two rows; this one has %d", len(xs))
	}
	type point struct{ x, y amount }
	points := make([]point, len(xs))
	for k := range xs {
		for _, part := range [...]struct {
			v   value.Value
			u   value.Unit
			out *amount
		}{{xs[k], t.xUnit, &points[k].x}, {ys[k], t.yUnit, &points[k].y}} {
			n, ok := value.Force(part.v).(value.Number)
			if !ok {
				return diag.New(diag.Type, "row %d of the table holds %s where a number is needed", k+1, value.Describe(part.v))
			}
			a, err := toSI(n, part.u)
			if err != nil {
				return err
			}
			*part.out = a
		}
	}
	sort.SliceStable(points, func(i, j int) bool { return points[i].x.float() < points[j].x.float() })
	for k, p := range points {
		t.x, t.y = append(t.x, p.x), append(t.y, p.y)
		t.fx, t.fy = append(t.fx, p.x.float()), append(t.fy, p.y.float())
		if k == 0 {
			continue
		}
		if t.fx[k] <= t.fx[k-1] {
			return diag.New(diag.Numerical, "two rows of the table stand at the same place, %g in SI units", t.fx[k])
		}
		slope, err := slopeBetween(points[k-1].x, points[k-1].y, p.x, p.y)
		if err != nil {
			return err
		}
		t.slopes, t.fs = append(t.slopes, slope), append(t.fs, slope.float())
	}
	return nil
}

func slopeBetween(x0, y0, x1, y1 amount) (amount, error) {
	dx, err := x1.subtract(x0)
	if err != nil {
		return amount{}, err
	}
	dy, err := y1.subtract(y0)
	if err != nil {
		return amount{}, err
	}
	return dy.divide(dx)
}

// piece finds the piece that x lies on, the right one at a knot; −1 before the first
// point and len(slopes) from the last one on.
func (t *table) piece(x float64) int {
	if !(x >= t.fx[0]) {
		return -1
	}
	if x >= t.fx[len(t.fx)-1] {
		return len(t.fs)
	}
	return sort.SearchFloat64s(t.fx, x) - knotShift(t.fx, x)
}

// knotShift is 0 where x is a knot, else 1: the search gives the knot itself or the next one.
func knotShift(knots []float64, x float64) int {
	k := sort.SearchFloat64s(knots, x)
	if k < len(knots) && knots[k] == x {
		return 0
	}
	return 1
}

// at evaluates in float64.
func (t *table) at(x float64) float64 {
	if x != x {
		return x // not a number
	}
	k := t.piece(x)
	switch {
	case k < 0:
		return t.fy[0]
	case k == len(t.fs):
		return t.fy[k]
	}
	return t.fy[k] + t.fs[k]*(x-t.fx[k])
}

// slope is the slope in float64, 0 beyond the ends.
func (t *table) slope(x float64) float64 {
	if k := t.piece(x); k >= 0 && k < len(t.fs) {
		return t.fs[k]
	}
	return 0
}

// exactAt gives value and slope, and where x stands: on a knot with a change of slope, or
// beyond the ends.
func (t *table) exactAt(x amount) (y, slope amount, where string, err error) {
	k := t.piece(x.float())
	switch {
	case k < 0:
		return t.y[0], zeroAmount, "before its first point", nil
	case k == len(t.fs):
		if _, tied, err := x.compare(t.x[k]); err != nil || tied {
			return t.y[k], zeroAmount, "on its last point", err
		}
		return t.y[k], zeroAmount, "beyond its last point", nil
	}
	for _, knot := range [...]int{k, k + 1} {
		if _, tied, err := x.compare(t.x[knot]); err == nil && tied && (knot == 0 || knot == len(t.fs) || t.fs[knot-1] != t.fs[knot]) {
			where = "on a corner"
		}
	}
	dx, err := x.subtract(t.x[k])
	if err != nil {
		return amount{}, amount{}, "", err
	}
	rise, err := dx.multiply(t.slopes[k])
	if err != nil {
		return amount{}, amount{}, "", err
	}
	y, err = t.y[k].add(rise)
	return y, t.slopes[k], where, err
}

var half = big.NewRat(1, 2)
