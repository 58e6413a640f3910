package gain

import (
	"math"
	"math/big"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

var poleBuiltins = []*value.Builtin{
	{
		Name: "pole_pair", Family: "gain",
		Params: []value.Param{
			{Name: "damping", Shape: value.AReal, Named: true, Optional: true, Doc: "damping ratio between 0 and 1, with frequency"},
			{Name: "frequency", Shape: value.AFrequency, Named: true, Optional: true, Doc: "undamped frequency in rad/s"},
			{Name: "overshoot", Shape: value.AReal, Named: true, Optional: true, Doc: "overshoot of a step, a fraction of the final value such as 5%, with settling"},
			{Name: "settling", Shape: value.ATime, Named: true, Optional: true, Doc: "settling time in s"},
			{Name: "within", Shape: value.AReal, Named: true, Optional: true, Default: "2%", Doc: "the band of the settling time"},
		},
		Result:  "conjugate pair of poles",
		Summary: "the pole pair of a damping and frequency, or an overshoot and settling",
		Doc: "With damping ζ and frequency ω: the roots of s² + 2ζω·s + ω², kept exactly as that factor. " +
			"With overshoot o and settling time t: ζ from o = exp(−πζ/√(1 − ζ²)), and ω such that the envelope exp(−ζωt)/√(1 − ζ²) of a second-order step has fallen to the band at t; " +
			"the step itself then stays inside the band from t on at the latest. Without zeros and further poles, that is.",
		Examples: []value.Example{
			{Input: "polynomial_with_roots([pole_pair(damping: 0.5, frequency: 2)])", Output: "= s^2 + 2*s + 4"},
		},
		Errors:  []string{"a damping outside 0 to 1", "an overshoot outside 0 to 1", "half of one description and half of the other"},
		Source:  "Kuo 1962, Automatic Control Systems; common practice",
		SeeAlso: []string{"assign_poles", "bessel_poles", "butterworth_poles"},
		Func:    polePair,
	},
}

func polePair(c *value.Call) (value.Value, error) {
	byDamping := c.Has("damping") && c.Has("frequency")
	byStep := c.Has("overshoot") && c.Has("settling")
	if byDamping == byStep || byDamping && (c.Has("overshoot") || c.Has("settling") || c.Has("within")) || byStep && (c.Has("damping") || c.Has("frequency")) {
		return nil, value.Errf(diag.Type, "", "pole_pair takes damping and frequency, or overshoot and settling").
			WithHelp("pole_pair(damping: 0.7, frequency: 3 rad/s) or pole_pair(overshoot: 5%%, settling: 2 s)")
	}
	if byDamping {
		z, w := c.Number("damping"), c.Number("frequency")
		if f := z.Float64(); f < 0 || f > 1 {
			return nil, value.Errf(diag.Numerical, "damping", "the damping %g is outside 0 to 1", f)
		}
		if w.Float64() <= 0 {
			return nil, value.Errf(diag.Numerical, "frequency", "the frequency must be positive")
		}
		return pairOf(z, w)
	}
	o, t := c.Number("overshoot").Float64(), c.Number("settling").Float64()
	band := 0.02
	if c.Has("within") {
		band = c.Number("within").Float64()
	}
	if o <= 0 || o >= 1 {
		return nil, value.Errf(diag.Numerical, "overshoot", "the overshoot %g must lie between 0 and 1 (0 %% and 100 %%)", o)
	}
	if band <= 0 || band >= 1 {
		return nil, value.Errf(diag.Numerical, "within", "the band %g must lie between 0 and 1", band)
	}
	l := math.Log(o)
	z := -l / math.Hypot(math.Pi, l)
	w := -math.Log(band*math.Sqrt(1-z*z)) / (z * t)
	return pairOf(value.FloatErr(z, 4*z*0x1p-52), value.FloatErr(w, 8*w*0x1p-52))
}

// pairOf gives the roots of s² + 2ζω·s + ω².
func pairOf(z, w value.Number) (value.Value, error) {
	if z.IsExact() && w.IsExact() {
		b := new(big.Rat).Mul(z.Exact, w.Exact)
		b.Add(b, b)
		return value.PairFromQuadratic(value.Rat(b), value.Rat(new(big.Rat).Mul(w.Exact, w.Exact)))
	}
	zf, wf := z.Float64(), w.Float64()
	b, q := 2*zf*wf, wf*wf
	return value.PairFromQuadratic(value.FloatErr(b, 2*(z.Err*wf+w.Err*zf)+b*0x1p-52), value.FloatErr(q, 2*wf*w.Err+q*0x1p-52))
}
