//go:build amd64

package numeric

import (
	"sync"

	"gonum.org/v1/gonum/blas"
	blasgonum "gonum.org/v1/gonum/blas/gonum"
)

// tiledProducts is gonum's BLAS with the matrix product replaced by one that
// packs its operands and works in tiles of 4×12 held in registers (K. Goto,
// R. A. van de Geijn, ACM Trans. Math. Softw. 34, 2008). gonum's LAPACK calls it
// too. It runs on the calling goroutine, so results do not depend on GOMAXPROCS.
type tiledProducts struct{ blasgonum.Implementation }

// The tile's size is the kernel's. A strip of B (tileColumns·depthBlock entries)
// stays in the first cache, a block of A (rowBlock·depthBlock) in the second.
const (
	tileRows, tileColumns = 4, 12
	depthBlock            = 256
	rowBlock              = 128
	columnBlock           = 480
	smallestProduct       = 16 * 16 * 16 // packing does not pay below
)

// productSpace holds packed operands and a tile.
type productSpace struct {
	a    [rowBlock * depthBlock]float64
	b    [columnBlock * depthBlock]float64
	tile [tileRows * tileColumns]float64
}

var productSpaces = sync.Pool{New: func() any { return new(productSpace) }}

// Dgemm computes C = α·op(A)·op(B) + β·C as blas.Float64Level3 says. Unlike
// gonum's it does not skip zeros, so 0·NaN is NaN.
func (t tiledProducts) Dgemm(ta, tb blas.Transpose, m, n, k int, alpha float64, a []float64, lda int, b []float64, ldb int, beta float64, c []float64, ldc int) {
	aRows, aColumns, bRows, bColumns := m, k, k, n
	if ta != blas.NoTrans {
		aRows, aColumns = k, m
	}
	if tb != blas.NoTrans {
		bRows, bColumns = n, k
	}
	small := m < tileRows || n < tileColumns/2 || k < 4 || m*n*k < smallestProduct
	if small || alpha == 0 || !holds(a, lda, aRows, aColumns) || !holds(b, ldb, bRows, bColumns) || !holds(c, ldc, m, n) {
		t.Implementation.Dgemm(ta, tb, m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
		return
	}
	for i := range m {
		row := c[i*ldc : i*ldc+n]
		switch beta {
		case 0:
			clear(row)
		case 1:
		default:
			scaleSlice(row, beta)
		}
	}
	space := productSpaces.Get().(*productSpace)
	for j := 0; j < n; j += columnBlock {
		columns := min(columnBlock, n-j)
		for l := 0; l < k; l += depthBlock {
			depth := min(depthBlock, k-l)
			space.packB(tb != blas.NoTrans, b, ldb, l, depth, j, columns)
			for i := 0; i < m; i += rowBlock {
				rows := min(rowBlock, m-i)
				space.packA(ta != blas.NoTrans, a, lda, i, rows, l, depth)
				space.addBlock(alpha, rows, columns, depth, c[i*ldc+j:], ldc)
			}
		}
	}
	productSpaces.Put(space)
}

// holds tells whether x can hold a rows×columns matrix with the stride given.
func holds(x []float64, stride, rows, columns int) bool {
	return rows > 0 && columns > 0 && stride >= columns && len(x) >= (rows-1)*stride+columns
}

// packA stores rows i … of op(A) in panels of four, depth after depth, padded
// with zeros.
func (s *productSpace) packA(transposed bool, a []float64, lda, i, rows, l, depth int) {
	for panel := 0; panel < rows; panel += tileRows {
		dst := s.a[panel*depth : (panel+tileRows)*depth]
		height := min(tileRows, rows-panel)
		if height < tileRows {
			clear(dst)
		}
		if transposed {
			for d := range depth {
				copy(dst[d*tileRows:d*tileRows+height], a[(l+d)*lda+i+panel:])
			}
			continue
		}
		for r := range height {
			row := a[(i+panel+r)*lda+l : (i+panel+r)*lda+l+depth]
			for d, v := range row {
				dst[d*tileRows+r] = v
			}
		}
	}
}

// packB stores columns j … of op(B) in panels of twelve.
func (s *productSpace) packB(transposed bool, b []float64, ldb, l, depth, j, columns int) {
	for panel := 0; panel < columns; panel += tileColumns {
		dst := s.b[panel*depth : (panel+tileColumns)*depth]
		width := min(tileColumns, columns-panel)
		if width < tileColumns {
			clear(dst)
		}
		if !transposed {
			for d := range depth {
				copy(dst[d*tileColumns:d*tileColumns+width], b[(l+d)*ldb+j+panel:])
			}
			continue
		}
		for r := range width {
			row := b[(j+panel+r)*ldb+l : (j+panel+r)*ldb+l+depth]
			for d, v := range row {
				dst[d*tileColumns+r] = v
			}
		}
	}
}

// addBlock adds α times the product of the packed blocks to c.
func (s *productSpace) addBlock(alpha float64, rows, columns, depth int, c []float64, ldc int) {
	for j := 0; j < columns; j += tileColumns {
		width := min(tileColumns, columns-j)
		for i := 0; i < rows; i += tileRows {
			tileProduct(depth, &s.a[i*depth], &s.b[j*depth], &s.tile[0])
			for r := range min(tileRows, rows-i) {
				row := c[(i+r)*ldc+j : (i+r)*ldc+j+width]
				for x, v := range s.tile[r*tileColumns : r*tileColumns+width] {
					row[x] += alpha * v
				}
			}
		}
	}
}

// smallestTriangle is the order below which gonum solves with a triangle itself.
const smallestTriangle = 24

// Dtrsm solves op(A)·X = α·B or X·op(A) = α·B as blas.Float64Level3 says, halving
// the triangle so that nearly all the work is products (F. G. Gustavson, IBM J.
// Res. Develop. 41, 1997).
func (t tiledProducts) Dtrsm(side blas.Side, uplo blas.Uplo, trans blas.Transpose, diag blas.Diag, m, n int, alpha float64, a []float64, lda int, b []float64, ldb int) {
	order := n
	if side == blas.Left {
		order = m
	}
	if order < smallestTriangle || m*n < smallestTriangle*4 || alpha == 0 || !holds(a, lda, order, order) || !holds(b, ldb, m, n) {
		t.Implementation.Dtrsm(side, uplo, trans, diag, m, n, alpha, a, lda, b, ldb)
		return
	}
	half := order / 2
	rest := order - half
	second := a[half*lda+half:]
	coupling := a[half*lda:] // rest×half below the diagonal, half×rest above it
	if uplo == blas.Upper {
		coupling = a[half:]
	}
	lower := (uplo == blas.Lower) == (trans == blas.NoTrans)
	if side == blas.Left {
		top, bottom := b, b[half*ldb:]
		if lower {
			t.Dtrsm(side, uplo, trans, diag, half, n, alpha, a, lda, top, ldb)
			t.Dgemm(trans, blas.NoTrans, rest, n, half, -1, coupling, lda, top, ldb, alpha, bottom, ldb)
			t.Dtrsm(side, uplo, trans, diag, rest, n, 1, second, lda, bottom, ldb)
			return
		}
		t.Dtrsm(side, uplo, trans, diag, rest, n, alpha, second, lda, bottom, ldb)
		t.Dgemm(trans, blas.NoTrans, half, n, rest, -1, coupling, lda, bottom, ldb, alpha, top, ldb)
		t.Dtrsm(side, uplo, trans, diag, half, n, 1, a, lda, top, ldb)
		return
	}
	left, right := b, b[half:]
	if lower {
		t.Dtrsm(side, uplo, trans, diag, m, rest, alpha, second, lda, right, ldb)
		t.Dgemm(blas.NoTrans, trans, m, half, rest, -1, right, ldb, coupling, lda, alpha, left, ldb)
		t.Dtrsm(side, uplo, trans, diag, m, half, 1, a, lda, left, ldb)
		return
	}
	t.Dtrsm(side, uplo, trans, diag, m, half, alpha, a, lda, left, ldb)
	t.Dgemm(blas.NoTrans, trans, m, rest, half, -1, left, ldb, coupling, lda, alpha, right, ldb)
	t.Dtrsm(side, uplo, trans, diag, m, rest, 1, second, lda, right, ldb)
}
