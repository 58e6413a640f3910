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
			Doc:      "−Re p/|p|: 1 for a real pole that decays, 0 for an integrator or an undamped swing, negative for what grows. A sampled pole is judged by p = ln z/T; a pole at z = 0 counts 1. Poles whose errors reach the origin leave the figure open: it then claims no digit.",
			Examples: []value.Example{{Input: "least_damping([[0, 1], [-25, -6]])", Output: "≈ 0.60000"}},
			Errors:   []string{"a plant without states"}, Source: "common practice", SeeAlso: []string{"slowest_decay", "modes"},
			Func: func(c *value.Call) (value.Value, error) { return smallest(c, damping, value.Int(1)) },
		},
		{
			Name: "slowest_decay", Family: "frequency", Params: params, Bare: bare,
			Result: "number in 1/s", Summary: "the smallest decay rate −Re p of all poles, in 1/s",
			Doc:      "Its inverse is the longest time constant; negative when a mode grows. A sampled pole is judged by p = ln z/T, a pole at z = 0 is left out; infinite when there is no other.",
			Examples: []value.Example{{Input: "slowest_decay([[-1, 0], [0, -4]])", Output: "= 1"}},
			Errors:   []string{"a plant without states"}, Source: "common practice", SeeAlso: []string{"least_damping", "modes"},
			Func: func(c *value.Call) (value.Value, error) { return smallest(c, decay, value.Number{F: math.Inf(1)}) },
		},
	}
}()

// smallest takes the least of a figure over all poles; none is that of a plant with all its poles at z = 0.
func smallest(c *value.Call, figure func(r system.Root, period float64) (value.Number, bool), none value.Number) (value.Value, error) {
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
	low, high := math.Inf(1), math.Inf(1)
	for _, r := range roots {
		f, ok := figure(r, period)
		if !ok {
			continue
		}
		if best == nil || f.Float64() < best.Float64() {
			best = &f
		}
		low, high = math.Min(low, f.Float64()-f.Err), math.Min(high, f.Float64()+f.Err)
	}
	if best == nil {
		if len(roots) > 0 { // all at z = 0
			return none, nil
		}
		return nil, value.Errf(diag.Numerical, "", "a system without states has no poles")
	}
	x := best.Float64()
	if best.IsExact() && low >= x {
		return *best, nil
	}
	return value.FloatErr(x, math.Max(x-low, high-x)), nil // another pole may be the least
}

// deadbeat is the largest |z| that, not known to differ from 0, passes for a pole at z = 0.
const deadbeat = 1e-3

// damping is −Re p/|p|, and 0 at the origin. Of a pole that may be at the origin, as far as its
// error goes, nothing is known; a real pole may be one of a pair that rounding has split.
func damping(r system.Root, period float64) (value.Number, bool) {
	p, shift := r.Value, r.Err
	if r.Re != nil {
		shift = 0
	}
	if period > 0 {
		if cmplx.Abs(p) <= shift {
			return value.FloatErr(0, 1), shift > deadbeat
		}
		if p == 0 {
			return value.Int(1), false
		}
		p, shift = cmplx.Log(p), shift/cmplx.Abs(p)
	}
	size := cmplx.Abs(p)
	switch {
	case size == 0:
		return value.Int(0), true
	case size <= shift:
		return value.FloatErr(0, 1), true
	case imag(p) == 0:
		sign, tilt := math.Copysign(1, -real(p)), shift/size
		if tilt > 0x1p-26 {
			return value.FloatErr(sign, 2*tilt*tilt), true
		}
		return value.Int(int(sign)), true
	case period > 0:
		return value.FloatErr(-real(p)/size, 2*shift/size+0x1p-50), true
	}
	return value.FloatErr(-real(p)/size, 2*shift/size), true
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
	size := cmplx.Abs(z)
	if size == 0 || size <= r.Err && r.Err <= deadbeat {
		return value.Int(0), false
	}
	rate, part := -math.Log(size), r.Err/size
	if part >= 1 {
		return value.FloatErr(rate/period, (math.Abs(rate)+math.Log1p(part))/period), true
	}
	return value.FloatErr(rate/period, (-math.Log1p(-part)+0x1p-52)/period), true
}
