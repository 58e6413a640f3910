package eval

import (
	"fmt"
	"math"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// the most entries of a gain that get columns of their own in the table
const mostScheduled = 6

// report lays the schedule out.
func (s *schedule) report() *value.Report {
	head := s.text
	if !s.unit.IsNone() {
		head += " [" + s.unit.Text + "]"
	}
	out := &value.Report{Columns: []string{head}}
	entries := s.entryNames()
	if len(entries) <= mostScheduled {
		out.Columns = append(out.Columns, entries...)
	}
	last := []string{"difference"}
	if s.role != "" {
		last = []string{"least damping", "slowest decay"}
		out.Title = "the gains at the nodes, and between them the loops that interpolated gains close"
	} else {
		out.Title = "the values at the nodes, and between them the interpolated ones with their difference from the true ones"
	}
	out.Columns = append(out.Columns, last...)
	for k := range s.nodes {
		out.Rows = append(out.Rows, s.row(&s.nodes[k], len(entries) <= mostScheduled))
		if k < len(s.between) {
			out.Rows = append(out.Rows, s.row(&s.between[k], len(entries) <= mostScheduled && s.role == ""))
		}
	}
	out.Fields = s.fields()
	out.Notes = s.notes()
	return out
}

func (s *schedule) entryNames() []string {
	var out []string
	for i := range s.size[0] {
		for j := range s.size[1] {
			switch {
			case s.size == [2]int{1, 1} && s.columns == nil:
				name := "value"
				if !s.result.IsNone() {
					name += " [" + s.result.Text + "]"
				}
				out = append(out, name)
			case s.rows == nil || s.columns == nil:
				out = append(out, fmt.Sprintf("%d, %d", i+1, j+1))
			case len(s.rows) == 1:
				out = append(out, s.columns[j].Name)
			case len(s.columns) == 1:
				out = append(out, s.rows[i].Name)
			default:
				out = append(out, s.rows[i].Name+", "+s.columns[j].Name)
			}
		}
	}
	return out
}

func (s *schedule) row(n *scheduled, withEntries bool) []value.Value {
	row := []value.Value{value.Number{F: n.parameter}}
	if len(s.entryNames()) <= mostScheduled {
		for _, x := range n.entries {
			if withEntries {
				row = append(row, value.FloatErr(x, n.err))
			} else {
				row = append(row, nil)
			}
		}
	}
	if s.role != "" {
		return append(row, n.damping, n.decay)
	}
	if n.there == nil {
		return append(row, nil)
	}
	off := 0.0
	for k, x := range n.there {
		if d := n.entries[k] - x; math.Abs(d) > math.Abs(off) {
			off = d
		}
	}
	return append(row, value.Float(off))
}

// fields are the smallest figures, and what a controller needs.
func (s *schedule) fields() []value.Named {
	var out []value.Named
	if s.role != "" {
		out = append(out, value.Named{Name: "least_damping", Value: s.smallest(func(n *scheduled) value.Value { return n.damping })},
			value.Named{Name: "slowest_decay", Value: s.smallest(func(n *scheduled) value.Value { return n.decay })})
	} else {
		worst := 0.0
		for k := range s.between {
			for i, x := range s.between[k].there {
				worst = max(worst, math.Abs(s.between[k].entries[i]-x))
			}
		}
		out = append(out, value.Named{Name: "largest_difference", Value: value.Float(worst)})
	}
	parameter := func(f float64) value.Value {
		if s.unit.IsNone() {
			return value.Number{F: f}
		}
		return value.Quantity{Magnitude: value.Number{F: f}, Unit: s.unit}
	}
	nodes, values := &value.List{}, make([]float64, 0, len(s.nodes)*len(s.nodes[0].entries))
	worst := 0.0
	for _, n := range s.nodes {
		nodes.Items = append(nodes.Items, parameter(n.parameter))
		values = append(values, n.entries...)
		worst = max(worst, n.err)
	}
	table := value.FloatMatrix(len(s.nodes), len(s.nodes[0].entries), values, worst)
	table.Columns = s.entryNames()
	for _, n := range s.nodes {
		table.Rows = append(table.Rows, s.valueText(n.parameter))
	}
	return append(out, value.Named{Name: "nodes", Value: nodes}, value.Named{Name: "values", Value: table}, value.Named{Name: "at", Value: s.lookUp()})
}

// lookUp is the function that interpolates, as a controller would.
func (s *schedule) lookUp() *value.Function {
	doc := "a value of the parameter from the first node to the last"
	return &value.Function{Name: "at", Params: []string{s.text}, Builtin: &value.Builtin{
		Name: "at", Params: []value.Param{{Name: s.text, Shape: value.Anything, Doc: doc}},
		Func: func(c *value.Call) (value.Value, error) { return s.interpolated(c.Args[s.text]) },
	}}
}

// interpolated gives the gain or number between the nodes by straight lines.
func (s *schedule) interpolated(v value.Value) (value.Value, error) {
	at, err := s.inParameterUnit(v)
	if err != nil {
		return nil, err
	}
	first, last := s.nodes[0].parameter, s.nodes[len(s.nodes)-1].parameter
	if !(min(first, last) <= at && at <= max(first, last)) {
		return nil, value.Errf(diag.Numerical, s.text, "%s lies outside the schedule, which goes from %s to %s", s.valueText(at), s.valueText(first), s.valueText(last))
	}
	place := (at - first) / (last - first) * float64(len(s.nodes)-1)
	k := min(int(place), len(s.nodes)-2)
	left, right, part := &s.nodes[k], &s.nodes[k+1], place-float64(k)
	entries := make([]float64, len(left.entries))
	for i, x := range left.entries {
		entries[i] = x + part*(right.entries[i]-x)
	}
	if s.size == [2]int{1, 1} && s.columns == nil {
		return (&value.StudyResult{Unit: s.result}).Number(entries[0]), nil
	}
	out := value.FloatMatrix(s.size[0], s.size[1], entries, max(left.err, right.err))
	out.Rows, out.Columns = plainNames(s.rows), plainNames(s.columns)
	return out, nil
}

func plainNames(signals []value.Signal) []string {
	var out []string
	for _, s := range signals {
		out = append(out, s.Name)
	}
	return out
}

// smallest is the least of a figure at the nodes and between them.
func (s *schedule) smallest(figure func(*scheduled) value.Value) value.Value {
	var best value.Value
	for _, list := range [][]scheduled{s.nodes, s.between} {
		for k := range list {
			if v := figure(&list[k]); best == nil || floatOf(v) < floatOf(best) {
				best = v
			}
		}
	}
	return best
}

func floatOf(v value.Value) float64 {
	if n, ok := value.Force(v).(value.Number); ok {
		return n.Float64()
	}
	return math.NaN()
}

// notes warn of intervals in which interpolation loses what the nodes have.
func (s *schedule) notes() []string {
	if s.role == "" {
		return nil
	}
	var out []string
	for k := range s.between {
		b, left, right := &s.between[k], &s.nodes[k], &s.nodes[k+1]
		damping, lower := floatOf(b.damping), min(floatOf(left.damping), floatOf(right.damping))
		switch {
		case floatOf(b.decay) <= 0 && min(floatOf(left.decay), floatOf(right.decay)) > 0:
			out = append(out, fmt.Sprintf("between %s and %s the interpolated gain does not stabilise the loop, and both nodes do: take more nodes",
				s.valueText(left.parameter), s.valueText(right.parameter)))
		case damping < 0.9*lower:
			out = append(out, fmt.Sprintf("between %s and %s the damping falls to %.3g, below %.3g at the nodes: more nodes would help",
				s.valueText(left.parameter), s.valueText(right.parameter), damping, lower))
		}
	}
	return out
}
