package figure

import (
	"fmt"
	"math"
	"strings"

	"gainwright/lang/value"
)

// at most so many panels in one drawing; a response with more signals shows the first
const mostPanels = 8

// drawResponse draws outputs, inputs and states over time, those of one unit together.
// required is what must hold of the signal with a band; nil for nothing.
func drawResponse(r *value.Response, required *requiredCourse) (*Drawing, bool) {
	n := len(r.Instants)
	if n == 0 {
		return nil, false
	}
	var panels []*panel
	units := map[*panel]string{}
	left := 0
	for _, role := range []string{"output", "input", "state"} {
		if role == "state" && len(panels) > 0 {
			// States are drawn where there is nothing else.
			break
		}
		for _, s := range r.Signals {
			if s.Role != role || len(s.Values) != n {
				continue
			}
			one := curve{name: symbol(s.Name), x: r.Instants, y: s.Values, low: s.Low, high: s.High,
				staircase: r.Sampled || role == "input" && jumps(s.Values)}
			p := placeFor(panels, units, role+" "+s.Unit.Text)
			if p == nil {
				if len(panels) == mostPanels {
					left++
					continue
				}
				p = &panel{}
				panels = append(panels, p)
				units[p] = role + " " + s.Unit.Text
			}
			p.curves = append(p.curves, one)
			p.band(s.Band)
			if s.Band != nil && required != nil {
				p.must = required.of(&s)
			}
			unit, role := s.Unit.Text, role
			p.heading = func(power int) string {
				if len(p.curves) == 1 {
					return heading(p.curves[0].name, unit, power)
				}
				return heading(role+"s", unit, power)
			}
		}
	}
	if len(panels) == 0 {
		return nil, false
	}
	last := r.Instants[n-1]
	x := linear(r.Instants[0], last, 8, false)
	title := r.Title
	if title == "" {
		title = "response"
	}
	return stacked(title, describeResponse(r, panels, left)+required.described(), panels, x, func(power int) string { return heading("time", "s", power) })
}

// placeFor finds the panel of a unit that has room for a further curve.
func placeFor(panels []*panel, units map[*panel]string, unit string) *panel {
	for _, p := range panels {
		if units[p] == unit && len(p.curves) < mostCurves {
			return p
		}
	}
	return nil
}

// band shades what a signal settles into, and marks its overshoot.
func (p *panel) band(b *value.Band) {
	if b == nil {
		return
	}
	p.bands = append(p.bands, *b)
	if !math.IsNaN(b.PeakAt) {
		p.marks = append(p.marks, mark{b.PeakAt, b.Peak, brief(b.Peak)})
	}
	if !math.IsInf(b.From, 0) && b.From > 0 {
		p.marks = append(p.marks, mark{b.From, nearest(b, p.curves[len(p.curves)-1]), "settled at " + briefer(b.From) + " s"})
	}
}

// nearest is the edge of the band that the curve comes in by.
func nearest(b *value.Band, c curve) float64 {
	for i := len(c.x) - 1; i >= 0; i-- {
		if c.x[i] < b.From && !math.IsNaN(c.y[i]) {
			if c.y[i] > (b.Low+b.High)/2 {
				return b.High
			}
			return b.Low
		}
	}
	return b.Low
}

// jumps tells whether a signal stands still between few levels, as a held one does.
func jumps(values []float64) bool {
	still := 0
	for i := 1; i < len(values); i++ {
		if values[i] == values[i-1] {
			still++
		}
	}
	return len(values) > 2 && still > len(values)/2
}

func describeResponse(r *value.Response, panels []*panel, left int) string {
	var parts []string
	for _, p := range panels {
		for _, c := range p.curves {
			low, high := math.Inf(1), math.Inf(-1)
			for _, v := range c.y {
				low, high = math.Min(low, v), math.Max(high, v)
			}
			parts = append(parts, fmt.Sprintf("%s from %s to %s, at the end %s", c.name, brief(low), brief(high), brief(c.y[len(c.y)-1])))
		}
	}
	text := fmt.Sprintf("Signals over time from %s s to %s s. %s.", brief(r.Instants[0]), brief(r.Instants[len(r.Instants)-1]), strings.Join(parts, "; "))
	if left > 0 {
		text += fmt.Sprintf(" %d more signals are not drawn.", left)
	}
	return text
}
