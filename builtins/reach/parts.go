package reach

import (
	"fmt"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

// partNames are the fields of the four parts, in the order of their coordinates.
var partNames = [4]string{"moved_and_seen", "moved_only", "seen_only", "neither"}

var partWords = [4]string{"moved and seen", "moved, not seen", "seen, not moved", "neither moved nor seen"}

var partBuiltins = []*value.Builtin{
	{
		Name: "kalman_split", Family: "reach",
		Params:  []value.Param{{Name: "plant", Shape: value.ASystem, Doc: "the plant"}},
		Result:  "report",
		Summary: "the four parts: moved and seen, moved only, seen only, neither",
		Doc: "Fields moved_and_seen, moved_only, seen_only and neither, each with size and poles; transformation (x̄ = T·x); system (the plant in these coordinates, " +
			"parts in this order); decided. Only the first part shows in the transfer function.",
		Examples: []value.Example{
			{Input: "kalman_split(plant([[-1, 0], [0, -2]], [[1], [0]], [[1, 1]])).seen_only.poles", Output: "= [-2]"},
		},
		Errors:  []string{"exact numbers that grow past their cap"},
		Source:  "Gilbert 1963, J. SIAM Control 1; Kalman 1963, J. SIAM Control 1",
		SeeAlso: []string{"minimal", "cancellations", "modes"},
		Func:    kalmanSplit,
	},
	{
		Name: "minimal", Family: "reach",
		Params:  []value.Param{{Name: "plant", Shape: value.ASystem, Doc: "the plant"}},
		Result:  "plant of least order with the same transfer function",
		Summary: "the part of a plant that is moved and seen",
		Doc:     "The plant itself when nothing is lost; else new states m1, m2, … in the coordinates of kalman_split.",
		Examples: []value.Example{
			{Input: "poles(minimal(plant([[-1, 0], [0, -2]], [[1], [0]], [[1, 1]])))", Output: "= [-1]"},
		},
		Errors:  []string{"exact numbers that grow past their cap"},
		Source:  "Kalman 1963, J. SIAM Control 1",
		SeeAlso: []string{"kalman_split", "transfer", "realize"},
		Func: func(c *value.Call) (value.Value, error) {
			s, err := splitOf(c.Plant("plant"))
			if err != nil {
				return nil, err
			}
			return s.minimal(c.Plant("plant")), nil
		},
	},
	{
		Name: "cancellations", Family: "reach",
		Params:  []value.Param{{Name: "plant", Shape: value.ASystem, Doc: "the plant"}},
		Result:  "report, a row a pole that is lost",
		Summary: "the poles that the transfer function loses, each with the reason",
		Doc: "A pole is lost against a zero when no input moves its mode, no output sees it, or neither. Fields: poles, count, transfer (what remains), and the table with the reasons. " +
			"A lost pole that does not decay is a hidden danger and is marked.",
		Examples: []value.Example{
			{Input: "cancellations(plant([[0, 1], [-2, -3]], [[0], [1]], [[1, 1]])).poles", Output: "= [-1]"},
		},
		Errors:  []string{"exact numbers that grow past their cap"},
		Source:  "Gilbert 1963, J. SIAM Control 1",
		SeeAlso: []string{"kalman_split", "transfer", "transmission_zeros"},
		Func:    cancellations,
	},
}

// split is a plant in the coordinates of its four parts.
type split struct {
	sizes      [4]int
	poles      [4][]system.Root
	t          *value.Matrix
	a, b, c, d *value.Matrix
	decided    string
}

func splitOf(p *value.Plant) (*split, error) {
	if system.ExactPlant(p) {
		e, err := exact.KalmanSplit(p.A.Exact(), p.B.Exact(), p.C.Exact())
		if err != nil {
			return nil, diag.New(diag.Limit, "%v", err)
		}
		s := &split{sizes: e.Sizes, t: value.ExactMatrix(e.T), a: value.ExactMatrix(e.A), b: value.ExactMatrix(e.B),
			c: value.ExactMatrix(e.C), d: p.D, decided: "exactly"}
		for i, poly := range e.Polynomials {
			if poly.Degree() < 1 {
				continue
			}
			if s.poles[i], err = system.RootsOf(poly); err != nil {
				return nil, err
			}
		}
		return s, nil
	}
	f, err := numeric.KalmanSplit(p.A.Dense(), p.B.Dense(), p.C.Dense())
	if err != nil {
		return nil, system.Refused(err, "plant")
	}
	digits := f.Certificate.Digits
	s := &split{sizes: f.Sizes, d: p.D, t: value.FromDense(f.T, digits), a: value.FromDense(f.A, digits)}
	n, m := system.PlantSize(p)
	outs, _ := p.C.Dims()
	s.b, s.c = system.Zero(n, m), system.Zero(outs, n)
	if m > 0 {
		s.b = value.FromDense(f.B, digits)
	}
	if outs > 0 {
		s.c = value.FromDense(f.C, digits)
	}
	s.decided = fmt.Sprintf("floating, singular values above %.1e count; smallest counted %.1e, largest not counted %.1e", f.Threshold, f.Above, f.Below)
	for i := range f.Poles {
		for k, v := range f.Poles[i] {
			s.poles[i] = append(s.poles[i], system.Root{Value: v, Err: f.PoleError[i][k], Multiplicity: 1})
		}
	}
	return s, nil
}

// minimal is the first part as a plant.
func (s *split) minimal(p *value.Plant) *value.Plant {
	n, m := system.PlantSize(p)
	k := s.sizes[0]
	if k == n {
		return p
	}
	outs, _ := p.C.Dims()
	q := &value.Plant{Title: "moved-and-seen part", Every: p.Every, Inputs: p.Inputs, Outputs: p.Outputs, U0: p.U0, Y0: p.Y0, D: p.D}
	q.A, q.B, q.C = system.Slice(s.a, 0, k, 0, k), system.Slice(s.b, 0, k, 0, m), system.Slice(s.c, 0, outs, 0, k)
	q.States = system.Numbered("m", k)
	q.Transformation = system.Slice(s.t, 0, k, 0, n)
	return q
}

func kalmanSplit(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	s, err := splitOf(p)
	if err != nil {
		return nil, err
	}
	r := &value.Report{Title: "the four parts", Columns: []string{"part", "size", "poles"}}
	for i, name := range partNames {
		part := &value.Report{Title: partWords[i], Fields: []value.Named{
			{Name: "size", Value: value.Int(s.sizes[i])},
			{Name: "poles", Value: system.List(s.poles[i])},
		}}
		r.Fields = append(r.Fields, value.Named{Name: name, Value: part})
		r.Rows = append(r.Rows, []value.Value{value.Text(partWords[i]), value.Int(s.sizes[i]), system.List(s.poles[i])})
	}
	n, _ := system.PlantSize(p)
	s.t.Columns = system.Labels(p.States)
	q := &value.Plant{A: s.a, B: s.b, C: s.c, D: s.d, Every: p.Every, Inputs: p.Inputs, Outputs: p.Outputs,
		States: system.Numbered("k", n), Transformation: s.t, Title: "in the coordinates of the four parts"}
	r.Fields = append(r.Fields,
		value.Named{Name: "transformation", Value: s.t},
		value.Named{Name: "system", Value: q},
		value.Named{Name: "decided", Value: value.Text(s.decided)})
	return r, nil
}

func cancellations(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	s, err := splitOf(p)
	if err != nil {
		return nil, err
	}
	reasons := [4]string{"", "not seen: no output shows it", "not moved: no input reaches it", "neither moved nor seen"}
	r := &value.Report{Columns: []string{"pole", "reason", "mode"}}
	var lost []system.Root
	lasting := 0
	for i := 1; i < 4; i++ {
		for _, root := range s.poles[i] {
			lost = append(lost, root)
			how := "decays"
			if !Decays(root, p.Every != nil) {
				how = "does not decay"
				lasting++
			}
			r.Rows = append(r.Rows, []value.Value{root.Number(), value.Text(reasons[i]), value.Text(how)})
		}
	}
	n, _ := system.PlantSize(p)
	r.Title = fmt.Sprintf("%d of %d poles are lost", len(lost), n)
	if len(lost) == 0 {
		r.Title = "no pole is lost"
		r.Columns = nil
	}
	if lasting > 0 {
		r.Notes = append(r.Notes, "a lost pole that does not decay is hidden from the transfer function, not from the machine")
	}
	r.Fields = []value.Named{
		{Name: "poles", Value: system.List(lost)},
		{Name: "count", Value: value.Int(len(lost))},
		{Name: "decided", Value: value.Text(s.decided)},
	}
	if n <= system.ExactOrder {
		r.Fields = append(r.Fields, value.Named{Name: "transfer", Value: value.Later(func() value.Value {
			g, err := value.ToTransfer(s.minimal(p))
			if err != nil {
				return value.Text(err.Error())
			}
			return g
		})})
	}
	return r, nil
}
