package figure

import (
	"fmt"
	"math"
	"strings"

	"gainwright/lang/value"
)

// PoleMapTitle begins the title of a report that is drawn as a pole map. Its table has the
// columns "what" ("pole", "zero", "wanted") and "place"; its fields may hold damping and
// decay, what is required of every pole, and every, the sample time in s.
const PoleMapTitle = "pole map"

// IsPoleMap tells whether a report is drawn as a pole map.
func IsPoleMap(r *value.Report) bool {
	return strings.HasPrefix(r.Title, PoleMapTitle) && len(r.Columns) >= 2 && r.Columns[0] == "what" && r.Columns[1] == "place"
}

type spot struct {
	what   string
	re, im float64
}

func spots(r *value.Report) []spot {
	var all []spot
	for _, row := range r.Rows {
		if len(row) < 2 {
			continue
		}
		what, ok := row[0].(value.Text)
		if !ok {
			continue
		}
		s := spot{what: string(what)}
		switch x := value.Force(row[1]).(type) {
		case value.Number:
			s.re = x.Float64()
		case value.Complex:
			z := x.Complex128()
			s.re, s.im = real(z), imag(z)
		default:
			continue
		}
		if !math.IsNaN(s.re+s.im) && !math.IsInf(s.re, 0) && !math.IsInf(s.im, 0) {
			all = append(all, s)
		}
	}
	return all
}

func fieldNumber(r *value.Report, name string) (float64, bool) {
	for _, f := range r.Fields {
		if f.Name == name {
			switch x := value.Force(f.Value).(type) {
			case value.Number:
				return x.Float64(), true
			case value.Quantity:
				return x.Magnitude.Float64(), true
			}
		}
	}
	return 0, false
}

// the height of the drawing's field
const mapHeight = 330.0

// drawPoleMap draws poles as crosses, zeros as circles and wanted poles as squares, with
// equal scales on both axes, and shades where no pole may lie.
func drawPoleMap(r *value.Report) (*Drawing, bool) {
	all := spots(r)
	if len(all) == 0 {
		return nil, false
	}
	_, sampled := fieldNumber(r, "every")
	drawn, far := reach(all, sampled)
	left, right, up := 0.0, 0.0, 0.0
	if sampled {
		left, right, up = -1, 1, 1
	}
	for _, s := range drawn {
		left, right, up = math.Min(left, s.re), math.Max(right, s.re), math.Max(up, math.Abs(s.im))
	}
	if decay, ok := fieldNumber(r, "decay"); ok && !sampled && decay < farZero*(right-left+up) {
		left = math.Min(left, -decay)
	}
	x, y := mapAxes(left, right, up)
	var c canvas
	height := headRoom + mapHeight + footRoom
	c.begin(pageWidth, height, "Pole map", describeMap(all, sampled))
	c.inside(x.from, y.to, x.to-x.from, y.from-y.to, func() { c.forbidden(r, x, y, sampled) })
	c.mapGrid(x, y, sampled)
	if sampled {
		c.ellipse("axis", x.place(0), y.place(0), x.place(1)-x.place(0), y.place(0)-y.place(1))
	}
	for _, s := range drawn {
		c.spot(s.what, x.place(s.re), y.place(s.im))
	}
	c.mapKey(drawn, x)
	if len(far) > 0 {
		c.text(x.from+6, y.from-8, start, "quiet", shortened("not drawn, farther away: "+placesText(far), x.to-x.from-12))
	}
	return &c.Drawing, true
}

// farZero is how many times farther than any pole a zero may lie to be drawn.
const farZero = 3

// reach parts what is drawn from zeros so far away that the poles would shrink to a point.
func reach(all []spot, sampled bool) (drawn, far []spot) {
	size := 0.0
	if sampled {
		size = 1
	}
	for _, s := range all {
		if s.what != "zero" {
			size = math.Max(size, math.Hypot(s.re, s.im))
		}
	}
	for _, s := range all {
		if s.what == "zero" && size > 0 && math.Hypot(s.re, s.im) > farZero*size {
			far = append(far, s)
		} else {
			drawn = append(drawn, s)
		}
	}
	return drawn, far
}

// mapAxes makes two axes of equal scale around the places.
func mapAxes(left, right, up float64) (x, y *axis) {
	width, height := right-left, 2*up
	size := math.Max(width, height)
	if size == 0 {
		size = 2
	}
	fieldWidth := pageWidth - rightRoom - 60
	scale := math.Max(math.Max(width*1.16, size*0.1)/fieldWidth, math.Max(height*1.16, size*0.1)/mapHeight)
	centre := (left + right) / 2
	x = linear(centre-scale*fieldWidth/2, centre+scale*fieldWidth/2, 8, false)
	y = linear(-scale*mapHeight/2, scale*mapHeight/2, 6, false)
	x.from, x.to = 60, pageWidth-rightRoom
	y.from, y.to = headRoom+mapHeight, headRoom
	return x, y
}

func (c *canvas) mapGrid(x, y *axis, sampled bool) {
	unit := "1/s"
	if sampled {
		unit = ""
	}
	for _, t := range x.ticks {
		class := "grid"
		if t.at == 0 {
			class = "axis"
		}
		c.line(class, x.place(t.at), y.from, x.place(t.at), y.to)
		c.text(x.place(t.at), y.from+16, middle, "", t.label)
	}
	for _, t := range y.ticks {
		class := "grid"
		if t.at == 0 {
			class = "axis"
		}
		c.line(class, x.from, y.place(t.at), x.to, y.place(t.at))
		c.text(x.from-7, y.place(t.at)+4, end, "", t.label)
	}
	c.text((x.from+x.to)/2, y.from+footRoom-6, middle, "", heading("real part", unit, x.power))
	c.text(x.from, y.to-9, start, "", heading("imaginary part", unit, y.power))
}

// forbidden shades where no pole may lie: outside the stable part, and outside what is required.
func (c *canvas) forbidden(r *value.Report, x, y *axis, sampled bool) {
	decay, _ := fieldNumber(r, "decay")
	if sampled {
		c.forbiddenSampled(r, decay, x, y)
		return
	}
	damping, ok := fieldNumber(r, "damping")
	if !ok || damping <= 0 || damping >= 1 {
		damping = 0
	}
	// The poles of one damping lie on two rays of this slope; without one the rays stand upright.
	slope := math.Sqrt(1-damping*damping) / math.Max(damping, 1e-9)
	far := 4 * (math.Max(-x.low, x.high) + y.high + decay) // beyond the field
	bend := math.Max(decay, math.Min(far, far/slope))      // where a ray leaves it
	var allowed []place
	for _, p := range [][2]float64{{far, -1}, {bend, -1}, {decay, -1}, {decay, 1}, {bend, 1}, {far, 1}} {
		allowed = append(allowed, at(x.place(-p[0]), y.place(p[1]*math.Min(far, slope*p[0]))))
	}
	c.shadeOutside(x, y, allowed)
	if damping > 0 || decay > 0 {
		c.add(shape{class: "limit", lines: [][]place{allowed[1:5]}})
	}
}

// shadeOutside shades the field but for a hole, whose edge turns against the clock on paper.
func (c *canvas) shadeOutside(x, y *axis, hole []place) {
	edge := []place{at(x.from, y.to), at(x.to, y.to), at(x.to, y.from), at(x.from, y.from)}
	c.add(shape{class: "shade", lines: [][]place{edge, hole}, closed: true})
}

// forbiddenSampled shades all but the places exp(p·T) of poles p that decay as required.
func (c *canvas) forbiddenSampled(r *value.Report, decay float64, x, y *axis) {
	every, _ := fieldNumber(r, "every")
	damping, ok := fieldNumber(r, "damping")
	if !ok || damping < 0 || damping >= 1 {
		damping = 0
	}
	const pieces = 180
	var allowed []place
	for k := range 2 * pieces {
		angle := math.Pi * float64(k-pieces) / pieces
		radius := math.Min(math.Exp(-decay*every), math.Exp(-damping/math.Sqrt(1-damping*damping)*math.Abs(angle)))
		allowed = append(allowed, at(x.place(radius*math.Cos(angle)), y.place(radius*math.Sin(angle))))
	}
	c.shadeOutside(x, y, allowed)
	if damping > 0 || decay > 0 {
		c.add(shape{class: "limit", lines: [][]place{append(allowed, allowed[0])}})
	}
}

func (c *canvas) spot(what string, px, py float64) {
	switch what {
	case "pole":
		c.add(shape{class: "pole", lines: [][]place{{at(px-5, py-5), at(px+5, py+5)}, {at(px+5, py-5), at(px-5, py+5)}}})
	case "zero":
		c.circle("zero", px, py, 5)
	default:
		c.rectangle("wanted", px-8, py-8, 16, 16)
	}
}

// mapKey names the signs at the top on the right.
func (c *canvas) mapKey(all []spot, x *axis) {
	has := map[string]bool{}
	for _, s := range all {
		has[s.what] = true
	}
	at := x.to
	for _, what := range []string{"wanted", "zero", "pole"} {
		if !has[what] {
			continue
		}
		w := textWidth(what)
		c.text(at-w, headRoom-9, start, "", what)
		c.spot(what, at-w-13, headRoom-13)
		at -= w + 34
	}
}

func describeMap(all []spot, sampled bool) string {
	plane := "the complex plane"
	if sampled {
		plane = "the plane of z with the unit circle"
	}
	return "Places in " + plane + ": " + placesText(all) + "."
}

// most places that are told in words
const mostPlaces = 40

func placesText(all []spot) string {
	parts := make([]string, 0, len(all))
	for i, s := range all {
		if i == mostPlaces {
			parts = append(parts, fmt.Sprintf("and %d more", len(all)-i))
			break
		}
		place := brief(s.re)
		if s.im != 0 {
			place += fmt.Sprintf(" %s %si", map[bool]string{true: "−", false: "+"}[s.im < 0], brief(math.Abs(s.im)))
		}
		parts = append(parts, s.what+" at "+place)
	}
	return strings.Join(parts, "; ")
}
