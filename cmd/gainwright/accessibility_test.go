package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/chromedp/chromedp"
)

// TestReportsAreAccessible runs axe-core (https://github.com/dequelabs/axe-core, MPL 2.0) on
// the reports of designs, light and dark, wide and narrow: no rule of WCAG 2 or of good
// practice may be violated. AXE_CORE names its file axe.min.js; without it the test is
// skipped, unless references are required.
func TestReportsAreAccessible(t *testing.T) {
	if testing.Short() {
		t.Skip("long")
	}
	name := os.Getenv("AXE_CORE")
	if name == "" {
		if os.Getenv("REQUIRE_REFERENCES") == "1" {
			t.Fatal("AXE_CORE names no file")
		}
		t.Skip("AXE_CORE names no file")
	}
	axe, err := os.ReadFile(name)
	if err != nil {
		t.Fatal(err)
	}
	ctx, _ := browser(t)
	folder := t.TempDir()
	for _, design := range []string{"tilting_tray.md", "review_wire_feed.md", "crane.gain", "hydraulic_axis.gain"} {
		output := filepath.Join(folder, strings.TrimSuffix(design, filepath.Ext(design))+".html")
		if status, _, errOut := gainwright("report", filepath.Join("..", "..", "scripts", design), "-o", output); status != scriptStatus[design] {
			t.Fatalf("%s: %d %s", design, status, errOut)
		}
		for _, scheme := range []string{"light", "dark"} {
			for _, width := range []int64{1280, 375} {
				prefer(t, ctx, scheme)
				do(t, ctx, chromedp.EmulateViewport(width, 900))
				do(t, ctx, chromedp.Navigate("file://"+output))
				evaluate[bool](t, ctx, string(axe)+"\n;typeof axe === 'object'")
				evaluate[bool](t, ctx, `window.found = null; axe.run(document, {resultTypes: ["violations", "passes"]}).then(r => {
					window.found = r.violations.map(v => v.id + ": " + v.help + "\n" + v.nodes.slice(0, 3).map(n => "  " + n.html.slice(0, 160) + "\n  " + n.failureSummary).join("\n"));
					window.passed = r.passes.length;
				}, e => { window.found = ["axe: " + e] }); true`)
				until(t, ctx, "window.found !== null")
				if found := evaluate[[]string](t, ctx, "window.found"); len(found) > 0 {
					t.Errorf("%s, %s, %d wide:\n%s", design, scheme, width, strings.Join(found, "\n"))
				} else if passed := evaluate[int](t, ctx, "window.passed"); passed < 15 {
					t.Errorf("%s: only %d rules applied", design, passed)
				}
			}
		}
	}
}
