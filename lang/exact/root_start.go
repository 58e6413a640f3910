package exact

import (
	"math"
	"math/big"
	"math/cmplx"
)

// scaledPolynomial holds coefficients as mantissa·2^exponent, so that values
// far outside the range of binary64 neither overflow nor vanish.
type scaledPolynomial struct {
	mantissa []float64 // lowest power first
	exponent []int
	work     []float64
}

func newScaledPolynomial(c []big.Int) *scaledPolynomial {
	s := &scaledPolynomial{make([]float64, len(c)), make([]int, len(c)), make([]float64, len(c))}
	for k := range c {
		var mantissa big.Float
		s.exponent[k] = new(big.Float).SetInt(&c[k]).MantExp(&mantissa)
		s.mantissa[k], _ = mantissa.Float64()
	}
	return s
}

// startingPoints spreads n guesses on circles whose radii come from the upper
// convex hull of the points (k, log|cₖ|), the Newton polygon (D. A. Bini,
// Numerical computation of polynomial zeros by means of Aberth's method,
// Numer. Algorithms 13, 1996).
func (s *scaledPolynomial) startingPoints() []complex128 {
	n := len(s.mantissa) - 1
	height := make([]float64, n+1)
	for k, m := range s.mantissa {
		height[k] = math.Inf(-1)
		if m != 0 {
			height[k] = math.Log2(math.Abs(m)) + float64(s.exponent[k])
		}
	}
	var hull []int
	for k := range height {
		if math.IsInf(height[k], -1) {
			continue
		}
		for len(hull) >= 2 {
			i, j := hull[len(hull)-2], hull[len(hull)-1]
			if (height[j]-height[i])*float64(k-i) > (height[k]-height[i])*float64(j-i) {
				break
			}
			hull = hull[:len(hull)-1]
		}
		hull = append(hull, k)
	}
	points := make([]complex128, 0, n)
	for h := 1; h < len(hull); h++ {
		i, j := hull[h-1], hull[h]
		radius := math.Exp2(max(-1000, min(1000, (height[i]-height[j])/float64(j-i))))
		for k := range j - i {
			angle := 2*math.Pi*(float64(k)/float64(j-i)+float64(h)/float64(n)) + 0.7
			points = append(points, cmplx.Rect(radius, angle))
		}
	}
	return points
}

// newton gives p(z)/p'(z) and whether |p(z)| is at the level of rounding.
func (s *scaledPolynomial) newton(z complex128) (step complex128, settled bool) {
	_, e := math.Frexp(max(math.Abs(real(z)), math.Abs(imag(z))))
	top := math.MinInt
	for k, m := range s.mantissa {
		if m != 0 {
			top = max(top, s.exponent[k]+k*e)
		}
	}
	for k, m := range s.mantissa {
		s.work[k] = math.Ldexp(m, s.exponent[k]+k*e-top)
	}
	w := complex(math.Ldexp(real(z), -e), math.Ldexp(imag(z), -e))
	size := cmplx.Abs(w)
	var value, slope complex128
	bound := 0.0
	for k := len(s.work) - 1; k >= 0; k-- {
		slope = slope*w + value
		value = value*w + complex(s.work[k], 0)
		bound = bound*size + math.Abs(s.work[k])
	}
	if cmplx.Abs(value) <= 4*0x1p-53*float64(len(s.work))*bound {
		settled = true
	}
	if slope == 0 {
		return 0, settled
	}
	step = value / slope
	return complex(math.Ldexp(real(step), e), math.Ldexp(imag(step), e)), settled
}

// approximate runs Aberth's iteration (O. Aberth, Iteration methods for finding
// all zeros of a polynomial simultaneously, Math. Comp. 27, 1973; L. W. Ehrlich
// 1967) in binary64 until every point is settled or the sweeps are used up.
func (s *scaledPolynomial) approximate() []complex128 {
	z := s.startingPoints()
	settled := make([]bool, len(z))
	for range 30 + 4*len(z) {
		busy := false
		for i := range z {
			if settled[i] {
				continue
			}
			step, done := s.newton(z[i])
			settled[i] = done
			if step == 0 {
				continue
			}
			correction := step / (1 - step*repulsion(z, i))
			if cmplx.IsNaN(correction) || cmplx.IsInf(correction) {
				continue
			}
			z[i] -= correction
			if !done && cmplx.Abs(correction) <= 0x1p-52*cmplx.Abs(z[i]) {
				settled[i] = true
			}
			busy = busy || !settled[i]
		}
		if !busy {
			break
		}
	}
	return z
}

// repulsion gives Σ 1/(z[i] − z[j]) over the other points.
func repulsion(z []complex128, i int) complex128 {
	var sum complex128
	for j, w := range z {
		if d := z[i] - w; j != i && d != 0 {
			sum += 1 / d
		}
	}
	return sum
}
