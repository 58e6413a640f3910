package figure

import (
	"math"

	"gainwright/lang/value"
)

// DrawFigures draws the response that figures were read off, with what is required of them:
// the side of a largest overshoot that misses it, and all outside the band after a longest
// settling. limits gives what is required of a field by its name, an overshoot in per cent,
// a settling in s; it may be nil. Of figures of several outputs nothing required is drawn.
func DrawFigures(r *value.Report, limits func(field string) []Limit) (*Drawing, bool) {
	if r.Basis == nil {
		return nil, false
	}
	within, ok := fieldNumber(r, "band")
	if limits == nil || !ok || !(within > 0) {
		return drawResponse(r.Basis, nil)
	}
	least := func(field string) float64 {
		bound := math.Inf(1)
		for _, l := range limits(field) {
			if l.Op == "<" || l.Op == "<=" {
				bound = math.Min(bound, l.Bound)
			}
		}
		return bound
	}
	return drawResponse(r.Basis, &requiredCourse{overshoot: least("overshoot") / 100, settling: least("settling"), within: within / 100})
}

// requiredCourse is what figures must stay under; +Inf for nothing.
type requiredCourse struct {
	overshoot float64 // as a part of the way
	settling  float64 // in s
	within    float64 // the band, as a part of the way
}

func (q *requiredCourse) described() string {
	text := ""
	if q == nil {
		return text
	}
	if !math.IsInf(q.overshoot, 0) {
		text += " Required: an overshoot of at most " + brief(100*q.overshoot) + " %."
	}
	if !math.IsInf(q.settling, 0) {
		text += " Required: settled by " + brief(q.settling) + " s."
	}
	return text
}

// mustStay is where a signal must stay, in its unit.
type mustStay struct {
	requiredCourse
	band       value.Band
	ceiling    float64 // of the overshoot
	hasCeiling bool
	downwards  bool // the signal goes down: the ceiling is a floor
}

// of turns what is required into places of a signal: its band is as wide on either side as
// that part of the way, and the way goes from its first value to the band.
func (q *requiredCourse) of(s *value.Trace) *mustStay {
	m := &mustStay{requiredCourse: *q, band: *s.Band}
	final := (s.Band.Low + s.Band.High) / 2
	way := (s.Band.High - s.Band.Low) / 2 / q.within
	ahead := final - s.Values[0]
	if !math.IsNaN(s.Band.PeakAt) { // it may begin beyond its final value
		ahead = s.Band.Peak - final
	}
	if way > 0 && ahead != 0 && !math.IsNaN(ahead) && !math.IsInf(q.overshoot, 0) {
		m.hasCeiling, m.downwards = true, ahead < 0
		m.ceiling = final + math.Copysign(way, ahead)*q.overshoot
	}
	return m
}

// mustStay shades what is not allowed.
func (c *canvas) mustStay(m *mustStay, x, y *axis) {
	shade := func(from, low, high float64) {
		low, high = math.Max(low, y.low), math.Min(high, y.high)
		if low < high {
			c.rectangle("shade", from, y.place(high), x.to-from, y.place(low)-y.place(high))
		}
	}
	floor, ceiling := y.low, y.high // of what the overshoot leaves
	if m.hasCeiling {
		if m.downwards {
			floor = math.Max(floor, m.ceiling)
			shade(x.from, y.low, floor)
		} else {
			ceiling = math.Min(ceiling, m.ceiling)
			shade(x.from, ceiling, y.high)
		}
		if m.ceiling > y.low && m.ceiling < y.high {
			at := y.place(m.ceiling)
			c.line("limit", x.from, at, x.to, at)
			c.written = append(c.written, written{x.from, at + 4, x.to - x.from})
			up := at - 5
			if m.downwards {
				up = at + 14
			}
			if up > y.to+10 && up < y.from-2 {
				c.requiredText(x.to-6, up, end, "overshoot at most "+brief(100*m.overshoot)+" %")
			}
		}
	}
	if !(m.settling > x.low && m.settling < x.high) {
		return
	}
	at := x.place(m.settling)
	shade(at, floor, math.Min(m.band.Low, ceiling))
	shade(at, math.Max(m.band.High, floor), ceiling)
	c.line("limit", at, y.from, at, y.to)
	text := "settled by " + brief(m.settling) + " s"
	if at+6+textWidth(text) > x.to {
		c.requiredText(at-6, y.from-6, end, text)
	} else {
		c.requiredText(at+6, y.from-6, start, text)
	}
}

// requiredText writes words that those of marks keep clear of.
func (c *canvas) requiredText(x, y float64, a anchor, text string) {
	width := textWidth(text)
	c.written = append(c.written, written{words{x, y, a}.from(width), y, width})
	c.text(x, y, a, "", text)
}
