package frequency

import (
	"errors"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// mostPoints bounds a sweep.
const mostPoints = 100_000

var sweepBuiltins = []*value.Builtin{
	{
		Name: "sweep", Family: "frequency",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "a plant or transfer function"},
			{Name: "from", Shape: value.AFrequency, Named: true, Doc: "lowest frequency in rad/s, above 0"},
			{Name: "to", Shape: value.AFrequency, Named: true, Doc: "highest frequency in rad/s"},
			{Name: "points", Shape: value.AWhole, Named: true, Optional: true, Default: "200", Doc: "how many, evenly spread on a logarithmic scale"},
		},
		Result:  "report, a row a frequency",
		Summary: "the frequency response over a range: gain and phase of each channel",
		Doc: "Fields: frequencies, values (complex numbers, or a matrix for each frequency with several channels), magnitude and phase of a single channel (plain ratio; degrees, without jumps). " +
			"The table has decibels and degrees. Of a sampled plant the range must end at or below the Nyquist frequency. A frequency on a pole gives infinity.",
		Examples: []value.Example{{Input: "sweep(1/(s + 1), from: 1, to: 1.001, points: 2).frequencies", Output: "≈ [1.0000, 1.0010]"}},
		Errors:   []string{"a range that is empty or starts at 0", "frequencies above the Nyquist frequency"},
		Source:   "Laub 1981, IEEE Trans. Automatic Control 26", SeeAlso: []string{"margins", "at", "largest_gain"},
		Func: sweep,
	},
}

func sweep(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	from, to := c.Number("from").Float64(), c.Number("to").Float64()
	points := 200
	if c.Has("points") {
		points = int(c.Number("points").Float64())
	}
	if !(from > 0) || !(to > from) || math.IsInf(to, 0) {
		return nil, value.Errf(diag.Numerical, "from", "the range %g to %g rad/s must start above 0 and end above its start", from, to)
	}
	if points < 2 || points > mostPoints {
		return nil, value.Errf(diag.Limit, "points", "%d points; between 2 and %d are worked", points, mostPoints)
	}
	t := periodOf(p)
	if t > 0 && to > math.Pi/t*(1+1e-12) {
		return nil, value.Errf(diag.Numerical, "to", "%g rad/s lies above the Nyquist frequency %.6g rad/s", to, math.Pi/t)
	}
	f, err := numeric.NewFrequencyResponse(p.A.Dense(), p.B.Dense(), p.C.Dense(), p.D.Dense())
	if err != nil {
		return nil, system.Refused(err, "plant")
	}
	_, m := system.PlantSize(p)
	outs, _ := p.C.Dims()
	if m == 0 || outs == 0 {
		return nil, value.Errf(diag.Shape, "plant", "a plant without inputs or outputs has no frequency response")
	}
	g := mat.NewCDense(outs, m, nil)
	r := &value.Report{Title: "frequency response"}
	var frequencies, values, magnitudes, phases value.List
	previous := make([]float64, outs*m)
	r.Columns = []string{"frequency [rad/s]"}
	for i := range outs {
		for j := range m {
			name := ""
			if outs*m > 1 {
				name = p.Outputs[i].Name + " from " + p.Inputs[j].Name + ": "
			}
			r.Columns = append(r.Columns, name+"gain [dB]", name+"phase [deg]")
		}
	}
	for k := range points {
		if err := c.Context.Err(); err != nil {
			return nil, err
		}
		w := from * math.Pow(to/from, float64(k)/float64(points-1))
		if k == points-1 {
			w = to
		}
		s := complex(0, w)
		if t > 0 {
			s = cmplx.Exp(complex(0, w*t))
		}
		off := 0.0 // the error of the largest entry; at a pole it is infinite
		if err := f.AtInto(g, s); err == nil {
			off = f.ErrorAt(s)
		} else if !errors.Is(err, numeric.ErrAtPole) {
			return nil, system.Refused(err, "plant")
		}
		frequencies.Items = append(frequencies.Items, value.FloatErr(w, w*1e-15))
		row := []value.Value{value.FloatErr(w, w*1e-15)}
		for i := range outs {
			for j := range m {
				v := g.At(i, j)
				a := cmplx.Abs(v)
				phase := unwrapped(cmplx.Phase(v)*180/math.Pi, previous[i*m+j], k > 0)
				previous[i*m+j] = phase
				row = append(row, value.FloatErr(20*math.Log10(a), 20*math.Log10(1+off/a)), value.FloatErr(phase, math.Min(off/a, math.Pi)*180/math.Pi))
				if outs*m == 1 {
					magnitudes.Items = append(magnitudes.Items, value.FloatErr(a, off))
					phases.Items = append(phases.Items, value.FloatErr(phase, math.Min(off/a, math.Pi)*180/math.Pi))
					values.Items = append(values.Items, value.Complex{C: v, Err: off})
				}
			}
		}
		if outs*m > 1 {
			values.Items = append(values.Items, complexMatrix(g, off))
		}
		r.Rows = append(r.Rows, row)
	}
	r.Fields = []value.Named{{Name: "frequencies", Value: &frequencies}, {Name: "values", Value: &values}}
	if outs*m == 1 {
		r.Fields = append(r.Fields, value.Named{Name: "magnitude", Value: &magnitudes}, value.Named{Name: "phase", Value: &phases})
	}
	return r, nil
}

// unwrapped takes the phase nearest to the one before.
func unwrapped(phase, before float64, follow bool) float64 {
	if !follow || math.IsNaN(before) {
		return phase
	}
	return phase + 360*math.Round((before-phase)/360)
}

func complexMatrix(g *mat.CDense, off float64) *value.Matrix {
	r, c := g.Dims()
	re, im := make([]float64, r*c), make([]float64, r*c)
	for i := range r {
		for j := range c {
			v := g.At(i, j)
			re[i*c+j], im[i*c+j] = real(v), imag(v)
		}
	}
	return value.FloatComplexMatrix(r, c, re, im, off)
}
