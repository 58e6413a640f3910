package figure

import (
	"bytes"
	"fmt"
	"image/png"
	"math"
	"math/rand/v2"
	"os/exec"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"gainwright/lang/value"
)

// some are drawings of every kind over ranges of many sizes; invented data.
func some(t *testing.T, seed uint64) []*Drawing {
	t.Helper()
	r := rand.New(rand.NewPCG(seed, 1))
	size := math.Pow(10, float64(r.IntN(13)-6))
	offset := size * float64(r.IntN(5)-2)
	end := math.Pow(10, float64(r.IntN(9)-5)) * (1 + 8*r.Float64())
	response := &value.Response{Title: "step response"}
	for k := range 200 {
		response.Instants = append(response.Instants, end*float64(k)/199)
	}
	limit := offset + 1.2*size
	for k, name := range []string{"omega1", "a rather long name of a signal", "F"} {
		trace := value.Trace{Name: name, Role: []string{"output", "output", "input"}[k], Unit: value.Unit{Text: "N*m/rad"}, High: &limit}
		for i := range response.Instants {
			trace.Values = append(trace.Values, offset+size*(1-math.Exp(-float64(i)/30)*math.Cos(float64(i)/10+float64(k))))
		}
		response.Signals = append(response.Signals, trace)
	}
	sweep := &value.Report{Columns: []string{"frequency [rad/s]", "gain [dB]", "phase [deg]"}}
	for k := range 120 {
		w := math.Pow(10, float64(r.IntN(2))) / end * math.Pow(10, float64(k)/30)
		if k > 0 {
			w = math.Max(w, sweep.Rows[k-1][0].(value.Number).Float64()*1.01)
		}
		sweep.Rows = append(sweep.Rows, []value.Value{value.Float(w), value.Float(20 * math.Log10(2/(1+w*end))), value.Float(-200 * math.Atan(w*end))})
	}
	poles := &value.Report{Title: PoleMapTitle, Columns: []string{"what", "place"}, Fields: []value.Named{{Name: "damping", Value: value.Float(0.5)}}}
	for range 5 {
		p := complex(-size*r.Float64(), size*r.Float64())
		poles.Rows = append(poles.Rows, []value.Value{value.Text("pole"), value.Complex{C: p}}, []value.Value{value.Text("wanted"), value.Complex{C: p * 1.1}})
	}
	study := &value.Study{Models: []string{"cart"}, Samples: 300, Corners: 4, Seed: int64(seed),
		Parameters: []value.StudyParameter{{Model: "cart", Name: "stiffness_of_the_shaft", Unit: value.Unit{Text: "N*m/rad"}, Nominal: size, Low: 0.9 * size, High: 1.1 * size},
			{Model: "cart", Name: "omega", Nominal: 1, Low: 0.9, High: 1.1}}}
	result := value.StudyResult{Text: "least_damping(closed(cart, quadratic_gain(cart, weights: \"ranges\")))", Unit: value.Unit{Text: "rad/s"}}
	draw := make([]float64, 2)
	for k := range study.Total() {
		study.Draw(k, draw)
		result.Values = append(result.Values, offset+size*draw[1]-0.3*draw[0])
	}
	study.Results = []value.StudyResult{result}
	var out []*Drawing
	for _, v := range []value.Value{response, sweep, poles, study} {
		d, ok := Draw(v)
		if !ok {
			t.Fatalf("seed %d: %T is not drawn", seed, v)
		}
		out = append(out, d)
	}
	limited, ok := DrawStudy(study, func(*value.StudyResult) []Limit { return []Limit{{">=", offset + 0.5*size}, {"<", offset + 1.5*size}} })
	if !ok {
		t.Fatal("the limits are not drawn")
	}
	response.Signals[0].Band = &value.Band{Low: offset + 0.95*size, High: offset + 1.05*size, From: 0.7 * end, PeakAt: end / 10, Peak: offset + 1.3*size}
	required, ok := DrawFigures(&value.Report{Basis: response, Fields: []value.Named{{Name: "band", Value: value.Float(5)}}},
		func(field string) []Limit {
			return []Limit{{"<", map[string]float64{"overshoot": 100 * r.Float64(), "settling": end * r.Float64()}[field]}}
		})
	if !ok {
		t.Fatal("the figures are not drawn")
	}
	return append(out, limited, required)
}

// TestLabelsStayInside: no text leaves the drawing, whatever the ranges are. The letters'
// own widths decide; the layout works with an estimate.
func TestLabelsStayInside(t *testing.T) {
	f := letters()
	for seed := range uint64(60) {
		for k, d := range some(t, seed) {
			for _, s := range d.shapes {
				if s.kind != label {
					continue
				}
				from := f.from(float64(s.at.x)/10, s.anchor, s.text)
				to, y := from+f.width(s.text), float64(s.at.y)/10
				if from < 0 || to > d.width || y < 9 || y > d.height-2 {
					t.Errorf("seed %d, drawing %d: %q spans %.1f … %.1f at height %.1f of %.0f × %.0f", seed, k, s.text, from, to, y, d.width, d.height)
				}
			}
		}
	}
}

// TestTicksAreRound: neighbouring ticks are 1, 2 or 5 times a power of ten apart.
func TestTicksAreRound(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 5))
	for range 300 {
		low := (r.Float64() - 0.5) * math.Pow(10, float64(r.IntN(20)-10))
		a := linear(low, low+math.Pow(10, float64(r.IntN(20)-10))*(0.1+r.Float64()), 5, r.IntN(2) == 0)
		if len(a.ticks) < 2 {
			continue
		}
		step := a.ticks[1].at - a.ticks[0].at
		lead := step / math.Pow(10, math.Floor(math.Log10(step)+1e-6))
		if d := math.Min(math.Abs(lead-1), math.Min(math.Abs(lead-2), math.Abs(lead-5))); d > 1e-3 && math.Abs(low) < 1e6*step {
			t.Errorf("ticks of %g … %g are %g apart", a.low, a.high, step)
		}
	}
}

func TestNumbersAreWrittenAsOnPaper(t *testing.T) {
	for want, got := range map[string]string{
		"1230": briefer(1234), "12.3": briefer(12.3456), "−0.05": brief(-0.05), "1.5·10⁶": brief(1.5e6), "−2·10⁻⁷": brief(-2e-7),
		"100000": brief(99999.9), "0": brief(0), "0.0003053": brief(0.00030529), "+Inf": brief(math.Inf(1)), "NaN": brief(math.NaN()), "0.1": rounded(0.1, 6),
	} {
		if got != want {
			t.Errorf("%s is written %s", want, got)
		}
	}
}

// TestPaletteIsThatOfTheStyle compares the colours and the lines of PNG and PDF with
// figure.css.
func TestPaletteIsThatOfTheStyle(t *testing.T) {
	root := Style[:strings.IndexByte(Style, '}')]
	for name, c := range palette {
		found := regexp.MustCompile(`--` + name + `:#([0-9a-f]{3,6})\b`).FindStringSubmatch(root)
		if found == nil {
			t.Errorf("the style has no --%s", name)
			continue
		}
		hex := found[1]
		if len(hex) == 3 {
			hex = strings.Repeat(hex[:1], 2) + strings.Repeat(hex[1:2], 2) + strings.Repeat(hex[2:], 2)
		}
		if got := fmt.Sprintf("%02x%02x%02x", c.R, c.G, c.B); got != hex {
			t.Errorf("%s is #%s here and #%s in the style", name, got, hex)
		}
	}
	for class, i := range inks {
		if class == "" || class == "quiet" {
			continue
		}
		rule := regexp.MustCompile(`\.figure \.` + class + `\{([^}]*)\}`).FindStringSubmatch(Style)
		if rule == nil {
			t.Errorf("the style has no rule for .%s", class)
			continue
		}
		wants := []string{}
		if i.stroke != "" {
			wants = append(wants, "stroke:var(--"+i.stroke+")")
		}
		if i.fill != "" {
			wants = append(wants, "fill:var(--"+i.fill+")")
		}
		if i.width != 0 && i.width != 1.7 {
			wants = append(wants, "stroke-width:"+strconv.FormatFloat(i.width, 'g', -1, 64))
		}
		if i.opacity != 0 {
			wants = append(wants, "fill-opacity:"+strings.TrimPrefix(strconv.FormatFloat(i.opacity, 'g', -1, 64), "0")+";")
		}
		if len(i.dashes) > 0 {
			var parts []string
			for _, d := range i.dashes {
				parts = append(parts, strconv.FormatFloat(d, 'g', -1, 64))
			}
			wants = append(wants, "stroke-dasharray:"+strings.Join(parts, " "))
		}
		for _, want := range wants {
			if !strings.Contains(rule[1], want) {
				t.Errorf(".%s is {%s} in the style, and %s here", class, rule[1], want)
			}
		}
	}
}

func TestPNGIsPainted(t *testing.T) {
	for k, d := range some(t, 3) {
		data, err := d.PNG()
		if err != nil {
			t.Fatal(err)
		}
		again, _ := d.PNG()
		if !bytes.Equal(data, again) {
			t.Errorf("drawing %d has other bytes the second time", k)
		}
		picture, err := png.Decode(bytes.NewReader(data))
		if err != nil {
			t.Fatal(err)
		}
		if got := picture.Bounds().Size(); got.X != 1440 || got.Y != int(math.Ceil(d.height*pixelsPerUnit)) {
			t.Errorf("drawing %d has %v pixels", k, got)
		}
		counts := map[[3]uint32]int{}
		for y := range picture.Bounds().Dy() {
			for x := range picture.Bounds().Dx() {
				r, g, b, _ := picture.At(x, y).RGBA()
				counts[[3]uint32{r >> 8, g >> 8, b >> 8}]++
			}
		}
		for name, least := range map[string]int{"paper": 100_000, "ink": 300, "grid": 1000} {
			c := palette[name]
			if n := counts[[3]uint32{uint32(c.R), uint32(c.G), uint32(c.B)}]; n < least {
				t.Errorf("drawing %d has %d pixels of %s", k, n, name)
			}
		}
	}
	// A line of known place: 10 units thick would be 22.5 pixels; its middle has its colour.
	d := &Drawing{width: 100, height: 50, shapes: []shape{{class: "curve one", lines: [][]place{{{100, 250}, {900, 250}}}}}}
	data, err := d.PNG()
	if err != nil {
		t.Fatal(err)
	}
	picture, _ := png.Decode(bytes.NewReader(data))
	for _, at := range []struct {
		x, y  float64
		inked bool
	}{{50, 25, true}, {12, 25, true}, {88, 25, true}, {8, 25, false}, {92, 25, false}, {50, 22, false}, {50, 28, false}} {
		r, _, _, _ := picture.At(int(at.x*pixelsPerUnit), int(at.y*pixelsPerUnit)).RGBA()
		if (r>>8 == uint32(palette["one"].R)) != at.inked {
			t.Errorf("at %g, %g the red is %d", at.x, at.y, r>>8)
		}
	}
}

// TestPDFHasItsParts checks the file's own table of objects, and the text where poppler's
// pdftotext is there.
func TestPDFHasItsParts(t *testing.T) {
	for k, d := range some(t, 4) {
		data := d.PDF()
		if !bytes.Equal(data, d.PDF()) {
			t.Errorf("drawing %d has other bytes the second time", k)
		}
		begin := bytes.LastIndex(data, []byte("startxref\n"))
		at, err := strconv.Atoi(string(bytes.TrimSpace(data[begin+10 : bytes.LastIndex(data, []byte("%%EOF"))])))
		if err != nil || !bytes.HasPrefix(data[at:], []byte("xref\n0 ")) {
			t.Fatalf("drawing %d: the table is not at %d (%v)", k, at, err)
		}
		offsets := regexp.MustCompile(`(?m)^(\d{10}) 00000 n $`).FindAllSubmatch(data[at:], -1)
		if len(offsets) < 8 {
			t.Errorf("drawing %d has %d objects", k, len(offsets))
		}
		for n, o := range offsets {
			place, _ := strconv.Atoi(string(o[1]))
			if !bytes.HasPrefix(data[place:], []byte(fmt.Sprintf("%d 0 obj\n", n+1))) {
				t.Errorf("drawing %d: object %d is not at %d", k, n+1, place)
			}
		}
		if _, err := exec.LookPath("pdftotext"); err != nil {
			continue
		}
		c := exec.Command("pdftotext", "-", "-")
		c.Stdin = bytes.NewReader(data)
		var problems bytes.Buffer
		c.Stderr = &problems
		text, err := c.Output()
		if err != nil || problems.Len() > 0 {
			t.Errorf("drawing %d: pdftotext: %v %s", k, err, problems.String())
		}
		for _, s := range d.shapes {
			if s.kind == label && !strings.Contains(strings.Join(strings.Fields(string(text)), " "), s.text) && !strings.Contains(s.text, "⁻") {
				t.Errorf("drawing %d: the text %q is not found", k, s.text)
			}
		}
	}
}

func TestUnknownLettersAreBoxes(t *testing.T) {
	f := letters()
	if f.of('漢') != f.of('□') || f.of('a') == f.of('□') || f.of('Ω') == f.of('□') {
		t.Error("the letters are not those of the face")
	}
	// Every letter that the layout writes itself has an outline.
	for _, r := range "0123456789.−·⁰¹²³⁴⁵⁶⁷⁸⁹⁻₀₁₂₃₄₅₆₇₈₉αβγδεζηθκλμνξρστφχψωΓΔΘΛΣΦΨΩ…[]°" {
		if f.of(r) == f.of('□') {
			t.Errorf("%c has no outline", r)
		}
	}
}

// TestStudyOnATerminal: the columns of the histogram stand as high as their samples are many.
func TestStudyOnATerminal(t *testing.T) {
	s := &value.Study{Samples: 100, Results: []value.StudyResult{{Unit: value.Unit{Text: "1/s"}}}}
	for k := range 100 {
		v := 1.0 // 70 of 100 lie at the lower end
		if k >= 70 {
			v = 1 + float64(k-69)/30
		}
		s.Results[0].Values = append(s.Results[0].Values, v)
	}
	lines := Terminal(s, 60)
	if len(lines) != histogramLines+1 || !strings.HasPrefix(strings.TrimSpace(lines[0]), "70 ⡇") || !strings.HasSuffix(lines[3], "2 1/s") {
		t.Errorf("%s", strings.Join(lines, "\n"))
	}
	s.Results[0].Values = make([]float64, 100)
	if Terminal(s, 60) != nil {
		t.Error("samples that are all equal have a drawing")
	}
}
