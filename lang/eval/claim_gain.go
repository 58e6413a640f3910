package eval

import (
	"fmt"
	"math"
	"math/big"
	"math/cmplx"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

const (
	largestPrintedLoop = 40   // states up to which the printed loop's poles are found exactly
	farPole            = 0.01 // relative distance from which a pole counts as moved by rounding
	poleDigits         = 12
)

// gain judges a printed gain entry by entry, or, where several gains give the same
// poles, by the poles it gives.
func (c *claimComparison) gain(p printedList, g *value.Gain) *diag.Error {
	r, k := g.Values.Dims()
	c.rows, c.columns = signalNames(g.RowSignals, g.Values.Rows), signalNames(g.ColumnSignals, g.Values.Columns)
	rows, err := c.sized(p, r, k)
	if rows == nil {
		return err
	}
	numbers := make([][]printedNumber, r)
	for i, row := range rows {
		for _, entry := range row {
			n, ok := entry.(printedNumber)
			if !ok {
				return kindsDiffer(entry, g)
			}
			numbers[i] = append(numbers[i], n)
		}
	}
	loop := newPrintedLoop(g, numbers)
	if g.Free && loop != nil {
		if err := c.freeGain(g, numbers, loop); err != nil {
			return err
		}
	} else if err := c.entriesOf(g, numbers); err != nil {
		return err
	}
	if loop != nil {
		return c.printedPoles(g, loop)
	}
	return nil
}

// entriesOf judges each entry by its own digits.
func (c *claimComparison) entriesOf(g *value.Gain, numbers [][]printedNumber) *diag.Error {
	for i, row := range numbers {
		for j, n := range row {
			if err := c.number([]int{i + 1, j + 1}, n, g.Values.At(i, j)); err != nil {
				return err
			}
		}
	}
	return nil
}

func signalNames(signals []value.Signal, otherwise []string) []string {
	if len(signals) == 0 {
		return otherwise
	}
	out := make([]string, len(signals))
	for i, s := range signals {
		out[i] = s.Name
	}
	return out
}

// printedLoop is the loop closed with printed numbers: A − B·K, or A − L·C of an observer.
type printedLoop struct {
	a, b, c *exact.Matrix // the loop is a − b·k·c; b or c is the identity
	k       *exact.Matrix
}

// newPrintedLoop gives nil where the gain closes no loop or the plant is too large.
func newPrintedLoop(g *value.Gain, numbers [][]printedNumber) *printedLoop {
	if g.Plant == nil || g.Plant.A == nil {
		return nil
	}
	n, _ := g.Plant.A.Dims()
	if n == 0 || n > largestPrintedLoop {
		return nil
	}
	l := &printedLoop{a: rational(g.Plant.A)}
	switch g.Role {
	case "state feedback":
		l.b, l.c = rational(g.Plant.B), exact.Identity(n)
	case "observer":
		l.b, l.c = exact.Identity(n), rational(g.Plant.C)
	}
	if l.a == nil || l.b == nil || l.c == nil {
		return nil
	}
	_, inputs := l.b.Dims()
	outputs, _ := l.c.Dims()
	if len(numbers) != inputs || inputs == 0 || len(numbers[0]) != outputs {
		return nil
	}
	l.k = exact.NewMatrix(inputs, outputs)
	for i, row := range numbers {
		for j, p := range row {
			l.k.Set(i, j, p.value)
		}
	}
	return l
}

// rational gives a real matrix over the rationals; floating entries are taken as they stand.
func rational(m *value.Matrix) *exact.Matrix {
	if m == nil || m.IsComplex() {
		return nil
	}
	if m.IsExact() {
		return m.Exact()
	}
	r, c := m.Dims()
	re, _ := m.Floats()
	out, err := exact.FromFloats(r, c, re)
	if err != nil {
		return nil
	}
	return out
}

// polynomial gives the characteristic polynomial of the loop with the gain k.
func (l *printedLoop) polynomial(k *exact.Matrix) (exact.Polynomial, error) {
	bk, err := l.b.Mul(k)
	if err != nil {
		return exact.Polynomial{}, err
	}
	bkc, err := bk.Mul(l.c)
	if err != nil {
		return exact.Polynomial{}, err
	}
	closed, err := l.a.Sub(bkc)
	if err != nil {
		return exact.Polynomial{}, err
	}
	return closed.CharacteristicPolynomial(), nil
}

// influence gives what one more in entry (i, j) adds to the characteristic polynomial,
// which depends on each single entry linearly.
func (l *printedLoop) influence(i, j int, base exact.Polynomial) (exact.Polynomial, error) {
	moved := l.k.Clone()
	moved.Set(i, j, new(big.Rat).Add(l.k.At(i, j), ratOne))
	p, err := l.polynomial(moved)
	if err != nil {
		return p, err
	}
	return p.Sub(base), nil
}

// printedPoles adds the poles that the printed numbers give, and says when they are far
// from those wanted.
func (c *claimComparison) printedPoles(g *value.Gain, l *printedLoop) *diag.Error {
	if err := c.task.step(); err != nil {
		return err
	}
	poly, err := l.polynomial(l.k)
	if err != nil {
		return nil
	}
	roots, err := poly.Roots(poleDigits)
	if err != nil {
		c.notes = append(c.notes, "the poles that the printed numbers give could not be separated")
		return nil
	}
	var poles []complex128
	for _, r := range roots {
		for range r.Multiplicity {
			poles = append(poles, r.Value)
			c.poles = append(c.poles, rootValue(r))
		}
	}
	wanted := complexes(g.Wanted)
	if wanted == nil {
		wanted = complexes(g.Poles)
	}
	if len(wanted) != len(poles) {
		return nil
	}
	c.notePoles(poles, wanted, g.Plant.Every != nil)
	return nil
}

func (c *claimComparison) notePoles(poles, wanted []complex128, isSampled bool) {
	if !isStable(poles, isSampled) && isStable(wanted, isSampled) {
		c.notes = append(c.notes, "the loop with the printed numbers is unstable")
		return
	}
	if c.worst != agrees {
		return
	}
	worst, at, instead := farthest(poles, wanted)
	if worst > farPole {
		c.notes = append(c.notes, fmt.Sprintf("rounding explains the printed numbers, but the loop with them has a pole at %s where %s is wanted: more digits are needed",
			poleText(at), poleText(instead)))
	}
}

// farthest matches poles to wanted ones and gives the largest relative distance and where it is.
func farthest(poles, wanted []complex128) (worst float64, pole, want complex128) {
	largest := 0.0
	for _, w := range wanted {
		largest = math.Max(largest, cmplx.Abs(w))
	}
	cost := make([][]float64, len(poles))
	for i, p := range poles {
		cost[i] = make([]float64, len(wanted))
		for j, w := range wanted {
			cost[i][j] = cmplx.Abs(p - w)
		}
	}
	for i, j := range assignment(cost) {
		size := cmplx.Abs(wanted[j])
		if size == 0 {
			size = largest
		}
		if size == 0 {
			size = 1
		}
		if d := cost[i][j] / size; d > worst {
			worst, pole, want = d, poles[i], wanted[j]
		}
	}
	return worst, pole, want
}

func isStable(poles []complex128, isSampled bool) bool {
	for _, p := range poles {
		if isSampled && cmplx.Abs(p) >= 1 || !isSampled && real(p) >= 0 {
			return false
		}
	}
	return true
}

func complexes(values []value.Value) []complex128 {
	var out []complex128
	for _, v := range values {
		re, im, ok := parts(v)
		if !ok {
			return nil
		}
		out = append(out, complex(re.Float64(), im.Float64()))
	}
	return out
}

func poleText(p complex128) string {
	switch {
	case imag(p) == 0:
		return fmt.Sprintf("%.4g", real(p))
	case imag(p) < 0:
		return fmt.Sprintf("%.4g - %.4gi", real(p), -imag(p))
	}
	return fmt.Sprintf("%.4g + %.4gi", real(p), imag(p))
}

// rootValue turns an enclosed root into a number with its uncertainty.
func rootValue(r exact.Root) value.Value {
	if r.Exact {
		return value.MakeComplex(value.Rat(r.ExactRe), value.Rat(r.ExactIm))
	}
	err := r.Radius + cmplx.Abs(r.Value)*0x1p-53
	if imag(r.Value) == 0 {
		return value.FloatErr(real(r.Value), err)
	}
	return value.Complex{C: r.Value, Err: err}
}
