package numeric

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// Bilinear samples x' = A·x + B·u, y = C·x + D·u by the substitution
// s = α·(z − 1)/(z + 1) with α = 2/T (A. Tustin, J. IEE 94, 1947), or, for a
// positive frequency exactAt in rad/s, α = exactAt/tan(exactAt·T/2), which makes
// the sampled frequency response equal to the continuous one there:
// A_d = (αI − A)⁻¹(αI + A), B_d = 2(αI − A)⁻¹B, C_d = αC(αI − A)⁻¹,
// D_d = D + C(αI − A)⁻¹B. It refuses a pole at s = α, which would go to
// infinity, and an exactAt that is not below the Nyquist frequency π/T.
func Bilinear(a, b, c, d *mat.Dense, period, exactAt float64) (ad, bd, cd, dd *mat.Dense, certificate Certificate, err error) {
	n, m, alpha, err := bilinearShapes(a, b, c, d, period, exactAt)
	if err != nil {
		return nil, nil, nil, nil, Certificate{}, err
	}
	certificate = Certificate{Method: "bilinear substitution", Digits: mostDigits}
	if n == 0 {
		return &mat.Dense{}, &mat.Dense{}, &mat.Dense{}, mat.DenseCopyOf(d), certificate, nil
	}
	minus, plus := shiftedPair(n, a, alpha)
	ad, reciprocal := solveSquare(minus, plus, false)
	if reciprocal < machineEpsilon {
		return nil, nil, nil, nil, certificate, refusePoleAt(a, complex(alpha, 0), "the bilinear substitution sends a pole to infinity; another sampling time avoids it")
	}
	certificate.Condition, certificate.Digits = 1/reciprocal, DigitsOf(4*unitRoundoff, 1/reciprocal)
	cd, _ = solveSquare(minus, scaledCopy(alpha, transposedCopy(c)), true)
	cd, dd = transposedCopy(cd), mat.DenseCopyOf(d)
	if m == 0 {
		return ad, &mat.Dense{}, cd, dd, certificate, nil
	}
	bd, _ = solveSquare(minus, scaledCopy(2, b), false)
	addThrough(dd, 0.5, c, bd)
	return ad, bd, cd, dd, certificate, nil
}

// BilinearInverse undoes Bilinear with the same T and exactAt:
// A = α(A_d + I)⁻¹(A_d − I), B = α(A_d + I)⁻¹B_d, C = 2C_d(A_d + I)⁻¹,
// D = D_d − C_d(A_d + I)⁻¹B_d. It refuses a pole at z = −1.
func BilinearInverse(ad, bd, cd, dd *mat.Dense, period, exactAt float64) (a, b, c, d *mat.Dense, certificate Certificate, err error) {
	n, m, alpha, err := bilinearShapes(ad, bd, cd, dd, period, exactAt)
	if err != nil {
		return nil, nil, nil, nil, Certificate{}, err
	}
	certificate = Certificate{Method: "inverse bilinear substitution", Digits: mostDigits}
	if n == 0 {
		return &mat.Dense{}, &mat.Dense{}, &mat.Dense{}, mat.DenseCopyOf(dd), certificate, nil
	}
	minus, plus := shiftedPair(n, ad, 1)
	a, reciprocal := solveSquare(plus, scaledCopy(-alpha, minus), false)
	if reciprocal < machineEpsilon {
		return nil, nil, nil, nil, certificate, refusePoleAt(ad, -1, "the inverse of the bilinear substitution sends a pole at z = -1 to infinity")
	}
	// A_d − I loses what A_d and I share.
	cancelled := math.Max(1, mat.Norm(ad, 1)/math.Max(mat.Norm(minus, 1), math.SmallestNonzeroFloat64))
	certificate.Condition = cancelled / reciprocal
	certificate.Digits = DigitsOf(4*unitRoundoff, certificate.Condition)
	c, _ = solveSquare(plus, scaledCopy(2, transposedCopy(cd)), true)
	c, d = transposedCopy(c), mat.DenseCopyOf(dd)
	if m == 0 {
		return a, &mat.Dense{}, c, d, certificate, nil
	}
	addThrough(d, -0.5, c, bd)
	b, _ = solveSquare(plus, scaledCopy(alpha, bd), false)
	return a, b, c, d, certificate, nil
}

// bilinearShapes checks everything and finds α.
func bilinearShapes(a, b, c, d *mat.Dense, period, exactAt float64) (n, m int, alpha float64, err error) {
	n, m, err = sampledShapes(a, b, period)
	if err == nil {
		err = outputShapes(c, d, n, m)
	}
	if err != nil {
		return 0, 0, 0, err
	}
	switch {
	case exactAt == 0:
		alpha = 2 / period
	case exactAt > 0 && exactAt*period < math.Pi:
		alpha = exactAt / math.Tan(exactAt*period/2)
	default:
		return 0, 0, 0, fmt.Errorf("the response can be exact only between 0 and the Nyquist frequency %.6g rad/s, not at %.6g rad/s", math.Pi/period, exactAt)
	}
	if alpha == 0 || math.IsInf(alpha, 0) {
		return 0, 0, 0, errors.New("the sampling time leaves no room for the bilinear substitution in binary64")
	}
	return n, m, alpha, nil
}

// shiftedPair is αI − A and αI + A.
func shiftedPair(n int, a *mat.Dense, alpha float64) (minus, plus *mat.Dense) {
	minus, plus = scaledCopy(-1, a), mat.DenseCopyOf(a)
	for i := range n {
		minus.Set(i, i, alpha-a.At(i, i))
		plus.Set(i, i, alpha+a.At(i, i))
	}
	return minus, plus
}

func transposedCopy(m *mat.Dense) *mat.Dense { return mat.DenseCopyOf(m.T()) }

// addThrough adds factor·C·B to d.
func addThrough(d *mat.Dense, factor float64, c, b *mat.Dense) {
	var product mat.Dense
	product.Mul(c, b)
	product.Scale(factor, &product)
	d.Add(d, &product)
}

// refusePoleAt refuses because of the eigenvalue of a nearest to point.
func refusePoleAt(a *mat.Dense, point complex128, reason string) error {
	refusal := &Refusal{Reason: reason}
	if w, err := Eigenvalues(a); err == nil {
		refusal.Modes = nearestTo(w, point)
	}
	return refusal
}

// nearestTo is the one value nearest to point, as a list; empty for none.
func nearestTo(values []complex128, point complex128) []complex128 {
	var nearest []complex128
	best := math.Inf(1)
	for _, v := range values {
		if d := math.Hypot(real(v-point), imag(v-point)); d < best {
			best, nearest = d, []complex128{v}
		}
	}
	return nearest
}
