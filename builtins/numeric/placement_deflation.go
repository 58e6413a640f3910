package numeric

import (
	"fmt"
	"math/cmplx"
	"math/rand"
)

// deflation splits invariant subspaces off a pair, one group of equal poles at
// a time: V, orthonormal, with (A − B·K)·V = V·Λ. What is left, the pair seen
// on the complement of V, is reached again and smaller.
type deflation struct {
	n       int
	basis   []float64 // n×n: chosen vectors first, the complement after
	done    int
	gain    []float64 // rows × n: K times the chosen vectors
	a, b    []float64 // the pair on the complement
	inputs  int
	random  *rand.Rand
	wanted  []wantedPole
	layered int
}

// byDeflation assigns any poles, repeated as often as one likes, in staircase
// coordinates. Each layer takes as many copies of the most repeated pole as
// the inputs left allow, so that Jordan blocks stay short.
func (t *assignment) byDeflation(seed int64) (*reducedGain, error) {
	r, q := t.reached, t.inputs
	d := &deflation{n: r, inputs: q, random: rand.New(rand.NewSource(seed)), wanted: append([]wantedPole(nil), t.wanted...)}
	d.basis, d.gain = make([]float64, r*r), make([]float64, q*r)
	d.a, d.b = append([]float64(nil), t.a...), make([]float64, r*q)
	for i := 0; i < r; i++ {
		d.basis[i*r+i] = 1
	}
	for i := 0; i < q; i++ {
		d.b[i*q+i] = 1
	}
	for d.done < r {
		group := poleGroups(d.wanted, 0)[0]
		if err := d.split(group); err != nil {
			return nil, err
		}
	}
	k := make([]float64, q*r) // gain·basisᵀ
	for i := 0; i < q; i++ {
		for j := 0; j < r; j++ {
			sum := 0.0
			for l := 0; l < r; l++ {
				sum += d.gain[i*r+l] * d.basis[j*r+l]
			}
			k[i*r+j] = sum
		}
	}
	return &reducedGain{k: k, method: fmt.Sprintf("several inputs: invariant subspaces split off in %d steps", d.layered)}, nil
}

// split takes up to count copies of one pole.
func (d *deflation) split(group poleGroup) error {
	k, m := d.n-d.done, d.inputs
	d.layered++
	form := newStaircase(k, m, d.a, d.b, 0, nil, 0)
	if err := form.reduce(); err != nil {
		return err
	}
	if form.rank < k {
		return &Refusal{Reason: "rounding hides how the inputs move what is left after some poles are assigned"}
	}
	x, w, count := d.choose(form, group)
	if count == 0 {
		return &Refusal{Reason: "no real gain was found that assigns this pole after the others", Modes: []complex128{group.pole.value}}
	}
	width := count * group.pole.count()
	// Triangularize x = Q·[R; 0]; K·Q₁ = −w·R⁻¹.
	turn := newStaircase(k, width, d.a, x, m, d.b, 0)
	turn.triangularize(turn.b, width, 0, k, 0, width)
	for i := 0; i < m; i++ {
		for j := 0; j < width; j++ {
			sum := -w[i*width+j]
			for l := 0; l < j; l++ {
				sum -= d.gain[i*d.n+d.done+l] * turn.b[l*width+j]
			}
			d.gain[i*d.n+d.done+j] = sum / turn.b[j*width+j]
		}
	}
	multiplyColumns(d.basis, d.n, d.done, k, turn.q)
	d.a = d.a[:0]
	for i := width; i < k; i++ {
		d.a = append(d.a, turn.a[i*k+width:(i+1)*k]...)
	}
	d.b = append(d.b[:0], turn.other[width*m:]...)
	d.done += width
	for taken := 0; taken < count; taken++ {
		for i, p := range d.wanted {
			if p == group.pole {
				d.wanted = append(d.wanted[:i:i], d.wanted[i+1:]...)
				break
			}
		}
	}
	return nil
}

// choose finds, for [B A−pI]·[w; x] = 0, vectors x that need little gain: real
// ones for a real pole, real and imaginary parts side by side for a pair.
// x is k×width and w m×width in the coordinates of the pair given.
func (d *deflation) choose(form *staircase, group poleGroup) (x, w []float64, count int) {
	k, m := form.n, form.m
	base := make([]float64, k*(k+m))
	for i := 0; i < k; i++ {
		copy(base[i*(k+m):], form.b[i*m:(i+1)*m])
		copy(base[i*(k+m)+m:], form.a[i*k:(i+1)*k])
	}
	pencil := newShiftedTrapezoid(k, m, base)
	pencil.factor(group.pole.value)
	kernel := make([]complex128, (k+m)*m)
	pencil.kernelBasis(kernel)
	gram, turn := make([]complex128, m*m), make([]complex128, m*m)
	for a := 0; a < m; a++ {
		for b := 0; b < m; b++ {
			for i := m; i < k+m; i++ {
				gram[a*m+b] += cmplx.Conj(kernel[i*m+a]) * kernel[i*m+b]
			}
		}
	}
	hermitianJacobi(gram, turn, m)
	candidates := sortedColumns(gram, turn, m)
	if group.pole.pair() { // mixtures: a single one may be real up to a factor
		for extra := 0; extra < 4*m; extra++ {
			mixed := make([]complex128, m)
			for i := range mixed {
				mixed[i] = complex(d.random.NormFloat64(), d.random.NormFloat64())
			}
			normalizeComplex(mixed)
			candidates = append(candidates, mixed)
		}
	}
	chooser := &spanChooser{k: k, m: m, pair: group.pole.pair(), limit: group.count}
	for _, candidate := range candidates {
		chooser.try(kernel, candidate)
	}
	return chooser.result(form.q)
}

// sortedColumns gives the eigenvectors with the largest eigenvalue first.
func sortedColumns(gram, turn []complex128, m int) [][]complex128 {
	columns := make([][]complex128, m)
	values := make([]float64, m)
	for j := 0; j < m; j++ {
		value := real(gram[j*m+j])
		column := make([]complex128, m)
		for i := range column {
			column[i] = turn[i*m+j]
		}
		at := j
		for at > 0 && values[at-1] < value {
			values[at], columns[at] = values[at-1], columns[at-1]
			at--
		}
		values[at], columns[at] = value, column
	}
	return columns
}

// smallestPart is how much of a unit kernel vector must lie outside the span
// of those taken before (and, for a pair, how far real and imaginary part must
// be from parallel) for it to count.
const smallestPart = 1e-5

// spanChooser gathers kernel vectors whose state parts are independent.
type spanChooser struct {
	k, m, limit int
	pair        bool
	vectors     [][]float64 // state parts
	inputs      [][]float64 // input parts
	orthonormal [][]float64
}

// try adds kernel·candidate when it is independent of what is there.
func (s *spanChooser) try(kernel, candidate []complex128) {
	if len(s.vectors) >= s.limit*s.parts() || len(s.vectors)+s.parts() > s.k {
		return
	}
	full := make([]complex128, s.k+s.m)
	for i := range full {
		for j, f := range candidate {
			full[i] += kernel[i*s.m+j] * f
		}
	}
	if s.pair {
		perpendicularParts(full, s.m)
	}
	columns := [][]float64{make([]float64, s.k+s.m), make([]float64, s.k+s.m)}
	for i, v := range full {
		columns[0][i], columns[1][i] = real(v), imag(v)
	}
	kept := len(s.orthonormal)
	for part := 0; part < s.parts(); part++ {
		rest := append([]float64(nil), columns[part][s.m:]...)
		for pass := 0; pass < 2; pass++ {
			for _, q := range s.orthonormal {
				sum := 0.0
				for i, v := range q {
					sum += v * rest[i]
				}
				for i, v := range q {
					rest[i] -= sum * v
				}
			}
		}
		length := blocksNorm(rest)
		if length < smallestPart {
			s.orthonormal = s.orthonormal[:kept]
			return
		}
		for i := range rest {
			rest[i] /= length
		}
		s.orthonormal = append(s.orthonormal, rest)
	}
	for part := 0; part < s.parts(); part++ {
		s.vectors = append(s.vectors, columns[part][s.m:])
		s.inputs = append(s.inputs, columns[part][:s.m])
	}
}

func (s *spanChooser) parts() int {
	if s.pair {
		return 2
	}
	return 1
}

// perpendicularParts turns the phase of full so that real and imaginary part
// of its state entries (from first on) are perpendicular.
func perpendicularParts(full []complex128, first int) {
	var square complex128
	for _, v := range full[first:] {
		square += v * v
	}
	if size := cmplx.Abs(square); size > 0 {
		turn := cmplx.Conj(cmplx.Sqrt(square / complex(size, 0)))
		for i := range full {
			full[i] *= turn
		}
	}
}

// result lists the chosen vectors as columns, the states turned back by q.
func (s *spanChooser) result(q []float64) (x, w []float64, count int) {
	width := len(s.vectors)
	x, w = make([]float64, s.k*width), make([]float64, s.m*width)
	for j := range s.vectors {
		for i := 0; i < s.k; i++ {
			sum := 0.0
			for l, v := range s.vectors[j] {
				sum += q[i*s.k+l] * v
			}
			x[i*width+j] = sum
		}
		for i, v := range s.inputs[j] {
			w[i*width+j] = v
		}
	}
	return x, w, width / s.parts()
}
