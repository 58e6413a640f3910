package figure

import (
	"bytes"
	"compress/zlib"
	"fmt"
	"math"
	"strings"
	"unicode/utf16"
)

// points for a unit of the drawing: 72 points are an inch, 96 units too
const pointsPerUnit = 0.75

// PDF writes the drawing as a page of its own size (PDF 1.7, ISO 32000-1). Its letters are a
// Type 3 font of outlines, so the file looks the same everywhere, and their meaning is kept,
// so that its text can be searched. The same drawing gives the same bytes.
func (d *Drawing) PDF() []byte {
	w := &pdfWriter{codes: map[rune]byte{}, opacities: map[string]float64{}}
	w.contents(d)
	var file bytes.Buffer
	var offsets []int
	object := func(format string, args ...any) int {
		offsets = append(offsets, file.Len())
		fmt.Fprintf(&file, "%d 0 obj\n", len(offsets))
		fmt.Fprintf(&file, format, args...)
		file.WriteString("\nendobj\n")
		return len(offsets)
	}
	stream := func(data []byte) int {
		var packed bytes.Buffer
		z, _ := zlib.NewWriterLevel(&packed, zlib.BestCompression)
		_, _ = z.Write(data) // into memory: it cannot fail
		_ = z.Close()
		return object("<< /Length %d /Filter /FlateDecode >>\nstream\n%s\nendstream", packed.Len(), packed.Bytes())
	}
	file.WriteString("%PDF-1.7\n%\xe2\xe3\xcf\xd3\n")
	content := stream(w.content.Bytes())
	font := w.font(object, stream)
	states := ""
	for _, name := range w.states {
		states += fmt.Sprintf("/%s << /ca %s /CA %s >> ", name, decimal(w.opacities[name]), decimal(w.opacities[name]))
	}
	pages := len(offsets) + 2
	page := object("<< /Type /Page /Parent %d 0 R /MediaBox [0 0 %s %s] /Contents %d 0 R /Resources << /Font << /F %d 0 R >> /ExtGState << %s>> >> >>",
		pages, decimal(d.width*pointsPerUnit), decimal(d.height*pointsPerUnit), content, font, states)
	object("<< /Type /Pages /Kids [%d 0 R] /Count 1 >>", page)
	catalogue := object("<< /Type /Catalog /Pages %d 0 R /ViewerPreferences << /DisplayDocTitle true >> >>", pages)
	info := object("<< /Title %s /Subject %s >>", pdfText(d.Title), pdfText(d.Description))
	table := file.Len()
	fmt.Fprintf(&file, "xref\n0 %d\n0000000000 65535 f \n", len(offsets)+1)
	for _, o := range offsets {
		fmt.Fprintf(&file, "%010d 00000 n \n", o)
	}
	fmt.Fprintf(&file, "trailer\n<< /Size %d /Root %d 0 R /Info %d 0 R >>\nstartxref\n%d\n%%%%EOF\n", len(offsets)+1, catalogue, info, table)
	return file.Bytes()
}

// pdfWriter collects the page's content and which letters and opacities it uses.
type pdfWriter struct {
	content   bytes.Buffer
	codes     map[rune]byte // of the letters used, in the order of their use
	used      []rune
	states    []string
	opacities map[string]float64
}

func (w *pdfWriter) printf(format string, args ...any) { fmt.Fprintf(&w.content, format, args...) }

// decimal writes a number without an exponent.
func decimal(x float64) string {
	s := strings.TrimRight(strings.TrimRight(fmt.Sprintf("%.4f", x), "0"), ".")
	if s == "-0" {
		return "0"
	}
	return s
}

// contents draws in the drawing's units, y downwards.
func (w *pdfWriter) contents(d *Drawing) {
	w.printf("%s 0 0 %s 0 %s cm\n", decimal(pointsPerUnit), decimal(-pointsPerUnit), decimal(d.height*pointsPerUnit))
	for k := range d.shapes {
		w.shape(&d.shapes[k])
	}
}

func (w *pdfWriter) shape(s *shape) {
	i := inkOf(s.class)
	switch s.kind {
	case path:
		w.begin(i)
		for _, line := range s.lines {
			for k, p := range line {
				w.printf("%s %s %s\n", tenths(p.x), tenths(p.y), map[bool]string{true: "m", false: "l"}[k == 0])
			}
			if s.closed {
				w.printf("h\n")
			}
		}
		if !s.closed {
			i.fill = ""
		}
		w.finish(i)
	case oval:
		w.begin(i)
		w.oval(float64(s.at.x)/10, float64(s.at.y)/10, float64(s.size.x)/10, float64(s.size.y)/10)
		w.finish(i)
	case box:
		w.begin(i)
		w.printf("%s %s %s %s re\n", tenths(s.at.x), tenths(s.at.y), tenths(s.size.x), tenths(s.size.y))
		w.finish(i)
	case clip:
		w.printf("q %s %s %s %s re W n\n", tenths(s.at.x), tenths(s.at.y), tenths(s.size.x), tenths(s.size.y))
	case unclip:
		w.printf("Q\n")
	case label:
		w.label(s, i)
	}
}

func colours(name string) string {
	c := palette[name]
	return fmt.Sprintf("%s %s %s", decimal(float64(c.R)/255), decimal(float64(c.G)/255), decimal(float64(c.B)/255))
}

// begin sets colours, width, dashes and opacity.
func (w *pdfWriter) begin(i ink) {
	w.printf("q ")
	if i.opacity < 1 {
		name := fmt.Sprintf("O%d", int(math.Round(i.opacity*1000)))
		if _, ok := w.opacities[name]; !ok {
			w.states = append(w.states, name)
			w.opacities[name] = i.opacity
		}
		w.printf("/%s gs ", name)
	}
	if i.fill != "" {
		w.printf("%s rg ", colours(i.fill))
	}
	if i.stroke != "" {
		var dashes []string
		for _, d := range i.dashes {
			dashes = append(dashes, decimal(d))
		}
		w.printf("%s RG %s w 1 j [%s] 0 d\n", colours(i.stroke), decimal(i.width), strings.Join(dashes, " "))
	}
}

// finish paints and takes the settings back.
func (w *pdfWriter) finish(i ink) {
	switch {
	case i.fill != "" && i.stroke != "":
		w.printf("B Q\n")
	case i.fill != "":
		w.printf("f Q\n")
	case i.stroke != "":
		w.printf("S Q\n")
	default:
		w.printf("n Q\n")
	}
}

// oval is an ellipse of four Bézier curves.
func (w *pdfWriter) oval(x, y, rx, ry float64) {
	const k = 0.5522847498 // 4/3·(√2 − 1)
	w.printf("%s %s m\n", decimal(x+rx), decimal(y))
	for _, q := range [][6]float64{
		{x + rx, y + k*ry, x + k*rx, y + ry, x, y + ry}, {x - k*rx, y + ry, x - rx, y + k*ry, x - rx, y},
		{x - rx, y - k*ry, x - k*rx, y - ry, x, y - ry}, {x + k*rx, y - ry, x + rx, y - k*ry, x + rx, y},
	} {
		for _, v := range q {
			w.printf("%s ", decimal(v))
		}
		w.printf("c\n")
	}
	w.printf("h\n")
}

func (w *pdfWriter) label(s *shape, i ink) {
	var codes strings.Builder
	for _, r := range s.text {
		fmt.Fprintf(&codes, "%02x", w.code(r))
	}
	x := letters().from(float64(s.at.x)/10, s.anchor, s.text)
	w.printf("BT %s rg /F %s Tf 1 0 0 -1 %s %s Tm <%s> Tj ET\n", colours(i.fill), decimal(letter), decimal(x), tenths(s.at.y), codes.String())
}

// code gives a letter its place in the font; one that finds none is the empty box.
func (w *pdfWriter) code(r rune) byte {
	if c, ok := w.codes[r]; ok {
		return c
	}
	if len(w.used) == 254 && r != '□' {
		return w.code('□')
	}
	c := byte(len(w.used) + 1)
	w.codes[r] = c
	w.used = append(w.used, r)
	return c
}

// font writes the letters that were used as a Type 3 font.
func (w *pdfWriter) font(object func(string, ...any) int, stream func([]byte) int) int {
	f := letters()
	var procedures, differences, widths, meanings strings.Builder
	for k, r := range w.used {
		g := f.of(r)
		p := &pdfPen{}
		fmt.Fprintf(&p.content, "%d 0 0 %d %d %d d1\n", g.advance, -f.perEm, 2*f.perEm, 2*f.perEm)
		g.trace(p)
		p.content.WriteString("f\n")
		fmt.Fprintf(&procedures, "/g%d %d 0 R ", k+1, stream(p.content.Bytes()))
		fmt.Fprintf(&differences, "/g%d ", k+1)
		fmt.Fprintf(&widths, "%d ", g.advance)
		fmt.Fprintf(&meanings, "<%02x> <%s>\n", k+1, hexUTF16(string(r)))
	}
	count := len(w.used)
	var pairs strings.Builder
	lines := strings.SplitAfter(meanings.String(), "\n")
	for first := 0; first < count; first += 100 { // at most a hundred in one block
		last := min(first+100, count)
		fmt.Fprintf(&pairs, "%d beginbfchar\n%sendbfchar\n", last-first, strings.Join(lines[first:last], ""))
	}
	unicode := stream([]byte("/CIDInit /ProcSet findresource begin\n12 dict begin\nbegincmap\n/CMapName /Meanings def\n/CMapType 2 def\n" +
		"1 begincodespacerange\n<00> <ff>\nendcodespacerange\n" + pairs.String() + "endcmap\nCMapName currentdict /CMap defineresource pop\nend\nend\n"))
	unit := fmt.Sprintf("%.9f", 1/float64(f.perEm))
	return object("<< /Type /Font /Subtype /Type3 /FontBBox [0 0 0 0] /FontMatrix [%s 0 0 %s 0 0] /CharProcs << %s>> "+
		"/Encoding << /Type /Encoding /Differences [1 %s] >> /FirstChar 1 /LastChar %d /Widths [%s] /Resources << >> /ToUnicode %d 0 R >>",
		unit, unit, procedures.String(), differences.String(), max(count, 1), widths.String(), unicode)
}

// pdfPen writes a letter's outline; a quadratic curve is written as the cubic one it is.
type pdfPen struct {
	content bytes.Buffer
	x, y    float64
}

func (p *pdfPen) moveTo(x, y float64) {
	fmt.Fprintf(&p.content, "%s %s m\n", decimal(x), decimal(y))
	p.x, p.y = x, y
}

func (p *pdfPen) lineTo(x, y float64) {
	fmt.Fprintf(&p.content, "%s %s l\n", decimal(x), decimal(y))
	p.x, p.y = x, y
}

func (p *pdfPen) quadTo(cx, cy, x, y float64) {
	third := func(from, to float64) string { return decimal(from + 2*(to-from)/3) }
	fmt.Fprintf(&p.content, "%s %s %s %s %s %s c\n", third(p.x, cx), third(p.y, cy), third(x, cx), third(y, cy), decimal(x), decimal(y))
	p.x, p.y = x, y
}

func (p *pdfPen) closePath() { p.content.WriteString("h\n") }

// pdfText is a text string of any letters.
func pdfText(s string) string { return "<feff" + hexUTF16(s) + ">" }

func hexUTF16(s string) string {
	var b strings.Builder
	for _, u := range utf16.Encode([]rune(s)) {
		fmt.Fprintf(&b, "%04x", u)
	}
	return b.String()
}
