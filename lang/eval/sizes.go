package eval

import (
	"fmt"

	"gainwright/lang/value"
)

const (
	headerBytes     = 64 // a small value with its interface and bookkeeping
	exactEntryBytes = 96 // a rational: two integers with their headers
)

// sizeOf estimates the bytes a value holds without what its parts, which were charged
// when they were made, hold themselves.
func sizeOf(v value.Value) int64 {
	switch v := v.(type) {
	case value.Number:
		if v.Exact != nil {
			return headerBytes + int64(v.Exact.Num().BitLen()+v.Exact.Denom().BitLen())/8
		}
	case value.Text:
		return headerBytes + int64(len(v))
	case *value.List:
		return headerBytes + 16*int64(len(v.Items))
	case *value.Matrix:
		return matrixBytes(v)
	case *value.Polynomial:
		return polynomialBytes(v)
	case *value.Transfer:
		total := int64(headerBytes)
		for _, row := range v.Entries {
			for _, e := range row {
				total += polynomialBytes(e.Num) + polynomialBytes(e.Den)
			}
		}
		return total
	case *value.Plant:
		return matrixBytes(v.A) + matrixBytes(v.B) + matrixBytes(v.C) + matrixBytes(v.D)
	case *value.Gain:
		return matrixBytes(v.Values) + matrixBytes(v.Cost)
	case *value.Report:
		return headerBytes * int64(1+len(v.Fields)+len(v.Rows)*(1+len(v.Columns)))
	}
	return headerBytes
}

func matrixBytes(m *value.Matrix) int64 {
	if m == nil {
		return 0
	}
	r, c := m.Dims()
	entry := int64(8)
	if m.IsExact() {
		entry = exactEntryBytes
	}
	if m.IsComplex() {
		entry *= 2
	}
	return headerBytes + entry*int64(r)*int64(c)
}

func polynomialBytes(p *value.Polynomial) int64 {
	if p == nil {
		return 0
	}
	if p.Exact == nil {
		return headerBytes + 8*int64(len(p.F))
	}
	return headerBytes + int64(p.Exact.Degree()+1)*(exactEntryBytes+int64(p.Exact.Lead().Num().BitLen())/4)
}

// productBytes foretells the size of a matrix product, so that an outer product of two
// long vectors is refused before it is made.
func productBytes(a, b value.Value) int64 {
	x, ok := a.(*value.Matrix)
	y, ok2 := b.(*value.Matrix)
	if !ok || !ok2 {
		return 0
	}
	r, _ := x.Dims()
	_, c := y.Dims()
	entry := int64(8)
	if x.IsExact() && y.IsExact() {
		entry = exactEntryBytes
	}
	return entry * int64(r) * int64(c)
}

func bytesText(n int64) string {
	switch {
	case n >= 1<<30:
		return fmt.Sprintf("%.3g GiB", float64(n)/(1<<30))
	case n >= 1<<20:
		return fmt.Sprintf("%.3g MiB", float64(n)/(1<<20))
	}
	return fmt.Sprintf("%d bytes", n)
}
