package eval

import (
	"math/big"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

// most entries whose influence on the poles is worked out one by one
const mostInfluences = 400

// The intervals' effect is taken to first order; a hundredth more covers the products of
// two half units.
var secondOrder = big.NewRat(101, 100)

// freeGain judges a gain that the poles do not fix: by the characteristic polynomial that
// the printed numbers give, each coefficient with the interval that their rounding leaves.
func (c *claimComparison) freeGain(g *value.Gain, numbers [][]printedNumber, l *printedLoop) *diag.Error {
	trial := &claimComparison{task: c.task, rows: c.rows, columns: c.columns}
	if err := trial.entriesOf(g, numbers); err != nil {
		return err
	}
	if trial.worst == agrees {
		return nil // the very gain that was computed
	}
	f, err := c.freeLoop(g, numbers, l)
	if err != nil {
		return err
	}
	if f == nil {
		c.entries, c.units, c.worst = trial.entries, trial.units, undecided
		for i := range c.entries {
			c.entries[i].Cannot = "several gains give the same poles"
		}
		return nil
	}
	c.notes = append(c.notes, "several gains give the same poles, so that the printed one is judged by its poles")
	if f.fits(nil, ratZero) {
		f.eachEntry(func(i, j int, q exact.Polynomial) {
			if _, off := trial.find(i, j); off && q.IsZero() {
				c.entries = append(c.entries, c.freeEntry(g, numbers, i, j, "the poles do not depend on it"))
			}
		})
		return nil
	}
	c.repairs(g, numbers, f, trial)
	return nil
}

// repairs looks for single entries whose change alone would give the wanted poles.
func (c *claimComparison) repairs(g *value.Gain, numbers [][]printedNumber, f *freeLoop, trial *claimComparison) {
	found := 0
	f.eachEntry(func(i, j int, q exact.Polynomial) {
		change, ok := f.repair(q)
		if !ok {
			return
		}
		found++
		n := numbers[i][j]
		right := new(big.Rat).Add(n.value, change)
		judged := printedNumber{text: n.text, value: n.value, half: n.half, last: n.last}
		_, units := judged.judge(value.Rat(right))
		entry := c.freeEntry(g, numbers, i, j, "")
		entry.Computed = value.Rat(right)
		c.record(disagrees, units, entry)
	})
	switch {
	case found == 1:
		c.notes = append(c.notes, "with that entry alone changed to the value shown, the printed gain gives the wanted poles")
	case found > 1:
		c.notes = append(c.notes, "any one of these entries, changed alone to the value shown, would give the wanted poles: which one is wrong cannot be told")
	default:
		c.worst, c.units = disagrees, trial.units
		for _, e := range trial.entries {
			e.Cannot = "several gains give the same poles: which entries are wrong cannot be told"
			c.entries = append(c.entries, e)
		}
	}
}

func (c *claimComparison) freeEntry(g *value.Gain, numbers [][]printedNumber, i, j int, cannot string) ClaimEntry {
	at := []int{i + 1, j + 1}
	return ClaimEntry{At: at, Name: c.nameOf(at), Printed: numbers[i][j].text, Computed: g.Values.At(i, j), Cannot: cannot}
}

func (c *claimComparison) find(i, j int) (ClaimEntry, bool) {
	for _, e := range c.entries {
		if len(e.At) == 2 && e.At[0] == i+1 && e.At[1] == j+1 {
			return e, true
		}
	}
	return ClaimEntry{}, false
}

// freeLoop is a printed loop with what its entries do to the characteristic polynomial.
type freeLoop struct {
	deviation exact.Polynomial     // printed minus wanted
	influence [][]exact.Polynomial // of one more in each entry
	tolerance []*big.Rat           // by power: what rounding of the printed numbers leaves
}

func (c *claimComparison) freeLoop(g *value.Gain, numbers [][]printedNumber, l *printedLoop) (*freeLoop, *diag.Error) {
	if len(numbers)*len(numbers[0]) > mostInfluences {
		return nil, nil
	}
	wanted, ok := polynomialOfPoles(g.Wanted)
	if !ok {
		if wanted, ok = polynomialOfPoles(g.Poles); !ok {
			return nil, nil
		}
	}
	base, err := l.polynomial(l.k)
	if err != nil || wanted.Degree() != base.Degree() {
		return nil, nil
	}
	f := &freeLoop{deviation: base.Sub(wanted), influence: make([][]exact.Polynomial, len(numbers))}
	for power := range base.Degree() {
		// Wanted poles that are roots are known to binary64 only.
		slack := new(big.Rat).Abs(wanted.Coefficient(power))
		f.tolerance = append(f.tolerance, slack.Mul(slack, big.NewRat(1, 1e12)))
	}
	for i, row := range numbers {
		for j, n := range row {
			if err := c.task.step(); err != nil {
				return nil, err
			}
			q, err := l.influence(i, j, base)
			if err != nil {
				return nil, nil
			}
			f.influence[i] = append(f.influence[i], q)
			for power := range f.tolerance {
				effect := new(big.Rat).Mul(q.Coefficient(power), n.half)
				f.tolerance[power].Add(f.tolerance[power], effect.Abs(effect))
			}
		}
	}
	return f, nil
}

func (f *freeLoop) eachEntry(visit func(i, j int, q exact.Polynomial)) {
	for i, row := range f.influence {
		for j, q := range row {
			visit(i, j, q)
		}
	}
}

// fits tells whether the polynomial, with one entry changed, is the wanted one within the tolerance.
func (f *freeLoop) fits(q *exact.Polynomial, change *big.Rat) bool {
	d := f.deviation
	if q != nil {
		d = d.Add(q.Scale(change))
	}
	for power, bound := range f.tolerance {
		size := new(big.Rat).Abs(d.Coefficient(power))
		if size.Cmp(new(big.Rat).Mul(bound, secondOrder)) > 0 {
			return false
		}
	}
	return true
}

// repair gives the change of one entry that undoes the deviation, if one does.
func (f *freeLoop) repair(q exact.Polynomial) (*big.Rat, bool) {
	if q.IsZero() {
		return nil, false
	}
	// Least squares, each coefficient in units of its tolerance.
	num, den := new(big.Rat), new(big.Rat)
	for power, bound := range f.tolerance {
		if bound.Sign() == 0 || q.Coefficient(power).Sign() == 0 {
			continue
		}
		weight := new(big.Rat).Inv(new(big.Rat).Mul(bound, bound))
		x := new(big.Rat).Mul(q.Coefficient(power), weight)
		num.Sub(num, new(big.Rat).Mul(x, f.deviation.Coefficient(power)))
		den.Add(den, new(big.Rat).Mul(x, q.Coefficient(power)))
	}
	if den.Sign() == 0 {
		return nil, false
	}
	change := num.Quo(num, den)
	return change, f.fits(&q, change)
}

// polynomialOfPoles gives the monic polynomial with the given roots; pairs that keep
// their real quadratic are used through it.
func polynomialOfPoles(poles []value.Value) (exact.Polynomial, bool) {
	product := exact.Constant(ratOne)
	for i := 0; i < len(poles); i++ {
		switch p := poles[i].(type) {
		case value.Number:
			x, _, ok := enclosed(p)
			if !ok {
				return product, false
			}
			product = product.Mul(exact.PolynomialWithRoots(x))
		case value.Complex:
			partner := partnerOf(poles, i)
			if partner < 0 {
				return product, false
			}
			poles = append(append([]value.Value(nil), poles[:partner]...), poles[partner+1:]...)
			quadratic, ok := quadraticOf(p)
			if !ok {
				return product, false
			}
			product = product.Mul(quadratic)
		default:
			return product, false
		}
	}
	return product, len(poles) > 0
}

// partnerOf finds the conjugate of the i-th pole further on: the nearest one.
func partnerOf(poles []value.Value, i int) int {
	z := poles[i].(value.Complex).Complex128()
	best, distance := -1, 0.0
	for j := i + 1; j < len(poles); j++ {
		w, ok := poles[j].(value.Complex)
		if !ok {
			continue
		}
		d := w.Complex128() - complex(real(z), -imag(z))
		size := real(d)*real(d) + imag(d)*imag(d)
		if best < 0 || size < distance {
			best, distance = j, size
		}
	}
	return best
}

func quadraticOf(z value.Complex) (exact.Polynomial, bool) {
	if z.Quadratic != nil && z.Quadratic.Exact != nil {
		return *z.Quadratic.Exact, true
	}
	re, im := z.RealPart(), z.ImaginaryPart()
	x, _, ok := enclosed(re)
	y, _, ok2 := enclosed(im)
	if !ok || !ok2 {
		return exact.Polynomial{}, false
	}
	norm := new(big.Rat).Add(new(big.Rat).Mul(x, x), new(big.Rat).Mul(y, y))
	return exact.NewPolynomial(ratOne, new(big.Rat).Mul(big.NewRat(-2, 1), x), norm), true
}
