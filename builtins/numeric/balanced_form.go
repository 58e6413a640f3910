package numeric

import (
	"context"
	"math"

	"gonum.org/v1/gonum/mat"
)

// BalancedForm finds the coordinates x̄ = T·x in which both gramians of a stable
// plant (A n×n, B n×m, C p×n) equal diag(values), values the Hankel singular
// values, largest first (B. C. Moore, IEEE Trans. Automat. Control 26, 1981, by the
// square-root method). A mode that does not decay is refused by name, and so is a
// plant with a state that is not moved or not seen, which has no such form.
func BalancedForm(ctx context.Context, a, b, c *mat.Dense, sampled bool) (t, inverse *mat.Dense, values []float64, certificate Certificate, err error) {
	n, _, _, err := plantShapes(a, b, c, nil)
	if err != nil {
		return nil, nil, nil, Certificate{}, err
	}
	if n == 0 {
		return &mat.Dense{}, &mat.Dense{}, nil, Certificate{Method: "empty", Digits: mostDigits}, nil
	}
	f, values, left, right, err := hankelOf(ctx, a, b, c, sampled)
	if err != nil {
		return nil, nil, nil, Certificate{}, err
	}
	if values[n-1] <= float64(n)*machineEpsilon*values[0] {
		return nil, nil, nil, Certificate{}, &Refusal{Reason: "there is no balanced form, because a state is not moved or not seen; take the minimal part first"}
	}
	into, out := mat.NewDense(n, n, nil), mat.NewDense(n, n, nil)
	into.Mul(f.reach, right.T())
	out.Mul(left.T(), f.see.T())
	inverse, t = mat.NewDense(n, n, nil), mat.NewDense(n, n, nil)
	for j := range n {
		root := math.Sqrt(values[j])
		for k, i := range f.balance.order {
			inverse.Set(i, j, math.Ldexp(into.At(k, j)/root, f.balance.exponent[k]))
			t.Set(j, i, math.Ldexp(out.At(j, k)/root, -f.balance.exponent[k]))
		}
	}
	certificate = f.certificate(machineEpsilon*values[0], values[n-1])
	certificate.Method, certificate.Condition = "square-root balancing", values[0]/values[n-1]
	return t, inverse, values, certificate, nil
}
