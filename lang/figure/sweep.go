package figure

import (
	"fmt"
	"math"
	"strings"

	"gainwright/lang/value"
)

// isSweep tells a frequency response by its columns.
func isSweep(r *value.Report) bool {
	if len(r.Columns) < 3 || len(r.Columns)%2 != 1 || r.Columns[0] != "frequency [rad/s]" || len(r.Rows) < 2 {
		return false
	}
	for j := 1; j < len(r.Columns); j += 2 {
		if !strings.HasSuffix(r.Columns[j], "gain [dB]") || !strings.HasSuffix(r.Columns[j+1], "phase [deg]") {
			return false
		}
	}
	return true
}

// realAt reads a number of a table; NaN where there is none.
func realAt(row []value.Value, j int) float64 {
	if j >= len(row) || row[j] == nil {
		return math.NaN()
	}
	switch x := value.Force(row[j]).(type) {
	case value.Number:
		return x.Float64()
	case value.Quantity:
		return x.Magnitude.Float64()
	}
	return math.NaN()
}

// drawSweep draws gain and phase over the frequency.
func drawSweep(r *value.Report) (*Drawing, bool) {
	frequencies := make([]float64, len(r.Rows))
	for i, row := range r.Rows {
		frequencies[i] = realAt(row, 0)
		if !(frequencies[i] > 0) || math.IsInf(frequencies[i], 0) || i > 0 && frequencies[i] <= frequencies[i-1] {
			return nil, false
		}
	}
	gain := &panel{heading: func(power int) string { return heading("gain", "dB", power) }, levels: []float64{0}}
	phase := &panel{heading: func(int) string { return "phase [deg]" }, step: 45, levels: []float64{-180, 180}}
	channels := (len(r.Columns) - 1) / 2
	for k := range min(channels, mostCurves) {
		name := strings.TrimSuffix(strings.TrimSuffix(r.Columns[1+2*k], "gain [dB]"), ": ")
		g, p := make([]float64, len(r.Rows)), make([]float64, len(r.Rows))
		for i, row := range r.Rows {
			g[i], p[i] = realAt(row, 1+2*k), realAt(row, 2+2*k)
		}
		gain.curves = append(gain.curves, curve{name: name, x: frequencies, y: g})
		phase.curves = append(phase.curves, curve{name: name, x: frequencies, y: p})
	}
	description := fmt.Sprintf("Gain and phase over the frequency from %s to %s rad/s.", brief(frequencies[0]), brief(frequencies[len(frequencies)-1]))
	if channels == 1 {
		description += markCrossings(gain, phase)
	}
	if channels > mostCurves {
		description += fmt.Sprintf(" The first %d of %d channels are drawn.", mostCurves, channels)
	}
	x := logarithmic(frequencies[0], frequencies[len(frequencies)-1])
	return stacked("Frequency response", description, []*panel{gain, phase}, x, func(power int) string { return heading("frequency", "rad/s", power) })
}

// more crossings than this are not told in words
const mostMarks = 4

// markCrossings marks where the gain passes 1 and the phase a half turn, read off the
// drawn points; margins(…) locates them to full accuracy.
func markCrossings(gain, phase *panel) string {
	text := ""
	g, p := gain.curves[0], phase.curves[0]
	for _, c := range crossings(g.x, g.y, 0) {
		if len(gain.marks) == mostMarks {
			break
		}
		gain.marks = append(gain.marks, mark{c, 0, "gain 1 at " + briefer(c)})
		text += fmt.Sprintf(" The gain passes 1 near %s rad/s.", briefer(c))
	}
	low, high := math.Inf(1), math.Inf(-1)
	for _, v := range p.y {
		low, high = math.Min(low, v), math.Max(high, v)
	}
	if math.IsInf(low, 0) || math.IsInf(high, 0) || high-low > 20*360 {
		return text
	}
	for level := math.Ceil((low-180)/360)*360 + 180; level <= high; level += 360 {
		for _, c := range crossings(p.x, p.y, level) {
			if len(phase.marks) == mostMarks {
				break
			}
			phase.marks = append(phase.marks, mark{c, level, "half a turn at " + briefer(c)})
			text += fmt.Sprintf(" The phase passes %s° near %s rad/s.", brief(level), briefer(c))
		}
	}
	return text
}

// crossings gives the frequencies where the values pass a level: at a point, or between
// two. What touches the level and turns back, or stays on it, passes nothing.
func crossings(x, y []float64, level float64) []float64 {
	var at []float64
	last := -1 // the latest point that is not on the level
	for i := range x {
		b := y[i] - level
		switch {
		case math.IsNaN(b):
			last = -1
			continue
		case b == 0:
			continue
		case last >= 0 && (y[last]-level)*b < 0 && i-last <= 2:
			if i-last == 2 {
				at = append(at, x[i-1])
			} else {
				a := y[last] - level
				at = append(at, math.Exp(math.Log(x[last])+a/(a-b)*math.Log(x[i]/x[last])))
			}
		}
		last = i
	}
	return at
}
