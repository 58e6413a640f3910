package exact

// ReachabilityMatrix gives [b, a·b, …, aⁿ⁻¹·b] of size n×(n·m).
func ReachabilityMatrix(a, b *Matrix) (*Matrix, error) {
	if err := checkPlant(a, b, nil, nil); err != nil {
		return nil, err
	}
	out, block := NewMatrix(a.rows, 0), b
	for k := range a.rows {
		var err error
		if k > 0 {
			if block, err = a.Mul(block); err != nil {
				return nil, err
			}
		}
		out = must(Augment(out, block))
	}
	return out, nil
}

// ObservabilityMatrix gives c, c·a, …, c·aⁿ⁻¹ stacked, of size (n·p)×n.
func ObservabilityMatrix(a, c *Matrix) (*Matrix, error) {
	if err := checkPlant(a, nil, c, nil); err != nil {
		return nil, err
	}
	r, err := ReachabilityMatrix(a.Transpose(), c.Transpose())
	if err != nil {
		return nil, err
	}
	return r.Transpose(), nil
}

// krylovChoice picks, from the columns of [b, a·b, …] in this order, the first
// independent ones modulo a prime; chosen lists (power, input). Independence
// modulo the prime proves independence; completeness is for the caller to prove.
func krylovChoice(a, b *Matrix, f residues) (chosen [][2]int) {
	n, m := a.rows, b.cols
	// Numerators of a suffice: scaling a by its denominator scales whole blocks.
	aInts, _ := clearAll(a)
	bInts, _ := clearRows(b.Transpose())
	rows := f.reduceRows(n, n, aInts)
	type vector struct {
		entries []uint64
		input   int
	}
	block := make([]vector, m)
	for j, entries := range f.reduceRows(m, n, bInts) {
		block[j] = vector{entries, j}
	}
	basis := make([][]uint64, 0, n) // reduced vectors, basis[k] has a one at lead[k]
	lead := make([]int, 0, n)
	for power := 0; power < n && len(basis) < n && len(block) > 0; power++ {
		var next []vector
		for _, v := range block {
			rest := append([]uint64(nil), v.entries...)
			for k, w := range basis {
				f.subtractMultiple(rest, w, rest[lead[k]])
			}
			at := 0
			for at < n && rest[at] == 0 {
				at++
			}
			if at == n {
				continue // this input's chain ends here, and so do its further powers
			}
			f.scaleRow(rest, f.inverse(rest[at]))
			basis, lead = append(basis, rest), append(lead, at)
			chosen = append(chosen, [2]int{power, v.input})
			image := make([]uint64, n)
			for i, row := range rows {
				image[i] = f.dot(row, v.entries)
			}
			next = append(next, vector{image, v.input})
		}
		block = next
	}
	return chosen
}

// reachableBasis gives the columns aᵏ·bⱼ that are the first independent ones of
// the reachability matrix, and the controllability indices: how many columns
// each input contributes. Completeness is proved by full rank or by checking
// that the span holds b and is carried into itself by a.
func reachableBasis(a, b *Matrix) (basis *Matrix, indices []int, err error) {
	if err = checkPlant(a, b, nil, nil); err != nil {
		return nil, nil, err
	}
	for attempt := 0; ; attempt++ {
		chosen := krylovChoice(a, b, primeField(attempt))
		indices = make([]int, b.cols)
		basis = NewMatrix(a.rows, len(chosen))
		chain := make(map[int]*Matrix, b.cols)
		for k, pick := range chosen {
			power, input := pick[0], pick[1]
			column := b.Columns(input)
			if power > 0 {
				if column, err = a.Mul(chain[input]); err != nil {
					return nil, nil, err
				}
			}
			chain[input] = column
			indices[input]++
			for i := range a.rows {
				basis.data[i*basis.cols+k] = column.data[i]
			}
		}
		if len(chosen) == a.rows {
			return basis, indices, nil
		}
		complete, err := spans(a, b, basis)
		if err != nil || complete {
			return basis, indices, err
		}
	}
}

// spans tells whether the column space of basis holds b and is invariant under a.
func spans(a, b, basis *Matrix) (bool, error) {
	s, err := newSubspace(basis)
	if err != nil {
		return false, err
	}
	image, err := a.Mul(s.columns)
	if err != nil {
		return false, err
	}
	outside, err := s.outside(must(Augment(image, b)))
	return err == nil && outside.IsZero(), err
}

// subspace is a column space with a basis that is the identity in the pivot
// rows and below in the other ones.
type subspace struct {
	columns      *Matrix
	below        *Matrix // the entries of columns in the rows rest
	pivots, rest []int
}

func newSubspace(spanning *Matrix) (*subspace, error) {
	reduced, pivots, err := spanning.Transpose().echelon()
	if err != nil {
		return nil, err
	}
	columns := reduced.Slice(0, len(pivots), 0, spanning.rows).Transpose()
	rest := complement(pivots, spanning.rows)
	return &subspace{columns, columns.Rows(rest...), pivots, rest}, nil
}

// outside gives the coordinates of m's columns along the unit vectors of the
// rows rest, once their part along the subspace is taken off; zero exactly for
// columns inside the subspace.
func (s *subspace) outside(m *Matrix) (*Matrix, error) {
	inside, err := s.below.Mul(m.Rows(s.pivots...))
	if err != nil {
		return nil, err
	}
	return m.Rows(s.rest...).Sub(inside)
}

// Split is a change of coordinates x̄ = T·x after which the reachable part comes first:
//
//	T·A·T⁻¹ = [A11 A12; 0 A22],  T·B = [B1; 0].
type Split struct {
	Rank     int     // dimension of the reachable part
	Basis    *Matrix // n×Rank, the first independent columns of the reachability matrix
	Indices  []int   // controllability indices, one for each input
	T        *Matrix
	Inverse  *Matrix // T⁻¹: a basis of the reachable subspace in echelon form, then unit vectors
	A11, A12 *Matrix
	A22      *Matrix
	B1       *Matrix
	Missing  Polynomial // characteristic polynomial of A22: the modes that no input moves
}

// ReachableSplit splits a (n×n), b (n×m) into what the inputs reach and the
// rest (R. E. Kalman, Mathematical description of linear dynamical systems,
// SIAM J. Control 1, 1963). When everything is reached, T is the identity.
func ReachableSplit(a, b *Matrix) (*Split, error) {
	basis, indices, err := reachableBasis(a, b)
	if err != nil {
		return nil, err
	}
	unit := Identity(a.rows)
	spanning := basis
	if basis.cols == a.rows {
		spanning = unit
	}
	reached, err := newSubspace(spanning)
	if err != nil {
		return nil, err
	}
	s := &Split{Rank: basis.cols, Basis: basis, Indices: indices}
	s.Inverse = must(Augment(reached.columns, unit.Columns(reached.rest...)))
	lower, err := reached.outside(unit)
	if err != nil {
		return nil, err
	}
	s.T = must(Stack(unit.Rows(reached.pivots...), lower))
	image, err := a.Mul(reached.columns)
	if err != nil {
		return nil, err
	}
	others := a.Columns(reached.rest...)
	s.A11, s.A12 = image.Rows(reached.pivots...), others.Rows(reached.pivots...)
	s.B1 = b.Rows(reached.pivots...)
	if s.A22, err = reached.outside(others); err != nil {
		return nil, err
	}
	s.Missing, err = s.A22.characteristic()
	return s, err
}

// ReachableRank gives the rank of the reachability matrix without forming it:
// full rank modulo a prime is a proof, a deficiency is proved by an invariant subspace.
func ReachableRank(a, b *Matrix) (int, error) {
	if err := checkPlant(a, b, nil, nil); err != nil {
		return 0, err
	}
	for index := range 2 {
		if len(krylovChoice(a, b, primeField(index))) == a.rows {
			return a.rows, nil
		}
	}
	basis, _, err := reachableBasis(a, b)
	if err != nil {
		return 0, err
	}
	return basis.cols, nil
}

// UnreachablePolynomial gives the characteristic polynomial of the modes that
// the columns of b do not move; 1 when all are moved.
func UnreachablePolynomial(a, b *Matrix) (Polynomial, error) {
	basis, _, err := reachableBasis(a, b)
	if err != nil {
		return Polynomial{}, err
	}
	if basis.cols == a.rows {
		return Constant(ratOne), nil
	}
	reached, err := newSubspace(basis)
	if err != nil {
		return Polynomial{}, err
	}
	rest, err := reached.outside(a.Columns(reached.rest...))
	if err != nil {
		return Polynomial{}, err
	}
	return rest.characteristic()
}

// JordanSizes lists the sizes of the Jordan blocks, largest first, that a has
// for each root of p. It takes a square-free p all of whose roots share one
// block structure (an irreducible factor of the characteristic polynomial, or a
// factor of its square-free split); blocks of roots that differ are refused by
// counting fractions: ok is false then.
func JordanSizes(a *Matrix, p Polynomial) (sizes []int, ok bool, err error) {
	if a.rows != a.cols {
		return nil, false, sizeError("Jordan blocks", a, nil)
	}
	degree := p.Degree()
	if degree < 1 {
		return nil, false, nil
	}
	step, err := p.EvalMatrix(a)
	if err != nil {
		return nil, false, err
	}
	power, rank := Identity(a.rows), a.rows
	var atLeast []int // number of blocks of size ≥ 1, 2, …
	for {
		if power, err = power.Mul(step); err != nil {
			return nil, false, err
		}
		next, err := power.rank()
		if err != nil {
			return nil, false, err
		}
		if next == rank {
			break
		}
		if (rank-next)%degree != 0 {
			return nil, false, nil
		}
		atLeast, rank = append(atLeast, (rank-next)/degree), next
	}
	for size := len(atLeast); size >= 1; size-- {
		count := atLeast[size-1]
		if size < len(atLeast) {
			count -= atLeast[size]
		}
		for range count {
			sizes = append(sizes, size)
		}
	}
	return sizes, true, nil
}
