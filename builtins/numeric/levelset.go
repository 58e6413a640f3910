package numeric

import (
	"context"
	"errors"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// GainPeak is the largest gain of a stable plant over all frequencies, as a
// bracket: Low is attained at Frequency, High is a level that no frequency passes.
// Rounding is the estimated relative error of the gain there, with a margin: a
// bracket that is to hold must be wider by it at both ends.
type GainPeak struct {
	Low, High   float64
	Rounding    float64
	Frequency   float64 // rad/s; +Inf when the gain is approached at infinite frequency
	Certificate Certificate
}

// levelStep is the relative height above the best gain found at which the next
// level is tried; the bracket ends twice as wide.
const levelStep = 1e-10

// mostLevels bounds the iteration, which converges quadratically: more than ten
// levels are not seen in practice.
const mostLevels = 60

// LargestGain computes the H∞ norm of G(s) = C(sI − A)⁻¹B + D, the largest
// singular value over all frequencies, or over the unit circle when period, the
// sampling time in seconds, is positive (0 means continuous). A mode that does
// not decay is refused by name: the gain is then infinite or hides it. The
// context is looked at between levels.
//
// Level sets: a level γ is passed where the Hamiltonian matrix of γ has
// eigenvalues on the imaginary axis (S. Boyd, V. Balakrishnan, Syst. Control Lett.
// 15, 1990; N. A. Bruinsma, M. Steinbuch, ibid. 14, 1990). Rounding moves them off
// it, so all eigenvalues are taken as candidates and judged by the gain there.
func LargestGain(ctx context.Context, a, b, c, d *mat.Dense, period float64) (*GainPeak, error) {
	n, m, p, err := plantShapes(a, b, c, d)
	if err != nil {
		return nil, err
	}
	if period < 0 || period-period != 0 {
		return nil, errors.New("the sampling time must be 0 (continuous) or positive and finite")
	}
	through := mat.NewDense(p, m, nil)
	if rows, _ := sizeOf(d); rows > 0 {
		through.Copy(d)
	}
	if n == 0 {
		gain := largestSingularValue(through)
		return &GainPeak{Low: gain, High: gain, Certificate: Certificate{Method: "constant", Digits: mostDigits}}, nil
	}
	search, err := newGainSearch(a, b, c, through, period)
	if err != nil {
		return nil, err
	}
	if err := search.climb(ctx); err != nil {
		return nil, err
	}
	return search.result()
}

// largestSingularValue of a real matrix.
func largestSingularValue(m *mat.Dense) float64 {
	var svd mat.SVD
	if !svd.Factorize(m, mat.SVDNone) {
		return mat.Norm(m, 2)
	}
	return svd.Values(nil)[0]
}

// gainSearch holds a plant in the continuous frame: a sampled one is mapped by
// s = α(z − 1)/(z + 1), which changes no gain.
type gainSearch struct {
	a, b, c, d *mat.Dense
	poles      []complex128
	response   *FrequencyResponse
	period     float64
	alpha      float64
	value      *mat.CDense
	embedded   *mat.Dense
	svd        mat.SVD
	low, high  float64
	at         float64
	levels     int
}

func newGainSearch(a, b, c, d *mat.Dense, period float64) (*gainSearch, error) {
	w, err := Eigenvalues(a)
	if err != nil {
		return nil, err
	}
	if modes := unstableModes(w, mat.Norm(a, 2), period > 0); len(modes) > 0 {
		return nil, refuseUnstable("the largest gain is infinite", modes)
	}
	s := &gainSearch{a: a, b: b, c: c, d: d, poles: w, period: period}
	if s.response, err = NewFrequencyResponse(a, b, c, d); err != nil {
		return nil, err
	}
	p, m := d.Dims()
	s.value, s.embedded = mat.NewCDense(p, m, nil), mat.NewDense(2*p, 2*m, nil)
	if period > 0 {
		s.alpha = 2 / period
		s.a, s.b, s.c, s.d, _, err = BilinearInverse(a, b, c, d, period, 0)
		if err != nil {
			return nil, err
		}
		if s.poles, err = Eigenvalues(s.a); err != nil {
			return nil, err
		}
	}
	return s, nil
}

// point is where the response is taken for frequency w of the continuous frame.
func (s *gainSearch) point(w float64) complex128 {
	if s.period == 0 {
		return complex(0, w)
	}
	if math.IsInf(w, 1) {
		return -1 // the Nyquist frequency
	}
	// z = (α + iw)/(α − iw) = e^(iθ) with tan(θ/2) = w/α.
	theta := 2 * math.Atan(w/s.alpha)
	return complex(math.Cos(theta), math.Sin(theta))
}

// gain is the largest singular value at frequency w ≥ 0 of the continuous frame.
func (s *gainSearch) gain(w float64) float64 {
	if math.IsInf(w, 1) && s.period == 0 {
		return largestSingularValue(s.d)
	}
	if err := s.response.AtInto(s.value, s.point(w)); err != nil {
		return 0 // a pole to working precision: neighbours are tried as well
	}
	p, m := s.value.Dims()
	if p == 1 || m == 1 {
		length := 0.0
		for i := range p {
			for j := range m {
				v := s.value.At(i, j)
				length = math.Hypot(length, math.Hypot(real(v), imag(v)))
			}
		}
		return length
	}
	for i := range p {
		for j := range m {
			v := s.value.At(i, j)
			s.embedded.Set(i, j, real(v))
			s.embedded.Set(p+i, m+j, real(v))
			s.embedded.Set(i, m+j, -imag(v))
			s.embedded.Set(p+i, j, imag(v))
		}
	}
	if !s.svd.Factorize(s.embedded, mat.SVDNone) {
		return 0
	}
	return s.svd.Values(nil)[0]
}

// try keeps the gain at w if it is the best so far, and returns it.
func (s *gainSearch) try(w float64) float64 {
	g := s.gain(w)
	if g > s.low {
		s.low, s.at = g, w
	}
	return g
}

// climb raises low until no frequency passes low·(1 + 2·levelStep).
func (s *gainSearch) climb(ctx context.Context) error {
	s.try(math.Inf(1))
	s.try(0)
	for _, pole := range s.poles {
		s.try(math.Hypot(real(pole), imag(pole)))
		s.try(math.Abs(imag(pole)))
	}
	s.survey()
	if s.low == 0 {
		// A response that vanishes at more points than it has zeros is zero.
		for k := range 2*len(s.poles) + 3 {
			s.try(0.1 + 0.37*float64(k))
		}
		if s.low == 0 {
			return nil
		}
	}
	for s.levels = 1; s.levels <= mostLevels; s.levels++ {
		if err := ctx.Err(); err != nil {
			return err
		}
		level := s.low * (1 + 2*levelStep)
		candidates, err := s.crossings(level)
		if err != nil {
			return err
		}
		for i, w := range candidates {
			s.try(w)
			if i > 0 {
				s.try((w + candidates[i-1]) / 2)
				s.try(math.Sqrt(w * candidates[i-1]))
			}
		}
		s.ascend()
		if s.low <= level {
			s.high = level
			return nil
		}
	}
	return errors.New("the level sets of the gain did not settle")
}

// crossings lists, in rising order, the frequencies near which a singular value
// may equal the level: 0 and the imaginary parts of the eigenvalues of
// [[A + B·R⁻¹·Dᵀ·C, B·R⁻¹·Bᵀ], [−Cᵀ(I + D·R⁻¹·Dᵀ)·C, −(A + B·R⁻¹·Dᵀ·C)ᵀ]], R = γ²I − DᵀD, with B and C scaled by √γ.
func (s *gainSearch) crossings(level float64) ([]float64, error) {
	n, m := s.b.Dims()
	p, _ := s.c.Dims()
	// With everything divided by γ, R = I − (D/γ)ᵀ(D/γ).
	root := 1 / math.Sqrt(level)
	b, c, d := scaledCopy(root, s.b), scaledCopy(root, s.c), scaledCopy(1/level, s.d)
	r, w := mat.NewDense(m, m, nil), mat.NewDense(p, p, nil)
	r.Mul(d.T(), d)
	w.Mul(d, d.T())
	for i := range m {
		for j := range m {
			r.Set(i, j, -r.At(i, j))
		}
		r.Set(i, i, 1+r.At(i, i))
	}
	for i := range p {
		for j := range p {
			w.Set(i, j, -w.At(i, j))
		}
		w.Set(i, i, 1+w.At(i, i))
	}
	// R⁻¹Bᵀ, R⁻¹DᵀC, and I + D·R⁻¹·Dᵀ = (I − D·Dᵀ)⁻¹.
	inputs, first := solveSquare(r, transposedCopy(b), false)
	outputs, second := solveSquare(w, c, false)
	if first == 0 || second == 0 {
		return nil, errors.New("the level equals the gain at infinite frequency to the last digit")
	}
	var drive, weigh, direct, shift mat.Dense
	drive.Mul(b, inputs)
	weigh.Mul(c.T(), outputs)
	direct.Mul(inputs.T(), d.T())
	shift.Mul(&direct, c)
	shift.Add(&shift, s.a)
	hamiltonian := mat.NewDense(2*n, 2*n, nil)
	for i := range n {
		for j := range n {
			hamiltonian.Set(i, j, shift.At(i, j))
			hamiltonian.Set(i, n+j, drive.At(i, j))
			hamiltonian.Set(n+i, j, -weigh.At(i, j))
			hamiltonian.Set(n+i, n+j, -shift.At(j, i))
		}
	}
	eigenvalues, err := Eigenvalues(hamiltonian)
	if err != nil {
		return nil, err
	}
	frequencies := []float64{0}
	for _, lambda := range eigenvalues {
		if imag(lambda) > 0 {
			frequencies = append(frequencies, imag(lambda))
		}
	}
	slices.Sort(frequencies)
	return frequencies, nil
}

// ascend climbs from the best frequency by golden sections in ever narrower
// neighbourhoods, so that the next level starts at the top of a peak that the
// candidates only touched.
func (s *gainSearch) ascend() {
	if s.at == 0 || math.IsInf(s.at, 1) {
		return
	}
	for _, factor := range []float64{30, 3, 1.3, 1.03, 1.003, 1.0003} {
		s.golden(s.at/factor, s.at*factor, 12)
	}
}

// survey tries frequencies spread around and beyond the poles. Where the gain
// at infinite frequency is nearly the largest, the Hamiltonian of a level close
// to it is singular to working precision and its eigenvalues say little.
func (s *gainSearch) survey() {
	slowest, fastest := math.Inf(1), 0.0
	for _, pole := range s.poles {
		if size := math.Hypot(real(pole), imag(pole)); size > 0 {
			slowest, fastest = math.Min(slowest, size), math.Max(fastest, size)
		}
	}
	if fastest == 0 {
		return
	}
	const points = 64
	lo, hi := math.Log(slowest/30), math.Log(fastest*1000)
	for k := range points {
		s.try(math.Exp(lo + (hi-lo)*float64(k)/(points-1)))
	}
	if !math.IsInf(s.at, 1) {
		s.ascend()
	}
}

// golden narrows [lo, hi] towards a maximum of the gain and returns its middle.
func (s *gainSearch) golden(lo, hi float64, rounds int) float64 {
	ratio := (math.Sqrt(5) - 1) / 2
	x, y := hi-ratio*(hi-lo), lo+ratio*(hi-lo)
	gx, gy := s.try(x), s.try(y)
	for range rounds {
		if gx > gy {
			hi, y, gy = y, x, gx
			x = hi - ratio*(hi-lo)
			gx = s.try(x)
		} else {
			lo, x, gx = x, y, gy
			y = lo + ratio*(hi-lo)
			gy = s.try(y)
		}
	}
	return (lo + hi) / 2
}

// result sharpens the frequency and states the digits.
func (s *gainSearch) result() (*GainPeak, error) {
	if math.IsInf(s.low, 1) {
		return nil, errors.New("the largest gain is beyond the range of numbers")
	}
	s.sharpen()
	peak := &GainPeak{Low: s.low, High: math.Max(s.high, s.low), Frequency: s.at}
	peak.Certificate = Certificate{Method: "level sets of the Hamiltonian", Digits: mostDigits}
	if s.low == 0 {
		return peak, nil
	}
	if math.IsInf(s.at, 1) {
		peak.Certificate.note("the gain is approached at the highest frequency; near it the level test is almost singular, so the upper end rests on the frequencies surveyed too")
	}
	if s.period > 0 {
		peak.Frequency = 2 * math.Atan(s.at/s.alpha) / s.period
	}
	width := (peak.High - peak.Low) / peak.High
	peak.Certificate.Digits = DigitsOf(width, 1)
	if !math.IsInf(s.at, 1) || s.period > 0 {
		at, err := s.response.Certify(s.point(s.at))
		if err != nil {
			return nil, err
		}
		peak.Certificate.Condition, peak.Certificate.Residual = at.Condition, at.Residual
		peak.Certificate.Digits = math.Min(peak.Certificate.Digits, at.Digits)
		peak.Rounding = 4 * math.Pow(10, -at.Digits)
	}
	return peak, nil
}

// sharpen moves the frequency to the middle of the flat top of its peak.
func (s *gainSearch) sharpen() {
	if s.at == 0 || math.IsInf(s.at, 1) || s.low == 0 {
		return
	}
	middle := s.golden(s.at*(1-1e-4), s.at*(1+1e-4), 25)
	if s.gain(middle) >= s.low*(1-4*machineEpsilon) {
		s.at = middle
	}
}

// NoiseGain computes the H₂ norm: the root of the power of all outputs together
// for independent white inputs of intensity 1 (sampled: of variance 1). A mode
// that does not decay is refused by name. A continuous plant with D ≠ 0 passes
// white noise straight on and has an infinite norm, returned as +Inf with a note.
//
// ‖G‖₂² = trace(C·W·Cᵀ), sampled + trace(D·Dᵀ), with W from its factor.
func NoiseGain(ctx context.Context, a, b, c, d *mat.Dense, sampled bool) (float64, Certificate, error) {
	n, _, _, err := plantShapes(a, b, c, d)
	if err != nil {
		return 0, Certificate{}, err
	}
	direct := 0.0
	if rows, _ := sizeOf(d); rows > 0 {
		direct = mat.Norm(d, 2)
	}
	exact := Certificate{Method: "constant", Digits: mostDigits}
	if n > 0 {
		w, err := Eigenvalues(a)
		if err != nil {
			return 0, Certificate{}, err
		}
		if modes := unstableModes(w, mat.Norm(a, 2), sampled); len(modes) > 0 {
			return 0, Certificate{}, refuseUnstable("the noise gain is infinite", modes)
		}
	}
	if direct > 0 && !sampled {
		exact.note("the direct term D passes white noise of infinite power")
		return math.Inf(1), exact, nil
	}
	if n == 0 {
		return direct, exact, nil
	}
	f, err := newGramianFactors(ctx, a, b, nil, sampled)
	if err != nil {
		return 0, Certificate{}, err
	}
	gain, difference := math.Hypot(direct, f.outputSize(c)), 0.0
	for attempt := 1; attempt <= f.samples(); attempt++ {
		turned, _ := f.turned(b, c, attempt)
		g, err := newGramianFactors(ctx, turned.a, turned.b, nil, sampled)
		if err != nil {
			return 0, Certificate{}, err
		}
		difference = math.Max(difference, math.Abs(gain-math.Hypot(direct, g.outputSize(turned.c))))
	}
	if gain-gain != 0 {
		return 0, Certificate{}, errors.New("the noise gain is beyond the range of numbers")
	}
	return gain, f.certificate(difference, gain), nil
}

// outputSize is the Frobenius norm of C̃·reach.
func (f *gramianFactors) outputSize(c *mat.Dense) float64 {
	var moved mat.Dense
	moved.Mul(f.inBalanced(nil, c).c, f.reach)
	return mat.Norm(&moved, 2)
}
