package reach

import (
	"fmt"
	"math"
	"math/cmplx"
	"sort"
	"strings"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// mostCandidates bounds the number of subsets to 2¹⁰ − 1.
const mostCandidates = 10

var optionBuiltins = []*value.Builtin{
	{
		Name: "sensor_options", Family: "reach",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "the plant"},
			{Name: "candidates", Shape: value.NameList, Optional: true, Default: "all outputs", Doc: "names of outputs or states that could be measured, at most 10"},
		},
		Result:  "report, a row a subset, best first",
		Summary: "what each choice of sensors would see, and by what margin",
		Doc: "For each subset of the candidates: how many modes are seen, the modes missed, the mode seen most weakly with its strength, and the distance to missing a mode " +
			"(in declared ranges where all are declared). Ordered by modes seen, then by distance. Field best names the first.",
		Examples: []value.Example{
			{Input: "P = plant([[0, 1], [0, 0]], [[0], [1]], [[1, 0], [0, 1]], outputs: [\"position\", \"speed\"])\nsensor_options(P).best", Output: "[\"position\", \"speed\"]"},
		},
		Errors:  []string{"a candidate that is no output and no state", "more than 10 candidates"},
		Source:  "Hamdan & Nayfeh 1989, J. Guidance 12; Eising 1984",
		SeeAlso: []string{"observability", "actuator_options"},
		Func:    func(c *value.Call) (value.Value, error) { return options(c, true) },
	},
	{
		Name: "actuator_options", Family: "reach",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "the plant"},
			{Name: "candidates", Shape: value.NameList, Optional: true, Default: "all inputs", Doc: "names of inputs that could be driven, at most 10"},
		},
		Result:  "report, a row a subset, best first",
		Summary: "what each choice of actuators would move, and by what margin",
		Doc:     "The dual of sensor_options: modes moved, modes missed, the mode moved most weakly, the distance to missing a mode.",
		Examples: []value.Example{
			{Input: "P = plant([[-1, 0], [0, -2]], [[1, 0], [0, 1]], inputs: [\"valve\", \"heater\"])\nactuator_options(P).best", Output: "[\"valve\", \"heater\"]"},
		},
		Errors:  []string{"a candidate that is no input", "more than 10 candidates"},
		Source:  "Hamdan & Nayfeh 1989, J. Guidance 12; Eising 1984",
		SeeAlso: []string{"reachability", "sensor_options"},
		Func:    func(c *value.Call) (value.Value, error) { return options(c, false) },
	},
}

// option is one subset with what it reaches.
type option struct {
	names     []string
	reached   int
	missing   []system.Root
	weakest   string
	low, high float64
}

func options(c *value.Call, dual bool) (value.Value, error) {
	p := c.Plant("plant")
	all, err := candidates(c, p, dual)
	if err != nil {
		return nil, err
	}
	n, _ := system.PlantSize(p)
	var rows []*option
	for set := 1; set < 1<<len(all.signals); set++ {
		if err := c.Context.Err(); err != nil {
			return nil, err
		}
		o, err := all.option(c, set, dual)
		if err != nil {
			return nil, err
		}
		rows = append(rows, o)
		if c.Progress != nil {
			c.Progress(set, 1<<len(all.signals)-1)
		}
	}
	sort.SliceStable(rows, func(i, j int) bool {
		a, b := rows[i], rows[j]
		if a.reached != b.reached {
			return a.reached > b.reached
		}
		if a.low != b.low {
			return a.low > b.low
		}
		return len(a.names) < len(b.names)
	})
	verb := "moved"
	title := "actuators"
	if dual {
		verb, title = "seen", "sensors"
	}
	r := &value.Report{Title: title + ", best first", Columns: []string{title, "modes " + verb, "missed", "weakest " + verb, "distance"}}
	for _, o := range rows {
		r.Rows = append(r.Rows, []value.Value{
			value.Text(strings.Join(o.names, ", ")), value.Text(fmt.Sprintf("%d of %d", o.reached, n)),
			system.List(o.missing), value.Text(o.weakest), bound(o.low, o.high)})
	}
	best := &value.List{}
	for _, name := range rows[0].names {
		best.Items = append(best.Items, value.Text(name))
	}
	r.Fields = []value.Named{{Name: "best", Value: best}}
	if _, _, ranged := all.scaled(); !ranged {
		r.Notes = append(r.Notes, "distances and strengths are in these units: declare ranges to compare")
	}
	return r, nil
}

// candidates gathers the pair with one column for each candidate.
func candidates(c *value.Call, p *value.Plant, dual bool) (*pair, error) {
	full, err := pairOfPlant(p, dual)
	if err != nil {
		return nil, err
	}
	n, _ := system.PlantSize(p)
	pool, columns := full.signals, full.b
	if dual { // states may be measured although they are no outputs
		pool = append(append([]value.Signal(nil), pool...), p.States...)
		columns = system.Block([][]*value.Matrix{{columns, system.Identity(n)}})
	}
	var picks []int
	if list := c.List("candidates"); list != nil {
		for _, item := range list.Items {
			k := signalIndex(pool, string(item.(value.Text)))
			if k < 0 {
				var names []string
				for _, s := range pool {
					names = append(names, s.Name)
				}
				e := value.Errf(diag.Name, "candidates", "%q is no candidate of this plant", string(item.(value.Text)))
				if near := diag.Nearest(string(item.(value.Text)), names); near != "" {
					e.WithHelp("did you mean %q?", near)
				}
				return nil, e
			}
			picks = append(picks, k)
		}
	} else {
		for k := range full.signals {
			picks = append(picks, k)
		}
	}
	if len(picks) == 0 || len(picks) > mostCandidates {
		return nil, value.Errf(diag.Limit, "candidates", "%d candidates; between 1 and %d can be compared", len(picks), mostCandidates)
	}
	q := *full
	q.b = system.Columns(columns, picks...)
	q.signals = nil
	for _, k := range picks {
		q.signals = append(q.signals, pool[k])
	}
	return &q, nil
}

// option judges the subset whose bits are set.
func (p *pair) option(c *value.Call, set int, dual bool) (*option, error) {
	q := *p
	q.signals = nil
	var picks []int
	o := &option{}
	for k, s := range p.signals {
		if set&(1<<k) != 0 {
			picks = append(picks, k)
			q.signals = append(q.signals, s)
			o.names = append(o.names, s.Name)
		}
	}
	q.b = system.Columns(p.b, picks...)
	d, err := q.decide()
	if err != nil {
		return nil, err
	}
	o.reached, o.missing = d.rank, d.missing
	a, b, _ := q.scaled()
	n, _ := q.a.Dims()
	if o.reached == n && n > 0 {
		found, err := numeric.DistanceToUnreachable(c.Context, a, b, distanceCap)
		if err != nil {
			return nil, system.Refused(err, "plant")
		}
		o.low, o.high = found.Low, found.High
	}
	if n == 0 {
		return o, nil
	}
	e, err := numeric.Eigen(a)
	if err != nil {
		return nil, system.Refused(err, "plant")
	}
	weakest := math.Inf(1)
	for k, v := range e.Values {
		total := 0.0
		for j := range picks {
			total = math.Hypot(total, grip(e.Left, k, b, j, false))
		}
		if imag(v) >= 0 && total < weakest && !isMissing(d.missing, v) {
			weakest = total
			o.weakest = fmt.Sprintf("%.4g ± %.4gi: %s", real(v), imag(v), strengthText(total))
			if imag(v) == 0 {
				o.weakest = fmt.Sprintf("%.4g: %s", real(v), strengthText(total))
			}
		}
	}
	return o, nil
}

func isMissing(missing []system.Root, v complex128) bool {
	for _, r := range missing {
		if cmplx.Abs(r.Value-v) <= 1e-9*math.Max(1, cmplx.Abs(v)) {
			return true
		}
	}
	return false
}
