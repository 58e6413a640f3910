package eval

import (
	"math"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// list judges a printed list or matrix against what was computed.
func (c *claimComparison) list(at []int, p printedList, v value.Value) *diag.Error {
	switch v := v.(type) {
	case *value.Gain:
		return c.gain(p, v)
	case *value.Matrix:
		c.rows, c.columns = v.Rows, v.Columns
		return c.matrix(p, v)
	case *value.Polynomial:
		return c.coefficientList(p, v)
	case *value.Transfer:
		return c.transferMatrix(p, v)
	case *value.List:
		if len(at) == 0 && !c.ordered && areNumbers(v.Items) && arePrintedNumbers(p.items) {
			c.set(p, v.Items)
			return nil
		}
		if len(p.items) != len(v.Items) {
			c.differ("%s printed, %s computed", count(len(p.items), "value"), count(len(v.Items), "value"))
			return nil
		}
		for i, item := range p.items {
			if err := c.compare(within(at, i+1), item, v.Items[i]); err != nil {
				return err
			}
		}
		return nil
	}
	return kindsDiffer(p, v)
}

func areNumbers(items []value.Value) bool {
	for _, v := range items {
		if _, _, ok := parts(v); !ok {
			return false
		}
	}
	return true
}

func arePrintedNumbers(items []printed) bool {
	for _, p := range items {
		switch p := p.(type) {
		case printedNumber:
			if p.unit != nil {
				return false
			}
		case printedComplex:
		default:
			return false
		}
	}
	return true
}

// rowsOf gives a printed matrix as rows. A flat list is one row, or one column where
// the computed matrix has one.
func rowsOf(p printedList, rows, cols int) ([][]printed, bool) {
	nested := false
	for _, item := range p.items {
		if _, ok := item.(printedList); ok {
			nested = true
		}
	}
	if !nested {
		if cols == 1 && rows != 1 {
			out := make([][]printed, len(p.items))
			for i, item := range p.items {
				out[i] = []printed{item}
			}
			return out, true
		}
		return [][]printed{p.items}, true
	}
	out := make([][]printed, len(p.items))
	for i, item := range p.items {
		row, ok := item.(printedList)
		if !ok || len(row.items) != len(p.items[0].(printedList).items) {
			return nil, false
		}
		out[i] = row.items
	}
	return out, true
}

// sized gives the printed rows when they have the computed size, else it records the difference.
func (c *claimComparison) sized(p printedList, rows, cols int) ([][]printed, *diag.Error) {
	out, ok := rowsOf(p, rows, cols)
	if !ok {
		return nil, diag.New(diag.Shape, "the printed rows are not of equal length").At(p.span)
	}
	width := 0
	if len(out) > 0 {
		width = len(out[0])
	}
	if len(out) != rows || width != cols {
		c.differ("the printed matrix is %d×%d, the computed one %d×%d", len(out), width, rows, cols)
		return nil, nil
	}
	return out, nil
}

func (c *claimComparison) matrix(p printedList, m *value.Matrix) *diag.Error {
	r, k := m.Dims()
	rows, err := c.sized(p, r, k)
	if err != nil {
		return err
	}
	for i, row := range rows {
		for j, entry := range row {
			if err := c.compare([]int{i + 1, j + 1}, entry, m.At(i, j)); err != nil {
				return err
			}
		}
	}
	return nil
}

// set judges a pole list: printed and computed values in the best one-to-one matching.
func (c *claimComparison) set(p printedList, computed []value.Value) {
	if len(p.items) != len(computed) {
		c.differ("%s printed, %s computed", count(len(p.items), "value"), count(len(computed), "value"))
		return
	}
	n := len(computed)
	cost := make([][]float64, n)
	for i, item := range p.items {
		cost[i] = make([]float64, n)
		for j, v := range computed {
			result, distance := fits(item, v)
			cost[i][j] = distance
			if result != agrees {
				// A pair that does not agree costs more than any number of pairs that do.
				cost[i][j] = float64(result)*1e6*float64(n) + math.Min(distance, 1e6)
			} else {
				cost[i][j] = 0
			}
		}
	}
	for i, j := range assignment(cost) {
		v := computed[j]
		at := []int{i + 1}
		if _, isComplex := v.(value.Complex); isComplex {
			re, im, _ := parts(v)
			pr, pi := printedParts(p.items[i])
			c.part(at, "real", pr, re)
			c.part(at, "imaginary", pi, im)
			continue
		}
		// Both lists hold numbers only, so that the comparison cannot fail.
		_ = c.compare(at, p.items[i], v)
	}
}

func printedParts(p printed) (re, im printedNumber) {
	if z, ok := p.(printedComplex); ok {
		return z.re, z.im
	}
	n := p.(printedNumber)
	return n, exactly(ratZero, n.span, "0")
}

// fits judges a printed number against a computed one; the distance is relative to the computed size.
func fits(p printed, v value.Value) (verdict, float64) {
	pr, pi := printedParts(p)
	re, im, _ := parts(v)
	first, _ := pr.judge(re)
	second, _ := pi.judge(im)
	x, _ := pr.value.Float64()
	y, _ := pi.value.Float64()
	distance := math.Hypot(x-re.Float64(), y-im.Float64())
	if size := math.Hypot(re.Float64(), im.Float64()); size > 0 {
		distance /= size
	}
	if math.IsNaN(distance) {
		distance = math.Inf(1)
	}
	return combined(first, second), distance
}

// assignment gives for each row the column of the cheapest one-to-one matching of a
// square table (the Hungarian method with potentials, Kuhn 1955; Munkres 1957), in n³ steps.
func assignment(cost [][]float64) []int {
	n := len(cost)
	u, v := make([]float64, n+1), make([]float64, n+1)
	match, way := make([]int, n+1), make([]int, n+1) // match: the row of each column, from 1
	for i := 1; i <= n; i++ {
		match[0] = i
		j0 := 0
		least := make([]float64, n+1)
		used := make([]bool, n+1)
		for j := range least {
			least[j] = math.MaxFloat64
		}
		for match[j0] != 0 {
			used[j0] = true
			i0, delta, j1 := match[j0], math.MaxFloat64, 0
			for j := 1; j <= n; j++ {
				if used[j] {
					continue
				}
				if reduced := cost[i0-1][j-1] - u[i0] - v[j]; reduced < least[j] {
					least[j], way[j] = reduced, j0
				}
				if least[j] < delta {
					delta, j1 = least[j], j
				}
			}
			for j := range used {
				if used[j] {
					u[match[j]] += delta
					v[j] -= delta
				} else {
					least[j] -= delta
				}
			}
			j0 = j1
		}
		for j0 != 0 {
			match[j0] = match[way[j0]]
			j0 = way[j0]
		}
	}
	rows := make([]int, n)
	for j := 1; j <= n; j++ {
		rows[match[j]-1] = j - 1
	}
	return rows
}
