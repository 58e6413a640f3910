package response

import (
	"fmt"
	"math"
	"math/big"
	"strconv"

	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

var figuresBuiltin = &value.Builtin{
	Name: "figures", Family: "response",
	Params: []value.Param{
		{Name: "response", Shape: value.Anything, Doc: "what response gave"},
		{Name: "within", Shape: value.AReal, Named: true, Optional: true, Default: "2%", Doc: "the band of settling, as a part of the way from start to final value"},
		{Name: "output", Shape: value.AText, Named: true, Optional: true, Default: "all outputs", Doc: "one output by name"},
	},
	Result:  "report; of several outputs a row each",
	Summary: "overshoot, settling, rise and the like of a response",
	Doc: "The way is from where the output starts before the drive acts to its final value. overshoot is the farthest beyond the final value and undershoot the farthest beyond the start, both as parts of the way, shown in per cent; overshoot_at is when. " +
		"settling is the last time the output is outside the band around its final value; of a sampled system the first sample from which on it is inside. rise is the time from the first crossing of 10 % of the way to that of 90 %. largest_input is the largest size of the input. " +
		"Where an output ends where it started (after an impulse) settling is within that part of its largest excursion, and there is no overshoot and no rise.\n\n" +
		"Linear responses to a step, an impulse or a start are followed for all time, not only until: the final value is exact where the plant is, turns and crossings are located on the response itself. " +
		"Limited, sampled-law and nonlinear responses are followed until their end. A response without a final value says why in its place. " +
		"In a document the response is drawn with the band, and, where f is shown and f.overshoot <= 5% or f.settling <= 2 s is required, with what these forbid shaded.",
	Examples: []value.Example{
		{Input: "figures(response(4/(s^2 + 2*s + 4)))", Output: "figures of the step response\n  final_value   = 1\n  largest_input = 1\n  overshoot     ≈ 16.303 %\n  overshoot_at  ≈ 1.8138 s\n  undershoot    = 0 %\n  settling      ≈ 4.0382 s\n  band          = 2 %\n  rise          ≈ 0.81879 s\n  rise_band     = [10 %, 90 %]"},
		{Input: "figures(response(1/(s*(s + 1)))).final_value", Output: "\"none: it keeps growing, as an integrator's answer does\""},
	},
	Errors:  []string{"a value that is no response", "a band outside 0 to 1"},
	Source:  "definitions as in Franklin, Powell & Emami-Naeini, Feedback Control of Dynamic Systems, chapter 3",
	SeeAlso: []string{"response", "least_damping", "pole_pair"},
	Func:    figures,
}

// numbers of one output
type outputFigures struct {
	name                               string
	final                              value.Value
	overshoot, overshootAt, undershoot value.Value
	settling, rise                     value.Value
	hidden                             string
	trace                              int
	band                               *value.Band // nil without a final value
}

const noFigure = value.Text("none")

func figures(c *value.Call) (value.Value, error) {
	r, ok := c.Args["response"].(*value.Response)
	if !ok {
		return nil, value.Errf(diag.Type, "response", "figures needs a response; it is %s", value.Describe(c.Args["response"])).
			WithHelp("figures(response(P, to: \"step\"))")
	}
	course, ok := r.Source.(*course)
	if !ok {
		return nil, value.Errf(diag.Type, "response", "this response keeps nothing to take figures from")
	}
	within := value.Rat(big.NewRat(1, 50))
	if c.Has("within") {
		within = c.Number("within")
	}
	band := within.Float64()
	if !(band > 0 && band < 1) {
		return nil, value.Errf(diag.Type, "within", "the band must lie between 0 and 100 %%; it is %.4g %%", 100*band)
	}
	only := c.Text("output", "")
	var all []*outputFigures
	for i, s := range course.q.plant.Outputs {
		if only != "" && s.Name != only {
			continue
		}
		f, err := course.outputFigures(r, i, band)
		if err != nil {
			return nil, err
		}
		all = append(all, f)
	}
	if len(all) == 0 {
		return nil, value.Errf(diag.Name, "output", "the response has no output named %q", only)
	}
	return course.report(r, all, within)
}

func seconds(t float64) string { return strconv.FormatFloat(t, 'g', 5, 64) + " s" }

// outputFigures follows one output.
func (c *course) outputFigures(r *value.Response, i int, within float64) (*outputFigures, error) {
	trace := &r.Signals[i]
	f := &outputFigures{name: trace.Name, trace: i, overshoot: noFigure, overshootAt: noFigure, undershoot: noFigure, settling: noFigure, rise: noFigure}
	start := dot(c.q.c.row(i), c.q.start)
	if c.wholeMotion() {
		return f, c.wholeFigures(f, trace, i, start, within)
	}
	final, none, err := c.restOf(i, within, trace)
	if err != nil || none != "" {
		f.final = value.Text(none)
		return f, err
	}
	f.final = quantity(final, trace.Unit)
	if c.q.dynamics != nil {
		start = trace.Values[0]
	}
	scan := func(reading *reading) error {
		if c.sampled {
			followSamples(reading, trace, r.Instants)
		} else {
			follow(reading, c.mesh(), c.at(i))
		}
		return c.q.call.Context.Err()
	}
	return f, f.fill(final, start, within, scan, math.Max(1e-11, trace.Err/math.Max(largest(trace.Values), 1e-300)), c.q.until, largest(trace.Values))
}

func (c *course) wholeFigures(f *outputFigures, trace *value.Trace, i int, start, within float64) error {
	t, err := c.q.tailOf(i)
	if err != nil {
		return err
	}
	if t.none != "" {
		f.final = value.Text(t.none)
		return nil
	}
	f.final, f.hidden = quantity(t.final, trace.Unit), t.hidden
	relative := math.Max(1e-11, t.motionError(t.final.Float64()-start, c.q.clock > 0))
	err = f.fill(t.final, start, within, t.scan, relative, math.Inf(1), largest(trace.Values))
	if err == errUnlocated {
		f.hidden = err.Error()
		return nil
	}
	return err
}

// noWay is the part of a signal's largest size below which the way it goes in the end
// cannot be told from none.
const noWay = 1e-10

// fill reads the figures; scan follows the signal, whose largest size was seen, into a
// reading.
func (f *outputFigures) fill(final value.Number, start, within float64, scan func(*reading) error, relative, until, seen float64) error {
	end := final.Float64()
	way := end - start
	size := math.Max(math.Abs(end), math.Abs(start))
	returns := math.Abs(way) <= math.Max(1e-12*size, math.Max(2*final.ErrorEstimate(), noWay*seen))
	if returns && final.ErrorEstimate() > 0 {
		end = start
	}
	if returns { // it ends where it began: measure by its largest excursion
		first := newReading(end-1, 1, within)
		if err := f.excursion(first, end, scan); err != nil {
			return err
		}
		peak := first.peak
		if peak <= 1e-13*size || peak == 0 {
			f.settling = timeOf(0, 0)
			return nil
		}
		r := newReading(end-peak, peak, within)
		if err := scan(r); err != nil {
			return err
		}
		f.settling = r.settling(relative, within, until)
		f.band = r.band(end, within*peak)
		return nil
	}
	r := newReading(start, way, within)
	if err := scan(r); err != nil {
		return err
	}
	f.overshoot, f.undershoot = percent(0, 0), percent(0, 0)
	if over := r.top - 1; over > math.Max(rounding, 10*relative) {
		f.overshoot, f.overshootAt = percent(over, relative), timeOf(r.topAt, math.Sqrt(relative)*0.01)
	}
	if under := -r.bottom; under > math.Max(rounding, 10*relative) {
		f.undershoot = percent(under, relative)
	}
	f.settling = r.settling(relative, within, until)
	f.band = r.band(end, within*math.Abs(way))
	if f.overshootAt != noFigure {
		f.band.PeakAt, f.band.Peak = r.topAt, start+way*r.top
	}
	if !math.IsNaN(r.highAt) && !math.IsNaN(r.lowAt) {
		f.rise = timeOf(r.highAt-r.lowAt, relative)
	}
	return nil
}

// excursion finds the largest distance from the final value, in first.peak.
func (f *outputFigures) excursion(first *reading, end float64, scan func(*reading) error) error {
	for range 3 { // the way is unknown at first: measure with what was found before
		if err := scan(first); err != nil {
			return err
		}
		peak := math.Max(first.top-1, 1-first.bottom) * first.way
		if peak <= 0 || peak > 0.1*first.way && peak < 10*first.way {
			first.peak = math.Max(peak, 0)
			return nil
		}
		*first = *newReading(end-peak, peak, first.within)
	}
	first.peak = math.Max(first.top-1, 1-first.bottom) * first.way
	return nil
}

func (r *reading) settling(relative, within, until float64) value.Value {
	if r.outside {
		return value.Text(fmt.Sprintf("not within %.4g %% by %s", 100*within, seconds(until)))
	}
	return timeOf(r.settledAt, relative/within*0.5)
}

// band is what the signal settles into.
func (r *reading) band(final, half float64) *value.Band {
	b := &value.Band{Low: final - half, High: final + half, From: r.settledAt, PeakAt: math.NaN(), Peak: math.NaN()}
	if r.outside {
		b.From = math.Inf(1)
	}
	return b
}

func quantity(n value.Number, u value.Unit) value.Value {
	if u.IsNone() {
		return n
	}
	return value.Quantity{Magnitude: n, Unit: u}
}

func timeOf(t, relative float64) value.Value {
	if t == 0 {
		return value.Quantity{Magnitude: value.Int(0), Unit: value.Second()}
	}
	return value.Quantity{Magnitude: value.FloatErr(t, relative*t), Unit: value.Second()}
}

// percent shows a part in per cent; its value is the part.
func percent(part, relative float64) value.Value {
	if part == 0 {
		return value.Quantity{Magnitude: value.Int(0), Unit: value.Percent()}
	}
	return value.Quantity{Magnitude: value.FloatErr(100*part, 100*math.Max(part, 1)*relative), Unit: value.Percent()}
}

// report puts the figures together: fields for one output, rows for several.
func (c *course) report(r *value.Response, all []*outputFigures, within value.Number) (*value.Report, error) {
	input, err := c.largestInput(r)
	if err != nil {
		return nil, err
	}
	hundred, err := value.Multiply(within, value.Int(100))
	if err != nil {
		return nil, err
	}
	band := value.Quantity{Magnitude: hundred.(value.Number), Unit: value.Percent()}
	riseBand := &value.List{Items: []value.Value{
		value.Quantity{Magnitude: value.Int(10), Unit: value.Percent()}, value.Quantity{Magnitude: value.Int(90), Unit: value.Percent()}}}
	basis := *r
	basis.Signals = append([]value.Trace{}, r.Signals...)
	for _, f := range all {
		basis.Signals[f.trace].Band = f.band
	}
	out := &value.Report{Title: "figures of the " + r.Title, Basis: &basis}
	for _, f := range all {
		if f.hidden != "" {
			out.Notes = append(out.Notes, f.hidden)
			break
		}
	}
	if len(c.q.x0)+len(c.q.u0) > 0 && (largest(c.q.x0) > 0 || largest(c.q.u0) > 0 || largest(c.q.y0) > 0) {
		out.Notes = append(out.Notes, "signals are counted from the operating point")
	}
	if len(all) == 1 {
		f := all[0]
		out.Fields = []value.Named{{Name: "final_value", Value: f.final}, {Name: "largest_input", Value: input}, {Name: "overshoot", Value: f.overshoot},
			{Name: "overshoot_at", Value: f.overshootAt}, {Name: "undershoot", Value: f.undershoot}, {Name: "settling", Value: f.settling},
			{Name: "band", Value: band}, {Name: "rise", Value: f.rise}, {Name: "rise_band", Value: riseBand}}
		return out, nil
	}
	out.Fields = []value.Named{{Name: "largest_input", Value: input}, {Name: "band", Value: band}, {Name: "rise_band", Value: riseBand}}
	out.Columns = []string{"output", "final value", "overshoot", "overshoot at", "undershoot", "settling", "rise"}
	for _, f := range all {
		out.Rows = append(out.Rows, []value.Value{value.Text(f.name), f.final, f.overshoot, f.overshootAt, f.undershoot, f.settling, f.rise})
	}
	return out, nil
}

// largestInput is the largest size of each input.
func (c *course) largestInput(r *value.Response) (value.Value, error) {
	q := c.q
	var fields []value.Named
	for i, s := range q.plant.Inputs {
		v, err := c.peakOf(r, i)
		if err != nil {
			return nil, err
		}
		fields = append(fields, value.Named{Name: s.Name, Value: v})
	}
	switch len(fields) {
	case 0:
		return noFigure, nil
	case 1:
		return fields[0].Value, nil
	}
	return &value.Report{Fields: fields}, nil
}

func (c *course) peakOf(r *value.Response, i int) (value.Value, error) {
	q := c.q
	trace := &r.Signals[q.p+i]
	seen := largest(trace.Values)
	if q.drive.kind == impulse && q.clock == 0 && q.drive.channel == i {
		return value.Text("none: an impulse"), nil
	}
	row := q.closedC.row(q.p + i)
	if !q.closed || c.noisy || largest(row) == 0 {
		if q.drive.kind == step && q.drive.channel == i && q.drive.exactly.IsExact() && !q.limited && !q.closed {
			return quantity(value.Rat(new(big.Rat).Abs(q.drive.exactly.Exact)), trace.Unit), nil
		}
		return quantity(value.Number{F: seen, Err: trace.Err}, trace.Unit), nil
	}
	if c.wholeMotion() {
		t, err := q.tailOf(q.p + i)
		if err != nil {
			return nil, err
		}
		if t.none == "" {
			size := math.Max(math.Abs(t.final.Float64()), seen)
			if size == 0 {
				return quantity(value.Int(0), trace.Unit), nil
			}
			reading := newReading(t.final.Float64()-size, size, 1e-6)
			if err := t.scan(reading); err == nil {
				peak := math.Max(reading.peak, math.Abs(t.final.Float64()))
				return quantity(value.FloatErr(peak, 1e-11*peak), trace.Unit), nil
			} else if err != errUnlocated {
				return nil, system.Refused(err, "response")
			}
		}
	} else if !trace.Held {
		reading := newReading(0, 1, 0.02)
		follow(reading, c.mesh(), c.at(q.p+i))
		seen = math.Max(seen, reading.peak)
	}
	return quantity(value.FloatErr(seen, trace.Err), trace.Unit), nil
}
