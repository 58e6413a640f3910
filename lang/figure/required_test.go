package figure

import (
	"math"
	"strings"
	"testing"

	"gainwright/lang/value"
)

// TestRequiredCourseIsShaded: a signal from 2 to 2 ± 4, whose band of 5 % is 0.2 wide on
// either side; an overshoot of at most 10 % is a ceiling 0.4 beyond its final value.
func TestRequiredCourseIsShaded(t *testing.T) {
	for _, sign := range []float64{1, -1} {
		r := &value.Response{Title: "step response"}
		s := value.Trace{Name: "y", Role: "output", Band: &value.Band{Low: 2 + 4*sign - 0.2, High: 2 + 4*sign + 0.2, From: 5, PeakAt: math.NaN(), Peak: math.NaN()}}
		for k := range 201 {
			r.Instants = append(r.Instants, float64(k)/20)
			s.Values = append(s.Values, 2+4*sign*(1-math.Exp(-float64(k)/30)))
		}
		r.Signals = []value.Trace{s}
		report := &value.Report{Basis: r, Fields: []value.Named{{Name: "band", Value: value.Quantity{Magnitude: value.Int(5), Unit: value.Percent()}}}}
		limits := map[string][]Limit{"overshoot": {{"<=", 10}, {"<", 30}}, "settling": {{"<=", 8}, {">", 1}}}
		d, ok := DrawFigures(report, func(field string) []Limit { return limits[field] })
		if !ok {
			t.Fatal("no drawing")
		}
		var shades []shape
		var levels []float64
		for _, one := range d.shapes {
			switch {
			case one.class == "shade":
				shades = append(shades, one)
			case one.class == "limit" && one.lines[0][0].y == one.lines[0][1].y:
				levels = append(levels, float64(one.lines[0][0].y)/10)
			}
		}
		if len(shades) != 3 || len(levels) != 1 {
			t.Fatalf("%d shades and %d levels", len(shades), len(levels))
		}
		// The ceiling lies 0.4 beyond the band's middle, the band's edges 0.2: heights in proportion.
		ceiling := levels[0]
		low, high := edges(shades[1])[0], edges(shades[2])[1] // of the band: it is shaded below, then above
		beyond := high - ceiling
		if sign < 0 {
			beyond = ceiling - low
		}
		if gap := low - high; gap < 1 || math.Abs(beyond/gap-0.5) > 0.05 {
			t.Errorf("the band spans %g … %g and the ceiling lies at %g", high, low, ceiling)
		}
		for _, one := range shades[1:] { // from 8 s of 10 s on
			if part := (float64(one.at.x)/10 - leastLeft) / (pageWidth - rightRoom - leastLeft); math.Abs(part-0.8) > 0.02 {
				t.Errorf("the shade begins at %g of the time", part)
			}
		}
		if !strings.Contains(d.Description, "an overshoot of at most 10 %") || !strings.Contains(d.Description, "settled by 8 s") {
			t.Error(d.Description)
		}
	}
}

// edges are the heights of a box.
func edges(s shape) [2]float64 {
	return [2]float64{float64(s.at.y) / 10, float64(s.at.y+s.size.y) / 10}
}
