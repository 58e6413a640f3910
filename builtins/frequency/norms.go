package frequency

import (
	"math"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/value"
)

var normBuiltins = []*value.Builtin{
	{
		Name: "largest_gain", Family: "frequency",
		Params:  []value.Param{{Name: "plant", Shape: value.ASystem, Doc: "a stable plant"}},
		Result:  "report with fields value, frequency, low, high",
		Summary: "the largest gain over all frequencies (H∞ norm), with its frequency",
		Doc: "The largest singular value of the frequency response, with the frequency in rad/s where it is met; low and high bracket it. " +
			"In the declared units of inputs and outputs.",
		Examples: []value.Example{{Input: "largest_gain(plant([[-1]], [[1]], [[1]])).value", Output: "≈ 1.0000"}},
		Errors:   []string{"a mode that does not decay, named: the gain is infinite or hides it"},
		Source:   "Boyd & Balakrishnan 1990, Systems & Control Letters 15; Bruinsma & Steinbuch 1990", SeeAlso: []string{"noise_gain", "margins", "sweep"},
		Func: largestGain,
	},
	{
		Name: "noise_gain", Family: "frequency",
		Params:  []value.Param{{Name: "plant", Shape: value.ASystem, Doc: "a stable plant"}},
		Result:  "number",
		Summary: "how strongly white noise passes: rms output for unit noise (H₂ norm)",
		Doc: "The root of the summed output variances for independent unit white noise at all inputs: intensity 1 for a continuous plant, variance 1 for a sampled one. " +
			"Infinite for a continuous plant with a direct term.",
		Examples: []value.Example{{Input: "noise_gain(plant([[-2]], [[2]], [[1]]))", Output: "≈ 1.0000"}},
		Errors:   []string{"a mode that does not decay, named"},
		Source:   "Åström 1970, Introduction to Stochastic Control Theory", SeeAlso: []string{"largest_gain", "lyapunov", "kalman_gain"},
		Func: noiseGain,
	},
}

func periodOf(p *value.Plant) float64 {
	if p.Every == nil {
		return 0
	}
	return p.Every.Float64()
}

func largestGain(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	g, err := numeric.LargestGain(c.Context, p.A.Dense(), p.B.Dense(), p.C.Dense(), p.D.Dense(), periodOf(p))
	if err != nil {
		return nil, system.Refused(err, "plant")
	}
	mid := (g.Low + g.High) / 2
	w := value.Value(value.FloatErr(g.Frequency, g.Frequency*1e-5))
	if math.IsInf(g.Frequency, 1) {
		w = value.Text("approached at infinite frequency")
	}
	return &value.Report{Title: "largest gain", Fields: []value.Named{
		{Name: "value", Value: value.FloatErr(mid, (g.High-g.Low)/2+mid*math.Pow(10, -g.Certificate.Digits))},
		{Name: "frequency", Value: w},
		{Name: "low", Value: value.Float(g.Low * math.Max(0, 1-g.Rounding))},
		{Name: "high", Value: value.Float(g.High * (1 + g.Rounding))},
	}, Notes: g.Certificate.Notes}, nil
}

func noiseGain(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	x, cert, err := numeric.NoiseGain(c.Context, p.A.Dense(), p.B.Dense(), p.C.Dense(), p.D.Dense(), p.Every != nil)
	if err != nil {
		return nil, system.Refused(err, "plant")
	}
	if math.IsInf(x, 1) {
		return value.Number{F: x}, nil
	}
	return value.FloatErr(x, x*math.Pow(10, -cert.Digits)), nil
}
