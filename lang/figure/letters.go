package figure

import (
	"bytes"
	"compress/zlib"
	_ "embed"
	"encoding/binary"
	"io"
	"sync"
)

// The outlines that letters.py took from DejaVu Sans; LICENSE there holds their licence.
//
//go:embed letters/letters.bin
var letterData []byte

// glyph is a letter's outline in units of the face, y upwards.
type glyph struct {
	advance  int
	contours [][]outlinePoint
}

// outlinePoint is on the curve, or the control point of a quadratic one.
type outlinePoint struct {
	x, y int
	on   bool
}

// face is all letters.
type face struct {
	perEm  int
	glyphs map[rune]*glyph
}

// letters reads the outlines when they are first needed.
var letters = sync.OnceValue(func() *face {
	r, err := zlib.NewReader(bytes.NewReader(letterData))
	if err != nil {
		panic(err) // the data is part of the program
	}
	data, err := io.ReadAll(r)
	if err != nil {
		panic(err)
	}
	number := func() int {
		n, size := binary.Uvarint(data)
		data = data[size:]
		return int(n)
	}
	signed := func() int {
		n := number()
		return n>>1 ^ -(n & 1)
	}
	f := &face{perEm: number(), glyphs: map[rune]*glyph{}}
	for range number() {
		code := rune(number())
		g := &glyph{advance: number()}
		g.contours = make([][]outlinePoint, number())
		x, y := 0, 0
		for k := range g.contours {
			g.contours[k] = make([]outlinePoint, number())
			for i := range g.contours[k] {
				x, y = x+signed(), y+signed()
				g.contours[k][i] = outlinePoint{x, y, number() == 1}
			}
		}
		f.glyphs[code] = g
	}
	return f
})

// of gives a letter; one that the face lacks is an empty box.
func (f *face) of(r rune) *glyph {
	if g, ok := f.glyphs[r]; ok {
		return g
	}
	return f.glyphs['□']
}

// width is a text's width in the drawing's units.
func (f *face) width(s string) float64 {
	w := 0
	for _, r := range s {
		w += f.of(r).advance
	}
	return float64(w) * letter / float64(f.perEm)
}

// from is where a text begins that stands at x by its anchor.
func (f *face) from(x float64, a anchor, s string) float64 {
	switch a {
	case middle:
		return x - f.width(s)/2
	case end:
		return x - f.width(s)
	}
	return x
}

// pen draws an outline.
type pen interface {
	moveTo(x, y float64)
	lineTo(x, y float64)
	quadTo(cx, cy, x, y float64)
	closePath()
}

// trace draws the letter's contours; between two control points lies a point on the curve.
func (g *glyph) trace(p pen) {
	for _, c := range g.contours {
		n := len(c)
		if n < 2 {
			continue
		}
		begin := c[0]
		if !begin.on {
			if last := c[n-1]; last.on {
				begin = last
			} else {
				begin = outlinePoint{(c[0].x + last.x) / 2, (c[0].y + last.y) / 2, true}
			}
		}
		p.moveTo(float64(begin.x), float64(begin.y))
		var control *outlinePoint
		arrive := func(to outlinePoint) {
			if control != nil {
				p.quadTo(float64(control.x), float64(control.y), float64(to.x), float64(to.y))
				control = nil
			} else {
				p.lineTo(float64(to.x), float64(to.y))
			}
		}
		for k := range n {
			next := c[k]
			if next.on {
				if k > 0 || next != begin {
					arrive(next)
				}
				continue
			}
			if control != nil {
				arrive(outlinePoint{(control.x + next.x) / 2, (control.y + next.y) / 2, true})
			}
			control = &c[k]
		}
		arrive(begin)
		p.closePath()
	}
}
