package frequency

import (
	"fmt"
	"math"
	"math/big"
	"math/cmplx"
	"sort"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

var marginBuiltins = []*value.Builtin{
	{
		Name: "margins", Family: "frequency",
		Params:  []value.Param{{Name: "loop", Shape: value.ASystem, Doc: "the loop L broken at one place: closed as 1 + L, negative feedback; as many inputs as outputs"}},
		Result:  "report, a row a crossing",
		Summary: "how far gain, phase and delay may change before the loop is unstable",
		Doc: "Stability of the closed loop comes first (field stable, hidden modes included), then a row a crossing: where |L| = 1 (degrees left and the delay they allow) and where L is real and negative " +
			"(the factor by which the gain may change: above 1 an increase, below 1 a reduction). Frequencies are roots of exact polynomials. " +
			"Fields: stable, factor_up, factor_down, degrees, delay (the tightest; infinity when there is none), distance (the smallest distance of L to −1, of a stable loop), and table. " +
			"Sampled loops are taken up to the Nyquist frequency. With several channels: each with the others closed, then all together (field distance is then the smallest singular value of I + L, " +
			"which allows simultaneous factors from 1/(1 + d) to 1/(1 − d) and phases of ±2·asin(d/2)).",
		Examples: []value.Example{{Input: "margins(1/(s*(s + 1)*(s + 2))).factor_up", Output: "= 6"}},
		Errors:   []string{"numbers of inputs and outputs that differ", fmt.Sprintf("more than %d states", 2*system.ExactOrder), "a loop whose direct terms leave 1 + L zero at infinite frequency"},
		Source:   "Bode 1945; several channels: Lehtomaki, Sandell & Athans 1981, IEEE Trans. Automatic Control 26", SeeAlso: []string{"return_ratio", "sweep", "largest_gain"},
		Func: margins,
	},
}

// crossing is one row: a frequency where |L| = 1 (degrees and delay) or where L < 0 (factor).
type crossing struct {
	frequency value.Number
	unit      bool
	factor    value.Number
	degrees   value.Number
	delay     value.Number
	channel   string
}

// marginSet is what one channel says.
type marginSet struct {
	rows           []crossing
	up, down       *value.Number
	degrees, delay value.Number
}

func margins(c *value.Call) (value.Value, error) {
	p := c.Plant("loop")
	n, m := system.PlantSize(p)
	outs, _ := p.C.Dims()
	if m != outs || m == 0 {
		return nil, value.Errf(diag.Shape, "loop", "the loop has %d inputs and %d outputs; to be closed it needs as many of each", m, outs)
	}
	if n > 2*system.ExactOrder {
		return nil, value.Errf(diag.Limit, "loop", "the loop has %d states; margins are worked up to %d", n, 2*system.ExactOrder)
	}
	loop, err := closedAll(p)
	if err != nil {
		return nil, err
	}
	poles, err := system.Eigenvalues(loop.A)
	if err != nil {
		return nil, err
	}
	stable := true
	for _, r := range poles {
		stable = stable && decays(r, p.Every != nil)
	}
	r := &value.Report{Holds: &stable, Title: "the closed loop is stable"}
	if !stable {
		r.Title = "the closed loop is NOT stable"
		r.Notes = append(r.Notes, "the crossings of an unstable loop are no margins: they tell which change would have to happen first")
	}
	all := &marginSet{degrees: none, delay: none}
	for i := range m {
		channel, name := p, ""
		if m > 1 {
			if channel, err = othersClosed(p, i); err != nil {
				return nil, err
			}
			name = p.Inputs[i].Name
		}
		set, err := channelMargins(channel, name)
		if err != nil {
			return nil, err
		}
		all.take(set)
	}
	all.report(r, m > 1)
	distance := value.Value(value.Text("none: the closed loop is not stable"))
	if stable {
		if distance, err = distanceToMinusOne(c, loop); err != nil {
			return nil, err
		}
	}
	r.Fields = append([]value.Named{{Name: "stable", Value: value.Boolean(stable)}}, r.Fields...)
	r.Fields = append(r.Fields, value.Named{Name: "distance", Value: distance})
	return r, nil
}

// decays tells whether a closed-loop pole certainly decays.
func decays(r system.Root, sampled bool) bool {
	if sampled {
		return cmplx.Abs(r.Value) < 1-r.Err
	}
	return real(r.Value) < -r.Err
}

// closedAll is the sensitivity (I + L)⁻¹: the loop u = v − y from v to u.
func closedAll(p *value.Plant) (*value.Plant, error) {
	_, m := system.PlantSize(p)
	var ch system.Chain
	e, err := system.Inverse(ch.Add(system.Identity(m), p.D))
	if err != nil {
		return nil, value.Errf(diag.Numerical, "loop", "1 + L vanishes at infinite frequency: the closed loop has no solution")
	}
	back := ch.Neg(ch.Mul(e, p.C))
	q := &value.Plant{Every: p.Every, A: ch.Add(p.A, ch.Mul(p.B, back)), B: ch.Mul(p.B, e), C: back, D: e,
		States: p.States, Inputs: p.Inputs, Outputs: p.Inputs}
	return q, ch.Err
}

// othersClosed is the loop at channel i with all other channels closed.
func othersClosed(p *value.Plant, i int) (*value.Plant, error) {
	_, m := system.PlantSize(p)
	var others []int
	for j := range m {
		if j != i {
			others = append(others, j)
		}
	}
	var ch system.Chain
	b1, b2 := system.Columns(p.B, i), system.Columns(p.B, others...)
	c1, c2 := system.RowsOf(p.C, i), system.RowsOf(p.C, others...)
	d := func(rows, cols []int) *value.Matrix { return system.Columns(system.RowsOf(p.D, rows...), cols...) }
	one := []int{i}
	d11, d12, d21, d22 := d(one, one), d(one, others), d(others, one), d(others, others)
	// u2 = −y2, y2 = C2·x + D21·u1 + D22·u2
	e, err := system.Inverse(ch.Add(system.Identity(m-1), d22))
	if err != nil {
		return nil, value.Errf(diag.Numerical, "loop", "1 + L vanishes at infinite frequency for the channels besides %s", p.Inputs[i].Name)
	}
	ux, uu := ch.Neg(ch.Mul(e, c2)), ch.Neg(ch.Mul(e, d21))
	q := &value.Plant{Every: p.Every, States: p.States, Inputs: p.Inputs[i : i+1], Outputs: p.Outputs[i : i+1]}
	q.A, q.B = ch.Add(p.A, ch.Mul(b2, ux)), ch.Add(b1, ch.Mul(b2, uu))
	q.C, q.D = ch.Add(c1, ch.Mul(d12, ux)), ch.Add(d11, ch.Mul(d12, uu))
	return q, ch.Err
}

// ratioOf gives numerator and denominator of a single channel over the rationals, binary64 numbers as what they are.
func ratioOf(p *value.Plant) (exact.Rational, error) {
	var parts [4]*exact.Matrix
	for k, m := range []*value.Matrix{p.A, p.B, p.C, p.D} {
		x, err := system.Rational(m)
		if err != nil {
			return exact.Rational{}, err
		}
		parts[k] = x
	}
	g, err := exact.Transfer(parts[0], parts[1], parts[2], parts[3])
	if err != nil {
		return exact.Rational{}, diag.New(diag.Limit, "%v", err).For("loop")
	}
	return g[0][0], nil
}

// channelMargins finds all crossings of one loop.
func channelMargins(p *value.Plant, name string) (*marginSet, error) {
	g, err := ratioOf(p)
	if err != nil {
		return nil, err
	}
	period := periodOf(p)
	num, den := g.Num, g.Den
	if period > 0 {
		num, den = toHalfPlane(g.Num, g.Den)
	}
	set := &marginSet{degrees: none, delay: none}
	unit, negative := crossingPolynomials(num, den)
	for _, q := range []struct {
		p    exact.Polynomial
		unit bool
	}{{unit, true}, {negative, false}} {
		if q.p.Degree() < 1 {
			continue
		}
		roots, err := system.RootsOf(q.p)
		if err != nil {
			return nil, err
		}
		for i, r := range roots {
			if imag(r.Value) != 0 || real(r.Value) <= 0 || i > 0 && roots[i-1].Value == r.Value {
				continue
			}
			set.add(g, period, math.Sqrt(real(r.Value)), r, q.unit, name)
		}
	}
	set.ends(g, period, name)
	sort.SliceStable(set.rows, func(i, j int) bool {
		return set.rows[i].frequency.Float64() < set.rows[j].frequency.Float64()
	})
	return set, nil
}

// toHalfPlane substitutes z = (1 + w)/(1 − w), which takes the unit circle to the imaginary axis.
func toHalfPlane(num, den exact.Polynomial) (n, d exact.Polynomial) {
	degree := max(num.Degree(), den.Degree())
	one := big.NewRat(1, 1)
	plus, minus := exact.NewPolynomial(one, one), exact.NewPolynomial(big.NewRat(-1, 1), one)
	substitute := func(p exact.Polynomial) exact.Polynomial {
		sum := exact.Polynomial{}
		for k := 0; k <= p.Degree(); k++ {
			term := exact.Constant(p.Coefficient(k))
			for range k {
				term = term.Mul(plus)
			}
			for range degree - k {
				term = term.Mul(minus)
			}
			sum = sum.Add(term)
		}
		return sum
	}
	return substitute(num), substitute(den)
}

// crossingPolynomials gives, as polynomials in x = ω², |N(iω)|² − |D(iω)|² and Im(N(iω)·D(−iω))/ω.
func crossingPolynomials(num, den exact.Polynomial) (unit, negative exact.Polynomial) {
	nr, ni := onAxis(num)
	dr, di := onAxis(den)
	x := exact.NewPolynomial(big.NewRat(1, 1), new(big.Rat))
	// N = nr + iω·ni, D = dr + iω·di with nr, ni, dr, di polynomials in x
	unit = nr.Mul(nr).Add(x.Mul(ni.Mul(ni))).Sub(dr.Mul(dr)).Sub(x.Mul(di.Mul(di)))
	negative = ni.Mul(dr).Sub(nr.Mul(di))
	return unit, negative
}

// onAxis splits p(iω) = a(x) + iω·b(x), x = ω².
func onAxis(p exact.Polynomial) (a, b exact.Polynomial) {
	var even, odd []*big.Rat
	for k := 0; k <= p.Degree(); k++ {
		c := new(big.Rat).Set(p.Coefficient(k))
		if k%4 >= 2 {
			c.Neg(c)
		}
		if k%2 == 0 {
			even = append([]*big.Rat{c}, even...)
		} else {
			odd = append([]*big.Rat{c}, odd...)
		}
	}
	return exact.NewPolynomial(even...), exact.NewPolynomial(odd...)
}

// add evaluates a crossing at the axis coordinate v (ω, or tan(ωT/2) when sampled) and keeps it if it is one.
func (s *marginSet) add(g exact.Rational, period, v float64, root system.Root, unit bool, name string) {
	relative := root.Err/real(root.Value)/2 + 0x1p-52
	w := v
	if period > 0 {
		w = 2 * math.Atan(v) / period
	}
	l := evaluate(g, v, period)
	frequency := value.FloatErr(w, w*relative)
	if !unit && real(l) >= 0 {
		return
	}
	// how much faster than ω the loop changes there, relative to its size
	const step = 1e-6
	slope := cmplx.Abs(evaluate(g, v*(1+step), period)-l) / cmplx.Abs(l) / step
	if unit {
		s.unitCrossing(frequency, l, 2*slope*relative, name)
		return
	}
	factor := value.FloatErr(1/cmplx.Abs(l), (8+2*slope)*relative/cmplx.Abs(l))
	if x := root.Re; period == 0 && x != nil { // ω² is rational: L is real and rational there
		if f, ok := exactFactor(g, x.Exact); ok {
			factor = f
		}
	}
	s.rows = append(s.rows, crossing{frequency: frequency, factor: factor, channel: name})
}

// exactFactor is −1/L at ω² = x, where L is real.
func exactFactor(g exact.Rational, x *big.Rat) (value.Number, bool) {
	nr, ni := onAxis(g.Num)
	dr, di := onAxis(g.Den)
	n, d := nr.Eval(x), dr.Eval(x)
	if d.Sign() == 0 { // both parts that remain are the imaginary ones
		n, d = ni.Eval(x), di.Eval(x)
	}
	if n.Sign() == 0 || d.Sign() == 0 {
		return value.Number{}, false
	}
	f := new(big.Rat).Quo(d, n)
	return value.Rat(f.Neg(f)), f.Sign() > 0
}

// unitCrossing keeps a crossing |L| = 1; turn is the error of the phase of L in radians.
func (s *marginSet) unitCrossing(frequency value.Number, l complex128, turn float64, name string) {
	degrees := 180 + cmplx.Phase(l)*180/math.Pi
	if degrees > 180 {
		degrees -= 360
	}
	left := degrees
	if left < 0 {
		left += 360
	}
	turn += 8 * 0x1p-52
	delay := none
	if w := frequency.Float64(); w > 0 {
		d := left * math.Pi / 180 / w
		delay = value.FloatErr(d, turn/w+d*frequency.Err/w)
	}
	s.rows = append(s.rows, crossing{frequency: frequency, unit: true, degrees: value.FloatErr(degrees, turn*180/math.Pi), delay: delay, channel: name})
}

// evaluate gives L at a point of the axis or circle, by exact arithmetic at the binary64 point of the axis.
func evaluate(g exact.Rational, v, period float64) complex128 {
	re, im := new(big.Rat), new(big.Rat).SetFloat64(v)
	num, den := g.Num, g.Den
	if period > 0 {
		num, den = toHalfPlane(num, den)
	}
	nr, ni := num.EvalComplex(re, im)
	dr, di := den.EvalComplex(re, im)
	return quotient(nr, ni, dr, di)
}

func quotient(nr, ni, dr, di *big.Rat) complex128 {
	size := new(big.Rat).Add(new(big.Rat).Mul(dr, dr), new(big.Rat).Mul(di, di))
	if size.Sign() == 0 {
		return cmplx.Inf()
	}
	re := new(big.Rat).Add(new(big.Rat).Mul(nr, dr), new(big.Rat).Mul(ni, di))
	im := new(big.Rat).Sub(new(big.Rat).Mul(ni, dr), new(big.Rat).Mul(nr, di))
	x, _ := re.Quo(re, size).Float64()
	y, _ := im.Quo(im, size).Float64()
	return complex(x, y)
}

// ends adds crossings exactly at ω = 0 and, of a sampled loop, at the Nyquist frequency, where L is real.
func (s *marginSet) ends(g exact.Rational, period float64, name string) {
	still, last := new(big.Rat), (*big.Rat)(nil)
	if period > 0 {
		still, last = big.NewRat(1, 1), big.NewRat(-1, 1)
	}
	s.end(g, still, value.Int(0), name)
	if last != nil {
		s.end(g, last, value.FloatErr(math.Pi/period, math.Pi/period*1e-15), name)
	}
}

func (s *marginSet) end(g exact.Rational, at *big.Rat, frequency value.Number, name string) {
	den := g.Den.Eval(at)
	if den.Sign() == 0 {
		return
	}
	l := new(big.Rat).Quo(g.Num.Eval(at), den)
	if l.Sign() == 0 {
		return
	}
	if new(big.Rat).Abs(l).Cmp(big.NewRat(1, 1)) == 0 {
		f, _ := l.Float64()
		s.unitCrossing(frequency, complex(f, 0), 0, name)
	}
	if l.Sign() < 0 {
		factor := new(big.Rat).Inv(l)
		s.rows = append(s.rows, crossing{frequency: frequency, factor: value.Rat(factor.Neg(factor)), channel: name})
	}
}

// take adds another channel's rows and keeps the tightest figures.
func (s *marginSet) take(o *marginSet) {
	s.rows = append(s.rows, o.rows...)
	for i := range o.rows {
		r := &o.rows[i]
		if r.unit {
			if math.Abs(r.degrees.F) < math.Abs(s.degrees.F) {
				s.degrees = r.degrees
			}
			if r.delay.F < s.delay.F {
				s.delay = r.delay
			}
			continue
		}
		f := r.factor.Float64()
		if f > 1 && (s.up == nil || f < s.up.Float64()) {
			s.up = &r.factor
		}
		if f < 1 && (s.down == nil || f > s.down.Float64()) {
			s.down = &r.factor
		}
	}
}

// none is the value of a margin that no crossing limits.
var none = value.Number{F: math.Inf(1)}

// inSeconds gives a time its unit; a time that nothing limits stays infinite.
func inSeconds(v value.Value) value.Value {
	if n, ok := v.(value.Number); ok {
		return value.Quantity{Magnitude: n, Unit: value.Second()}
	}
	return v
}

func (s *marginSet) report(r *value.Report, channels bool) {
	r.Columns = []string{"frequency [rad/s]", "kind", "factor", "degrees", "delay [s]"}
	if channels {
		r.Columns = append([]string{"channel"}, r.Columns...)
	}
	for _, x := range s.rows {
		var row []value.Value
		if channels {
			row = append(row, value.Text(x.channel))
		}
		if x.unit {
			row = append(row, x.frequency, value.Text("gain 1"), nil, x.degrees, x.delay)
		} else {
			row = append(row, x.frequency, value.Text("phase −180°"), x.factor, nil, nil)
		}
		r.Rows = append(r.Rows, row)
	}
	up, down := value.Value(none), value.Value(value.Int(0))
	if s.up != nil {
		up = *s.up
	}
	if s.down != nil {
		down = *s.down
	}
	r.Fields = []value.Named{{Name: "factor_up", Value: up}, {Name: "factor_down", Value: down},
		{Name: "degrees", Value: s.degrees}, {Name: "delay", Value: inSeconds(s.delay)}}
}

// distanceToMinusOne is 1/‖(I + L)⁻¹‖∞ of a stable loop.
func distanceToMinusOne(c *value.Call, sensitivity *value.Plant) (value.Value, error) {
	g, err := numeric.LargestGain(c.Context, sensitivity.A.Dense(), sensitivity.B.Dense(), sensitivity.C.Dense(), sensitivity.D.Dense(), periodOf(sensitivity))
	if err != nil {
		return nil, system.Refused(err, "loop")
	}
	if g.High == 0 {
		return none, nil
	}
	return value.FloatErr(2/(g.Low+g.High), (g.High-g.Low)/(g.Low*g.Low)+math.Pow(10, -g.Certificate.Digits)/g.Low), nil
}
