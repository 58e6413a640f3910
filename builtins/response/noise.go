package response

import (
	"math"
	"math/rand/v2"

	"gonum.org/v1/gonum/mat"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// noise draws what shakes the states and what spoils the measurements. The two come from
// streams of their own, so that one does not change when the other is left out.
type noise struct {
	seed              uint64
	intensity         grid // of the process, n×n
	process, measured grid // factors of the covariances of one draw
	states, outputs   *rand.Rand
	draw              []float64
}

// readNoise reads `noise` and `seed`; it runs last, when the spacing of the draws is known.
func (q *request) readNoise() error {
	v, ok := q.call.Args["noise"]
	if !ok {
		for _, name := range []string{"seed", "enters"} {
			if q.call.Has(name) {
				return value.Errf(diag.Type, name, "%s belongs to noise: …", name)
			}
		}
		return nil
	}
	process, measurement, err := q.noiseParts(v)
	if err != nil {
		return forParam(err, "noise")
	}
	n := &noise{seed: 1, draw: make([]float64, max(q.n, q.p)), intensity: process, process: newGrid(q.n, q.n), measured: newGrid(q.p, q.p)}
	if q.call.Has("seed") {
		k, _ := q.call.Number("seed").Whole()
		n.seed = uint64(k)
	}
	if !measurement.isZero() {
		if q.clock == 0 {
			return value.Errf(diag.Type, "noise", "white noise on a continuous measurement has no value at an instant; give a sampled law, or sample the plant")
		}
		if n.measured, err = factor(measurement, "the measurement's"); err != nil {
			return err
		}
	}
	if !process.isZero() {
		if n.process, err = q.processFactor(process); err != nil {
			return err
		}
	}
	if q.limited && q.closed && q.clock == 0 && q.dynamics == nil {
		return value.Errf(diag.Type, "noise", "noise in a continuous loop with limited inputs is not built; a sampled law (every: …) or nonlinear: true takes both")
	}
	n.restart()
	q.noise = n
	return nil
}

// noiseParts reads W, or the list [W, V].
func (q *request) noiseParts(v value.Value) (process, measurement grid, err error) {
	measurement = newGrid(q.p, q.p)
	w := v
	if items, ok := v.(*value.List); ok {
		if len(items.Items) != 2 {
			return process, measurement, diag.New(diag.Shape, "noise is the process's covariance W, or the list [W, V] with the measurement's")
		}
		w = items.Items[0]
		if measurement, err = covariance(items.Items[1], q.p, "V"); err != nil {
			return process, measurement, err
		}
	}
	if !q.call.Has("enters") {
		process, err = covariance(w, q.n, "W")
		return process, measurement, err
	}
	g := gridOf(q.call.Matrix("enters"))
	if g.r != q.n {
		return process, measurement, value.Errf(diag.Shape, "enters", "enters is %d×%d; it needs a row for each of the %d states", g.r, g.c, q.n)
	}
	inner, err := covariance(w, g.c, "W")
	if err != nil {
		return process, measurement, err
	}
	t := newGrid(g.c, g.r)
	for i := range g.r {
		for j := range g.c {
			t.v[j*g.r+i] = g.at(i, j)
		}
	}
	return g.times(inner).times(t), measurement, nil
}

func covariance(v value.Value, n int, name string) (grid, error) {
	c, err := value.Coerce(value.Param{Name: name, Shape: value.AMatrix}, v)
	if err != nil {
		return grid{}, err
	}
	m := c.(*value.Matrix)
	if r, cols := m.Dims(); r != n || cols != n || m.IsComplex() {
		return grid{}, diag.New(diag.Shape, "%s is %d×%d; it must be real, %d×%d", name, r, cols, n, n)
	}
	g := gridOf(m)
	for i := range n {
		for j := range i {
			if math.Abs(g.at(i, j)-g.at(j, i)) > 1e-12*largest(g.v) {
				return grid{}, diag.New(diag.Type, "%s is not symmetric", name)
			}
		}
	}
	return g, nil
}

// factor gives F with F·Fᵀ = W.
func factor(w grid, whose string) (grid, error) {
	n := w.r
	if n == 0 {
		return w, nil
	}
	if err := numeric.Finite("the covariance", mat.NewDense(n, n, append([]float64(nil), w.v...))); err != nil {
		return w, value.Errf(diag.Numerical, "noise", "%v", err)
	}
	var e mat.EigenSym
	if !e.Factorize(mat.NewSymDense(n, append([]float64(nil), w.v...)), true) {
		return w, value.Errf(diag.Numerical, "noise", "the covariance could not be factored")
	}
	values := e.Values(nil)
	var vectors mat.Dense
	e.VectorsTo(&vectors)
	f := newGrid(n, n)
	for j, x := range values {
		if x < -1e-12*math.Abs(values[n-1]) {
			return w, value.Errf(diag.Type, "noise", "%s covariance has a negative eigenvalue, %.4g", whose, x)
		}
		for i := range n {
			f.v[i*n+j] = vectors.At(i, j) * math.Sqrt(math.Max(x, 0))
		}
	}
	return f, nil
}

// processFactor factors what the process adds from one draw to the next.
func (q *request) processFactor(w grid) (grid, error) {
	if q.plant.Every != nil {
		return factor(w, "the process's")
	}
	spacing := q.until / float64(q.points)
	if q.hybrid() {
		spacing = q.clock / float64(q.points)
	}
	if q.dynamics != nil {
		if q.hybrid() {
			spacing = q.clock
		}
		return factor(w.scaled(spacing), "the process's")
	}
	if _, err := factor(w, "the process's"); err != nil {
		return w, err
	}
	a, whole := q.a, w
	if !q.hybrid() && q.closed {
		a, whole = q.closedA, newGrid(q.closedA.r, q.closedA.r)
		whole.put(0, 0, w)
	}
	n := a.r
	d, _, err := numeric.VanLoanNoise(mat.NewDense(n, n, a.v), mat.NewDense(n, n, whole.v), spacing)
	if err != nil {
		return w, system.Refused(err, "noise")
	}
	return factor(grid{n, n, mat.DenseCopyOf(d).RawMatrix().Data}, "the process's")
}

func (n *noise) restart() {
	n.states = rand.New(rand.NewPCG(n.seed, 1))
	n.outputs = rand.New(rand.NewPCG(n.seed, 2))
}

// push adds one draw of the process to the states.
func (n *noise) push(x []float64) {
	if len(n.draw) < n.process.c {
		n.draw = make([]float64, n.process.c)
	}
	d := n.draw[:n.process.c]
	for i := range d {
		d[i] = n.states.NormFloat64()
	}
	n.process.add(x, d)
}

// measure fills out with one draw of the measurement's error.
func (n *noise) measure(out []float64) {
	d := n.draw[:n.measured.c]
	for i := range d {
		d[i] = n.outputs.NormFloat64()
	}
	n.measured.apply(out, d)
}

// addNoise adds to a continuous linear motion what the noise makes of the free loop: the
// two superpose.
func (q *request) addNoise(r *value.Response, spacing float64, count int) error {
	n := q.noise.process.r
	a, c := q.a, q.c
	if q.closed {
		a, c = q.closedA, q.closedC
	}
	if n != a.r {
		return nil // nothing but the measurement is noisy
	}
	prop, err := numeric.NewPropagator(mat.NewDense(n, n, a.v), spacing)
	if err != nil {
		return system.Refused(err, "plant")
	}
	q.noise.restart()
	z, next, y := make([]float64, n), make([]float64, n), make([]float64, c.r)
	for k := range count {
		c.apply(y, z)
		for i, v := range y {
			r.Signals[i].Values[k] += v
		}
		for i, v := range z {
			r.Signals[q.p+q.m+i].Values[k] += v
		}
		if err := prop.Step(0, next, z); err != nil {
			return err
		}
		copy(z, next)
		q.noise.push(z)
	}
	return nil
}
