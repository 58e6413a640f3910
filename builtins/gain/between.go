package gain

import (
	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// heldFrom is the field by which a sampled plant remembers the continuous one it was made from.
const heldFrom = "continuous"

// continuousOf gives the continuous plant behind a sampled one made with a hold.
func continuousOf(p *value.Plant, param string) (*value.Plant, error) {
	for _, e := range p.Extra {
		if q, ok := e.Value.(*value.Plant); ok && e.Name == heldFrom {
			return q, nil
		}
	}
	return nil, value.Errf(diag.Type, param, "the plant was not made by sampled(…) with a hold, so what happens between the samples is unknown")
}

// betweenSamples turns continuous weights into those of the samples (Van Loan 1978).
func betweenSamples(c *value.Call, p *value.Plant, q, r, cross *value.Matrix) (qd, rd, nd *value.Matrix, err error) {
	held, err := continuousOf(p, "cost")
	if err != nil {
		return nil, nil, nil, err
	}
	return sampledWeights(held, p.Every.Float64(), q, r, cross)
}

func sampledWeights(held *value.Plant, period float64, q, r, cross *value.Matrix) (qd, rd, nd *value.Matrix, err error) {
	qf, nf, rf, cert, err := numeric.VanLoanCost(held.A.Dense(), held.B.Dense(), q.Dense(), dense(cross), r.Dense(), period)
	if err != nil {
		return nil, nil, nil, system.Refused(err, "plant")
	}
	return value.FromDense(qf, cert.Digits), value.FromDense(rf, cert.Digits), value.FromDense(nf, cert.Digits), nil
}

func noiseBetweenSamples(p *value.Plant, w *value.Matrix) (*value.Matrix, error) {
	held, err := continuousOf(p, "noise")
	if err != nil {
		return nil, err
	}
	wf, cert, err := numeric.VanLoanNoise(held.A.Dense(), w.Dense(), p.Every.Float64())
	if err != nil {
		return nil, system.Refused(err, "plant")
	}
	return value.FromDense(wf, cert.Digits), nil
}

var betweenBuiltins = []*value.Builtin{
	{
		Name: "sampled_weights", Family: "gain",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "the continuous plant"},
			{Name: "every", Shape: value.ARate, Named: true, Doc: "the sample time, or the rate in Hz"},
			{Name: "states", Shape: value.AMatrix, Named: true, Doc: "Q, n×n symmetric"},
			{Name: "inputs", Shape: value.AMatrix, Named: true, Doc: "R, m×m symmetric"},
			{Name: "cross", Shape: value.AMatrix, Named: true, Optional: true, Default: "zero", Doc: "N, n×m"},
		},
		Result:  "report with fields states, inputs, cross",
		Summary: "weights of the samples that equal a continuous quadratic cost",
		Doc:     "The integral of xᵀQx + uᵀRu + 2xᵀNu over one sample with the input held is quadratic in x and u at its start; these are its matrices.",
		Examples: []value.Example{
			{Input: "sampled_weights(plant([[0]], [[1]]), every: 1, states: [[1]], inputs: [[1]]).states", Output: "≈\n  1.0000"},
		},
		Errors:  []string{"a sampled plant", "weights whose sizes do not fit"},
		Source:  "Van Loan 1978, IEEE Trans. Automatic Control 23",
		SeeAlso: []string{"quadratic_gain", "sampled_noise", "sampled"},
		Func: func(c *value.Call) (value.Value, error) {
			p := c.Plant("plant")
			if p.Every != nil {
				return nil, value.Errf(diag.Type, "plant", "the plant is sampled already")
			}
			q, r, cross, err := weightsOf(c, p)
			if err != nil {
				return nil, err
			}
			every := c.Number("every")
			qd, rd, nd, err := sampledWeights(p, every.Float64(), q, r, cross)
			if err != nil {
				return nil, err
			}
			return &value.Report{Title: "weights of the samples", Fields: []value.Named{
				{Name: "states", Value: qd}, {Name: "inputs", Value: rd}, {Name: "cross", Value: nd}}}, nil
		},
	},
	{
		Name: "sampled_noise", Family: "gain",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "the continuous plant"},
			{Name: "every", Shape: value.ARate, Named: true, Doc: "the sample time, or the rate in Hz"},
			{Name: "process", Shape: value.AMatrix, Named: true, Doc: "W, n×n: intensity of the process noise in state coordinates"},
		},
		Result:  "matrix n×n",
		Summary: "covariance that continuous process noise gathers over one sample",
		Doc:     "∫ exp(A·t)·W·exp(Aᵀ·t) dt over one sample time.",
		Examples: []value.Example{
			{Input: "sampled_noise(plant([[0]], [[1]]), every: 2, process: [[3]])", Output: "≈\n           x\n  x   6.0000"},
		},
		Errors:  []string{"a sampled plant", "an intensity that is not symmetric"},
		Source:  "Van Loan 1978, IEEE Trans. Automatic Control 23",
		SeeAlso: []string{"kalman_gain", "sampled_weights", "sampled"},
		Func: func(c *value.Call) (value.Value, error) {
			p, w := c.Plant("plant"), c.Matrix("process")
			if p.Every != nil {
				return nil, value.Errf(diag.Type, "plant", "the plant is sampled already")
			}
			n, _ := system.PlantSize(p)
			if err := symmetric(w, n, "process", "this plant"); err != nil {
				return nil, err
			}
			wf, cert, err := numeric.VanLoanNoise(p.A.Dense(), w.Dense(), c.Number("every").Float64())
			if err != nil {
				return nil, system.Refused(err, "plant")
			}
			m := value.FromDense(wf, cert.Digits)
			m.Rows, m.Columns = system.Labels(p.States), system.Labels(p.States)
			return m, nil
		},
	},
}
