package exact

// Part names one of the four parts of a plant.
type Part int

// The four parts, in the order of their coordinates in a [KalmanSplit].
const (
	MovedAndSeen Part = iota // reachable and observable
	MovedOnly                // reachable, not observable
	SeenOnly                 // observable once the reachable part is taken off, not reachable
	Neither
)

// Parts is a plant split into four, x̄ = T·x with the coordinates in the order of [Part]:
//
//	A̅ = [A11  0  A13  0 ]   B̅ = [B1]   C̅ = [C1 0 C3 0]
//	    [A21 A22 A23 A24]       [B2]
//	    [ 0   0  A33  0 ]       [0 ]
//	    [ 0   0  A43 A44]       [0 ]
type Parts struct {
	Sizes       [4]int
	T, Inverse  *Matrix
	A, B, C     *Matrix
	Polynomials [4]Polynomial // characteristic polynomials of A11, A22, A33, A44
}

// Block gives the diagonal block of A that belongs to a part.
func (p *Parts) Block(part Part) *Matrix {
	start := p.start(part)
	end := start + p.Sizes[part]
	return p.A.Slice(start, end, start, end)
}

// Inputs gives the rows of B that belong to a part.
func (p *Parts) Inputs(part Part) *Matrix {
	start := p.start(part)
	return p.B.Slice(start, start+p.Sizes[part], 0, p.B.cols)
}

// Outputs gives the columns of C that belong to a part.
func (p *Parts) Outputs(part Part) *Matrix {
	start := p.start(part)
	return p.C.Slice(0, p.C.rows, start, start+p.Sizes[part])
}

func (p *Parts) start(part Part) int {
	start := 0
	for _, size := range p.Sizes[:part] {
		start += size
	}
	return start
}

// KalmanSplit splits a (n×n), b (n×m), c (p×n) into the four parts of E. G.
// Gilbert and R. E. Kalman (SIAM J. Control 1, 1963): the reachable subspace R
// and the unobservable subspace U give R∩U, and complements of it in R, in U,
// and of R+U in the whole space.
func KalmanSplit(a, b, c *Matrix) (*Parts, error) {
	if err := checkPlant(a, b, c, nil); err != nil {
		return nil, err
	}
	n := a.rows
	reached, err := reachableSubspace(a, b)
	if err != nil {
		return nil, err
	}
	seen, err := reachableSubspace(a.Transpose(), c.Transpose())
	if err != nil {
		return nil, err
	}
	hidden := kernelOf(seen.columns.Transpose(), seen.pivots, n)
	// x = reached·y is unobservable exactly when seenᵀ·reached·y = 0.
	product, err := seen.columns.Transpose().Mul(reached.columns)
	if err != nil {
		return nil, err
	}
	reduced, pivots, err := product.echelon()
	if err != nil {
		return nil, err
	}
	both, err := reached.columns.Mul(kernelOf(reduced, pivots, reached.columns.cols))
	if err != nil {
		return nil, err
	}
	p := &Parts{}
	first := reached.columns.Columns(pivots...)
	neither, err := extension(both, hidden)
	if err != nil {
		return nil, err
	}
	three := must(Augment(must(Augment(first, both)), neither))
	third, err := extension(three, Identity(n))
	if err != nil {
		return nil, err
	}
	p.Sizes = [4]int{first.cols, both.cols, third.cols, neither.cols}
	p.Inverse = must(Augment(must(Augment(must(Augment(first, both)), third)), neither))
	return p, p.transform(a, b, c)
}

// reachableSubspace gives the subspace that the columns of b reach.
func reachableSubspace(a, b *Matrix) (*subspace, error) {
	basis, _, err := reachableBasis(a, b)
	if err != nil {
		return nil, err
	}
	if basis.cols == a.rows { // the whole space: its echelon basis is the identity
		basis = Identity(a.rows)
	}
	return newSubspace(basis)
}

// extension gives those columns of more that enlarge the span of the independent columns of base.
func extension(base, more *Matrix) (*Matrix, error) {
	_, pivots, err := must(Augment(base, more)).echelon()
	if err != nil {
		return nil, err
	}
	added := make([]int, 0, more.cols)
	for _, j := range pivots {
		if j >= base.cols {
			added = append(added, j-base.cols)
		}
	}
	return more.Columns(added...), nil
}

func (p *Parts) transform(a, b, c *Matrix) (err error) {
	if p.T, err = p.Inverse.Inverse(); err != nil {
		return err
	}
	if p.A, p.B, err = transform(p.T, p.Inverse, a, b); err != nil {
		return err
	}
	if p.C, err = c.Mul(p.Inverse); err != nil {
		return err
	}
	for part := MovedAndSeen; part <= Neither; part++ {
		if p.Polynomials[part], err = p.Block(part).characteristic(); err != nil {
			return err
		}
	}
	return nil
}

// transform gives t·a·inverse and t·b.
func transform(t, inverse, a, b *Matrix) (abar, bbar *Matrix, err error) {
	if abar, err = a.Mul(inverse); err != nil {
		return nil, nil, err
	}
	if abar, err = t.Mul(abar); err != nil {
		return nil, nil, err
	}
	bbar, err = t.Mul(b)
	return abar, bbar, err
}

// MinimalRealization gives the moved-and-seen part of a plant, which has the
// same transfer matrix with the same feedthrough. A plant that is minimal
// already comes back unchanged.
func MinimalRealization(a, b, c *Matrix) (am, bm, cm *Matrix, err error) {
	p, err := KalmanSplit(a, b, c)
	if err != nil {
		return nil, nil, nil, err
	}
	return p.Block(MovedAndSeen), p.Inputs(MovedAndSeen), p.Outputs(MovedAndSeen), nil
}
