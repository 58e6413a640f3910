package figure

import (
	"math"

	"gainwright/lang/value"
)

// the drawing's width, and of a panel the height and the room for texts
const (
	pageWidth   = 640.0
	panelHeight = 150.0
	headRoom    = 26.0 // above a panel: what it shows
	footRoom    = 40.0 // below the last one: ticks and their heading
	panelGap    = 12.0
	rightRoom   = 22.0
	leastLeft   = 34.0
	mostCurves  = 4
)

// curve is one line of a panel.
type curve struct {
	name      string
	x, y      []float64
	staircase bool
	low, high *float64 // limits to draw
}

// panel is one set of axes; panels stand below each other over one horizontal axis.
type panel struct {
	heading func(power int) string
	curves  []curve
	levels  []float64 // horizontal lines that mean something
	step    float64   // wanted distance of ticks, 0 for any round one
	marks   []mark
	bands   []value.Band
	must    *mustStay
	y       *axis
}

type mark struct {
	x, y float64
	text string
}

// the classes of the curves in their order: hue and dashes differ
var curveClasses = [mostCurves]string{"one", "two", "three", "four"}

// stacked draws panels over one horizontal axis.
func stacked(title, description string, panels []*panel, x *axis, xHeading func(power int) string) (*Drawing, bool) {
	left := leastLeft
	for _, p := range panels {
		if !p.scale() {
			return nil, false
		}
		for _, t := range p.y.ticks {
			left = math.Max(left, textWidth(t.label)+14)
		}
	}
	x.from, x.to = left, pageWidth-rightRoom
	var c canvas
	height := float64(len(panels))*(panelHeight+headRoom+panelGap) - panelGap + footRoom
	c.begin(pageWidth, height, title, description)
	top := headRoom
	for k, p := range panels {
		p.y.from, p.y.to = top+panelHeight, top
		c.panel(p, x, k == len(panels)-1)
		top += panelHeight + headRoom + panelGap
	}
	c.text((x.from+x.to)/2, height-6, middle, "", xHeading(x.power))
	return &c.Drawing, true
}

// scale chooses the panel's vertical axis.
func (p *panel) scale() bool {
	low, high := math.Inf(1), math.Inf(-1)
	see := func(v float64) {
		if !math.IsNaN(v) && !math.IsInf(v, 0) {
			low, high = math.Min(low, v), math.Max(high, v)
		}
	}
	for _, c := range p.curves {
		for _, v := range c.y {
			see(v)
		}
	}
	if low > high {
		return false
	}
	// A limit is drawn where it does not squeeze the curve flat.
	span := math.Max(high-low, math.Max(math.Abs(low), math.Abs(high)))
	for _, c := range p.curves {
		for _, limit := range []*float64{c.low, c.high} {
			if limit != nil && *limit > low-4*span && *limit < high+4*span {
				see(*limit)
			}
		}
	}
	for _, level := range p.levels {
		if level > low-0.4*(high-low) && level < high+0.4*(high-low) {
			see(level)
		}
	}
	for _, b := range p.bands { // room for the words at the farthest point
		see(b.Low)
		see(b.High)
		if b.Peak >= high {
			see(b.Peak + 0.12*(high-low))
		}
	}
	if p.must != nil && p.must.hasCeiling { // room for its words
		away := 0.14 * (high - low)
		if p.must.downwards {
			away = -away
		}
		if d := p.must.ceiling - (low+high)/2; math.Abs(d) < 2*(high-low) {
			see(p.must.ceiling + away)
		}
	}
	if high-low < 1e-9*math.Max(math.Abs(low), math.Abs(high)) {
		// What differs by rounding alone is a constant.
		low = (low + high) / 2
		high = low
	}
	if p.step > 0 {
		step := p.step
		for (high-low)/step > 6 {
			step *= 2
		}
		first, last := math.Floor(low/step), math.Ceil(high/step)
		if first == last {
			first, last = first-1, last+1
		}
		p.y = (&axis{low: first * step, high: last * step}).labelled(step, first, last)
		return true
	}
	p.y = linear(low, high, 4, true)
	return true
}

func (c *canvas) panel(p *panel, x *axis, last bool) {
	bottom, top := p.y.from, p.y.to
	for _, v := range x.fine {
		c.line("grid", x.place(v), bottom, x.place(v), bottom-4)
	}
	taken := -1.0
	for _, t := range x.ticks {
		at := x.place(t.at)
		c.line("grid", at, bottom, at, top)
		half := textWidth(t.label) / 2
		if last && at-half > taken {
			c.text(at, bottom+16, middle, "", t.label)
			taken = at + half + 4
		}
	}
	for _, t := range p.y.ticks {
		at := p.y.place(t.at)
		class := "grid"
		if t.at == 0 {
			class = "axis"
		}
		c.line(class, x.from, at, x.to, at)
		c.text(x.from-7, at+4, end, "", t.label)
	}
	for _, b := range p.bands {
		low, high := math.Max(b.Low, p.y.low), math.Min(b.High, p.y.high)
		if low < high {
			c.rectangle("band", x.from, p.y.place(high), x.to-x.from, p.y.place(low)-p.y.place(high))
		}
	}
	if p.must != nil {
		c.mustStay(p.must, x, p.y)
	}
	for _, level := range p.levels {
		if level >= p.y.low && level <= p.y.high {
			c.line("axis", x.from, p.y.place(level), x.to, p.y.place(level))
		}
	}
	c.head(p, x)
	for k, one := range p.curves {
		for _, limit := range []*float64{one.low, one.high} {
			if limit != nil && *limit >= p.y.low && *limit <= p.y.high {
				c.line("limit", x.from, p.y.place(*limit), x.to, p.y.place(*limit))
			}
		}
		c.add(shape{class: "curve " + curveClasses[k%mostCurves], lines: trace(one, x, p.y)})
	}
	for _, m := range p.marks {
		c.mark(m, x, p.y)
	}
}

// head writes above a panel what it shows: the quantity, and the curves where there are several.
func (c *canvas) head(p *panel, x *axis) {
	at, top := x.from, p.y.to-9
	head := p.heading(p.y.power)
	room := x.to - x.from
	if len(p.curves) < 2 {
		c.text(at, top, start, "", shortened(head, room))
		return
	}
	if head != "" {
		head = shortened(head, room/3)
		c.text(at, top, start, "", head)
		at += textWidth(head) + 14
	}
	each := (x.to - at) / float64(len(p.curves))
	for k, one := range p.curves {
		name := shortened(one.name, each-40)
		c.line("curve "+curveClasses[k], at, top-4, at+24, top-4)
		c.text(at+29, top, start, "", name)
		at += math.Min(each, textWidth(name)+46)
	}
}

func (c *canvas) mark(m mark, x, y *axis) {
	if m.x < x.low || m.x > x.high || m.y < y.low || m.y > y.high {
		return
	}
	px, py := x.place(m.x), y.place(m.y)
	c.circle("mark", px, py, 3.5)
	if m.text == "" {
		return
	}
	// The first place beside the point where no other word stands.
	width := textWidth(m.text)
	best := -1
	var free words
	for k, w := range [...]words{{px + 8, py - 8, start}, {px + 8, py + 16, start}, {px - 8, py - 8, end}, {px - 8, py + 16, end}} {
		from := w.from(width)
		if from < x.from || from+width > x.to || w.y < y.to+11 || w.y > y.from-3 {
			continue
		}
		if best < 0 || !c.crosses(w, width) && c.crosses(free, width) {
			best, free = k, w
		}
	}
	if best < 0 {
		return
	}
	c.written = append(c.written, written{free.from(width), free.y, width})
	at, up, side := free.x, free.y, free.side
	c.text(at, up, side, "", m.text)
}

// words is a place for a mark's text.
type words struct {
	x, y float64
	side anchor
}

func (w words) from(width float64) float64 {
	if w.side == end {
		return w.x - width
	}
	return w.x
}

// written is a mark's text that stands already.
type written struct{ from, y, width float64 }

func (c *canvas) crosses(w words, width float64) bool {
	from := w.from(width)
	for _, o := range c.written {
		if from < o.from+o.width+4 && o.from < from+width+4 && math.Abs(w.y-o.y) < letter+1 {
			return true
		}
	}
	return false
}

// trace gives a curve as lines, a new one behind every gap. Where many points fall on one
// place of the horizontal axis, the first, the lowest, the highest and the last are kept, so
// that nothing of the curve's extent is lost.
func trace(one curve, x, y *axis) [][]place {
	var lines [][]place
	down := false
	put := func(px, py int) {
		p := place{px, py}
		if !down {
			lines = append(lines, []place{p})
			down = true
			return
		}
		line := &lines[len(lines)-1]
		if p != (*line)[len(*line)-1] {
			*line = append(*line, p)
		}
	}
	column := newColumn(put)
	started := false // the curve has a point since its last gap
	for i, t := range one.x {
		v := one.y[i]
		if math.IsNaN(v) || math.IsInf(v, 0) || math.IsNaN(t) || x.isLog && t <= 0 {
			column.flush()
			down, started = false, false
			continue
		}
		px, py := tenth(x.place(t)), tenth(y.place(v))
		if one.staircase && started {
			column.add(px, column.last)
		}
		started = true
		column.add(px, py)
	}
	column.flush()
	return lines
}

// column gathers the points of one place.
type column struct {
	put                           func(px, py int)
	at, first, lowest, high, last int
	lowFirst, filled              bool
	few                           []int
}

func newColumn(put func(px, py int)) *column { return &column{put: put} }

// how wide a place is, in tenths of the drawing's unit
const placeWidth = 6

func (c *column) add(px, py int) {
	if c.filled && px/placeWidth != c.at/placeWidth {
		c.flush()
	}
	if !c.filled {
		*c = column{put: c.put, at: px, first: py, lowest: py, high: py, filled: true, few: c.few[:0]}
	}
	c.few = append(c.few, px, py)
	if py < c.lowest {
		c.lowest, c.lowFirst = py, false
	}
	if py > c.high {
		c.high, c.lowFirst = py, true
	}
	c.last = py
}

func (c *column) flush() {
	if !c.filled {
		return
	}
	if len(c.few) <= 8 {
		for i := 0; i < len(c.few); i += 2 {
			c.put(c.few[i], c.few[i+1])
		}
	} else {
		a, b := c.high, c.lowest
		if c.lowFirst {
			a, b = b, a
		}
		for _, py := range []int{c.first, a, b, c.last} {
			c.put(c.at, py)
		}
	}
	c.filled = false
	c.few = c.few[:0]
}
