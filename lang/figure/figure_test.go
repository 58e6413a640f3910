package figure_test

import (
	"encoding/xml"
	"errors"
	"io"
	"math"
	"regexp"
	"strconv"
	"strings"
	"testing"
	"unicode/utf8"

	"gainwright/lang/figure"
	"gainwright/lang/value"
)

// swing is a decaying swing of n samples, an invented example.
func swing(n int, names ...string) *value.Response {
	r := &value.Response{Title: "response"}
	limit := 2.0
	for i := range n {
		r.Instants = append(r.Instants, 4*float64(i)/float64(n-1))
	}
	for k, name := range names {
		t := value.Trace{Name: name, Role: "output", Unit: value.Unit{Text: "rad"}}
		if k%2 == 1 {
			t.Role, t.High, t.Unit.Text = "input", &limit, "N"
		}
		for _, at := range r.Instants {
			t.Values = append(t.Values, 1-math.Exp(-at)*math.Cos(40*at+float64(k)))
		}
		r.Signals = append(r.Signals, t)
	}
	return r
}

func table(columns []string, rows ...[]value.Value) *value.Report {
	return &value.Report{Title: "pole map", Columns: columns, Rows: rows}
}

func sweep() *value.Report {
	r := &value.Report{Title: "frequency response", Columns: []string{"frequency [rad/s]", "gain [dB]", "phase [deg]"}}
	for k := range 200 {
		w := 0.01 * math.Pow(10, float64(k)/40)
		// 10/(s + 1)³
		gain := 20 - 30*math.Log10(1+w*w)
		r.Rows = append(r.Rows, []value.Value{value.Float(w), value.Float(gain), value.Float(-3 * math.Atan(w) * 180 / math.Pi)})
	}
	return r
}

func poles() *value.Report {
	r := table([]string{"what", "place"},
		[]value.Value{value.Text("pole"), value.Int(-3)},
		[]value.Value{value.Text("pole"), value.Complex{C: complex(-1, 2)}},
		[]value.Value{value.Text("pole"), value.Complex{C: complex(-1, -2)}},
		[]value.Value{value.Text("zero"), value.Int(1)},
		[]value.Value{value.Text("wanted"), value.Int(-4)})
	r.Fields = []value.Named{{Name: "damping", Value: value.Float(0.6)}}
	return r
}

// parsed reads a drawing as XML and gives its elements and texts.
func parsed(t *testing.T, svg string) (elements map[string]int, texts []string) {
	t.Helper()
	elements = map[string]int{}
	d := xml.NewDecoder(strings.NewReader(svg))
	for {
		token, err := d.Token()
		if errors.Is(err, io.EOF) {
			return elements, texts
		}
		if err != nil {
			t.Fatalf("%v in %.400s", err, svg)
		}
		switch x := token.(type) {
		case xml.StartElement:
			elements[x.Name.Local+" "+class(x)]++
		case xml.CharData:
			if s := strings.TrimSpace(string(x)); s != "" {
				texts = append(texts, s)
			}
		}
	}
}

func class(e xml.StartElement) string {
	for _, a := range e.Attr {
		if a.Name.Local == "class" {
			return a.Value
		}
	}
	return ""
}

func draw(t *testing.T, v value.Value) string {
	t.Helper()
	svg, ok := figure.Of(v, "f")
	if !ok {
		t.Fatal("no figure")
	}
	again, _ := figure.Of(v, "f")
	if svg != again {
		t.Error("the second drawing has other bytes")
	}
	return svg
}

func TestResponseIsDrawn(t *testing.T) {
	elements, texts := parsed(t, draw(t, swing(500, "omega1", "F")))
	if elements["title "] != 1 || elements["desc "] != 1 || elements["path curve one"] != 2 || elements["path limit"] != 1 {
		t.Errorf("elements %v", elements)
	}
	all := strings.Join(texts, "|")
	for _, want := range []string{"ω₁ [rad]", "F [N]", "time [s]", "0.5", "2.0"} {
		if !strings.Contains(all, want) {
			t.Errorf("the drawing lacks %q: %s", want, all)
		}
	}
}

// TestSampledSignalsAreHeld follows a staircase: every step goes along or up, never both.
func TestSampledSignalsAreHeld(t *testing.T) {
	r := &value.Response{Sampled: true, Instants: []float64{0, 1, 2, 3}, Signals: []value.Trace{{Name: "x", Role: "output", Values: []float64{0, 1, 3, 2}}}}
	path := curvePath.FindStringSubmatch(draw(t, r))[1]
	numbers := regexp.MustCompile(`-?[0-9.]+`).FindAllString(path, -1)
	if len(numbers) != 2+2*6 {
		t.Fatalf("the path is %s", path)
	}
	for i := 2; i < len(numbers); i += 2 {
		if (numbers[i] == "0") == (numbers[i+1] == "0") {
			t.Errorf("a step of the path %s goes by %s and %s", path, numbers[i], numbers[i+1])
		}
	}
}

func TestManySamplesStaySmallAndKeepTheExtremes(t *testing.T) {
	r := swing(10_000, "x")
	r.Signals[0].Values[7003] = 9
	svg := draw(t, r)
	if len(svg) > 200_000 {
		t.Errorf("%d bytes", len(svg))
	}
	if !strings.Contains(svg, "x from ") || !strings.Contains(svg, " to 9, at the end") {
		t.Error("the description lacks the extremes")
	}
	// The single outlier reaches the top of the panel: the axis ends at 10.
	low, high := extent(t, svg)
	if high-low < 0.85*150 {
		t.Errorf("the curve spans %g of 150 units", high-low)
	}
	for _, few := range []int{1, 2, 3} {
		if _, ok := figure.Of(swing(few+1, "x"), "f"); !ok {
			t.Errorf("%d samples have no drawing", few+1)
		}
	}
}

var curvePath = regexp.MustCompile(`class="curve one" d="M([^"]*)"`)

// extent follows a curve's path and gives its lowest and highest vertical place.
func extent(t *testing.T, svg string) (low, high float64) {
	t.Helper()
	found := curvePath.FindStringSubmatch(svg)
	if found == nil {
		t.Fatal("no curve")
	}
	numbers := regexp.MustCompile(`-?[0-9.]+`).FindAllString(found[1], -1)
	y, low, high := 0.0, math.Inf(1), math.Inf(-1)
	for i := 1; i < len(numbers); i += 2 {
		v, err := strconv.ParseFloat(numbers[i], 64)
		if err != nil {
			t.Fatal(err)
		}
		y += v
		low, high = math.Min(low, y), math.Max(high, y)
	}
	return low, high
}

func TestSweepMarksItsCrossings(t *testing.T) {
	svg := draw(t, sweep())
	elements, texts := parsed(t, svg)
	if elements["circle mark"] != 2 || elements["path curve one"] != 2 {
		t.Errorf("elements %v", elements)
	}
	all := strings.Join(texts, "|")
	// |10/(1 + iω)³| = 1 at ω = √(10^(2/3) − 1) = 1.9089…, and −3·atan ω = −180° at ω = √3.
	for _, want := range []string{"gain [dB]", "phase [deg]", "frequency [rad/s]", "gain 1 at 1.91", "half a turn at 1.73", "−180", "0.01|0.1|1|10|100|"} {
		if !strings.Contains(all, want) {
			t.Errorf("the drawing lacks %q: %s", want, all)
		}
	}
}

func TestPoleMapHasItsSigns(t *testing.T) {
	elements, texts := parsed(t, draw(t, poles()))
	// One of each sign more stands in the key.
	if elements["path pole"] != 4 || elements["circle zero"] != 2 || elements["rect wanted"] != 2 || elements["path shade"] != 1 || elements["path limit"] != 1 {
		t.Errorf("elements %v", elements)
	}
	if all := strings.Join(texts, "|"); !strings.Contains(all, "pole at −1 + 2i; pole at −1 − 2i") {
		t.Errorf("description: %s", all)
	}
}

func TestHostileNamesStayText(t *testing.T) {
	r := swing(50, `</text><script>alert(1)</script>`, "a\x00\x1b[31m\u202e\"'&")
	r.Title = "]]><b>"
	r.Signals[0].Unit.Text = "<img>"
	elements, _ := parsed(t, draw(t, r))
	if elements["script "] != 0 || elements["b "] != 0 || elements["img "] != 0 {
		t.Errorf("elements %v", elements)
	}
}

func TestOddValuesAreDrawnOrRefused(t *testing.T) {
	for name, values := range map[string][]float64{
		"constant":  {2, 2, 2},
		"zero":      {0, 0, 0},
		"huge":      {-1e308, 1e308, 1e308},
		"tiny":      {1e-320, 2e-320, 0},
		"not all":   {math.NaN(), 1, math.Inf(1)},
		"nothing":   {math.NaN(), math.NaN(), math.Inf(-1)},
		"rounding":  {1, 1 + 1e-15, 1 - 1e-15},
		"near zero": {1e-17, -1e-17, 0},
	} {
		r := &value.Response{Instants: []float64{0, 1, 2}, Signals: []value.Trace{{Name: "x", Role: "output", Values: values}}}
		svg, ok := figure.Of(r, "f")
		if ok == (name == "nothing") {
			t.Errorf("%s: drawn %v", name, ok)
		}
		if ok {
			parsed(t, svg)
			for _, bad := range []string{"NaN", "Inf"} {
				if strings.Contains(strings.SplitN(svg, "</desc>", 2)[1], bad) {
					t.Errorf("%s: the drawing holds %s", name, bad)
				}
			}
		}
		figure.Terminal(r, 60)
	}
	if _, ok := figure.Of(value.Int(1), "f"); ok {
		t.Error("a number has no figure")
	}
}

// TestLabelsStayInside holds every text within the drawing by an upper estimate of its width.
func TestLabelsStayInside(t *testing.T) {
	box := regexp.MustCompile(`viewBox="0 0 ([0-9.]+) ([0-9.]+)"`)
	text := regexp.MustCompile(`<text x="([-0-9.]+)" y="([-0-9.]+)" text-anchor="([a-z]+)"[^>]*>([^<]*)</text>`)
	long := swing(300, strings.Repeat("very long name ", 20), "b", strings.Repeat("W", 90), strings.Repeat("another ", 9))
	for i := range long.Signals {
		long.Signals[i].Role = "output"
		for k := range long.Signals[i].Values {
			long.Signals[i].Values[k] *= -123456.7
		}
	}
	for name, v := range map[string]value.Value{"long names": long, "sweep": sweep(), "poles": poles(), "plain": swing(20, "x", "u")} {
		svg := draw(t, v)
		size := box.FindStringSubmatch(svg)
		width, _ := strconv.ParseFloat(size[1], 64)
		height, _ := strconv.ParseFloat(size[2], 64)
		for _, m := range text.FindAllStringSubmatch(svg, -1) {
			x, _ := strconv.ParseFloat(m[1], 64)
			y, _ := strconv.ParseFloat(m[2], 64)
			w := 0.62 * 12 * float64(utf8.RuneCountInString(m[4]))
			left := map[string]float64{"start": x, "middle": x - w/2, "end": x - w}[m[3]]
			if left < -1 || left+w > width+8 || y < 8 || y > height {
				t.Errorf("%s: %q from %g to %g, at %g, in %g × %g", name, m[4], left, left+w, y, width, height)
			}
		}
	}
}

func TestTerminalKeepsItsWidth(t *testing.T) {
	lines := figure.Terminal(swing(1000, "x", "F"), 72)
	if len(lines) != 13 {
		t.Fatalf("%d lines\n%s", len(lines), strings.Join(lines, "\n"))
	}
	for _, l := range lines {
		if utf8.RuneCountInString(l) > 72 {
			t.Errorf("%d cells: %s", utf8.RuneCountInString(l), l)
		}
	}
	if !strings.Contains(strings.Join(lines, "\n"), "⠈") && !strings.ContainsAny(strings.Join(lines, ""), "⡀⠄⠂⠁") {
		t.Error("no dots")
	}
}

func TestStandaloneParses(t *testing.T) {
	parsed(t, figure.Standalone(draw(t, sweep())))
}

// TestFiguresShadeTheBand: what figures were read off is drawn with the band and its marks.
func TestFiguresShadeTheBand(t *testing.T) {
	basis := swing(200, "x")
	basis.Signals[0].Band = &value.Band{Low: 0.98, High: 1.02, From: 3.5, PeakAt: 0.1, Peak: 1.9}
	elements, texts := parsed(t, draw(t, &value.Report{Title: "figures of the response", Basis: basis}))
	if elements["rect band"] != 1 || elements["circle mark"] != 2 {
		t.Errorf("elements %v", elements)
	}
	if all := strings.Join(texts, "|"); !strings.Contains(all, "settled at 3.5 s") || !strings.Contains(all, "1.9|") {
		t.Errorf("the marks say %s", all)
	}
	basis.Signals[0].Band = &value.Band{Low: 0.98, High: 1.02, From: math.Inf(1), PeakAt: math.NaN(), Peak: math.NaN()}
	elements, _ = parsed(t, draw(t, &value.Report{Title: "figures of the response", Basis: basis}))
	if elements["rect band"] != 1 || elements["circle mark"] != 0 {
		t.Errorf("without settling: elements %v", elements)
	}
}
