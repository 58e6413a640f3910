package gain

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

// rounding says where the gain rounded to binary64, or to the five digits usually shown, would miss the poles.
func (t *task) rounding(k *value.Matrix, poles []system.Root, e *numeric.Eigensystem) string {
	re, _ := k.Floats()
	r, n := k.Dims()
	for _, round := range []struct {
		digits int
		words  string
	}{{16, "rounded to binary64"}, {5, "rounded to 5 digits"}} {
		rounded := make([]float64, len(re))
		change := 0.0
		for i, x := range re {
			rounded[i] = toDigits(x, round.digits)
			change = math.Max(change, math.Abs(rounded[i]-x)+math.Abs(x)*0x1p-53)
		}
		if !t.mayShift(change, e) {
			continue
		}
		loop, err := t.loop(value.FloatMatrix(r, n, rounded, 0))
		if err != nil {
			return ""
		}
		lr, _ := loop.Floats()
		size, _ := loop.Dims()
		x, err := t.roundedLoop(rounded, r, n)
		if err != nil {
			x = value.FloatMatrix(size, size, lr, 0)
		}
		moved, err := system.Eigenvalues(x)
		if err != nil {
			return ""
		}
		// a floating gain is rounded already: what it gives is compared with what was wanted
		which, reference := "these", poles
		if t.wanted != nil && !k.IsExact() && round.digits == 16 {
			which, reference = "the wanted", system.RootsFromList(t.wanted)
		}
		if shift := largestShift(reference, moved); shift > spoiled {
			return fmt.Sprintf("%s the gain does not give %s poles: one moves by %.2g (relative to the larger of 1 and its size); it gives %s",
				round.words, which, shift, listWords(moved))
		}
	}
	return ""
}

// roundedLoop is the loop with the rounded gain, without further rounding.
func (t *task) roundedLoop(k []float64, r, n int) (*value.Matrix, error) {
	if states, _ := t.a.Dims(); states > system.ExactOrder {
		return nil, errors.New("too large")
	}
	x, err := exact.FromFloats(r, n, k)
	if err != nil {
		return nil, err
	}
	return t.exactLoop(x)
}

// mayShift tells, to first order with a wide margin, whether a change of the gain can move a pole by more than spoiled.
func (t *task) mayShift(change float64, e *numeric.Eigensystem) bool {
	norm := 0.0
	re, _ := t.b.Floats()
	for _, x := range re {
		norm = math.Hypot(norm, x)
	}
	n, _ := t.a.Dims()
	for i, v := range e.Values {
		if 10*e.Condition[i]*norm*change*math.Sqrt(float64(n)) > spoiled*math.Max(1, cmplx.Abs(v)) {
			return true
		}
	}
	return false
}

// largestShift matches two sets of poles greedily and gives the largest relative distance.
func largestShift(a, b []system.Root) float64 {
	used := make([]bool, len(b))
	worst := 0.0
	for _, p := range a {
		best, at := math.Inf(1), -1
		for j, q := range b {
			if d := cmplx.Abs(p.Value - q.Value); !used[j] && d < best {
				best, at = d, j
			}
		}
		if at >= 0 {
			used[at] = true
			worst = math.Max(worst, best/math.Max(1, cmplx.Abs(p.Value)))
		}
	}
	return worst
}
