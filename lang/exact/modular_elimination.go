package exact

import "math/big"

// reduction is the outcome of a Gauss–Jordan elimination modulo a prime.
type reduction struct {
	rows   [][]uint64 // reduced rows, pivot rows first
	pivots []int      // pivot columns
	origin []int      // origin[k] is the row of the argument that became row k
	det    uint64     // product of the pivots with the sign of the row exchanges
}

// gaussJordan reduces the first limit columns. With below set, only the rows
// below a pivot are cleared, which suffices for ranks and determinants.
func (f residues) gaussJordan(rows [][]uint64, limit int, below bool) reduction {
	r := reduction{rows: rows, origin: make([]int, len(rows)), det: 1}
	for i := range r.origin {
		r.origin[i] = i
	}
	for col := 0; col < limit && len(r.pivots) < len(rows); col++ {
		rank := len(r.pivots)
		at := rank
		for at < len(rows) && rows[at][col] == 0 {
			at++
		}
		if at == len(rows) {
			continue
		}
		if at != rank {
			rows[at], rows[rank] = rows[rank], rows[at]
			r.origin[at], r.origin[rank] = r.origin[rank], r.origin[at]
			r.det = f.neg(r.det)
		}
		pivot := rows[rank]
		r.det = f.mul(r.det, pivot[col])
		f.scaleRow(pivot[col:], f.inverse(pivot[col]))
		start := 0
		if below {
			start = rank + 1
		}
		for i := start; i < len(rows); i++ {
			if i != rank {
				f.subtractMultiple(rows[i][col:], pivot[col:], rows[i][col])
			}
		}
		r.pivots = append(r.pivots, col)
	}
	return r
}

// reduceRows gives the rows of an integer matrix modulo the prime.
func (f residues) reduceRows(rows, cols int, a []big.Int) [][]uint64 {
	flat := f.reduceAll(a)
	out := make([][]uint64, rows)
	for i := range out {
		out[i] = flat[i*cols : (i+1)*cols : (i+1)*cols]
	}
	return out
}

// squareSystem is matrix·X = right over the integers: n×n and n×k, row-major.
type squareSystem struct {
	n, k          int
	matrix, right []big.Int
}

// bounds gives bit lengths that |det| and every entry of det·X cannot exceed,
// by Hadamard's inequality and Cramer's rule.
func (s *squareSystem) bounds() (det, both int) {
	columns := func(a []big.Int, width int) (sum, least, most int) {
		var square, norm big.Int
		for j := range width {
			norm.SetInt64(0)
			for i := range s.n {
				norm.Add(&norm, square.Mul(&a[i*width+j], &a[i*width+j]))
			}
			length := norm.BitLen()
			sum += length
			if j == 0 || length < least {
				least = length
			}
			most = max(most, length)
		}
		return sum, least, most
	}
	sum, least, _ := columns(s.matrix, s.n)
	_, _, most := columns(s.right, s.k)
	return (sum + 1) / 2, (max(sum, sum-least+most) + 1) / 2
}

// cramer gives det and det·X by Chinese remaindering up to the bounds, so both
// are proved. ErrSingular is proved likewise: the determinant vanishes modulo
// more primes than its bound allows.
func (s *squareSystem) cramer() (det *big.Int, scaled []big.Int, err error) {
	detBits, bothBits := s.bounds()
	if bothBits > LargestBits+64 {
		return nil, nil, ErrTooLarge
	}
	sum := newRemaindering(1 + s.n*s.k)
	vanished := 0 // bits of the primes that divide the determinant
	residue := make([]uint64, 1+s.n*s.k)
	rows := make([][]uint64, s.n)
	width := s.n + s.k
	flat := make([]uint64, s.n*width)
	for index := 0; sum.modulus.BitLen() <= bothBits+2; index++ {
		f := primeField(index)
		for i := range rows {
			rows[i] = flat[i*width : (i+1)*width]
			f.reduceInto(rows[i], s.matrix[i*s.n:(i+1)*s.n])
			f.reduceInto(rows[i][s.n:], s.right[i*s.k:(i+1)*s.k])
		}
		r := f.gaussJordan(rows, s.n, s.k == 0)
		if len(r.pivots) < s.n {
			if vanished += 61; vanished > detBits+1 {
				return nil, nil, ErrSingular
			}
			continue
		}
		residue[0] = r.det
		for i, row := range rows {
			if s.k > 0 && r.det != 0 {
				f.scaleRow(row[s.n:], r.det)
			}
			copy(residue[1+i*s.k:], row[s.n:])
		}
		sum.add(residue, f)
	}
	lifted := sum.lift()
	return &lifted[0], lifted[1:], nil
}

// modularEchelon finds the reduced row echelon form from the pivots modulo a
// prime: the pivot rows and columns form a square system whose solution is
// proved against all other rows. It fails (nil) only when the prime misled.
func modularEchelon(rows, cols int, a []big.Int, f residues) (*Matrix, []int, error) {
	r := f.gaussJordan(f.reduceRows(rows, cols, a), cols, true)
	rank := len(r.pivots)
	free := complement(r.pivots, cols)
	pick := func(row int, columns []int) []big.Int {
		out := make([]big.Int, len(columns))
		for k, j := range columns {
			out[k] = a[row*cols+j] // shares words; read only
		}
		return out
	}
	system := &squareSystem{n: rank, k: len(free)}
	for _, i := range r.origin[:rank] {
		system.matrix = append(system.matrix, pick(i, r.pivots)...)
		system.right = append(system.right, pick(i, free)...)
	}
	det, scaled, err := system.cramer()
	if err != nil {
		return nil, nil, err
	}
	for i, p := range r.pivots {
		for k, j := range free {
			if j < p && scaled[i*len(free)+k].Sign() != 0 {
				return nil, nil, nil
			}
		}
	}
	for _, i := range r.origin[rank:] {
		if !dependent(pick(i, r.pivots), pick(i, free), det, scaled) {
			return nil, nil, nil
		}
	}
	out := NewMatrix(rows, cols)
	for i, p := range r.pivots {
		out.data[i*cols+p] = ratOne
		for k, j := range free {
			out.data[i*cols+j] = fraction(&scaled[i*len(free)+k], det)
		}
	}
	return out, r.pivots, nil
}

// dependent tells whether a row (its pivot and its free part) is the
// combination of the pivot rows that its pivot part says: head·scaled = det·tail.
func dependent(head, tail []big.Int, det *big.Int, scaled []big.Int) bool {
	var sum, term big.Int
	for k := range tail {
		sum.SetInt64(0)
		for i := range head {
			if head[i].Sign() != 0 {
				sum.Add(&sum, term.Mul(&head[i], &scaled[i*len(tail)+k]))
			}
		}
		if sum.Cmp(term.Mul(det, &tail[k])) != 0 {
			return false
		}
	}
	return true
}

// complement lists the numbers below n that are not in the ascending list.
func complement(chosen []int, n int) []int {
	rest := make([]int, 0, n-len(chosen))
	next := 0
	for j := range n {
		if next < len(chosen) && chosen[next] == j {
			next++
			continue
		}
		rest = append(rest, j)
	}
	return rest
}
