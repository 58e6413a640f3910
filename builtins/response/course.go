package response

import (
	"math"
	"sort"

	"gonum.org/v1/gonum/mat"

	"gainwright/lang/value"
)

// course is what figures need to follow a response between its instants.
type course struct {
	q       *request
	linear  *linearPath
	held    *heldPath
	dense   *densePath
	sampled bool
	noisy   bool
	samples *value.Response
}

// most places of a mesh
const mostMesh = 400_000

// mesh gives times between which a signal of the path turns at most once.
func (c *course) mesh() []float64 {
	var out []float64
	divide := func(a, b float64, parts int) {
		for k := range parts {
			out = append(out, a+(b-a)*float64(k)/float64(parts))
		}
	}
	switch {
	case c.linear != nil:
		pieces := c.linear.pieces
		each := max(4, min(mostMesh/len(pieces), 4*(c.q.points+1)))
		total := pieces[len(pieces)-1].end
		for _, p := range pieces {
			parts := int(math.Ceil(float64(4*c.q.points) * (p.end - p.start) / total))
			divide(p.start, p.end, min(each, max(4, parts)))
		}
		return append(out, total)
	case c.held != nil:
		samples := len(c.held.starts)/(c.q.n+c.q.m) - 1
		parts := max(4, min(mostMesh/max(samples, 1), 2*c.q.points, 32))
		for k := range samples {
			divide(float64(k)*c.q.clock, float64(k+1)*c.q.clock, parts)
		}
		return append(out, float64(samples)*c.q.clock)
	}
	for _, s := range c.dense.segments {
		divide(s.Start, s.Start+s.Span, 6)
	}
	if n := len(c.dense.segments); n > 0 {
		out = append(out, c.dense.segments[n-1].Start+c.dense.segments[n-1].Span)
	}
	return out
}

// at reads a signal of the path, outputs then inputs, at any time.
func (c *course) at(row int) func(t float64) float64 {
	switch {
	case c.linear != nil:
		z := make([]float64, c.linear.size)
		return func(t float64) float64 {
			p := pieceAt(c.linear.pieces, t)
			copy(z, p.z)
			if p.mode.prop.Advance(z, math.Max(0, t-p.start)) != nil {
				return math.NaN()
			}
			return dot(p.mode.read.row(row), z)
		}
	case c.held != nil:
		return c.held.at(row)
	}
	q := c.q
	z, y, u := make([]float64, q.n+q.law.own.r), make([]float64, q.p), make([]float64, q.m)
	return func(t float64) float64 {
		if c.dense.at(t, z, y, u) != nil {
			return math.NaN()
		}
		if row < q.p {
			return y[row]
		}
		return u[row-q.p]
	}
}

func pieceAt(pieces []piece, t float64) *piece {
	after := sort.Search(len(pieces), func(i int) bool { return pieces[i].start > t })
	return &pieces[max(after-1, 0)]
}

// at reads an output or an input between samples.
func (p *heldPath) at(row int) func(t float64) float64 {
	q := p.q
	size := q.n + q.m
	z, y := make([]float64, size), make([]float64, q.p)
	return func(t float64) float64 {
		k := min(int(t/p.clock*(1+1e-14)), len(p.starts)/size-1)
		copy(z, p.starts[k*size:])
		if row >= q.p {
			return z[q.n+row-q.p]
		}
		dt := math.Max(0, t-float64(k)*p.clock)
		if p.prop == nil {
			if k < len(p.firsts) && dt > 0 {
				find(p.segments[p.firsts[k]:], t).At(t, z[:q.n])
			}
			if q.ownOutputs(z[:q.n], z[q.n:], y) != nil {
				return math.NaN()
			}
			return y[row]
		}
		if p.prop.Advance(z, dt) != nil {
			return math.NaN()
		}
		return dot(q.c.row(row), z[:q.n]) + dot(q.d.row(row), z[q.n:])
	}
}

// restOf gives where the path comes to rest: exactly, at the free loop's point of rest,
// where the loop decays towards it; else what the end of the path shows.
func (c *course) restOf(row int, within float64, end *value.Trace) (final value.Number, none string, err error) {
	q := c.q
	if c.noisy {
		return final, "none: noise keeps it moving", nil
	}
	if q.dynamics == nil && (q.drive.kind == step || q.drive.kind == still || q.drive.kind == impulse) {
		final, ok, err := q.pointOfRest(row)
		if ok || err != nil {
			return final, "", err
		}
	}
	if q.drive.kind == ramp {
		return final, "none: the drive keeps growing", nil
	}
	last := len(end.Values) - 1
	low, high := math.Inf(1), math.Inf(-1)
	for _, v := range end.Values[last-last/10:] {
		low, high = math.Min(low, v), math.Max(high, v)
	}
	way := math.Max(math.Abs(end.Values[last]-end.Values[0]), within*largest(end.Values))
	if high-low > 0.1*within*way || last < 10 {
		return final, "none: it has not come to rest by " + seconds(q.until), nil
	}
	return value.FloatErr(end.Values[last], high-low+end.Err), "", nil
}

// pointOfRest is the loop's answer to a constant drive when no input is at its limit there.
func (q *request) pointOfRest(row int) (final value.Number, ok bool, err error) {
	roots, err := q.spectrum()
	if err != nil {
		return final, false, err
	}
	for _, r := range roots {
		if !decays(r, q.clock > 0) {
			return final, false, nil
		}
	}
	n := q.closedA.r
	amp := 0.0
	if q.drive.kind == step {
		amp = q.drive.amplitude
	}
	rest, wrong := make([]float64, n), 0.0
	if n > 0 && amp != 0 {
		lhs, rhs := mat.NewDense(n, n, nil), mat.NewDense(n, 1, nil)
		for i := range n {
			for j := range n {
				x := -q.closedA.at(i, j)
				if q.clock > 0 && i == j {
					x++
				}
				lhs.Set(i, j, x)
			}
			rhs.Set(i, 0, q.closedB.at(i, q.drive.channel)*amp)
		}
		x, errors, ok := restOf(lhs, rhs, q.closedC.row(row))
		if !ok {
			return final, false, nil
		}
		rest, wrong = x, errors[0]
	}
	level := func(row int) float64 {
		y := dot(q.closedC.row(row), rest)
		if amp != 0 {
			y += q.closedD.at(row, q.drive.channel) * amp
		}
		return y
	}
	for i := range q.m {
		if u := level(q.p + i); u < q.low[i] || u > q.high[i] {
			return final, false, nil
		}
	}
	y := level(row)
	return value.FloatErr(y, math.Max(wrong, 1e-15*math.Abs(y))), true, nil
}
