package value

import (
	"gainwright/lang/diag"
)

// Collect makes the value of a list literal or of `for each`: pairs are spliced one
// level, and items that are all lists of scalars are the rows of a matrix.
func Collect(items []Value) (Value, error) {
	rows := make([][]Entry, 0, len(items))
	out := make([]Value, 0, len(items))
	for _, item := range items {
		item = Force(item)
		l, isList := item.(*List)
		if isList && l.Pair {
			out = append(out, l.Items...)
			continue
		}
		out = append(out, item)
		if isList && len(l.Items) > 0 && allScalars(l.Items) {
			row := make([]Entry, len(l.Items))
			for k, x := range l.Items {
				row[k].Value = x
			}
			rows = append(rows, row)
		}
	}
	if len(rows) > 0 && len(rows) == len(items) {
		v, _, err := MatrixLiteral(rows)
		return v, err
	}
	return &List{Items: out}, nil
}

func allScalars(items []Value) bool {
	for _, item := range items {
		if !isScalar(item) {
			return false
		}
	}
	return true
}

// Elements gives what `for each` runs over: the items of a list, the entries of a row or
// a column, the rows of another matrix.
func Elements(v Value) ([]Value, error) {
	switch x := Force(v).(type) {
	case *List:
		return x.Items, nil
	case *Gain:
		return Elements(x.Values)
	case *Matrix:
		if x.rows == 1 || x.cols == 1 {
			out := make([]Value, x.rows*x.cols)
			for k := range out {
				out[k] = x.At(k/x.cols, k%x.cols)
			}
			return out, nil
		}
		out := make([]Value, x.rows)
		for i := range out {
			out[i] = x.slice([]int{i}, wholeRange(x.cols))
		}
		return out, nil
	case *Report:
		out := make([]Value, len(x.Rows))
		for i := range out {
			out[i] = x.row(i)
		}
		return out, nil
	}
	return nil, diag.New(diag.Type, "a list is needed here; this is %s", Describe(v))
}

// Entry is an element of a matrix literal; Zero and One tell that it is the token 0 or 1,
// which in a block matrix means the zero and the identity block.
type Entry struct {
	Value     Value
	Zero, One bool
}

// MatrixLiteral makes a matrix of rows: of numbers, a block matrix when an entry is a
// matrix, a transfer function when an entry is a polynomial or a transfer function, and a
// list of lists when an entry cannot stand in a matrix. On error at is the row and the
// column at fault, from 0; the column is −1 when the row as a whole is.
func MatrixLiteral(rows [][]Entry) (v Value, at [2]int, err error) {
	blocks, functions := false, false
	for i, row := range rows {
		for j := range row {
			row[j].Value = Force(row[j].Value)
			switch x := row[j].Value.(type) {
			case *List:
				if x.Pair {
					return nil, [2]int{i, j}, diag.New(diag.Type, "a conjugate pair cannot stand in a row of a matrix").
						WithHelp("a list of poles is written without inner brackets: [-1, -2 ± 3i]")
				}
				if !allScalars(x.Items) {
					return listOfLists(rows), at, nil
				}
				blocks = true
			case *Matrix, *Gain:
				blocks = true
			case *Polynomial, *Transfer:
				functions = true
			case Number, Complex, Quantity:
			default:
				return listOfLists(rows), at, nil
			}
		}
	}
	for i, row := range rows {
		if len(row) != len(rows[0]) {
			return nil, [2]int{i, -1}, diag.New(diag.Shape, "the rows of a matrix have unequal lengths: row 1 has %d, row %d has %d",
				len(rows[0]), i+1, len(row))
		}
	}
	switch {
	case len(rows) == 0 || len(rows[0]) == 0:
		return zeroMatrix(len(rows), 0), at, nil
	case functions:
		return transferLiteral(rows)
	case blocks:
		return blockLiteral(rows)
	}
	return numberLiteral(rows)
}

func listOfLists(rows [][]Entry) Value {
	out := &List{Items: make([]Value, len(rows))}
	for i, row := range rows {
		inner := &List{}
		for _, e := range row {
			if pair, ok := e.Value.(*List); ok && pair.Pair {
				inner.Items = append(inner.Items, pair.Items...)
				continue
			}
			inner.Items = append(inner.Items, e.Value)
		}
		out.Items[i] = inner
	}
	return out
}

func numberLiteral(rows [][]Entry) (Value, [2]int, error) {
	items := make([]Value, 0, len(rows)*len(rows[0]))
	for i, row := range rows {
		for j, e := range row {
			if _, err := asComplex(e.Value); err != nil { // Hz, whose SI value is not known
				return nil, [2]int{i, j}, err
			}
			items = append(items, e.Value)
		}
	}
	m, err := scalarsMatrix(len(rows), len(rows[0]), items)
	if err != nil {
		return nil, [2]int{0, -1}, err
	}
	return m, [2]int{}, nil
}

// blockSizes finds the height of each block row and the width of each block column.
// size gives the size of an entry, ok false for the tokens 0 and 1.
func blockSizes(rows [][]Entry, size func(Value) (r, c int)) (heights, widths []int, at [2]int, err error) {
	heights, widths = make([]int, len(rows)), make([]int, len(rows[0]))
	for k := range heights {
		heights[k] = -1
	}
	for k := range widths {
		widths[k] = -1
	}
	single := true
	set := func(known *int, n int) bool {
		if *known < 0 {
			*known = n
		}
		return *known == n
	}
	for i, row := range rows {
		for j, e := range row {
			if e.Zero || e.One {
				continue
			}
			r, c := size(e.Value)
			single = single && r == 1 && c == 1
			if !set(&heights[i], r) {
				return nil, nil, [2]int{i, j}, diag.New(diag.Shape, "this block is %s, but the blocks before it in row %d have %s",
					sizeText(r, c), i+1, count(heights[i], "row"))
			}
			if !set(&widths[j], c) {
				return nil, nil, [2]int{i, j}, diag.New(diag.Shape, "this block is %s, but the blocks above it in column %d have %s",
					sizeText(r, c), j+1, count(widths[j], "column"))
			}
		}
	}
	if single { // nothing is larger than a number, so 0 and 1 are numbers
		for k := range heights {
			heights[k] = 1
		}
		for k := range widths {
			widths[k] = 1
		}
	}
	for changed := true; changed; { // an identity carries a height to a width and back
		changed = false
		for i, row := range rows {
			for j, e := range row {
				if !e.One || (heights[i] < 0) == (widths[j] < 0) {
					continue
				}
				heights[i], widths[j] = max(heights[i], widths[j]), max(heights[i], widths[j])
				changed = true
			}
		}
	}
	at, err = checkBlockSizes(rows, heights, widths)
	return heights, widths, at, err
}

// checkBlockSizes refuses tokens whose block has no size, or an identity that is not square.
func checkBlockSizes(rows [][]Entry, heights, widths []int) (at [2]int, err error) {
	for i, row := range rows {
		for j, e := range row {
			at = [2]int{i, j}
			token := "0"
			if e.One {
				token = "1"
			}
			switch {
			case (e.Zero || e.One) && (heights[i] < 0 || widths[j] < 0):
				side := "height"
				if heights[i] >= 0 {
					side = "width"
				}
				return at, diag.New(diag.Shape, "the %s of this block %s is not fixed by the other blocks", side, token).
					WithHelp("write filled(0, rows: r, columns: c) or identity(n) where the size is not clear")
			case e.One && heights[i] != widths[j]:
				return at, diag.New(diag.Shape, "1 stands for an identity block, but this block is %s", sizeText(heights[i], widths[j]))
			}
		}
	}
	return [2]int{}, nil
}

func blockLiteral(rows [][]Entry) (Value, [2]int, error) {
	grid := make([][]*Matrix, len(rows))
	for i, row := range rows {
		grid[i] = make([]*Matrix, len(row))
		for j, e := range row {
			m, err := asMatrix(e.Value)
			if err != nil {
				return nil, [2]int{i, j}, err
			}
			grid[i][j] = m
			rows[i][j].Value = m
		}
	}
	heights, widths, at, err := blockSizes(rows, func(v Value) (int, int) { return v.(*Matrix).Dims() })
	if err != nil {
		return nil, at, err
	}
	for i, row := range rows {
		for j, e := range row {
			if err := CheckSize(heights[i], widths[j], true); err != nil && (e.Zero || e.One) {
				return nil, [2]int{i, j}, err
			}
			switch {
			case e.Zero:
				grid[i][j] = zeroMatrix(heights[i], widths[j])
			case e.One:
				grid[i][j] = IdentityMatrix(heights[i])
			}
		}
	}
	m, err := joinBlocks(grid)
	if err != nil {
		return nil, [2]int{0, -1}, err
	}
	return m, [2]int{}, nil
}

// transferLiteral puts transfer functions, polynomials, matrices and numbers together.
func transferLiteral(rows [][]Entry) (Value, [2]int, error) {
	out := &Transfer{}
	grid := make([][]*Transfer, len(rows))
	for i, row := range rows {
		grid[i] = make([]*Transfer, len(row))
		for j, e := range row {
			if e.Value.Kind() == KComplex {
				return nil, [2]int{i, j}, diag.New(diag.Type, "transfer functions have real coefficients; this is a complex number")
			}
			t, err := asTransfer(e.Value)
			if err != nil {
				return nil, [2]int{i, j}, err
			}
			if out.Variable, out.Every, err = combineTime(&Transfer{Variable: out.Variable, Every: out.Every}, t); err != nil {
				return nil, [2]int{i, j}, err
			}
			grid[i][j] = t
			rows[i][j].Value = t
		}
	}
	heights, widths, at, err := blockSizes(rows, func(v Value) (int, int) { return v.(*Transfer).Dims() })
	if err != nil {
		return nil, at, err
	}
	for i, row := range rows {
		block := newEntries(heights[i], 0)
		for j, e := range row {
			t := grid[i][j]
			switch {
			case e.Zero:
				t = staticTransfer(zeroMatrix(heights[i], widths[j]), out)
			case e.One:
				t = staticTransfer(IdentityMatrix(heights[i]), out)
			}
			for k := range block {
				block[k] = append(block[k], t.Entries[k]...)
			}
		}
		out.Entries = append(out.Entries, block...)
	}
	return out, [2]int{}, nil
}
