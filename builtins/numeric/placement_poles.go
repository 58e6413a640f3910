package numeric

import (
	"cmp"
	"math"
	"math/cmplx"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// finish carries the reduced gain back to the caller's coordinates and
// recomputes the poles of the loop.
func (t *assignment) finish(reduced *reducedGain) (*Placement, error) {
	n := t.form.n
	_, m := sizeOf(t.inputMap)
	placement := &Placement{Kept: t.kept, K: denseOf(m, n, make([]float64, m*n))}
	placement.Certificate.Method = reduced.method
	if !t.plain {
		placement.Certificate.Method += ", in balanced coordinates"
		placement.Certificate.note("the states differ so much in scale that sensitivities are those of the balanced coordinates")
	}
	if t.reached > 0 && m > 0 {
		spread, err := t.spreadInputs(reduced.k)
		if err != nil {
			return nil, err
		}
		rows := mat.NewDense(t.reached, n, nil)
		for i := 0; i < t.reached; i++ {
			for j := 0; j < n; j++ {
				rows.Set(i, j, t.form.q[j*n+i]/t.scale.states[j])
			}
		}
		placement.K.Mul(spread, rows)
	}
	if err := Finite("the gain", placement.K); err != nil {
		return nil, &Refusal{Reason: "the gain that these poles need is beyond the range of numbers"}
	}
	return placement, t.examine(placement, reduced)
}

// spreadInputs divides what acts on the first rows among the inputs: the
// smallest K̂ with B₁·K̂ = k, B₁ the first rows of the reduced input map.
func (t *assignment) spreadInputs(k []float64) (*mat.Dense, error) {
	_, m := sizeOf(t.inputMap)
	first := mat.NewDense(t.inputs, m, nil)
	for i := 0; i < t.inputs; i++ {
		for j := 0; j < m; j++ {
			value := t.form.b[i*m+j]
			if t.inputs < m { // only here is there a choice; make it in the declared units
				value /= t.scale.inputs[j]
			}
			first.Set(i, j, value)
		}
	}
	spread := mat.NewDense(m, t.reached, nil)
	err := spread.Solve(first, mat.NewDense(t.inputs, t.reached, k))
	if _, poor := err.(mat.Condition); err != nil && !poor {
		return nil, err
	}
	if t.inputs == m {
		for j, f := range t.scale.inputs {
			for i := 0; i < t.reached; i++ {
				spread.Set(j, i, spread.At(j, i)*f)
			}
		}
	}
	return spread, nil
}

// examine recomputes the poles of A − B·K and their sensitivities.
func (t *assignment) examine(placement *Placement, reduced *reducedGain) error {
	n := t.form.n
	loop := mat.DenseCopyOf(t.original)
	if _, m := sizeOf(t.inputMap); m > 0 {
		var change mat.Dense
		change.Mul(t.inputMap, placement.K)
		loop.Sub(loop, &change)
		if placement.Norm = mat.Norm(placement.K, 2); m > 1 { // of one row that is the 2-norm
			values, err := singularValues(placement.K)
			if err != nil {
				return err
			}
			placement.Norm = values[0]
		}
	}
	if err := Finite("A − B·K", loop); err != nil {
		return &Refusal{Reason: "the gain that these poles need is beyond the range of numbers"}
	}
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			loop.Set(i, j, loop.At(i, j)/t.scale.states[i]*t.scale.states[j])
		}
	}
	system, err := Eigen(loop)
	if err != nil {
		return err
	}
	order := matchPoles(t.asked, system.Values)
	placement.Poles = make([]complex128, n)
	placement.PoleError, placement.PoleSensitivity = make([]float64, n), make([]float64, n)
	position := make([]int, n)
	for i, j := range order {
		placement.Poles[i], placement.PoleError[i], placement.PoleSensitivity[i] = system.Values[j], system.ErrorOf[j], system.Condition[j]
		position[j] = i
	}
	placement.Sensitivity = system.VectorCondition
	if len(system.Clusters) > 0 && t.repeatsTooOften() {
		placement.Sensitivity = math.Inf(1)
	}
	if reduced.x != nil && len(t.kept) == 0 {
		t.useDesigned(placement, reduced, mat.Norm(loop, 2))
		system.Clusters = nil
		for j, i := range position {
			system.ErrorOf[j], system.Condition[j] = placement.PoleError[i], placement.PoleSensitivity[i]
		}
	}
	t.compare(placement, system, position)
	return nil
}

// useDesigned takes sensitivities from the eigenvectors that the gain was made
// from: recomputed ones are arbitrary where a pole is repeated.
func (t *assignment) useDesigned(placement *Placement, reduced *reducedGain, norm float64) {
	placement.Sensitivity = reduced.condition
	var spelled []complex128
	var sensitivities []float64
	for p, w := range reduced.order {
		spelled, sensitivities = append(spelled, w.value), append(sensitivities, reduced.sensitivities[p])
		if w.pair() {
			spelled, sensitivities = append(spelled, cmplx.Conj(w.value)), append(sensitivities, reduced.sensitivities[p])
		}
	}
	for i, j := range matchPoles(t.asked, spelled) {
		placement.PoleSensitivity[i] = sensitivities[j]
		placement.PoleError[i] = math.Sqrt(float64(len(spelled))) * machineEpsilon * norm * sensitivities[j]
	}
}

// repeatsTooOften tells whether a wanted pole stands more often in the list
// than there are independent inputs, so that the loop must be defective.
func (t *assignment) repeatsTooOften() bool {
	for _, group := range poleGroups(t.wanted, 0) {
		if group.count > t.inputs {
			return true
		}
	}
	return false
}

// compare writes the residual and notes: how far the poles, or the means of
// clusters that rounding scatters, are from where they were wanted.
func (t *assignment) compare(placement *Placement, system *Eigensystem, position []int) {
	clustered := make([]bool, len(position))
	worst, largest := 0.0, 0.0
	for _, p := range t.asked {
		largest = math.Max(largest, cmplx.Abs(p))
	}
	for _, cluster := range system.Clusters {
		var shift complex128
		for _, j := range cluster {
			clustered[j] = true
			shift += system.Values[j] - t.asked[position[j]]
		}
		worst = math.Max(worst, cmplx.Abs(shift)/float64(len(cluster)))
		placement.Certificate.note("%d poles near %s scatter by about %.1g as repeated poles do; their polynomial is far better determined",
			len(cluster), modeText(clusterMean(system.Values, cluster)), system.ErrorOf[cluster[0]])
	}
	for j, i := range position {
		if !clustered[j] {
			worst = math.Max(worst, cmplx.Abs(system.Values[j]-t.asked[i]))
			placement.Certificate.Condition = math.Max(placement.Certificate.Condition, system.Condition[j])
		}
	}
	if largest == 0 {
		largest = blocksNorm(t.a)
	}
	if largest > 0 {
		placement.Certificate.Residual = worst / largest
	}
	uncertain := 0.0
	for j := range position {
		if !clustered[j] {
			uncertain = math.Max(uncertain, system.ErrorOf[j])
		}
	}
	placement.Certificate.Digits = digitsOfError(math.Max(worst, uncertain), largest)
	if worst > 1e-6*math.Max(largest, 1e-300) {
		placement.Certificate.note("the gain, rounded to binary64, gives poles up to %.2g away from the wanted ones", worst)
	}
}

// judgePoles lowers the digits by what the eigenvectors leave undetermined in
// K's entries.
func (t *assignment) judgePoles(placement *Placement) {
	if s := placement.Sensitivity; !math.IsInf(s, 0) && s > 1 {
		placement.Certificate.Digits = math.Min(placement.Certificate.Digits, DigitsOf(machineEpsilon*math.Sqrt(float64(t.form.n)), s))
	}
}

// matchPoles pairs each wanted pole with one of the values, closest pairs
// first; order[i] is the index of the value for wanted pole i.
func matchPoles(wanted, values []complex128) []int {
	type couple struct {
		i, j int
		gap  float64
	}
	couples := make([]couple, 0, len(wanted)*len(values))
	for i, p := range wanted {
		for j, v := range values {
			couples = append(couples, couple{i, j, cmplx.Abs(p - v)})
		}
	}
	slices.SortFunc(couples, func(a, b couple) int {
		return cmp.Or(cmp.Compare(a.gap, b.gap), cmp.Compare(a.i, b.i), cmp.Compare(a.j, b.j))
	})
	order := make([]int, len(wanted))
	for i := range order {
		order[i] = -1
	}
	taken := make([]bool, len(values))
	for _, c := range couples {
		if order[c.i] < 0 && !taken[c.j] {
			order[c.i], taken[c.j] = c.j, true
		}
	}
	return order
}

// poleGroup is a wanted pole with how often it stands in the list.
type poleGroup struct {
	pole  wantedPole
	count int
}

// poleGroups gathers poles that agree within a relative tolerance, those that
// repeat most first, otherwise in the order given.
func poleGroups(wanted []wantedPole, tolerance float64) []poleGroup {
	var groups []poleGroup
next:
	for _, w := range wanted {
		for g := range groups {
			if p := groups[g].pole; p.count() == w.count() && cmplx.Abs(p.value-w.value) <= tolerance*cmplx.Abs(w.value) {
				groups[g].count++
				continue next
			}
		}
		groups = append(groups, poleGroup{w, 1})
	}
	slices.SortStableFunc(groups, func(a, b poleGroup) int { return cmp.Compare(b.count, a.count) })
	return groups
}
