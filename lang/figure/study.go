package figure

import (
	"fmt"
	"math"
	"sort"
	"strings"

	"gainwright/lang/value"
)

// Limit is a requirement on a study's number: drawn as a line, with the side that misses
// it shaded.
type Limit struct {
	Op    string // as the number stands on its left
	Bound float64
}

const (
	histogramHeight = 150.0
	lowerHeight     = 170.0
	mostBars        = 8     // parameters whose influence is drawn
	mostDots        = 1000  // samples that a scatter shows
	lowerGap        = 70.0  // between the influence and the scatter
	aboutBins       = 40    // of a histogram
	barRoom         = 118.0 // for the names of the parameters
)

// DrawStudy draws how a study's numbers are spread: of one number a histogram of its drawn
// samples with the corners below it and the limits, what influences it, and its samples
// over the strongest parameter; of several numbers their histograms. limits gives what is
// required of a number; it may be nil.
func DrawStudy(s *value.Study, limits func(*value.StudyResult) []Limit) (*Drawing, bool) {
	if limits == nil {
		limits = func(*value.StudyResult) []Limit { return nil }
	}
	var c canvas
	top := headRoom
	var told []string
	for k := range s.Results {
		r := &s.Results[k]
		if k == mostCurves || r.IsTruth {
			break
		}
		h := newHistogram(s, r, limits(r))
		if h == nil {
			continue
		}
		c.histogram(h, top)
		top += histogramHeight + headRoom + footRoom + panelGap
		told = append(told, h.described())
	}
	if len(told) == 0 {
		return nil, false
	}
	if len(s.Results) == 1 {
		if text := c.causes(s, &s.Results[0], top); text != "" {
			told = append(told, text)
			top += lowerHeight + headRoom + footRoom
		}
	}
	c.begin(pageWidth, top-headRoom, "Study over "+strings.Join(s.Models, ", "), strings.Join(told, " "))
	return &c.Drawing, true
}

// histogram is one number's spread.
type histogram struct {
	name, unit  string
	first, step float64
	counts      []int
	drawn       []float64
	corners     []float64
	limits      []Limit
	low, high   float64
	x, y        *axis
}

// newHistogram counts the drawn samples; nil where none has a finite value.
func newHistogram(s *value.Study, r *value.StudyResult, limits []Limit) *histogram {
	h := &histogram{name: r.Name, unit: r.Unit.Text, limits: limits}
	if h.name == "" {
		h.name = r.Text
	}
	low, high := math.Inf(1), math.Inf(-1)
	for k, v := range r.Values {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			continue
		}
		low, high = math.Min(low, v), math.Max(high, v)
		if s.First+k < s.Samples {
			h.drawn = append(h.drawn, v)
		} else {
			h.corners = append(h.corners, v)
		}
	}
	if len(h.drawn) == 0 {
		return nil
	}
	h.low, h.high = low, high
	spread := high - low
	for _, l := range limits { // a limit is drawn where it does not squeeze the samples flat
		if l.Bound > low-2*spread && l.Bound < high+2*spread {
			low, high = math.Min(low, l.Bound), math.Max(high, l.Bound)
		}
	}
	h.x = linear(low, high, 7, false)
	room := (h.x.high - h.x.low) / 40
	h.x.low, h.x.high = h.x.low-room, h.x.high+room
	h.step = roundStep((h.x.high - h.x.low) / aboutBins)
	h.first = math.Floor(h.x.low/h.step) * h.step
	h.counts = make([]int, int(math.Ceil((h.x.high-h.first)/h.step))+1)
	most := 0
	for _, v := range h.drawn {
		k := max(0, min(len(h.counts)-1, int((v-h.first)/h.step)))
		h.counts[k]++
		most = max(most, h.counts[k])
	}
	h.y = linear(0, float64(most), 3, true)
	return h
}

func (h *histogram) described() string {
	text := fmt.Sprintf("%s over the samples: from %s to %s.", h.name, brief(h.low), brief(h.high))
	for _, l := range h.limits {
		text += fmt.Sprintf(" Required: %s %s.", l.Op, brief(l.Bound))
	}
	return text
}

func (c *canvas) histogram(h *histogram, top float64) {
	x, y := h.x, h.y
	x.from, x.to, y.from, y.to = 60, pageWidth-rightRoom, top+histogramHeight, top
	for _, l := range h.limits {
		c.limit(l, x, y)
	}
	for _, t := range y.ticks {
		c.line(map[bool]string{true: "axis", false: "grid"}[t.at == 0], x.from, y.place(t.at), x.to, y.place(t.at))
		c.text(x.from-7, y.place(t.at)+4, end, "", t.label)
	}
	c.inside(x.from, y.to, x.to-x.from, y.from-y.to, func() {
		for k, n := range h.counts {
			if n > 0 {
				left, right := x.place(h.first+float64(k)*h.step), x.place(h.first+float64(k+1)*h.step)
				c.rectangle("bar", left+0.4, y.place(float64(n)), right-left-0.8, y.from-y.place(float64(n)))
			}
		}
	})
	for _, t := range x.ticks {
		c.line("axis", x.place(t.at), y.from, x.place(t.at), y.from+4)
		c.text(x.place(t.at), y.from+24, middle, "", t.label)
	}
	seen := map[int]bool{}
	for _, v := range h.corners {
		at := x.place(v)
		if !seen[tenth(at)/5] {
			seen[tenth(at)/5] = true
			c.line("corner", at, y.from+4, at, y.from+11)
		}
	}
	head := "samples"
	if len(h.corners) > 0 {
		head += ", corners below"
	}
	c.text(x.from, y.to-9, start, "", head)
	c.text((x.from+x.to)/2, y.from+footRoom, middle, "", heading(shortened(h.name, 420), h.unit, x.power))
}

// limit draws a requirement: its line, and the side that misses it.
func (c *canvas) limit(l Limit, x, y *axis) {
	if !(l.Bound >= x.low && l.Bound <= x.high) {
		return
	}
	at := x.place(l.Bound)
	words := map[string]string{">": "over ", ">=": "at least ", "<": "under ", "<=": "at most "}
	word, ok := words[l.Op]
	if !ok {
		return
	}
	if l.Op[0] == '>' {
		c.rectangle("shade", x.from, y.to, at-x.from, y.from-y.to)
	} else {
		c.rectangle("shade", at, y.to, x.to-at, y.from-y.to)
	}
	c.line("limit", at, y.from, at, y.to)
	text := word + rounded(l.Bound, 6)
	if at+5+textWidth(text) > x.to {
		c.text(at-5, y.to+12, end, "", text)
	} else {
		c.text(at+5, y.to+12, start, "", text)
	}
}

// cause is a parameter with its rank correlation.
type cause struct {
	name  string
	index int
	value float64
}

// causes draws the influence of the parameters, and the samples over the strongest of them.
func (c *canvas) causes(s *value.Study, r *value.StudyResult, top float64) string {
	names := s.ParameterNames()
	found, ok := s.Only(*r).Field("influence")
	if !ok || len(names) == 0 {
		return ""
	}
	report, ok := value.Force(found).(*value.Report)
	if !ok {
		return ""
	}
	var all []cause
	for _, row := range report.Rows {
		n, ok := row[1].(value.Number)
		text, isText := row[0].(value.Text)
		if !ok || !isText {
			continue
		}
		for k, name := range names {
			if name == string(text) {
				all = append(all, cause{name, k, n.Float64()})
			}
		}
	}
	if len(all) == 0 {
		return ""
	}
	sort.SliceStable(all, func(a, b int) bool { return math.Abs(all[a].value) > math.Abs(all[b].value) })
	c.influence(all[:min(len(all), mostBars)], top)
	c.scatter(s, r, all[0], top)
	var parts []string
	for _, one := range all[:min(len(all), mostBars)] {
		parts = append(parts, one.name+" "+briefer(one.value))
	}
	return "Rank correlation with the parameters: " + strings.Join(parts, ", ") + "."
}

func (c *canvas) influence(all []cause, top float64) {
	x := linear(-1, 1, 4, true)
	x.from, x.to = barRoom, pageWidth/2-lowerGap/2
	c.text(14, top-9, start, "", "rank correlation")
	bottom := top + lowerHeight
	for _, t := range x.ticks {
		c.line(map[bool]string{true: "axis", false: "grid"}[t.at == 0], x.place(t.at), bottom, x.place(t.at), top)
		c.text(x.place(t.at), bottom+16, middle, "", t.label)
	}
	each := math.Min(34, lowerHeight/float64(len(all)))
	for k, one := range all {
		y := top + each*(float64(k)+0.5)
		zero, at := x.place(0), x.place(one.value)
		c.rectangle("bar", math.Min(zero, at), y-each*0.32, math.Abs(at-zero), each*0.64)
		c.text(barRoom-8, y+4, end, "", shortened(symbol(one.name), barRoom-16))
	}
}

func (c *canvas) scatter(s *value.Study, r *value.StudyResult, strongest cause, top float64) {
	p := s.Parameters[strongest.index]
	x := linear(p.Low, p.High, 4, false)
	x.from, x.to = pageWidth/2+lowerGap/2+20, pageWidth-rightRoom
	low, high := math.Inf(1), math.Inf(-1)
	draw := make([]float64, len(s.Parameters))
	type dot struct {
		x, y   float64
		corner bool
	}
	var dots []dot
	every := (s.Samples + mostDots - 1) / mostDots
	for k, v := range r.Values {
		sample := s.First + k
		if math.IsNaN(v) || math.IsInf(v, 0) || sample < s.Samples && k%every != 0 || sample-s.Samples > 256 {
			continue
		}
		s.Draw(sample, draw)
		low, high = math.Min(low, v), math.Max(high, v)
		dots = append(dots, dot{draw[strongest.index], v, sample >= s.Samples})
	}
	y := linear(low, high, 4, true)
	bottom := top + lowerHeight
	y.from, y.to = bottom, top
	for _, t := range x.ticks {
		c.line("grid", x.place(t.at), bottom, x.place(t.at), top)
		c.text(x.place(t.at), bottom+16, middle, "", t.label)
	}
	for _, t := range y.ticks {
		c.line("grid", x.from, y.place(t.at), x.to, y.place(t.at))
		c.text(x.from-7, y.place(t.at)+4, end, "", t.label)
	}
	for _, d := range dots {
		if d.corner {
			c.circle("corner", x.place(d.x), y.place(d.y), 2.6)
		} else {
			c.circle("dot", x.place(d.x), y.place(d.y), 1.4)
		}
	}
	name := r.Name
	if name == "" {
		name = r.Text
	}
	c.text(x.from, top-9, start, "", heading(shortened(name, 200), r.Unit.Text, y.power))
	c.text((x.from+x.to)/2, bottom+footRoom-6, middle, "", heading(symbol(strongest.name), p.Unit.Text, x.power))
}
