package report_test

import (
	"bytes"
	"context"
	"encoding/json"
	"encoding/xml"
	"errors"
	"io"
	"math"
	"os"
	"regexp"
	"strings"
	"testing"
	"testing/fstest"
	"unicode/utf8"

	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/report"
	"gainwright/lang/value"
)

// table holds one function whose value is floating, √2 with 15.95 digits.
var table = []*value.Builtin{{Name: "root_of_two", Func: func(*value.Call) (value.Value, error) { return value.Float(math.Sqrt2), nil }}}

// run makes a document of a text that needs no other built-ins.
func run(t *testing.T, name, text string) *report.Document {
	t.Helper()
	src := diag.NewSource(name, text)
	var events []eval.Event
	eval.New(eval.Options{Builtins: table}).RunText(context.Background(), src, func(e eval.Event) { events = append(events, e) })
	folder := fstest.MapFS{"dot.svg": {Data: []byte(`<svg xmlns="http://www.w3.org/2000/svg"/>`)}, "note.png": {Data: []byte("no picture")}}
	return report.New(report.Run{Source: src, Events: events, Version: "test", Folder: folder})
}

func page(t *testing.T, name, text string) string {
	t.Helper()
	var b bytes.Buffer
	if err := run(t, name, text).HTML(&b); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// elements lists the elements of a page and the attributes that could load or run something.
func elements(t *testing.T, text string) (names map[string]int, suspicious []string) {
	t.Helper()
	names = map[string]int{}
	d := xml.NewDecoder(strings.NewReader(text))
	d.Strict, d.AutoClose, d.Entity = false, xml.HTMLAutoClose, xml.HTMLEntity
	for {
		token, err := d.Token()
		if errors.Is(err, io.EOF) {
			return names, suspicious
		}
		if err != nil {
			t.Fatal(err)
		}
		n, ok := token.(xml.StartElement)
		if !ok {
			continue
		}
		names[n.Name.Local]++
		for _, a := range n.Attr {
			key, target := a.Name.Local, strings.ToLower(strings.TrimSpace(a.Value))
			isLoad := (key == "href" || key == "src") && n.Name.Local != "a" && !strings.HasPrefix(target, "data:image/")
			isRun := key == "href" && strings.HasPrefix(target, "javascript:") || strings.HasPrefix(key, "on")
			if isLoad || isRun || key == "style" || key == "srcset" || key == "srcdoc" {
				suspicious = append(suspicious, n.Name.Local+" "+key+"="+a.Value)
			}
		}
	}
}

const hostile = "---\ntitle: </title><script>alert(1)</script>\nauthor: \"<img src=x onerror=alert(1)>\"\n---\n" +
	"# Head <script>alert(2)</script>\n\n<script>alert(3)</script>\n\n<iframe src=x></iframe> [a](javascript:alert(4)) [b](JaVaScRiPt:alert(5)) ![c](javascript:alert(6))\n\n" +
	"![out](../secret.png) ![abs](/etc/passwd) ![net](https://example.org/a.png) ![no](note.png) ![yes](dot.svg)\n\n" +
	"```html\n<script>alert(7)</script>\n```\n\n```gain\n\"</script><script>alert(8)</script>\"\nrequire 1 == 1, \"</script><svg onload=alert(9)>\"\n[\"<!--\", \"]]>\", \"&lt;\"]\nclaim 2 is 3\n1/0 # <b onclick=x>\n```\n"

func TestHostileTextStaysText(t *testing.T) {
	text := page(t, "<b>.md", hostile)
	names, suspicious := elements(t, text)
	if len(suspicious) > 0 {
		t.Errorf("the page holds %q", suspicious)
	}
	if names["script"] != 1 || names["iframe"] != 0 || names["img"] != 1 || names["b"] != 0 {
		t.Errorf("elements of the text came through: %v", names)
	}
	for _, want := range []string{"it lies outside the notebook", "only pictures in the notebook", "it is no PNG", "alert(3)", "alert(7)"} {
		if !strings.Contains(text, want) {
			t.Errorf("the page does not say %q", want)
		}
	}
	if !strings.Contains(text, "default-src &#39;none&#39;") {
		t.Error("the page has no policy")
	}
}

var data = regexp.MustCompile(`(?s)<script type="application/json" id="results">(.*?)</script>`)

func TestTheDataIsWholeAndParses(t *testing.T) {
	found := data.FindStringSubmatch(page(t, "<b>.md", hostile))
	if found == nil {
		t.Fatal("no data")
	}
	var kept struct {
		Results []map[string]any
		Hash    string `json:"sha256"`
	}
	if err := json.Unmarshal([]byte(found[1]), &kept); err != nil {
		t.Fatal(err)
	}
	if len(kept.Results) != 5 || kept.Results[0]["source"] != `"</script><script>alert(8)</script>"` || len(kept.Hash) != 64 {
		t.Errorf("the data holds %v", kept)
	}
}

func TestTheSameRunGivesTheSameBytes(t *testing.T) {
	for name, text := range map[string]string{"a.md": hostile, "a.gain": "# Lead\nx = 2\n[[1, x], [3, 1/3]]\n(s + 1)/(s^2 + 0.5*s + 1)\n"} {
		if first, second := page(t, name, text), page(t, name, text); first != second {
			t.Errorf("%s gives other bytes the second time", name)
		}
		a, _ := run(t, name, text).Markdown("out")
		b, _ := run(t, name, text).Markdown("out")
		if !bytes.Equal(a, b) {
			t.Errorf("%s gives other Markdown the second time", name)
		}
	}
}

func TestEveryLineOfAScriptIsShown(t *testing.T) {
	text := "# First words.\n# More of them.\n\nalpha = 2 # beside\n\n# Alone.\nbeta = [\n  1,\n  alpha]\nbeta\n\ngamma = 4\n\n# Last words.\n"
	got := page(t, "x.gain", text)
	at := 0
	for _, want := range []string{"First words.\nMore of them.", "alpha = 2 ", "# beside", "Alone.", "beta = [\n  1,\n  alpha]", "gamma = 4", "Last words."} {
		k := strings.Index(got[at:], want)
		if k < 0 {
			t.Fatalf("%q is missing, or out of order, after %q", want, got[max(0, at-60):at])
		}
		at += k
	}
}

func TestAnErrorStandsAtItsPlace(t *testing.T) {
	got := page(t, "x.md", "Before.\n\n```gain\n1\nrequire 1 == 2\n2 + [1, 2\n```\n\nAfter.\n\n```gain\n5\n```\n")
	names := []string{"The file stops at an error in line 6", "Before.", "missed", "x.md:6:10", "After.", "not run", "5"}
	at := 0
	for _, want := range names {
		k := strings.Index(got[at:], want)
		if k < 0 {
			t.Fatalf("%q is missing, or out of order, after %q", want, got[max(0, at-60):at])
		}
		at += k
	}
}

func TestTheMachinesFoldersAreNotShown(t *testing.T) {
	got := page(t, "/home/marguerite/x.gain", "1 + y\n")
	if strings.Contains(got, "marguerite") {
		t.Error("the page shows the folder")
	}
	if !strings.Contains(got, "x.gain:1:5") {
		t.Error("the page does not show the error's place")
	}
}

func TestMatricesAreTablesAndFormulasMathML(t *testing.T) {
	names, _ := elements(t, page(t, "x.gain", "[[1, 2.25], [-3, 1/3]]\n(s + 1)/(s^2 + 0.5*s + 1)\ns^3 + 1.5e-7\n"))
	if names["table"] != 1 || names["td"] != 4 || names["math"] != 2 || names["mfrac"] != 1 || names["msup"] != 3 {
		t.Errorf("elements %v", names)
	}
}

// TestCautionsAreTheReadmes holds the page's cautions to those of the README.
func TestCautionsAreTheReadmes(t *testing.T) {
	readme, err := os.ReadFile("../../README.md")
	if err != nil {
		t.Fatal(err)
	}
	cautions, err := os.ReadFile("cautions.md")
	if err != nil {
		t.Fatal(err)
	}
	_, after, _ := strings.Cut(string(readme), "\n## Cautions\n")
	section, _, _ := strings.Cut(after, "\n## ")
	if strings.TrimSpace(section) != strings.TrimSpace(string(cautions)) {
		t.Error("lang/report/cautions.md and the README's cautions differ")
	}
}

func source(text string) *diag.Source { return diag.NewSource("x.gain", text) }

// FuzzDocument looks for a text that cannot be set, or that brings elements of its own.
func FuzzDocument(f *testing.F) {
	f.Add(hostile, true)
	f.Add("# a\n\nx = [1,\n2] # b\nx\n1 + ) 2\nrequire x[1] == 2\n", false)
	f.Add("> - ```gain\n>   1\n>   2 +\n>   ```\n", true)
	f.Fuzz(func(t *testing.T, text string, isNotebook bool) {
		if len(text) > 4000 || !utf8.ValidString(text) || strings.ContainsRune(text, 0) {
			return // refused before
		}
		name := "x.gain"
		if isNotebook {
			name = "x.md"
		}
		d := run(t, name, text)
		d.Recall(run(t, name, "1\n```gain\n2\n```\n"))
		var b bytes.Buffer
		if err := d.HTML(&b); err != nil {
			t.Fatal(err)
		}
		for _, bad := range []string{"<script>", "<iframe", "<object", " onerror=\"", "javascript:alert(1)\""} {
			if strings.Contains(strings.ToLower(b.String()), bad) {
				t.Errorf("the page of %q holds %s", text, bad)
			}
		}
		if n := strings.Count(b.String(), "</script>"); n != 1 {
			t.Errorf("the page of %q holds %d ends of scripts", text, n)
		}
		if k, err := report.ReadKept(b.Bytes()); err != nil {
			t.Errorf("the page of %q cannot be read back: %v", text, err)
		} else if found, err := d.Compare(k); err != nil || len(found) > 0 {
			t.Errorf("%q differs from itself: %v %v", text, found, err)
		}
		d.Markdown("out")
	})
}
