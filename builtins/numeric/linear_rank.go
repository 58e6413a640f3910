package numeric

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/lapack"
	"gonum.org/v1/gonum/mat"
)

// SingularValues computes the singular values of a, largest first; none for an
// empty matrix. Each errs by rounding of the largest at most.
func SingularValues(a *mat.Dense) ([]float64, Certificate, error) {
	if err := Finite("the matrix", a); err != nil {
		return nil, Certificate{}, err
	}
	c := Certificate{Method: "QR iteration on the bidiagonal form", Condition: 1, Digits: mostDigits}
	if m, n := sizeOf(a); m == 0 || n == 0 {
		return nil, c, nil
	}
	d, err := decompose(a, lapack.SVDNone)
	if err != nil {
		return nil, Certificate{}, err
	}
	c.Digits = DigitsOf(backwardOfSVD(d.m, d.n), 1)
	return d.sigma, c, nil
}

// backwardOfSVD is the relative backward error expected of the decomposition.
func backwardOfSVD(m, n int) float64 {
	return unitRoundoff * math.Sqrt(float64(m+n))
}

// Norm computes a norm of a: kind is "1" (largest column sum), "2" (largest
// singular value), "infinity" (largest row sum) or "frobenius". The norm of an
// empty matrix is 0. An overflow of the result is an error.
func Norm(a *mat.Dense, kind string) (float64, Certificate, error) {
	if err := Finite("the matrix", a); err != nil {
		return 0, Certificate{}, err
	}
	m, n := sizeOf(a)
	c := Certificate{Method: "sum", Condition: 1, Digits: DigitsOf(unitRoundoff*math.Sqrt(float64(max(m, n, 1))), 1)}
	if m == 0 || n == 0 {
		return 0, c, nil
	}
	value := 0.0
	switch kind {
	case "1":
		value = mat.Norm(a, 1)
	case "infinity":
		value = mat.Norm(a, math.Inf(1))
	case "frobenius":
		value = scaleToUnit(entriesOf(a))
		if math.IsNaN(value) {
			value = 0
		}
	case "2":
		sigma, certificate, err := SingularValues(a)
		if err != nil {
			return 0, Certificate{}, err
		}
		value, c = sigma[0], certificate
	default:
		return 0, Certificate{}, fmt.Errorf(`no norm is called %q; there are "1", "2", "infinity" and "frobenius"`, kind)
	}
	if math.IsInf(value, 0) {
		return 0, Certificate{}, fmt.Errorf("the norm exceeds the largest binary64 number")
	}
	return value, c, nil
}

// ConditionNumber is κ₂ = σ_max/σ_min; +Inf when σ_min is 0, 1 for an empty
// matrix. Its relative error is κ₂ times that of the singular values, so beyond
// about 1e15 only its order of magnitude means anything.
func ConditionNumber(a *mat.Dense) (float64, Certificate, error) {
	sigma, c, err := SingularValues(a)
	if err != nil || len(sigma) == 0 {
		return 1, c, err
	}
	kappa := ratio(sigma[0], sigma[len(sigma)-1])
	if sigma[0] == 0 {
		kappa = math.Inf(1)
	}
	m, n := a.Dims()
	c.Condition = kappa
	c.Digits = DigitsOf(backwardOfSVD(m, n), kappa)
	return kappa, c, nil
}

// RankDecision is a floating rank with what decided it.
type RankDecision struct {
	Rank int
	// Threshold separates the singular values: max(m, n)·2⁻⁵²·σ_max.
	Threshold float64
	// Above is the smallest singular value counted, Below the largest not
	// counted; 0 where there is none.
	Above, Below float64
	Singular     []float64
	Certificate  Certificate
}

// Rank counts the singular values above max(m, n)·2⁻⁵²·σ_max. The gap between
// Above and Below tells how clear the case is: digits of the certificate are the
// decades between Threshold and the nearer of the two.
func Rank(a *mat.Dense) (*RankDecision, error) {
	sigma, _, err := SingularValues(a)
	if err != nil {
		return nil, err
	}
	m, n := sizeOf(a)
	return decideRank(m, n, sigma), nil
}

// decideRank applies the threshold to singular values sorted downwards.
func decideRank(m, n int, sigma []float64) *RankDecision {
	d := &RankDecision{Singular: sigma, Certificate: Certificate{Method: "singular values above a threshold", Digits: mostDigits}}
	if len(sigma) == 0 || sigma[0] == 0 {
		return d
	}
	d.Threshold = float64(max(m, n)) * machineEpsilon * sigma[0]
	for _, s := range sigma {
		if s > d.Threshold {
			d.Rank++
			d.Above = s
		} else {
			d.Below = s
			break
		}
	}
	clear := math.Log10(d.Above / d.Threshold)
	if d.Below > 0 {
		clear = math.Min(clear, math.Log10(d.Threshold/d.Below))
	}
	d.Certificate.Digits = math.Max(0, math.Min(mostDigits, clear))
	if clear < 1 {
		d.Certificate.note("the rank is a close decision: a singular value lies within a factor ten of the threshold %.3g", d.Threshold)
	}
	return d
}

// Kernel gives an orthonormal basis of {x : A·x = 0} to rounding, n×(n − rank);
// an empty matrix when A has full column rank. The certificate's condition is
// σ_max/gap, which turns rounding into an angle.
func Kernel(a *mat.Dense) (*mat.Dense, *RankDecision, error) {
	d, decision, err := fullDecomposition(a)
	if err != nil {
		return nil, nil, err
	}
	if d == nil || decision.Rank == d.n {
		return &mat.Dense{}, decision, nil
	}
	r := decision.Rank
	basis := mat.NewDense(d.n, d.n-r, nil)
	basis.Apply(func(i, j int, _ float64) float64 { return d.vt[(r+j)*d.n+i] }, basis)
	return basis, decision, nil
}

// Image gives an orthonormal basis of {A·x}, m×rank; empty for a zero matrix.
func Image(a *mat.Dense) (*mat.Dense, *RankDecision, error) {
	d, decision, err := fullDecomposition(a)
	if err != nil {
		return nil, nil, err
	}
	if d == nil || decision.Rank == 0 {
		return &mat.Dense{}, decision, nil
	}
	basis := mat.NewDense(d.m, decision.Rank, nil)
	basis.Apply(func(i, j int, _ float64) float64 { return d.u[i*d.m+j] }, basis)
	return basis, decision, nil
}

// fullDecomposition is nil for an empty matrix.
func fullDecomposition(a *mat.Dense) (*decomposition, *RankDecision, error) {
	if err := Finite("the matrix", a); err != nil {
		return nil, nil, err
	}
	m, n := sizeOf(a)
	if m == 0 || n == 0 {
		return nil, decideRank(m, n, nil), nil
	}
	d, err := decompose(a, lapack.SVDAll)
	if err != nil {
		return nil, nil, err
	}
	decision := decideRank(m, n, d.sigma)
	if decision.Rank > 0 {
		decision.Certificate.Condition = d.sigma[0] / (decision.Above - decision.Below)
		decision.Certificate.Digits = DigitsOf(backwardOfSVD(m, n), decision.Certificate.Condition)
	}
	return d, decision, nil
}
