package frequency

import (
	"math"
	"math/cmplx"

	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

func systemOrMatrix() (params, bare []value.Param) {
	return []value.Param{{Name: "plant", Shape: value.ASystem, Doc: "a plant, a model, a closed loop or a transfer function"}},
		[]value.Param{{Name: "A", Shape: value.ASquare, Doc: "a square matrix"}}
}

var dampingBuiltins = func() []*value.Builtin {
	params, bare := systemOrMatrix()
	return []*value.Builtin{
		{
			Name: "least_damping", Family: "frequency", Params: params, Bare: bare,
			Result: "number between −1 and 1", Summary: "the smallest damping ratio of all poles",
			Doc:      "−Re p/|p|: 1 for a real pole that decays, 0 for an integrator or an undamped swing, negative for what grows. A sampled pole is judged by p = ln z/T; a pole at z = 0 counts 1.",
			Examples: []value.Example{{Input: "least_damping([[0, 1], [-25, -6]])", Output: "≈ 0.60000"}},
			Errors:   []string{"a plant without states"}, Source: "common practice", SeeAlso: []string{"slowest_decay", "modes"},
			Func: func(c *value.Call) (value.Value, error) { return smallest(c, damping) },
		},
		{
			Name: "slowest_decay", Family: "frequency", Params: params, Bare: bare,
			Result: "number in 1/s", Summary: "the smallest decay rate −Re p of all poles, in 1/s",
			Doc:      "Its inverse is the longest time constant; negative when a mode grows. A sampled pole is judged by p = ln z/T, a pole at z = 0 is left out.",
			Examples: []value.Example{{Input: "slowest_decay([[-1, 0], [0, -4]])", Output: "= 1"}},
			Errors:   []string{"a plant without states"}, Source: "common practice", SeeAlso: []string{"least_damping", "modes"},
			Func: func(c *value.Call) (value.Value, error) { return smallest(c, decay) },
		},
	}
}()

// smallest takes the least of a figure over all poles.
func smallest(c *value.Call, figure func(r system.Root, period float64) (value.Number, bool)) (value.Value, error) {
	a, period := c.Matrix("A"), 0.0
	if p := c.Plant("plant"); p != nil {
		a = p.A
		if p.Every != nil {
			period = p.Every.Float64()
		}
	}
	roots, err := system.Eigenvalues(a)
	if err != nil {
		return nil, err
	}
	var best *value.Number
	for _, r := range roots {
		f, ok := figure(r, period)
		if ok && (best == nil || f.Float64() < best.Float64()) {
			best = &f
		}
	}
	if best == nil {
		if len(roots) > 0 { // all at z = 0
			return value.Int(1), nil
		}
		return nil, value.Errf(diag.Numerical, "", "a system without states has no poles")
	}
	return *best, nil
}

// damping is −Re p/|p|, and 0 at the origin.
func damping(r system.Root, period float64) (value.Number, bool) {
	z := r.Value
	if period == 0 {
		size := cmplx.Abs(z)
		switch {
		case size == 0 || size <= r.Err:
			return value.Int(0), true
		case imag(z) == 0 && real(z) < 0:
			return value.Int(1), true
		case imag(z) == 0:
			return value.Int(-1), true
		}
		return value.FloatErr(-real(z)/size, 2*r.Err/size), true
	}
	if cmplx.Abs(z) <= r.Err {
		return value.Int(1), false
	}
	p := cmplx.Log(z)
	size := cmplx.Abs(p)
	shift := r.Err / cmplx.Abs(z)
	if size <= shift || size == 0 {
		return value.Int(0), true
	}
	if imag(p) == 0 {
		if real(p) < 0 {
			return value.Int(1), true
		}
		return value.Int(-1), true
	}
	return value.FloatErr(-real(p)/size, 2*shift/size+0x1p-50), true
}

// decay is −Re p.
func decay(r system.Root, period float64) (value.Number, bool) {
	z := r.Value
	if period == 0 {
		if r.Re != nil {
			n, err := value.Negate(*r.Re)
			if x, ok := n.(value.Number); err == nil && ok {
				return x, true
			}
		}
		return value.FloatErr(-real(z), r.Err), true
	}
	if cmplx.Abs(z) <= r.Err {
		return value.Int(0), false
	}
	return value.FloatErr(-math.Log(cmplx.Abs(z))/period, (r.Err/cmplx.Abs(z)+0x1p-52)/period), true
}
