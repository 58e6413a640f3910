package system

import (
	"math/cmplx"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

// systemParam is the parameter of a function of a plant; matrixParam its bare form.
func systemParam(doc string) []value.Param {
	return []value.Param{{Name: "plant", Shape: value.ASystem, Doc: doc}}
}

func matrixParam(doc string) []value.Param {
	return []value.Param{{Name: "A", Shape: value.ASquare, Doc: doc}}
}

var spectrumBuiltins = []*value.Builtin{
	{
		Name: "poles", Family: "system",
		Params:  systemParam("a plant, a model or a transfer function"),
		Bare:    matrixParam("a square matrix"),
		Result:  "list of numbers and complex numbers, each as often as it occurs",
		Summary: "the poles of a system: the eigenvalues of A",
		Doc: "Ordered by magnitude. Exact data of up to 30 states: certified roots of the exact characteristic polynomial, rational ones exactly. " +
			"Floating data: balanced Schur form, found again in higher precision where the sensitivity asks for it. " +
			"Of a transfer function: the poles of a minimal realisation.",
		Examples: []value.Example{
			{Input: "poles(plant([[0, 1], [-2, -3]], [[0], [1]]))", Output: "= [-1, -2]"},
		},
		Errors:  []string{"roots that were not found to the precision wanted"},
		Source:  "Francis 1961, Computer Journal 4; roots: Aberth 1973, Mathematics of Computation 27",
		SeeAlso: []string{"modes", "eigenvalues", "transmission_zeros"},
		Func:    poles,
	},
	{
		Name: "characteristic_polynomial", Family: "system",
		Params:  systemParam("a plant"),
		Bare:    matrixParam("a square matrix"),
		Result:  "polynomial, monic of degree n",
		Summary: "det(sI − A), exact when A is",
		Doc: "Exact data: computed modulo primes and put together by Chinese remainders, checked modulo a fresh prime. " +
			"Floating data: from the binary64 entries taken as exact up to 30 states, then rounded; above, from the eigenvalues.",
		Examples: []value.Example{
			{Input: "characteristic_polynomial([[0, 1], [-2, -3]])", Output: "= s^2 + 3*s + 2"},
		},
		Errors:  []string{"a matrix that is not square"},
		Source:  "von zur Gathen & Gerhard 2013, Modern Computer Algebra, ch. 5",
		SeeAlso: []string{"poles", "routh_table", "resolvent"},
		Func:    characteristicPolynomial,
	},
	{
		Name: "eigenvalues", Family: "matrix",
		Params:  matrixParam("a square matrix, real or complex"),
		Result:  "list of numbers and complex numbers, each as often as it occurs",
		Summary: "the eigenvalues of a square matrix",
		Doc:     "Ordered by magnitude; certified for exact real matrices of up to 30 rows, see poles.",
		Examples: []value.Example{
			{Input: "eigenvalues([[2, 1], [1, 2]])", Output: "= [1, 3]"},
		},
		Errors:  []string{"a matrix that is not square"},
		Source:  "Francis 1961, Computer Journal 4",
		SeeAlso: []string{"eigenvectors", "poles", "characteristic_polynomial"},
		Func:    poles,
	},
}

// squareOf gives the matrix the call is about: A of a plant, or the bare one.
func squareOf(c *value.Call) *value.Matrix {
	if p := c.Plant("plant"); p != nil {
		return p.A
	}
	return c.Matrix("A")
}

func poles(c *value.Call) (value.Value, error) {
	roots, err := Eigenvalues(squareOf(c))
	if err != nil {
		return nil, err
	}
	return List(roots), nil
}

func variableOf(p *value.Plant) string {
	if p != nil && p.Every != nil {
		return "z"
	}
	return "s"
}

func characteristicPolynomial(c *value.Call) (value.Value, error) {
	return CharacteristicPolynomial(squareOf(c), variableOf(c.Plant("plant")))
}

// CharacteristicPolynomial is det(vI − A).
func CharacteristicPolynomial(a *value.Matrix, variable string) (*value.Polynomial, error) {
	n, _ := a.Dims()
	if a.IsComplex() {
		return nil, diag.New(diag.Type, "the matrix must be real")
	}
	if AllExact(a) && n <= 2*ExactOrder {
		p := a.Exact().CharacteristicPolynomial()
		return &value.Polynomial{Variable: variable, Exact: &p}, nil
	}
	if n <= ExactOrder {
		re, _ := a.Floats()
		x, err := exact.FromFloats(n, n, re)
		if err != nil {
			return nil, diag.New(diag.Numerical, "%v", err)
		}
		f := x.CharacteristicPolynomial().Float64()
		return &value.Polynomial{Variable: variable, F: f, Err: coefficientError(a, f)}, nil
	}
	roots, err := Eigenvalues(a)
	if err != nil {
		return nil, err
	}
	f := []float64{1}
	for i := 0; i < len(roots); i++ {
		r := roots[i].Value
		factor := []float64{1, -real(r)}
		if imag(r) != 0 {
			factor = []float64{1, -2 * real(r), real(r)*real(r) + imag(r)*imag(r)}
			i++
		}
		f = convolved(f, factor)
	}
	return &value.Polynomial{Variable: variable, F: f, Err: coefficientError(a, f) + relativeError(roots)*largest(f)}, nil
}

// coefficientError is a first-order bound of what the entries' uncertainty and one rounding make of the largest coefficient.
func coefficientError(a *value.Matrix, f []float64) float64 {
	n, _ := a.Dims()
	norm := 0.0
	re, _ := a.Floats()
	for _, x := range re {
		norm = max(norm, abs(x))
	}
	rel := 0x1p-53
	if norm > 0 {
		rel += float64(n) * a.Err / norm
	}
	return rel * largest(f)
}

func relativeError(roots []Root) float64 {
	sum := 0.0
	for _, r := range roots {
		if m := cmplx.Abs(r.Value); m > 0 {
			sum += r.Err / m
		}
	}
	return sum
}

func convolved(a, b []float64) []float64 {
	out := make([]float64, len(a)+len(b)-1)
	for i, x := range a {
		for j, y := range b {
			out[i+j] += x * y
		}
	}
	return out
}

func largest(f []float64) float64 {
	m := 0.0
	for _, x := range f {
		m = max(m, abs(x))
	}
	return m
}

func abs(x float64) float64 {
	if x < 0 {
		return -x
	}
	return x
}
