package figure

import (
	"fmt"
	"strconv"
	"strings"
)

// SVG writes the drawing as an element of a page; id begins the names of its parts and
// must differ between the drawings of a page. Colours come from Style.
func (d *Drawing) SVG(id string) string {
	w := &svgWriter{id: clean(id)}
	width, height := tenths(tenth(d.width)), tenths(tenth(d.height))
	w.printf(`<svg xmlns="http://www.w3.org/2000/svg" class="figure" role="img" viewBox="0 0 %s %s" width="%s" height="%s" aria-labelledby="%s-title %s-text">`,
		width, height, width, height, w.id, w.id)
	w.printf(`<title id="%s-title">%s</title><desc id="%s-text">%s</desc>`, w.id, clean(d.Title), w.id, clean(d.Description))
	for k := range d.shapes {
		w.shape(&d.shapes[k])
	}
	w.WriteString("</svg>")
	return w.String()
}

// Standalone makes a drawing a file of its own.
func Standalone(svg string) string {
	end := strings.IndexByte(svg, '>') + 1
	return `<?xml version="1.0" encoding="UTF-8"?>` + "\n" + svg[:end] + "<style>" + Style + "</style>" + svg[end:] + "\n"
}

type svgWriter struct {
	strings.Builder
	id    string
	clips int
}

func (w *svgWriter) printf(format string, args ...any) { fmt.Fprintf(w, format, args...) }

var svgAnchors = [...]string{"start", "middle", "end"}

func (w *svgWriter) shape(s *shape) {
	x, y := tenths(s.at.x), tenths(s.at.y)
	switch s.kind {
	case path:
		w.printf(`<path class="%s" d="`, s.class)
		for _, line := range s.lines {
			w.path(line)
			if s.closed {
				w.WriteByte('Z')
			}
		}
		w.WriteString(`"/>`)
	case label:
		class := ""
		if s.class != "" {
			class = ` class="` + s.class + `"`
		}
		w.printf(`<text x="%s" y="%s" text-anchor="%s"%s>%s</text>`, x, y, svgAnchors[s.anchor], class, clean(s.text))
	case oval:
		if s.size.x == s.size.y {
			w.printf(`<circle class="%s" cx="%s" cy="%s" r="%s"/>`, s.class, x, y, tenths(s.size.x))
		} else {
			w.printf(`<ellipse class="%s" cx="%s" cy="%s" rx="%s" ry="%s"/>`, s.class, x, y, tenths(s.size.x), tenths(s.size.y))
		}
	case box:
		w.printf(`<rect class="%s" x="%s" y="%s" width="%s" height="%s"/>`, s.class, x, y, tenths(s.size.x), tenths(s.size.y))
	case clip:
		w.clips++
		w.printf(`<clipPath id="%s-clip%d"><rect x="%s" y="%s" width="%s" height="%s"/></clipPath><g clip-path="url(#%s-clip%d)">`,
			w.id, w.clips, x, y, tenths(s.size.x), tenths(s.size.y), w.id, w.clips)
	case unclip:
		w.WriteString("</g>")
	}
}

// path writes a line by its steps.
func (w *svgWriter) path(line []place) {
	for k, p := range line {
		switch k {
		case 0:
			w.WriteString("M" + tenths(p.x) + " " + tenths(p.y))
			continue
		case 1:
			w.WriteByte('l')
		default:
			w.WriteByte(' ')
		}
		dy := tenths(p.y - line[k-1].y)
		w.WriteString(tenths(p.x - line[k-1].x))
		if !strings.HasPrefix(dy, "-") {
			w.WriteByte(' ')
		}
		w.WriteString(dy)
	}
}

// tenths writes a whole number of tenths.
func tenths(n int) string {
	sign := ""
	if n < 0 {
		sign, n = "-", -n
	}
	if n%10 == 0 {
		return sign + strconv.Itoa(n/10)
	}
	return sign + strconv.Itoa(n/10) + "." + strconv.Itoa(n%10)
}
