package exact

// Zeros are the invariant zeros of a plant.
type Zeros struct {
	// Polynomial is monic; its roots are the zeros with their multiplicities:
	// the product of the invariant factors of the system matrix
	// [a − s·I, b; c, d]. It is 1 when there are none.
	Polynomial Polynomial
	// NormalRank is the rank of the transfer matrix c·(s·I − a)⁻¹·b + d at all
	// but finitely many s.
	NormalRank int
	// Singular tells that the system matrix loses rank at every s: the normal
	// rank is below the smaller of the numbers of inputs and outputs.
	Singular bool
}

// InvariantZeros gives the zeros of the system matrix of a (n×n), b (n×m),
// c (p×n), d (p×m), square or not. Two staircase reductions (A. Emami-Naeini and
// P. Van Dooren, Computation of zeros of linear multivariable systems,
// Automatica 18, 1982), carried out over the rationals so that every rank is
// decided exactly, leave a square invertible feedthrough; the zeros are then
// the eigenvalues of a − b·d⁻¹·c.
func InvariantZeros(a, b, c, d *Matrix) (Zeros, error) {
	if err := checkPlant(a, b, c, d); err != nil {
		return Zeros{}, err
	}
	z := pencil{a, b, c, d}
	if err := z.reduce(); err != nil {
		return Zeros{}, err
	}
	z = z.dual()
	if err := z.reduce(); err != nil {
		return Zeros{}, err
	}
	back, err := z.d.Solve(z.c)
	if err != nil {
		return Zeros{}, err
	}
	feedback, err := z.b.Mul(back)
	if err != nil {
		return Zeros{}, err
	}
	polynomial, err := must(z.a.Sub(feedback)).characteristic()
	rank := z.d.rows
	return Zeros{polynomial, rank, rank < min(b.cols, c.rows)}, err
}

// TransmissionZeros gives the zeros of the moved-and-seen part: those of the
// transfer matrix.
func TransmissionZeros(a, b, c, d *Matrix) (Zeros, error) {
	if err := checkPlant(a, b, c, d); err != nil {
		return Zeros{}, err
	}
	am, bm, cm, err := MinimalRealization(a, b, c)
	if err != nil {
		return Zeros{}, err
	}
	return InvariantZeros(am, bm, cm, d)
}

type pencil struct{ a, b, c, d *Matrix }

func (z pencil) dual() pencil {
	return pencil{z.a.Transpose(), z.c.Transpose(), z.b.Transpose(), z.d.Transpose()}
}

// reduce splits off what has no finite zeros until d has full row rank. One
// step compresses the rows of [d, c]: those where d vanishes are equations
// 0 = c̃·x on the states alone, which leaves fewer states and turns the
// derivatives of the eliminated ones into outputs.
func (z *pencil) reduce() error {
	for {
		m, n := z.d.cols, z.a.rows
		joined, pivots, err := must(Augment(z.d, z.c)).echelon()
		if err != nil {
			return err
		}
		sigma := 0
		for sigma < len(pivots) && pivots[sigma] < m {
			sigma++
		}
		z.d, z.c = joined.Slice(0, sigma, 0, m), joined.Slice(0, sigma, m, m+n)
		if sigma == len(pivots) {
			return nil
		}
		if err := z.eliminate(joined.Slice(sigma, len(pivots), m, m+n), pivots[sigma:], m); err != nil {
			return err
		}
	}
}

// eliminate uses the equations 0 = e·x, e in reduced echelon form with the given
// pivots (counted with an offset): x = kernel·x₁ for the other states x₁, and
// 0 = e·(a·x + b·u) becomes an output equation.
func (z *pencil) eliminate(e *Matrix, pivots []int, offset int) error {
	fixed := make([]int, len(pivots))
	for k, p := range pivots {
		fixed[k] = p - offset
	}
	free := complement(fixed, e.cols)
	kernel := kernelOf(e, fixed, e.cols)
	ak, err := z.a.Mul(kernel)
	if err != nil {
		return err
	}
	ck, err := z.c.Mul(kernel)
	if err != nil {
		return err
	}
	ea, err := e.Mul(ak)
	if err != nil {
		return err
	}
	eb, err := e.Mul(z.b)
	if err != nil {
		return err
	}
	z.c, z.d = must(Stack(ck, ea)), must(Stack(z.d, eb))
	z.a, z.b = ak.Rows(free...), z.b.Rows(free...)
	return nil
}
