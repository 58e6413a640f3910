package main

import (
	"context"
	"encoding/json"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/chromedp/cdproto/emulation"
	"github.com/chromedp/chromedp"
)

// browser starts Chromium for a test and collects what it complains of. Without Chromium
// the test is skipped, unless references are required.
func browser(t *testing.T) (ctx context.Context, complaints func() []string) {
	t.Helper()
	program := ""
	for _, name := range []string{"chromium", "chromium-browser", "google-chrome"} {
		if path, err := exec.LookPath(name); err == nil {
			program = path
			break
		}
	}
	if program == "" {
		if os.Getenv("REQUIRE_REFERENCES") == "1" {
			t.Fatal("Chromium is not installed")
		}
		t.Skip("Chromium is not installed")
	}
	options := []chromedp.ExecAllocatorOption{chromedp.ExecPath(program), chromedp.Headless, chromedp.NoSandbox, chromedp.DisableGPU,
		chromedp.NoFirstRun, chromedp.UserDataDir(t.TempDir()), chromedp.WindowSize(1280, 900)}
	for _, flag := range []string{"disable-quic", "disable-background-networking", "disable-component-update", "disable-sync"} {
		options = append(options, chromedp.Flag(flag, true))
	}
	allocated, stop := chromedp.NewExecAllocator(t.Context(), options...)
	t.Cleanup(stop)
	ctx, cancel := chromedp.NewContext(allocated)
	t.Cleanup(func() { _ = chromedp.Cancel(ctx); cancel() })
	do(t, ctx, chromedp.Navigate("about:blank")) // starts the browser for as long as ctx lives
	ctx, end := context.WithTimeout(ctx, 90*time.Second)
	t.Cleanup(end)
	messages := chromedp.Console(ctx)
	var mutex sync.Mutex
	var said []string
	go func() {
		for m, err := range messages {
			if err != nil {
				return
			}
			mutex.Lock()
			said = append(said, string(m.Type)+": "+m.Text)
			mutex.Unlock()
		}
	}()
	return ctx, func() []string { mutex.Lock(); defer mutex.Unlock(); return said }
}

func do(t *testing.T, ctx context.Context, action chromedp.Action[chromedp.Void]) {
	t.Helper()
	if err := chromedp.Do(ctx, action); err != nil {
		t.Fatal(err)
	}
}

// evaluate gives the value of an expression in the page.
func evaluate[T any](t *testing.T, ctx context.Context, expression string) T {
	t.Helper()
	v, err := chromedp.Run(ctx, chromedp.Evaluate[T](expression))
	if err != nil {
		t.Fatal(err)
	}
	return v
}

// prefer sets what the reader's system prefers.
func prefer(t *testing.T, ctx context.Context, scheme string) {
	t.Helper()
	_, err := chromedp.Call(ctx, emulation.SetEmulatedMedia, emulation.SetEmulatedMediaParams{
		Features: []*emulation.MediaFeature{{Name: "prefers-color-scheme", Value: scheme}}})
	if err != nil {
		t.Fatal(err)
	}
}

// until waits for an expression to become true.
func until(t *testing.T, ctx context.Context, expression string) {
	t.Helper()
	for range 200 {
		if evaluate[bool](t, ctx, expression) {
			return
		}
		time.Sleep(25 * time.Millisecond)
	}
	t.Fatalf("%s does not come true; the page reads\n%s", expression, evaluate[string](t, ctx, "document.body.innerText"))
}

const figuresDesign = `# A page with everything on it.
P = plant([[0, 1], [-2, -3]], [[0], [1]], [[3, 1]], states: ["x in m", "v in m/s"])
P
transfer(P)
sweep(P, from: 0.01 rad/s, to: 100 rad/s)
pole_map(P, wanted: [-4, -5], damping: 0.6)
modes(P)
require least_damping(P) >= 0.9, "<b>damped</b> </script>"
claim poles(P) is [-1, -2.1]
`

func TestTheReportInABrowser(t *testing.T) {
	ctx, complaints := browser(t)
	folder := t.TempDir()
	file, output := filepath.Join(folder, "a.gain"), filepath.Join(folder, "a.html")
	write(t, file, figuresDesign)
	if status, _, errOut := gainwright("report", file, "-o", output); status != 1 {
		t.Fatal(status, errOut)
	}
	do(t, ctx, chromedp.Navigate("file://"+output))
	if n := evaluate[int](t, ctx, "document.querySelectorAll('svg.figure').length"); n != 2 {
		t.Errorf("%d figures", n)
	}
	if got := evaluate[string](t, ctx, "getComputedStyle(document.querySelector('.curve')).stroke"); got != "rgb(23, 87, 126)" {
		t.Errorf("the style sheet does not apply: a curve is %s", got)
	}
	var kept map[string]any
	if err := json.Unmarshal([]byte(evaluate[string](t, ctx, "document.getElementById('results').textContent")), &kept); err != nil {
		t.Error(err)
	}
	if n := evaluate[int](t, ctx, "document.querySelectorAll('b').length"); n != 0 {
		t.Errorf("%d elements of the text came through", n)
	}

	t.Run("no label is clipped", func(t *testing.T) {
		clipped := evaluate[[]string](t, ctx, `[...document.querySelectorAll('svg.figure')].flatMap(svg => {
			const box = svg.getBoundingClientRect();
			return [...svg.querySelectorAll('text')].filter(x => { const b = x.getBoundingClientRect();
				return b.left < box.left - .5 || b.right > box.right + .5 || b.top < box.top - .5 || b.bottom > box.bottom + .5; }).map(x => x.textContent); })`)
		if len(clipped) > 0 {
			t.Errorf("clipped: %q", clipped)
		}
	})
	t.Run("telephone", func(t *testing.T) {
		do(t, ctx, chromedp.EmulateViewport(390, 844, chromedp.EmulateScale(2)))
		if wide := evaluate[int](t, ctx, "document.documentElement.scrollWidth"); wide > 390 {
			t.Errorf("the page is %d wide on 390", wide)
		}
	})
	t.Run("dark", func(t *testing.T) {
		prefer(t, ctx, "dark")
		if got := evaluate[string](t, ctx, "getComputedStyle(document.documentElement).backgroundColor"); got != "rgb(22, 24, 27)" {
			t.Errorf("the paper is %s", got)
		}
		checkContrast(t, ctx)
	})
	t.Run("light", func(t *testing.T) {
		prefer(t, ctx, "light")
		checkContrast(t, ctx)
	})
	t.Run("print", func(t *testing.T) {
		pdf, err := chromedp.Run(ctx, chromedp.PrintToPDF(chromedp.PDFPreferCSSPageSize()))
		if err != nil {
			t.Fatal(err)
		}
		if !strings.HasPrefix(string(pdf), "%PDF") || len(pdf) < 10_000 {
			t.Errorf("the print is %d bytes", len(pdf))
		}
	})
	t.Run("structure", func(t *testing.T) {
		missing := evaluate[[]string](t, ctx, `[
			document.documentElement.lang ? '' : 'language',
			document.querySelectorAll('h1').length === 1 ? '' : 'one main heading',
			document.querySelectorAll('main').length === 1 ? '' : 'one main part',
			[...document.querySelectorAll('svg')].every(s => s.getAttribute('aria-labelledby').split(' ').every(id => s.querySelector('#' + id).textContent)) ? '' : 'names of figures',
			[...document.querySelectorAll('th')].every(h => h.scope) ? '' : 'scopes of heads',
			new Set([...document.querySelectorAll('[id]')].map(e => e.id)).size === document.querySelectorAll('[id]').length ? '' : 'ids that occur once',
			[...document.querySelectorAll('a[href^="#"]')].every(a => document.getElementById(a.getAttribute('href').slice(1))) ? '' : 'targets of links',
		].filter(x => x)`)
		if len(missing) > 0 {
			t.Errorf("missing: %q", missing)
		}
	})
	if said := complaints(); len(said) > 0 {
		t.Errorf("the browser complains: %q", said)
	}
}

// checkContrast holds every text to a contrast of 4.5 with the paper (WCAG 2.2, 1.4.3).
func checkContrast(t *testing.T, ctx context.Context) {
	t.Helper()
	weak := evaluate[[]string](t, ctx, `(() => {
		const rgb = s => s.match(/[\d.]+/g).map(Number);
		const light = c => { const [r, g, b] = c.map(v => (v /= 255) <= .04045 ? v / 12.92 : ((v + .055) / 1.055) ** 2.4); return .2126 * r + .7152 * g + .0722 * b; };
		const paper = e => { for (; e; e = e.parentElement) { const c = rgb(getComputedStyle(e).backgroundColor); if (c.length < 4 || c[3] > 0) return c.slice(0, 3); } return [255, 255, 255]; };
		const found = new Set();
		for (const e of document.querySelectorAll('main *, header *')) {
			if (![...e.childNodes].some(n => n.nodeType === 3 && n.textContent.trim()) || !e.getClientRects().length) continue;
			const s = getComputedStyle(e), a = light(rgb(e instanceof SVGElement ? s.fill : s.color).slice(0, 3)), b = light(paper(e));
			const ratio = (Math.max(a, b) + .05) / (Math.min(a, b) + .05);
			if (ratio < 4.5) found.add(e.tagName + '.' + e.getAttribute('class') + ' ' + ratio.toFixed(2));
		}
		return [...found];
	})()`)
	if len(weak) > 0 {
		t.Errorf("weak contrast: %q", weak)
	}
}

func TestTheLivePageInABrowser(t *testing.T) {
	ctx, complaints := browser(t)
	var filler string
	for k := range 60 {
		filler += fmt.Sprintf("# Paragraph %d of a long text, so that the page can be scrolled.\n\n", k)
	}
	tail := strings.Repeat("\n# Words below.\n", 40)
	address, file := following(t, filler+"a = 2\na\n1001*a\n"+tail)
	do(t, ctx, chromedp.Navigate(address))
	until(t, ctx, "document.body.innerText.includes('2002')")
	do(t, ctx, chromedp.Evaluate[chromedp.Void]("document.querySelector('.pair').scrollIntoView({block: 'center'})"))
	before := evaluate[float64](t, ctx, "document.querySelector('.pair').getBoundingClientRect().top")

	// A line more above the place that is read must not move it.
	write(t, file, "# New first words.\n\n"+filler+"a = 3\na\n1001*a\n"+tail)
	until(t, ctx, "document.body.innerText.includes('3003')")
	if after := evaluate[float64](t, ctx, "document.querySelector('.pair').getBoundingClientRect().top"); after < before-2 || after > before+2 {
		t.Errorf("the place moved from %g to %g", before, after)
	}
	if marked := evaluate[string](t, ctx, "[...document.querySelectorAll('.row.changed')].map(r => r.innerText).join('|')"); !strings.Contains(marked, "3003") {
		t.Errorf("what changed is not marked: %q", marked)
	}
	if n := evaluate[int](t, ctx, "document.querySelectorAll('.comment.changed').length"); n != 1 {
		t.Errorf("%d comments are marked", n)
	}

	write(t, file, filler+"a = 3\nunknown\n1001*a\n"+tail)
	until(t, ctx, "document.querySelector('.failure') !== null")
	if text := evaluate[string](t, ctx, "document.querySelector('.old').innerText"); !strings.Contains(text, "3003") {
		t.Errorf("the last results are gone: %q", text)
	}
	write(t, file, filler+"a = 4\na\n1001*a\n"+tail)
	until(t, ctx, "document.body.innerText.includes('4004') && document.querySelector('.failure') === null")
	if said := complaints(); len(said) > 0 {
		t.Errorf("the browser complains: %q", said)
	}
}
