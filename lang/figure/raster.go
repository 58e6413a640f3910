package figure

import (
	"bytes"
	"image"
	"image/color"
	"image/draw"
	"image/png"
	"math"

	"golang.org/x/image/vector"
)

// pixels for a unit of the drawing: 216 pixels an inch
const pixelsPerUnit = 2.25

// PNG paints the drawing on white paper, 1440 pixels wide where the drawing has 640 units.
// The same drawing gives the same bytes.
func (d *Drawing) PNG() ([]byte, error) {
	var out bytes.Buffer
	encoder := png.Encoder{CompressionLevel: png.BestCompression}
	if err := encoder.Encode(&out, d.painted()); err != nil {
		return nil, err
	}
	return out.Bytes(), nil
}

func (d *Drawing) painted() *image.RGBA {
	p := newPainter(d)
	for k := range d.shapes {
		p.shape(&d.shapes[k])
	}
	return p.image
}

// painter fills outlines with ink.
type painter struct {
	image   *image.RGBA
	field   image.Rectangle // what may be painted on
	outline []contour       // of the shape at hand, in pixels
}

// contour is a closed line, counter-clockwise or not as its maker says.
type contour [][2]float64

func newPainter(d *Drawing) *painter {
	size := image.Rect(0, 0, int(math.Ceil(d.width*pixelsPerUnit)), int(math.Ceil(d.height*pixelsPerUnit)))
	p := &painter{image: image.NewRGBA(size), field: size}
	draw.Draw(p.image, size, image.NewUniform(palette["paper"]), image.Point{}, draw.Src)
	return p
}

func pixels(tenths int) float64 { return float64(tenths) / 10 * pixelsPerUnit }

func (p *painter) shape(s *shape) {
	i := inkOf(s.class)
	switch s.kind {
	case path:
		p.path(s, i)
	case label:
		p.label(s, i)
	case oval:
		p.closedLine(arc(pixels(s.at.x), pixels(s.at.y), pixels(s.size.x), pixels(s.size.y)), i)
	case box:
		p.closedLine(corners(s), i)
	case clip:
		c := corners(s)
		p.field = image.Rect(int(math.Round(c[0][0])), int(math.Round(c[0][1])), int(math.Round(c[2][0])), int(math.Round(c[2][1]))).Intersect(p.image.Rect)
	case unclip:
		p.field = p.image.Rect
	}
}

func corners(s *shape) contour {
	x, y, w, h := pixels(s.at.x), pixels(s.at.y), pixels(s.size.x), pixels(s.size.y)
	return contour{{x, y}, {x + w, y}, {x + w, y + h}, {x, y + h}}
}

// arc is an ellipse as a polygon finer than a pixel.
func arc(x, y, rx, ry float64) contour {
	n := int(math.Max(16, math.Min(720, 4*math.Sqrt(math.Max(rx, ry))*math.Pi)))
	c := make(contour, n)
	for k := range c {
		sin, cos := math.Sincos(2 * math.Pi * float64(k) / float64(n))
		c[k] = [2]float64{x + rx*cos, y + ry*sin}
	}
	return c
}

func (p *painter) closedLine(c contour, i ink) {
	if i.fill != "" {
		p.outline = append(p.outline, c)
		p.fill(i.fill, i.opacity)
	}
	if i.stroke != "" {
		p.stroke(append(c[:len(c):len(c)], c[0]), i)
	}
}

func (p *painter) path(s *shape, i ink) {
	var lines []contour
	for _, line := range s.lines {
		c := make(contour, len(line), len(line)+1)
		for k, at := range line {
			c[k] = [2]float64{pixels(at.x), pixels(at.y)}
		}
		lines = append(lines, c)
	}
	if s.closed && i.fill != "" { // together: a line that turns the other way is a hole
		p.outline = append(p.outline, lines...)
		p.fill(i.fill, i.opacity)
	}
	for _, c := range lines {
		if s.closed {
			c = append(c, c[0])
		}
		if i.stroke != "" {
			p.stroke(c, i)
		}
	}
}

// stroke paints along a line, with the ink's width and dashes.
func (p *painter) stroke(line contour, i ink) {
	half := i.width * pixelsPerUnit / 2
	for _, part := range dashed(line, i.dashes) {
		for k := 1; k < len(part); k++ {
			p.segment(part[k-1], part[k], half)
			if k > 1 && turns(part[k-2], part[k-1], part[k]) {
				p.outline = append(p.outline, arc(part[k-1][0], part[k-1][1], half, half))
			}
		}
	}
	p.fill(i.stroke, i.opacity)
}

// turns tells whether a line bends so much at b that its outer side would gape.
func turns(a, b, c [2]float64) bool {
	ux, uy, vx, vy := b[0]-a[0], b[1]-a[1], c[0]-b[0], c[1]-b[1]
	return math.Abs(ux*vy-uy*vx) > 0.1*math.Hypot(ux, uy)*math.Hypot(vx, vy) || ux*vx+uy*vy < 0
}

// segment is a rectangle about a piece of a line, turning as arc does.
func (p *painter) segment(a, b [2]float64, half float64) {
	dx, dy := b[0]-a[0], b[1]-a[1]
	long := math.Hypot(dx, dy)
	if long == 0 {
		return
	}
	nx, ny := -dy/long*half, dx/long*half
	p.outline = append(p.outline, contour{{a[0] - nx, a[1] - ny}, {b[0] - nx, b[1] - ny}, {b[0] + nx, b[1] + ny}, {a[0] + nx, a[1] + ny}})
}

// dashed cuts a line into dashes, given in the drawing's units.
func dashed(line contour, dashes []float64) []contour {
	if len(dashes) == 0 || len(line) < 2 {
		return []contour{line}
	}
	var out []contour
	current := contour{line[0]}
	k, left := 0, dashes[0]*pixelsPerUnit
	for i := 1; i < len(line); i++ {
		a, b := line[i-1], line[i]
		long := math.Hypot(b[0]-a[0], b[1]-a[1])
		done := 0.0
		for long-done > left {
			done += left
			at := [2]float64{a[0] + (b[0]-a[0])*done/long, a[1] + (b[1]-a[1])*done/long}
			if k%2 == 0 {
				out = append(out, append(current, at))
			}
			current = contour{at}
			k++
			left = dashes[k%len(dashes)] * pixelsPerUnit
		}
		left -= long - done
		current = append(current, b)
	}
	if k%2 == 0 && len(current) > 1 {
		out = append(out, current)
	}
	return out
}

// label paints a text's letters.
func (p *painter) label(s *shape, i ink) {
	f := letters()
	scale := letter * pixelsPerUnit / float64(f.perEm)
	x := f.from(float64(s.at.x)/10, s.anchor, s.text) * pixelsPerUnit
	for _, r := range s.text {
		g := f.of(r)
		g.trace(&outlinePen{p, x, pixels(s.at.y), scale})
		x += float64(g.advance) * scale
	}
	p.fill(i.fill, i.opacity)
}

// outlinePen adds a letter to the outline.
type outlinePen struct {
	*painter
	x, y, scale float64
}

func (o *outlinePen) at(x, y float64) [2]float64 { return [2]float64{o.x + x*o.scale, o.y - y*o.scale} }

func (o *outlinePen) moveTo(x, y float64) { o.outline = append(o.outline, contour{o.at(x, y)}) }

func (o *outlinePen) lineTo(x, y float64) {
	last := &o.outline[len(o.outline)-1]
	*last = append(*last, o.at(x, y))
}

func (o *outlinePen) quadTo(cx, cy, x, y float64) {
	last := &o.outline[len(o.outline)-1]
	a, c, b := (*last)[len(*last)-1], o.at(cx, cy), o.at(x, y)
	const pieces = 6
	for k := 1; k <= pieces; k++ {
		t := float64(k) / pieces
		u := 1 - t
		*last = append(*last, [2]float64{u*u*a[0] + 2*u*t*c[0] + t*t*b[0], u*u*a[1] + 2*u*t*c[1] + t*t*b[1]})
	}
}

func (o *outlinePen) closePath() {}

// fill paints the outline, and begins a new one. Only its own surroundings are worked on.
func (p *painter) fill(name string, opacity float64) {
	lines := p.outline
	p.outline = nil
	low, high := [2]float64{math.Inf(1), math.Inf(1)}, [2]float64{math.Inf(-1), math.Inf(-1)}
	for _, c := range lines {
		for _, at := range c {
			for k := range at {
				low[k], high[k] = math.Min(low[k], at[k]), math.Max(high[k], at[k])
			}
		}
	}
	if low[0] > high[0] {
		return
	}
	limited := func(x float64) int { return int(math.Max(-farAway, math.Min(farAway, x))) }
	area := image.Rect(limited(math.Floor(low[0])), limited(math.Floor(low[1])), limited(math.Ceil(high[0]))+1, limited(math.Ceil(high[1]))+1).Intersect(p.field)
	if area.Empty() {
		return
	}
	z := vector.NewRasterizer(area.Dx(), area.Dy())
	for _, c := range lines {
		for k, at := range c {
			x, y := float32(at[0]-float64(area.Min.X)), float32(at[1]-float64(area.Min.Y))
			if k == 0 {
				z.MoveTo(x, y)
			} else {
				z.LineTo(x, y)
			}
		}
		z.ClosePath()
	}
	c := palette[name]
	alpha := uint8(math.Round(opacity * 255))
	source := color.NRGBA{R: c.R, G: c.G, B: c.B, A: alpha}
	z.Draw(p.image, area, image.NewUniform(source), image.Point{})
}
