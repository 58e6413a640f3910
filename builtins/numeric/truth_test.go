package numeric

import (
	"math"
	"math/big"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// truthBits is the working precision of the big.Float reference computations.
const truthBits = 2000

// bigMatrix is a row-major matrix of big floats, the truth tests compare with.
type bigMatrix struct {
	rows, columns int
	entry         []*big.Float
}

func bigFloat(x float64) *big.Float { return new(big.Float).SetPrec(truthBits).SetFloat64(x) }

func newBig(rows, columns int) bigMatrix {
	m := bigMatrix{rows, columns, make([]*big.Float, rows*columns)}
	for i := range m.entry {
		m.entry[i] = bigFloat(0)
	}
	return m
}

func bigOf(d *mat.Dense) bigMatrix {
	r, c := d.Dims()
	m := newBig(r, c)
	for i := range r {
		for j := range c {
			m.entry[i*c+j].SetFloat64(d.At(i, j))
		}
	}
	return m
}

func (m bigMatrix) times(o bigMatrix) bigMatrix {
	p, t := newBig(m.rows, o.columns), bigFloat(0)
	for i := range m.rows {
		for k := range m.columns {
			if m.entry[i*m.columns+k].Sign() == 0 {
				continue
			}
			for j := range o.columns {
				t.Mul(m.entry[i*m.columns+k], o.entry[k*o.columns+j])
				p.entry[i*o.columns+j].Add(p.entry[i*o.columns+j], t)
			}
		}
	}
	return p
}

func (m bigMatrix) plus(o bigMatrix) bigMatrix {
	p := newBig(m.rows, m.columns)
	for i := range p.entry {
		p.entry[i].Add(m.entry[i], o.entry[i])
	}
	return p
}

func (m bigMatrix) scaled(f *big.Float) bigMatrix {
	p := newBig(m.rows, m.columns)
	for i := range p.entry {
		p.entry[i].Mul(m.entry[i], f)
	}
	return p
}

func (m bigMatrix) transposed() bigMatrix {
	p := newBig(m.columns, m.rows)
	for i := range m.rows {
		for j := range m.columns {
			p.entry[j*m.rows+i].Set(m.entry[i*m.columns+j])
		}
	}
	return p
}

func (m bigMatrix) block(i0, i1, j0, j1 int) bigMatrix {
	p := newBig(i1-i0, j1-j0)
	for i := i0; i < i1; i++ {
		for j := j0; j < j1; j++ {
			p.entry[(i-i0)*(j1-j0)+j-j0].Set(m.entry[i*m.columns+j])
		}
	}
	return p
}

func (m bigMatrix) put(i0, j0 int, o bigMatrix) {
	for i := range o.rows {
		for j := range o.columns {
			m.entry[(i0+i)*m.columns+j0+j].Set(o.entry[i*o.columns+j])
		}
	}
}

func bigIdentity(n int) bigMatrix {
	m := newBig(n, n)
	for i := range n {
		m.entry[i*n+i].SetInt64(1)
	}
	return m
}

func (m bigMatrix) largest() *big.Float {
	l, t := bigFloat(0), bigFloat(0)
	for _, e := range m.entry {
		if t.Abs(e).Cmp(l) > 0 {
			l.Set(t)
		}
	}
	return l
}

// exponential sums the Taylor series of m/2^s and squares s times.
func (m bigMatrix) exponential() bigMatrix {
	s := 8
	if l := m.largest(); l.Sign() != 0 {
		s = max(l.MantExp(nil)+12, 0)
	}
	x := m.scaled(new(big.Float).SetPrec(truthBits).SetMantExp(big.NewFloat(1), -s))
	sum, term := bigIdentity(m.rows), bigIdentity(m.rows)
	for k := 1; ; k++ {
		term = term.times(x).scaled(new(big.Float).SetPrec(truthBits).Quo(bigFloat(1), bigFloat(float64(k))))
		sum = sum.plus(term)
		l := term.largest()
		if l.Sign() == 0 || l.MantExp(nil) < -truthBits+100 {
			break
		}
	}
	for range s {
		sum = sum.times(sum)
	}
	return sum
}

// errorAgainst is max|got − truth| / max|truth|.
func errorAgainst(got *mat.Dense, truth bigMatrix) float64 {
	largest := truth.largest()
	difference := bigOf(got).plus(truth.scaled(bigFloat(-1))).largest()
	if largest.Sign() == 0 {
		if difference.Sign() == 0 {
			return 0
		}
		return math.Inf(1)
	}
	f, _ := new(big.Float).Quo(difference, largest).Float64()
	return f
}

// entryErrorAgainst is the largest relative error of a single entry.
func entryErrorAgainst(got *mat.Dense, truth bigMatrix) float64 {
	worst := 0.0
	for i, e := range truth.entry {
		g := got.At(i/truth.columns, i%truth.columns)
		if e.Sign() == 0 {
			if g != 0 {
				return math.Inf(1)
			}
			continue
		}
		d := new(big.Float).Sub(bigFloat(g), e)
		f, _ := d.Quo(d, e).Float64()
		worst = math.Max(worst, math.Abs(f))
	}
	return worst
}

// requireHonest fails when fewer digits hold than claimed, by more than one.
func requireHonest(t *testing.T, what string, claimed, trueError float64) {
	t.Helper()
	if held := -math.Log10(math.Max(trueError, 1e-17)); claimed > 0 && claimed > held+1 {
		t.Errorf("%s: %.2f digits claimed, %.2f hold", what, claimed, held)
	}
}

// inverse by Gauss–Jordan elimination with row pivoting.
func (m bigMatrix) inverse() bigMatrix {
	n := m.rows
	a, x := m.scaled(bigFloat(1)), bigIdentity(n)
	t := bigFloat(0)
	for k := range n {
		pivot := k
		for i := k + 1; i < n; i++ {
			if new(big.Float).Abs(a.entry[i*n+k]).Cmp(new(big.Float).Abs(a.entry[pivot*n+k])) > 0 {
				pivot = i
			}
		}
		for j := range n {
			a.entry[k*n+j], a.entry[pivot*n+j] = a.entry[pivot*n+j], a.entry[k*n+j]
			x.entry[k*n+j], x.entry[pivot*n+j] = x.entry[pivot*n+j], x.entry[k*n+j]
		}
		reciprocal := new(big.Float).SetPrec(truthBits).Quo(bigFloat(1), a.entry[k*n+k])
		for j := range n {
			a.entry[k*n+j].Mul(a.entry[k*n+j], reciprocal)
			x.entry[k*n+j].Mul(x.entry[k*n+j], reciprocal)
		}
		for i := range n {
			if i == k || a.entry[i*n+k].Sign() == 0 {
				continue
			}
			factor := new(big.Float).Set(a.entry[i*n+k])
			for j := range n {
				a.entry[i*n+j].Sub(a.entry[i*n+j], t.Mul(factor, a.entry[k*n+j]))
				x.entry[i*n+j].Sub(x.entry[i*n+j], t.Mul(factor, x.entry[k*n+j]))
			}
		}
	}
	return x
}

// logarithm takes square roots by the coupled iteration of E. D. Denman and
// A. N. Beavers (Appl. Math. Comput. 2, 1976), then sums the series.
func (m bigMatrix) logarithm() bigMatrix {
	const roots = 40
	half := bigFloat(0.5)
	x := m
	for range roots {
		y, z := x, bigIdentity(m.rows)
		for range 60 {
			ny := y.plus(z.inverse()).scaled(half)
			z = z.plus(y.inverse()).scaled(half)
			change := ny.plus(y.scaled(bigFloat(-1))).largest()
			y = ny
			if change.Sign() == 0 || change.MantExp(nil) < -truthBits+300 {
				break
			}
		}
		x = y
	}
	delta := x.plus(bigIdentity(m.rows).scaled(bigFloat(-1)))
	sum, power := newBig(m.rows, m.rows), bigIdentity(m.rows)
	for k := 1; k < 200; k++ {
		power = power.times(delta)
		sign := float64(1 - 2*((k+1)%2))
		sum = sum.plus(power.scaled(new(big.Float).SetPrec(truthBits).Quo(bigFloat(sign), bigFloat(float64(k)))))
	}
	return sum.scaled(bigFloat(1 << roots))
}

// lyapunov solves A·X + X·Aᵀ + Q = 0, or A·X·Aᵀ − X + Q = 0, as one linear system.
func (m bigMatrix) lyapunov(q bigMatrix, sampled bool) bigMatrix {
	n := m.rows
	system, right := newBig(n*n, n*n), newBig(n*n, 1)
	for i := range n {
		for j := range n {
			row := system.entry[(i*n+j)*n*n : (i*n+j+1)*n*n]
			right.entry[i*n+j].Neg(q.entry[i*n+j])
			for k := range n {
				if sampled {
					for l := range n {
						row[k*n+l].Add(row[k*n+l], new(big.Float).SetPrec(truthBits).Mul(m.entry[i*n+k], m.entry[j*n+l]))
					}
				} else {
					row[k*n+j].Add(row[k*n+j], m.entry[i*n+k])
					row[i*n+k].Add(row[i*n+k], m.entry[j*n+k])
				}
			}
			if sampled {
				row[i*n+j].Sub(row[i*n+j], bigFloat(1))
			}
		}
	}
	x := system.inverse().times(right)
	return bigMatrix{n, n, x.entry}
}

// positiveRoots are the roots, smallest first, of det(x·I − m), all of which must
// be real and positive: Newton's method from 0 climbs to the smallest root,
// which is then divided out.
func (m bigMatrix) positiveRoots() []*big.Float {
	n := m.rows
	// U. J. J. Le Verrier, D. K. Faddeev: coefficients, highest power first.
	polynomial := []*big.Float{bigFloat(1)}
	product := newBig(n, n)
	for k := 1; k <= n; k++ {
		product = m.times(product.plus(bigIdentity(n).scaled(polynomial[k-1])))
		trace := bigFloat(0)
		for i := range n {
			trace.Add(trace, product.entry[i*n+i])
		}
		polynomial = append(polynomial, trace.Quo(trace, bigFloat(float64(-k))))
	}
	var roots []*big.Float
	for len(polynomial) > 1 {
		x := bigFloat(0)
		for range 1500 {
			value, slope := bigFloat(0), bigFloat(0)
			for _, c := range polynomial {
				slope.Add(slope.Mul(slope, x), value)
				value.Add(value.Mul(value, x), c)
			}
			if value.Sign() == 0 {
				break
			}
			step := new(big.Float).Quo(value, slope)
			x.Sub(x, step)
			if step.MantExp(nil) < x.MantExp(nil)-300 {
				break
			}
		}
		roots = append(roots, x)
		quotient := []*big.Float{polynomial[0]}
		for _, c := range polynomial[1 : len(polynomial)-1] {
			next := new(big.Float).SetPrec(truthBits).Mul(quotient[len(quotient)-1], x)
			quotient = append(quotient, next.Add(next, c))
		}
		polynomial = quotient
	}
	return roots
}
