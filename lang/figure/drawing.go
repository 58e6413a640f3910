package figure

import "math"

// Drawing is a figure as shapes in order, in units of 1/96 inch; its writers make SVG, PNG
// and PDF of it.
type Drawing struct {
	Title, Description string // for those who do not see it
	width, height      float64
	shapes             []shape
}

// place is a point in tenths of the drawing's unit, as it is written.
type place struct{ x, y int }

// shape is one element; what is set depends on its kind. Its class gives it ink.
type shape struct {
	kind   shapeKind
	class  string
	lines  [][]place // of a path
	closed bool      // the path's lines are
	at     place     // of a text, the middle of an oval, the upper left corner of a box
	size   place     // of a box; the radii of an oval
	text   string
	anchor anchor
}

type shapeKind uint8

const (
	path   shapeKind = iota
	label            // a text
	oval             // a circle or an ellipse
	box              // a rectangle
	clip             // what follows is drawn inside the box only
	unclip           // up to here
)

// anchor is which part of a text stands at its place.
type anchor uint8

const (
	start anchor = iota
	middle
	end
)

// canvas collects a drawing.
type canvas struct {
	Drawing
	written []written // the texts of marks, which must not stand on each other
}

func (c *canvas) begin(width, height float64, title, description string) {
	c.width, c.height, c.Title, c.Description = width, height, title, description
}

func (c *canvas) add(s shape) { c.shapes = append(c.shapes, s) }

func (c *canvas) text(x, y float64, a anchor, class, s string) {
	c.add(shape{kind: label, class: class, at: at(x, y), anchor: a, text: s})
}

func (c *canvas) line(class string, x1, y1, x2, y2 float64) {
	c.add(shape{class: class, lines: [][]place{{at(x1, y1), at(x2, y2)}}})
}

func (c *canvas) circle(class string, x, y, r float64) { c.ellipse(class, x, y, r, r) }

func (c *canvas) ellipse(class string, x, y, rx, ry float64) {
	c.add(shape{kind: oval, class: class, at: at(x, y), size: at(rx, ry)})
}

func (c *canvas) rectangle(class string, x, y, width, height float64) {
	c.add(shape{kind: box, class: class, at: at(x, y), size: at(width, height)})
}

// inside draws what f draws within a rectangle only.
func (c *canvas) inside(x, y, width, height float64, f func()) {
	c.add(shape{kind: clip, at: at(x, y), size: at(width, height)})
	f()
	c.add(shape{kind: unclip})
}

func at(x, y float64) place { return place{tenth(x), tenth(y)} }

// far beyond any drawing, and within what an int holds
const farAway = 1e7

func tenth(x float64) int { return int(math.Round(math.Max(-farAway, math.Min(farAway, x*10)))) }
