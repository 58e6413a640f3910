package system

import (
	"math"
	"math/cmplx"

	"gainwright/builtins/numeric"
	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

// exactZeroOrder is the largest sum of states and channels for which zeros are found through exact polynomials.
const exactZeroOrder = 12

var zeroBuiltins = []*value.Builtin{
	{
		Name: "transmission_zeros", Family: "system",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "a plant, a model or a transfer function; any numbers of inputs and outputs"},
			{Name: "all", Shape: value.ABoolean, Named: true, Optional: true, Default: "false", Doc: "adds the decoupling zeros, marked"},
		},
		Result:  "list of numbers and complex numbers; with all: a report",
		Summary: "where the transfer function loses rank: signals that pass unseen",
		Doc: "The zeros are those of the moved-and-seen part: the points where the system matrix [[A − sI, B], [C, D]] of that part has less than its normal rank. " +
			"With all: true the decoupling zeros stand beside them: modes no input moves (input), no output sees (output), or both. " +
			"Zeros at infinity are not listed. Small exact plants: exactly, through polynomials; else two staircase reductions of the system pencil by orthogonal transformations. " +
			"A system matrix singular for every s is an error, since then every point is a zero.",
		Examples: []value.Example{
			{Input: "transmission_zeros(plant([[0, 1], [-2, -3]], [[0], [1]], [[3, 1]]))", Output: "= [-3]"},
		},
		Errors:  []string{"a system matrix that is singular for every s"},
		Source:  "Rosenbrock 1970; Emami-Naeini & Van Dooren 1982, Automatica 18",
		SeeAlso: []string{"cancellations", "poles", "transfer"},
		Func:    transmissionZeros,
	},
}

func transmissionZeros(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	z, err := Zeros(c, p)
	if err != nil {
		return nil, err
	}
	for _, n := range z.Notes {
		c.Note(n)
	}
	if !c.Truth("all") {
		return List(z.Transmission), nil
	}
	r := &value.Report{Title: "zeros", Columns: []string{"zero", "kind"}}
	var every []Root
	add := func(roots []Root, kind string) {
		for _, root := range roots {
			r.Rows = append(r.Rows, []value.Value{root.Number(), value.Text(kind)})
		}
		every = append(every, roots...)
	}
	add(z.Transmission, "transmission zero")
	add(z.Input, "input decoupling: moved by no input")
	add(z.Output, "output decoupling: seen by no output")
	add(z.Both, "input and output decoupling")
	r.Fields = []value.Named{
		{Name: "zeros", Value: List(every)},
		{Name: "transmission", Value: List(z.Transmission)},
		{Name: "input_decoupling", Value: List(z.Input)},
		{Name: "output_decoupling", Value: List(z.Output)},
		{Name: "input_output_decoupling", Value: List(z.Both)},
	}
	return r, nil
}

// ZeroSets are the zeros of a plant by kind.
type ZeroSets struct {
	Transmission, Input, Output, Both []Root
	Notes                             []string
}

// Zeros finds the zeros of a plant.
func Zeros(c *value.Call, p *value.Plant) (*ZeroSets, error) {
	n, m := PlantSize(p)
	outs, _ := p.C.Dims()
	if n+max(m, outs) <= exactZeroOrder && ExactPlant(p) {
		return exactZeros(p)
	}
	return floatingZeros(c, p)
}

func singularPencil() error {
	return diag.New(diag.Numerical, "the system matrix is singular for every s: every point is a zero").For("plant").
		WithHelp("two channels depend on each other, or a channel does not react at all; look at transfer(…)")
}

func exactZeros(p *value.Plant) (*ZeroSets, error) {
	a, b, cm, d := p.A.Exact(), p.B.Exact(), p.C.Exact(), p.D.Exact()
	split, err := exact.KalmanSplit(a, b, cm)
	if err != nil {
		return nil, diag.New(diag.Numerical, "%v", err)
	}
	z := &ZeroSets{}
	zeros, err := exact.TransmissionZeros(a, b, cm, d)
	if err != nil {
		return nil, diag.New(diag.Numerical, "%v", err)
	}
	if zeros.Singular {
		return nil, singularPencil()
	}
	for _, part := range []struct {
		p   exact.Polynomial
		set *[]Root
	}{
		{zeros.Polynomial, &z.Transmission}, {split.Polynomials[exact.SeenOnly], &z.Input}, {split.Polynomials[exact.MovedOnly], &z.Output}, {split.Polynomials[exact.Neither], &z.Both},
	} {
		if part.p.Degree() < 1 {
			continue
		}
		if *part.set, err = RootsOf(part.p); err != nil {
			return nil, err
		}
	}
	return z, nil
}

func floatingZeros(c *value.Call, p *value.Plant) (*ZeroSets, error) {
	f, err := numeric.TransmissionZeros(c.Context, p.A.Dense(), p.B.Dense(), p.C.Dense(), p.D.Dense())
	if err != nil {
		return nil, Refused(err, "plant")
	}
	if f.Singular {
		return nil, singularPencil()
	}
	z := &ZeroSets{Notes: f.Certificate.Notes}
	for i, v := range f.Zeros {
		z.Transmission = append(z.Transmission, Root{Value: v, Err: f.ErrorOf[i], Multiplicity: 1})
	}
	poles, err := EigenvaluesWithin(p.A.Dense(), uncertainty(p.A))
	if err != nil {
		return nil, err
	}
	z.Input, z.Output, z.Both = decoupling(f.InputDecoupling, f.OutputDecoupling, poles)
	return z, nil
}

// asPole is a decoupling zero with the error of the pole it is, as far as the two differ and beyond.
func asPole(v complex128, poles []Root) Root {
	r := Root{Value: v, Err: cmplx.Abs(v), Multiplicity: 1}
	nearest := math.Inf(1)
	for _, p := range poles {
		if d := cmplx.Abs(p.Value - v); d < nearest {
			nearest, r.Err = d, d+p.Err
		}
	}
	return r
}

// decoupling tells those that occur in both lists from the rest.
func decoupling(input, output []complex128, poles []Root) (in, out, both []Root) {
	used := make([]bool, len(output))
	for _, v := range input {
		match := -1
		for j, w := range output {
			if !used[j] && cmplx.Abs(v-w) <= 1e-7*math.Max(1, cmplx.Abs(v)) {
				match = j
				break
			}
		}
		r := asPole(v, poles)
		if match < 0 {
			in = append(in, r)
			continue
		}
		used[match] = true
		both = append(both, r)
	}
	for j, w := range output {
		if !used[j] {
			out = append(out, asPole(w, poles))
		}
	}
	return in, out, both
}
