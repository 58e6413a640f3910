package frequency

import (
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

var poleMapBuiltins = []*value.Builtin{
	{
		Name: "pole_map", Family: "frequency",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "a plant or transfer function"},
			{Name: "wanted", Shape: value.PoleList, Named: true, Optional: true, Default: "none", Doc: "poles that were asked for, shown beside those reached"},
			{Name: "damping", Shape: value.AReal, Named: true, Optional: true, Default: "none", Doc: "smallest damping ratio that is required, between 0 and 1, of a sampled pole that of ln z/T"},
			{Name: "decay", Shape: value.AReal, Named: true, Optional: true, Default: "none", Doc: "smallest decay rate −Re p that is required, in 1/s"},
		},
		Result:  "report, a row a pole, a zero or a wanted pole",
		Summary: "where poles and zeros lie, beside wanted poles and a required region",
		Doc: "Fields: poles, zeros (the transmission zeros), and what was asked for: wanted, damping, decay. " +
			"In a document it is drawn: poles as crosses, zeros as circles, wanted poles as squares, the region where no pole may lie shaded; of a sampled plant in the plane of z with the unit circle.",
		Examples: []value.Example{{Input: "pole_map((s + 3)/(s^2 + 3*s + 2)).zeros", Output: "= [-3]"}},
		Errors:   []string{"a damping outside 0 … 1"},
		Source:   "definition", SeeAlso: []string{"poles", "transmission_zeros", "least_damping"},
		Func: poleMap,
	},
}

func poleMap(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	roots, err := system.Eigenvalues(p.A)
	if err != nil {
		return nil, err
	}
	r := &value.Report{Title: "pole map", Columns: []string{"what", "place"}}
	add := func(what string, items []value.Value) {
		for _, at := range items {
			r.Rows = append(r.Rows, []value.Value{value.Text(what), at})
		}
	}
	poles := system.List(roots)
	add("pole", poles.Items)
	r.Fields = append(r.Fields, value.Named{Name: "poles", Value: poles})
	_, inputs := p.B.Dims()
	if outputs, _ := p.C.Dims(); inputs > 0 && outputs > 0 {
		z, err := system.Zeros(c, p)
		if err != nil {
			// A system matrix that is singular for every s has no zeros to show.
			c.Note("no zeros are shown: " + err.Error())
		} else {
			zeros := system.List(z.Transmission)
			add("zero", zeros.Items)
			r.Fields = append(r.Fields, value.Named{Name: "zeros", Value: zeros})
		}
	}
	if c.Has("wanted") {
		add("wanted", c.List("wanted").Items)
		r.Fields = append(r.Fields, value.Named{Name: "wanted", Value: c.List("wanted")})
	}
	if p.Every != nil {
		r.Fields = append(r.Fields, value.Named{Name: "every", Value: *p.Every})
	}
	if c.Has("damping") {
		d := c.Number("damping")
		if x := d.Float64(); !(x >= 0 && x < 1) {
			return nil, value.Errf(diag.Numerical, "damping", "a damping of %g: between 0 and 1 is asked for", x)
		}
		r.Fields = append(r.Fields, value.Named{Name: "damping", Value: d})
	}
	if c.Has("decay") {
		r.Fields = append(r.Fields, value.Named{Name: "decay", Value: c.Number("decay")})
	}
	return r, nil
}
