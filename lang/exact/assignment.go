package exact

import (
	"fmt"
	"math/big"
)

// UnreachableError says that modes which no input moves are not among the
// wanted ones.
type UnreachableError struct {
	Unreachable Polynomial // characteristic polynomial of all modes that no input moves
	Lost        Polynomial // the part of it that the wanted polynomial lacks
}

// Error counts the modes.
func (e *UnreachableError) Error() string {
	return fmt.Sprintf("the input does not move %d of the modes, and %d of these are not among the wanted ones",
		e.Unreachable.Degree(), e.Lost.Degree())
}

// WantedError says that a closed-loop polynomial does not have the number of
// roots that the plant has states.
type WantedError struct {
	Degree, States int
}

// Error shows both numbers.
func (e *WantedError) Error() string {
	return fmt.Sprintf("a polynomial of degree %d is wanted of a plant with %d states", e.Degree, e.States)
}

func checkAssignment(a, b *Matrix, wanted Polynomial) error {
	if err := checkPlant(a, b, nil, nil); err != nil {
		return err
	}
	if b.cols != 1 {
		return sizeError("pole assignment with one input", a, b)
	}
	if wanted.Degree() != a.rows {
		return &WantedError{wanted.Degree(), a.rows}
	}
	return nil
}

// BassGura gives the 1×n gain k for which det(s·I − a + b·k) is the wanted
// polynomial, made monic, for one input that reaches every state (R. W. Bass
// and I. Gura, High order system design via state-space considerations, JACC
// 1965). With adj(s·I − a)·b = Σ h[i]·sⁱ the gain solves
// k·h[i] = wanted[i] − characteristic[i].
//
// A pair that is not reachable gives a [*UnreachableError] or, where the wanted
// polynomial keeps the unreachable modes, ErrSingular: see [AssignReachable].
func BassGura(a, b *Matrix, wanted Polynomial) (*Matrix, error) {
	if err := checkAssignment(a, b, wanted); err != nil {
		return nil, err
	}
	wanted = wanted.Monic()
	h, err := adjugateTimes(a, b)
	if err != nil {
		return nil, err
	}
	n := a.rows
	equations, right := NewMatrix(n, n), NewMatrix(n, 1)
	var factor big.Rat
	for i, row := range h.coefficients {
		common := content(row)
		if common.Sign() == 0 {
			return nil, unreachable(a, b, wanted)
		}
		for j := range row {
			equations.data[i*n+j] = fraction(row[j].Quo(&row[j], common), intOne)
		}
		change := new(big.Rat).Sub(wanted.Coefficient(i), h.characteristic.Coefficient(i))
		right.data[i] = ratProduct(change, factor.SetFrac(&h.den[i], common))
	}
	k, err := equations.solveSquare(right)
	if err == ErrSingular {
		return nil, unreachable(a, b, wanted)
	}
	if err != nil {
		return nil, err
	}
	return k.Transpose(), nil
}

// unreachable makes the error for a pair that is not reachable.
func unreachable(a, b *Matrix, wanted Polynomial) error {
	missing, err := UnreachablePolynomial(a, b)
	if err != nil {
		return err
	}
	lost := missing.quotient(missing.Gcd(wanted))
	if lost.Degree() < 1 {
		return ErrSingular
	}
	return &UnreachableError{missing, lost}
}

// Ackermann gives the same gain as [BassGura] as k = eₙᵀ·R⁻¹·wanted(a) with the
// reachability matrix R (J. Ackermann, Der Entwurf linearer Regelungssysteme im
// Zustandsraum, Regelungstechnik 20, 1972).
func Ackermann(a, b *Matrix, wanted Polynomial) (*Matrix, error) {
	if err := checkAssignment(a, b, wanted); err != nil {
		return nil, err
	}
	wanted = wanted.Monic()
	n := a.rows
	if n == 0 {
		return NewMatrix(1, 0), nil
	}
	q, err := lastRow(a, b)
	if err == ErrSingular {
		return nil, unreachable(a, b, wanted)
	}
	if err != nil {
		return nil, err
	}
	return rowTimesPolynomial(q, wanted, a), nil
}

// rowTimesPolynomial gives q·p(a) by Horner's scheme over the integers.
func rowTimesPolynomial(q *Matrix, p Polynomial, a *Matrix) *Matrix {
	n := a.rows
	ints, den := clearAll(a)
	row, rowDen := clearAll(q)
	weights, weightDen := p.integral()
	sum := make([]big.Int, n)
	power := big.NewInt(1) // den^(degree−i)
	var weight, term big.Int
	for i := p.Degree(); i >= 0; i-- {
		sum = multiplyIntegers(1, n, n, sum, ints)
		weight.Mul(&weights[i], power)
		for j := range sum {
			sum[j].Add(&sum[j], term.Mul(&weight, &row[j]))
		}
		if i > 0 {
			power.Mul(power, den)
		}
	}
	power.Mul(power.Mul(power, rowDen), weightDen)
	out := NewMatrix(1, n)
	for j := range sum {
		out.data[j] = fraction(&sum[j], power)
	}
	return out
}

// lastRow gives the last row of the inverse reachability matrix of a pair with
// one input and at least one state.
func lastRow(a, b *Matrix) (*Matrix, error) {
	r, err := ReachabilityMatrix(a, b)
	if err != nil {
		return nil, err
	}
	q, err := r.Transpose().solveSquare(Identity(a.rows).Columns(a.rows - 1))
	if err != nil {
		return nil, err
	}
	return q.Transpose(), nil
}

// AssignReachable gives the gain for the wanted polynomial when some modes may
// be out of the input's reach. They must be among the wanted roots, as often as
// they occur, else a [*UnreachableError] comes back. Along the unreachable
// directions the gain is free: the one of least Euclidean norm is returned.
func AssignReachable(a, b *Matrix, wanted Polynomial) (*Matrix, error) {
	if err := checkAssignment(a, b, wanted); err != nil {
		return nil, err
	}
	wanted = wanted.Monic()
	k, err := BassGura(a, b, wanted)
	if err != ErrSingular {
		return k, err
	}
	s, err := ReachableSplit(a, b)
	if err != nil {
		return nil, err
	}
	movable, rest, err := wanted.DivMod(s.Missing)
	if err != nil {
		return nil, err
	}
	if !rest.IsZero() { // a repeated mode is wanted less often than it is fixed
		return nil, &UnreachableError{s.Missing, s.Missing.quotient(s.Missing.Gcd(wanted))}
	}
	reachedGain, err := BassGura(s.A11, s.B1, movable)
	if err != nil {
		return nil, err
	}
	// Every gain with k·w = reachedGain serves, w the basis of the reachable
	// subspace; the least one is reachedGain·(wᵀ·w)⁻¹·wᵀ.
	w := s.Inverse.Slice(0, a.rows, 0, s.Rank)
	gram, err := w.Transpose().Mul(w)
	if err != nil {
		return nil, err
	}
	weights, err := gram.solveSquare(reachedGain.Transpose())
	if err != nil {
		return nil, err
	}
	column, err := w.Mul(weights)
	if err != nil {
		return nil, err
	}
	return column.Transpose(), nil
}

// Form is a plant in other coordinates, x̄ = T·x.
type Form struct {
	T, Inverse *Matrix
	A          *Matrix // T·A·T⁻¹
	Vector     *Matrix // T·b of the controller form, c·T⁻¹ of the observer form
}

// ControllerForm gives the coordinates in which one input drives a chain of
// integrators: A̅ is a companion matrix with ones above the diagonal and the
// negated coefficients of the characteristic polynomial, lowest power first, in
// its last row; b̅ is the last unit vector. The pair must be reachable
// (otherwise ErrSingular).
func ControllerForm(a, b *Matrix) (*Form, error) {
	if err := checkPlant(a, b, nil, nil); err != nil {
		return nil, err
	}
	if b.cols != 1 {
		return nil, sizeError("the controller form", a, b)
	}
	n := a.rows
	t, inverse := NewMatrix(n, n), NewMatrix(n, n)
	p, err := a.characteristic()
	if err != nil || n == 0 {
		return &Form{t, inverse, companion(p), b}, err
	}
	row, err := lastRow(a, b)
	if err != nil {
		return nil, err
	}
	for i := range n {
		if i > 0 {
			if row, err = row.Mul(a); err != nil {
				return nil, err
			}
		}
		copy(t.data[i*n:(i+1)*n], row.data)
	}
	// The columns of T⁻¹ are the coefficients of adj(s·I − a)·b.
	h, err := adjugateTimes(a, b)
	if err != nil {
		return nil, err
	}
	for k, column := range h.coefficients {
		for i := range n {
			inverse.data[i*n+k] = fraction(&column[i], &h.den[k])
		}
	}
	return &Form{t, inverse, companion(p), Identity(n).Columns(n - 1)}, nil
}

// ObserverForm is the dual of [ControllerForm] for one output c: A̅ is the
// transposed companion matrix, c̅ the last unit row.
func ObserverForm(a, c *Matrix) (*Form, error) {
	if err := checkPlant(a, nil, c, nil); err != nil {
		return nil, err
	}
	f, err := ControllerForm(a.Transpose(), c.Transpose())
	if err != nil {
		return nil, err
	}
	return &Form{f.Inverse.Transpose(), f.T.Transpose(), f.A.Transpose(), f.Vector.Transpose()}, nil
}

// companion gives the companion matrix of a monic polynomial, in the layout of [ControllerForm].
func companion(p Polynomial) *Matrix {
	n := max(p.Degree(), 0)
	m := NewMatrix(n, n)
	for i := range n {
		if i+1 < n {
			m.data[i*n+i+1] = ratOne
		}
		m.data[(n-1)*n+i] = tidy(new(big.Rat).Neg(p.Coefficient(i)))
	}
	return m
}

// Assigns tells whether a − b·k (b n×1, k 1×n) has exactly the wanted characteristic
// polynomial, by det(s·I − a + b·k) = det(s·I − a) + k·adj(s·I − a)·b: no large
// determinant is formed.
func Assigns(a, b, k *Matrix, wanted Polynomial) (bool, error) {
	if err := checkPlant(a, b, nil, nil); err != nil {
		return false, err
	}
	if b.cols != 1 || k.rows != 1 || k.cols != a.rows || !k.clearable() {
		return false, sizeError("checking a gain", b, k)
	}
	adj, err := adjugateTimes(a, b)
	if err != nil {
		return false, err
	}
	if wanted.Degree() != a.rows || wanted.Lead().Cmp(ratOne) != 0 {
		return false, nil
	}
	gain, gainDen := clearAll(k)
	var sum, term big.Int
	for power := range a.rows {
		sum.SetInt64(0)
		for i := range gain {
			sum.Add(&sum, term.Mul(&gain[i], &adj.coefficients[power][i]))
		}
		change := fraction(&sum, term.Mul(gainDen, &adj.den[power]))
		want := new(big.Rat).Sub(wanted.Coefficient(power), adj.characteristic.Coefficient(power))
		if want.Cmp(change) != 0 {
			return false, nil
		}
	}
	return true, nil
}
