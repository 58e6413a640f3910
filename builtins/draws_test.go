package builtins_test

import (
	"encoding/json"
	"math"
	"math/rand/v2"

	"gonum.org/v1/gonum/mat"
)

// draw makes random plants of graded conditioning.
type draw struct{ *rand.Rand }

func (r draw) normal(rows, columns int) *mat.Dense {
	m := mat.NewDense(rows, columns, nil)
	m.Apply(func(_, _ int, _ float64) float64 { return r.NormFloat64() }, m)
	return m
}

// graded has singular values from 1 down to 10^−decades.
func (r draw) graded(n int, decades float64) *mat.Dense {
	var qr mat.QR
	var u, v mat.Dense
	qr.Factorize(r.normal(n, n))
	qr.QTo(&u)
	qr.Factorize(r.normal(n, n))
	qr.QTo(&v)
	for j := range n {
		for i := range n {
			u.Set(i, j, u.At(i, j)*math.Pow(10, -decades*float64(j)/math.Max(1, float64(n-1))))
		}
	}
	var m mat.Dense
	m.Mul(&u, &v)
	return &m
}

// plant draws a stable A, B, C with lightly damped modes in coordinates of condition up to
// 10^decades, and then in units that differ by up to 2^(2·units).
func (r draw) plant(n, inputs, outputs int, sampled bool, decades float64, units int) (a, b, c *mat.Dense, scale []float64) {
	modes := mat.NewDense(n, n, nil)
	for i := 0; i < n; i++ {
		size, angle := math.Pow(10, 3*r.Float64()-2), math.Pi/2*(1+math.Pow(10, -3*r.Float64()))
		if sampled {
			size, angle = 1-math.Pow(10, -3*r.Float64()), math.Pi*r.Float64()
		}
		if i+1 < n && r.Float64() < 0.5 {
			re, im := size*math.Cos(angle), size*math.Sin(angle)
			modes.Set(i, i, re)
			modes.Set(i+1, i+1, re)
			modes.Set(i, i+1, im)
			modes.Set(i+1, i, -im)
			i++
			continue
		}
		if !sampled || r.Float64() < 0.3 {
			size = -size
		}
		modes.Set(i, i, size)
	}
	t := r.graded(n, decades*r.Float64())
	var inverse mat.Dense
	if err := inverse.Inverse(t); err != nil {
		panic(err)
	}
	a = &mat.Dense{}
	a.Mul(t, modes)
	a.Mul(a, &inverse)
	b, c = r.normal(n, inputs), r.normal(outputs, n)
	scale = make([]float64, n)
	for i := range scale {
		scale[i] = math.Ldexp(1, r.IntN(2*units+1)-units)
	}
	a.Apply(func(i, j int, v float64) float64 { return v * scale[i] / scale[j] }, a)
	b.Apply(func(i, _ int, v float64) float64 { return v * scale[i] }, b)
	c.Apply(func(_, j int, v float64) float64 { return v / scale[j] }, c)
	return a, b, c, scale
}

// weight is symmetric with eigenvalues from 1 down to 10^−decades; every second one is negative where indefinite.
func (r draw) weight(n int, decades float64, indefinite bool) *mat.Dense {
	var qr mat.QR
	var u mat.Dense
	qr.Factorize(r.normal(n, n))
	qr.QTo(&u)
	w := mat.NewDense(n, n, nil)
	for k := range n {
		s := math.Pow(10, -decades*r.Float64())
		if indefinite && k%2 == 1 {
			s *= -0.03
		}
		for i := range n {
			for j := range n {
				w.Set(i, j, w.At(i, j)+s*u.At(i, k)*u.At(j, k))
			}
		}
	}
	for i := range n {
		for j := range i {
			w.Set(i, j, w.At(j, i))
		}
	}
	return w
}

// rowsOf writes a matrix for the script.
func rowsOf(m mat.Matrix) [][]float64 {
	r, c := m.Dims()
	out := make([][]float64, r)
	for i := range out {
		for j := range c {
			out[i] = append(out[i], m.At(i, j)+0)
		}
	}
	return out
}

// floatText writes a matrix of binary64 numbers in the language.
func floatText(m mat.Matrix) string {
	data, err := json.Marshal(rowsOf(m))
	if err != nil {
		panic(err)
	}
	return "floating(" + literal(data) + ")"
}

func plantText(a, b, c *mat.Dense, sampled bool) string {
	text := "plant(" + floatText(a) + ", " + floatText(b) + ", " + floatText(c)
	if sampled {
		text += ", every: 1"
	}
	return text + ")"
}
