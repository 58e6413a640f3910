package numeric

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"
)

// Placement is a state feedback u = −K·x that puts the poles of A − B·K where
// they were wanted.
type Placement struct {
	K *mat.Dense // m×n
	// Poles are those that K really gives, recomputed from A − B·K, in the
	// order of the wanted ones that they match; PoleError estimates the absolute
	// error of each recomputed pole.
	Poles     []complex128
	PoleError []float64
	// Sensitivity is κ₂ of the matrix of unit eigenvectors of A − B·K, and
	// PoleSensitivity how far each pole moves, at most and to first order, for a change of
	// A − B·K of size 1 (1/|yᴴx|). +Inf where the loop is defective, as it must be
	// when a pole is repeated more often than there are independent inputs.
	Sensitivity     float64
	PoleSensitivity []float64
	Norm            float64 // ‖K‖₂
	// Kept are the modes no input moves; they were among the wanted poles.
	Kept        []complex128
	Certificate Certificate
}

// A wanted pole counts as one that no input moves when it is within
// keptRelative·|mode| + keptAbsolute·(largest |eigenvalue| of A) of it: typed
// decimals of four digits do not pass, rounding of a double mode does.
const (
	keptRelative = 1e-6
	keptAbsolute = 1e-8
)

// balancedSpread is the ratio of state scales from which assignment works in
// balanced coordinates; below it the declared coordinates serve as well, and κ
// keeps its meaning in them.
const balancedSpread = 1024

// AssignOneInput computes the gain of one input for floating data: a n×n,
// b n×1, n poles closed under conjugation, repeated ones allowed. The pair is
// brought to Hessenberg form, and each pole is split off by a sweep of
// rotations (G. S. Miminis, C. C. Paige, Int. J. Control 35, 1982); no powers
// of A are formed. The gain is unique, so Certificate.Digits speaks of its
// entries, by a statistical condition estimate (C. S. Kenney, A. J. Laub, SIAM
// J. Sci. Comput. 15, 1994).
//
// A mode the input does not move stays where it is if it is among the wanted
// poles; if not, the error is a *Refusal that names it. K is then the
// smallest of the gains that do (in balanced coordinates, where those serve).
func AssignOneInput(a, b *mat.Dense, poles []complex128) (*Placement, error) {
	if _, m := sizeOf(b); m != 1 {
		return nil, fmt.Errorf("%s has %d columns; this method is for one input", "B", m)
	}
	task, err := newAssignment(a, b, poles)
	if err != nil {
		return nil, err
	}
	reduced, err := task.oneInput()
	if err != nil {
		return nil, err
	}
	placement, err := task.finish(reduced)
	if err != nil {
		return nil, err
	}
	if err := task.judgeOneInput(placement, reduced); err != nil {
		return nil, err
	}
	return placement, nil
}

// AssignRobust computes a gain for any number of inputs whose loop is as
// insensitive as coordinate ascent on |det X| makes it, X the matrix of unit
// eigenvectors: real poles by projection (J. Kautsky, N. K. Nichols, P. Van
// Dooren, Int. J. Control 41, 1985), complex pairs by the closed-form maximiser of
// rank two (A. L. Tits, Y. Yang, IEEE Trans. Autom. Control 41, 1996). A greedy start and
// seeded random ones are tried and the smallest κ₂(X) is kept; the same seed
// gives the same gain. A pole repeated more often than there are independent
// inputs, or a set of poles that no diagonalizable loop can have, is assigned by splitting
// off invariant subspaces in as few layers as possible.
//
// a is n×n, b n×m with any m: dependent and zero columns are allowed, and as
// many independent inputs as states leave full freedom. Modes no input moves
// are treated as in AssignOneInput. Certificate.Digits is the smaller of the
// digits to which the poles hold (relative to the largest) and those to which
// K's entries are determined by the chosen eigenvectors.
func AssignRobust(ctx context.Context, a, b *mat.Dense, poles []complex128, seed int64) (*Placement, error) {
	task, err := newAssignment(a, b, poles)
	if err != nil {
		return nil, err
	}
	var reduced *reducedGain
	switch task.inputs {
	case 0:
		reduced = &reducedGain{k: make([]float64, 0), method: "nothing to assign"}
	case 1:
		reduced, err = task.oneInput()
	default:
		reduced, err = task.severalInputs(ctx, seed)
	}
	if err != nil {
		return nil, err
	}
	placement, err := task.finish(reduced)
	if err != nil {
		return nil, err
	}
	if _, m := sizeOf(b); m == 1 && task.inputs == 1 {
		return placement, task.judgeOneInput(placement, reduced)
	}
	task.judgePoles(placement)
	return placement, nil
}

// wantedPole is a real pole or, with positive imaginary part, a complex pair.
type wantedPole struct{ value complex128 }

func (w wantedPole) pair() bool { return imag(w.value) > 0 }

func (w wantedPole) count() int {
	if w.pair() {
		return 2
	}
	return 1
}

// assignment is the question in staircase coordinates: only the reached part
// (size n of the staircase) is left, its first inputs rows are what B acts on.
type assignment struct {
	original   *mat.Dense // A as given
	inputMap   *mat.Dense // B as given
	form       *staircase
	scale      systemScaling
	inputs     int       // independent inputs
	reached    int       // states that are moved
	a          []float64 // reached × reached
	wanted     []wantedPole
	kept       []complex128
	asked      []complex128 // all wanted poles in the caller's order
	plain      bool         // declared coordinates were used
	largestOld float64      // largest |eigenvalue| of A
}

// newAssignment checks everything at the door, finds the reached part and
// sorts out the kept modes.
func newAssignment(a, b *mat.Dense, poles []complex128) (*assignment, error) {
	if err := checkPair(a, b); err != nil {
		return nil, err
	}
	n, _ := sizeOf(a)
	_, m := sizeOf(b)
	if n == 0 {
		return nil, fmt.Errorf("there is no state to assign a pole to")
	}
	if len(poles) != n {
		return nil, fmt.Errorf("%d poles are wanted of a system with %d states", len(poles), n)
	}
	wanted, err := pairedPoles(poles)
	if err != nil {
		return nil, err
	}
	s := stateSpace{n: n, m: m, a: flatCopy(a), b: flatCopy(b)}
	task := &assignment{original: a, inputMap: b, asked: poles}
	task.scale = s.balanced()
	if task.scale.spread() < balancedSpread {
		s.a, s.b = flatCopy(a), flatCopy(b)
		for j, f := range task.scale.inputs {
			scaleColumn(s.b, n, m, j, f)
		}
		task.scale.states, task.plain = unitScales(n), true
	}
	task.form = newStaircase(n, m, s.a, s.b, 0, nil, staircaseThreshold(n, m, blocksNorm(s.a, s.b)))
	if err := task.form.reduce(); err != nil {
		return nil, err
	}
	task.reached = task.form.rank
	if len(task.form.blocks) > 0 {
		task.inputs = task.form.blocks[0]
	}
	task.a = make([]float64, 0, task.reached*task.reached)
	for i := 0; i < task.reached; i++ {
		task.a = append(task.a, task.form.a[i*n:i*n+task.reached]...)
	}
	return task, task.keepUnmoved(wanted)
}

// pairedPoles checks that the poles are finite and closed under conjugation.
func pairedPoles(poles []complex128) ([]wantedPole, error) {
	var wanted []wantedPole
	var upper, lower []complex128
	for i, p := range poles {
		switch {
		case cmplx.IsNaN(p) || cmplx.IsInf(p):
			return nil, fmt.Errorf("wanted pole %d is not a finite number", i+1)
		case imag(p) == 0:
			wanted = append(wanted, wantedPole{complex(real(p), 0)})
		case imag(p) > 0:
			upper = append(upper, p)
		default:
			lower = append(lower, p)
		}
	}
	var lonely []complex128
	for _, p := range upper {
		best, at := 1e-10*cmplx.Abs(p), -1
		for j, q := range lower {
			if gap := cmplx.Abs(cmplx.Conj(q) - p); gap <= best {
				best, at = gap, j
			}
		}
		if at < 0 {
			lonely = append(lonely, p)
			continue
		}
		wanted = append(wanted, wantedPole{p})
		lower = append(lower[:at:at], lower[at+1:]...)
	}
	if lonely = append(lonely, lower...); len(lonely) > 0 {
		return nil, &Refusal{Reason: "a real gain gives complex poles in conjugate pairs only; without its partner stands", Modes: lonely}
	}
	return wanted, nil
}

// keepUnmoved takes the modes no input moves out of the wanted poles.
func (t *assignment) keepUnmoved(wanted []wantedPole) error {
	t.wanted = wanted
	n := t.form.n
	if t.reached == n {
		return nil
	}
	old, err := Eigenvalues(t.original)
	if err != nil {
		return err
	}
	for _, v := range old {
		t.largestOld = math.Max(t.largestOld, cmplx.Abs(v))
	}
	part := mat.NewDense(n-t.reached, n-t.reached, nil)
	for i := t.reached; i < n; i++ {
		part.SetRow(i-t.reached, t.form.a[i*n+t.reached:i*n+n])
	}
	system, err := Eigen(part)
	if err != nil {
		return err
	}
	var missed []complex128
	for i, mode := range system.Values {
		t.kept = append(t.kept, mode)
		if imag(mode) < 0 {
			continue
		}
		tolerance := keptRelative*cmplx.Abs(mode) + keptAbsolute*t.largestOld + math.Min(2*system.ErrorOf[i], 1e-4*t.largestOld)
		if !t.takeOut(mode, tolerance) {
			missed = append(missed, mode)
			if imag(mode) > 0 {
				missed = append(missed, cmplx.Conj(mode))
			}
		}
	}
	if len(missed) > 0 {
		return &Refusal{Reason: "no input moves these modes, and they are not among the wanted poles", Modes: missed}
	}
	return nil
}

// takeOut removes the wanted pole closest to mode when it is close enough. Two
// coinciding real poles may stand for a pair that rounding made complex, and
// the other way round.
func (t *assignment) takeOut(mode complex128, tolerance float64) bool {
	need := wantedPole{mode}.count()
	best, at := tolerance, -1
	for i, w := range t.wanted {
		if gap := cmplx.Abs(w.value - mode); w.count() == need && gap <= best {
			best, at = gap, i
		}
	}
	if at >= 0 {
		t.wanted = append(t.wanted[:at:at], t.wanted[at+1:]...)
		return true
	}
	if need == 2 && imag(mode) <= tolerance {
		first := complex(real(mode), 0)
		before := append([]wantedPole(nil), t.wanted...)
		taken := 0
		for taken < 2 && t.takeOut(first, 2*tolerance) {
			taken++
		}
		if taken == 2 {
			return true
		}
		t.wanted = before
	}
	return false
}

// list spells the wanted poles out, pairs as two.
func (t *assignment) list() []complex128 {
	out := make([]complex128, 0, t.reached)
	for _, w := range t.wanted {
		out = append(out, w.value)
		if w.pair() {
			out = append(out, cmplx.Conj(w.value))
		}
	}
	return out
}
