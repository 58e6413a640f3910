// Package figure draws values as SVG: responses over time, frequency responses, pole
// maps; and responses in a few lines of a terminal.
//
// [Of] draws a *value.Response, the report of a frequency response or that of a pole map;
// any other value has no figure. The drawing has no colours of its own: its elements carry
// classes, and [Style] holds the rules for light, dark and print, so that a page states
// them once. [Standalone] makes a file of a drawing. Nothing here computes: what is drawn
// are the numbers of the value. The same value gives the same bytes.
//
// It refuses nothing with an error: points that are not finite are left out, and a value
// without one finite point has no figure.
package figure

import (
	_ "embed"

	"gainwright/lang/value"
)

// Style is the style sheet of the drawings.
//
//go:embed figure.css
var Style string

// Of draws a value; id begins the names of the drawing's elements and must differ
// between the drawings of a page.
func Of(v value.Value, id string) (svg string, ok bool) {
	d, ok := Draw(v)
	if !ok {
		return "", false
	}
	return d.SVG(id), true
}

// Draw draws a value, when it has a figure.
func Draw(v value.Value) (*Drawing, bool) {
	switch x := value.Force(v).(type) {
	case *value.Response:
		return drawResponse(x, nil)
	case *value.Study:
		return DrawStudy(x, nil)
	case *value.Report:
		switch {
		case isSweep(x):
			return drawSweep(x)
		case IsPoleMap(x):
			return drawPoleMap(x)
		case x.Basis != nil:
			return DrawFigures(x, nil)
		}
	}
	return nil, false
}
