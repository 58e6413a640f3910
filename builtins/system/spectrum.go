package system

import (
	"fmt"
	"math"
	"math/cmplx"
	"sort"

	"gonum.org/v1/gonum/mat"

	"gainwright/builtins/numeric"
	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

// ExactOrder is the largest number of states for which exact answers are kept.
const ExactOrder = 30

// FewDigits is the relative error above which floating eigenvalues are found again in higher precision.
const FewDigits = 1e-12

// Root is an eigenvalue, pole or zero with its absolute error estimate. Exact parts are
// set when the root is rational (or has rational parts); Multiplicity counts how often a
// certified root occurs, 1 for a floating one.
type Root struct {
	Value        complex128
	Err          float64
	Re, Im       *exactPart
	Multiplicity int
}

type exactPart = value.Number

// Number gives the root as a Number when it is real, else as a Complex.
func (r Root) Number() value.Value {
	if r.Re != nil {
		if r.Im.Exact.Sign() == 0 {
			return *r.Re
		}
		return value.Complex{ExactRe: r.Re.Exact, ExactIm: r.Im.Exact}
	}
	if imag(r.Value) == 0 {
		return value.FloatErr(real(r.Value), r.Err)
	}
	return value.Complex{C: r.Value, Err: math.Max(r.Err, cmplx.Abs(r.Value)*0x1p-53)}
}

// Eigenvalues gives the eigenvalues of a square matrix, each as often as it occurs,
// ordered by magnitude. Of an exact matrix of at most ExactOrder rows they are certified
// roots of the exact characteristic polynomial. Floating ones whose sensitivity leaves
// few digits are found again from the binary64 entries taken as exact.
func Eigenvalues(m *value.Matrix) ([]Root, error) {
	n, _ := m.Dims()
	if n == 0 {
		return nil, nil
	}
	if m.IsComplex() {
		return complexEigenvalues(m)
	}
	if m.IsExact() && n <= ExactOrder {
		return RootsOf(m.Exact().CharacteristicPolynomial())
	}
	roots, e, err := floatingEigenvalues(m.Dense(), uncertainty(m))
	if err != nil {
		return nil, err
	}
	if n <= ExactOrder && LargestError(roots) > FewDigits {
		if better, err := sharpened(m, e); err == nil {
			return better, nil
		}
	}
	return roots, nil
}

// EigenvaluesWithin gives the eigenvalues of a real matrix whose entries are known to ±uncertainty.
func EigenvaluesWithin(m, uncertainty *mat.Dense) ([]Root, error) {
	roots, _, err := floatingEigenvalues(m, uncertainty)
	return roots, err
}

func floatingEigenvalues(m, uncertainty *mat.Dense) ([]Root, *numeric.Eigensystem, error) {
	e, err := numeric.EigenWithin(m, uncertainty)
	if err != nil {
		return nil, nil, Refused(err, "")
	}
	roots := make([]Root, len(e.Values))
	for i, v := range e.Values {
		roots[i] = Root{Value: v, Err: e.ErrorOf[i], Multiplicity: 1}
	}
	sortRoots(roots)
	return roots, e, nil
}

// LargestError is the largest error of the roots, relative to the largest of them.
func LargestError(roots []Root) float64 {
	scale, worst := 0.0, 0.0
	for _, r := range roots {
		scale, worst = math.Max(scale, cmplx.Abs(r.Value)), math.Max(worst, r.Err)
	}
	if worst == 0 {
		return 0
	}
	return worst / scale
}

// uncertainty is the matrix of the entries' error estimates, nil where there are none.
func uncertainty(m *value.Matrix) *mat.Dense {
	if m.Err == 0 {
		return nil
	}
	n, k := m.Dims()
	err := m.Err
	if !(err <= math.MaxFloat64) { // nothing is known of the entries
		re, _ := m.Floats()
		err = largest(re)
	}
	d := mat.NewDense(n, k, nil)
	d.Apply(func(_, _ int, _ float64) float64 { return err }, d)
	return d
}

// sharpened finds the eigenvalues of the stored binary64 matrix in higher precision; what
// is left of the error is what the entries' own uncertainty makes of it.
func sharpened(m *value.Matrix, e *numeric.Eigensystem) ([]Root, error) {
	n, _ := m.Dims()
	re, _ := m.Floats()
	x, err := exact.FromFloats(n, n, re)
	if err != nil {
		return nil, err
	}
	roots, err := RootsOf(x.CharacteristicPolynomial())
	if err != nil {
		return nil, err
	}
	for i := range roots {
		if m.Err == 0 {
			continue
		}
		best, passed := math.Inf(1), 0.0
		for j, v := range e.Values {
			if d := cmplx.Abs(v - roots[i].Value); d < best {
				best, passed = d, e.ErrorOf[j]
			}
		}
		roots[i].Err = passed
		roots[i].Re, roots[i].Im = nil, nil
	}
	return roots, nil
}

// RootsOf gives the certified roots of an exact polynomial, each as often as it occurs,
// ordered by magnitude.
func RootsOf(p exact.Polynomial) ([]Root, error) {
	found, err := p.Roots(17)
	if err != nil {
		return nil, diag.New(diag.Numerical, "the roots of a polynomial of degree %d were not found: %v", p.Degree(), err)
	}
	var roots []Root
	for _, f := range found {
		r := Root{Value: f.Value, Err: f.Radius + cmplx.Abs(f.Value)*0x1p-53, Multiplicity: f.Multiplicity}
		if f.Exact {
			re, im := value.Rat(f.ExactRe), value.Rat(f.ExactIm)
			r.Re, r.Im = &re, &im
		}
		for range f.Multiplicity {
			roots = append(roots, r)
		}
	}
	sortRoots(roots)
	return roots, nil
}

// complexEigenvalues finds them in the real matrix [[R, −I], [I, R]] of twice the size,
// whose spectrum is that of R + iI and its conjugate, and keeps of each pair λ, λ̄ the
// one for which R + iI − λ is closer to singular.
func complexEigenvalues(m *value.Matrix) ([]Root, error) {
	n, _ := m.Dims()
	e, err := numeric.Eigen(realForm(m, 0))
	if err != nil {
		return nil, Refused(err, "")
	}
	var roots []Root
	upper := map[int]int{}
	for i, v := range e.Values {
		if imag(v) < 0 {
			continue
		}
		pick := v
		if imag(v) > 0 {
			same := nearIndex(e.Values[:i], v, e.ErrorOf[i])
			upper[same]++
			if distanceToSingular(m, cmplx.Conj(v)) < distanceToSingular(m, v) || upper[same] == 2 {
				pick = cmplx.Conj(v)
			}
		} else if len(e.Values) > i+1 && imag(v) == 0 {
			// a real eigenvalue occurs twice in the doubled matrix: count every other one
			upper[-1]++
			if upper[-1]%2 == 0 {
				continue
			}
		}
		roots = append(roots, Root{Value: pick, Err: e.ErrorOf[i] + e.Condition[i]*m.Err, Multiplicity: 1})
	}
	if len(roots) != n {
		return nil, diag.New(diag.Numerical, "the eigenvalues of this complex matrix could not be told from their conjugates")
	}
	sortRoots(roots)
	return roots, nil
}

// nearIndex finds the first value within the error, or len(vs).
func nearIndex(vs []complex128, v complex128, err float64) int {
	for i, w := range vs {
		if cmplx.Abs(w-v) <= 4*err+1e-13*cmplx.Abs(v) {
			return i
		}
	}
	return len(vs)
}

// realForm is the real matrix of twice the size that stands for m − shift.
func realForm(m *value.Matrix, shift complex128) *mat.Dense {
	n, _ := m.Dims()
	re, im := m.Floats()
	d := mat.NewDense(2*n, 2*n, nil)
	for i := range n {
		for j := range n {
			x, y := re[i*n+j], im[i*n+j]
			if i == j {
				x, y = x-real(shift), y-imag(shift)
			}
			d.Set(i, j, x)
			d.Set(n+i, n+j, x)
			d.Set(i, n+j, -y)
			d.Set(n+i, j, y)
		}
	}
	return d
}

// distanceToSingular is the smallest singular value of m − λ.
func distanceToSingular(m *value.Matrix, lambda complex128) float64 {
	var svd mat.SVD
	if !svd.Factorize(realForm(m, lambda), mat.SVDNone) {
		return math.Inf(1)
	}
	s := svd.Values(nil)
	return s[len(s)-1]
}

// sortRoots orders by magnitude, then real part descending, then imaginary part; equal
// magnitudes to rounding count as equal, so that pairs stay together.
func sortRoots(roots []Root) {
	sort.SliceStable(roots, func(i, j int) bool {
		a, b := roots[i].Value, roots[j].Value
		ma, mb := cmplx.Abs(a), cmplx.Abs(b)
		if math.Abs(ma-mb) > 1e-12*math.Max(ma, mb) {
			return ma < mb
		}
		if d := real(a) - real(b); math.Abs(d) > 1e-12*ma {
			return d > 0
		}
		return imag(a) < imag(b)
	})
}

// RootsFromList turns a list of numbers and complex numbers into roots ordered by magnitude.
func RootsFromList(l *value.List) []Root {
	var roots []Root
	for _, v := range l.Items {
		switch v := v.(type) {
		case value.Number:
			r := Root{Value: complex(v.Float64(), 0), Err: v.Err, Multiplicity: 1}
			if v.IsExact() {
				zero := value.Int(0)
				r.Re, r.Im = &v, &zero
			}
			roots = append(roots, r)
		case value.Complex:
			r := Root{Value: v.Complex128(), Err: v.Err, Multiplicity: 1}
			if v.IsExact() {
				re, im := value.Rat(v.ExactRe), value.Rat(v.ExactIm)
				r.Re, r.Im = &re, &im
			}
			roots = append(roots, r)
		}
	}
	sortRoots(roots)
	return roots
}

// List turns roots into a list value.
func List(roots []Root) *value.List {
	l := &value.List{}
	for _, r := range roots {
		l.Items = append(l.Items, r.Number())
	}
	return l
}

// Refused turns an error of the numerical package into one for the user that points at a parameter.
func Refused(err error, param string) error {
	if d, ok := err.(*diag.Error); ok {
		return d
	}
	return diag.New(diag.Numerical, "%v", err).For(param)
}

// RootText writes roots in a sentence, to five digits.
func RootText(roots []Root) string {
	text := ""
	for i, r := range roots {
		if i > 0 {
			text += ", "
		}
		v := r.Value
		switch {
		case imag(v) == 0:
			text += fmt.Sprintf("%.5g", real(v))
		default:
			sign := "+"
			if imag(v) < 0 {
				sign = "-"
			}
			text += fmt.Sprintf("%.5g %s %.5gi", real(v), sign, math.Abs(imag(v)))
		}
	}
	return text
}
