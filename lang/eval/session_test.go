package eval_test

import (
	"context"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"sync/atomic"
	"testing"
	"time"

	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// The language tested in the language: every requirement in testdata/*.gain is met, every
// claim agrees, and a line with a comment #! fails with an error that holds its words.
func TestFilesInTheLanguage(t *testing.T) {
	files, err := filepath.Glob("testdata/*.gain")
	if err != nil || len(files) == 0 {
		t.Fatal("no files", err)
	}
	for _, path := range files {
		t.Run(filepath.Base(path), func(t *testing.T) {
			text, err := os.ReadFile(path)
			if err != nil {
				t.Fatal(err)
			}
			runLines(t, string(text))
		})
	}
}

func runLines(t *testing.T, text string) {
	s := session(true)
	piece, judged := "", 0
	for number, line := range strings.Split(text, "\n") {
		piece += line + "\n"
		if syntax.Incomplete(piece) {
			continue
		}
		_, wanted, fails := strings.Cut(line, "#!")
		message := ""
		src := diag.NewSource("line", piece)
		file, err := syntax.Parse(src)
		for _, st := range file.Statements {
			s.RunStatement(context.Background(), src, st, func(e eval.Event) {
				switch {
				case e.Error != nil:
					message = e.Error.Render()
				case e.Requirement != nil && !e.Requirement.Met:
					t.Errorf("line %d: missed: %s", number+1, line)
				case e.Claim != nil && !e.Claim.Agrees:
					t.Errorf("line %d: the claim disagrees: %s", number+1, line)
				}
				if e.Requirement != nil || e.Claim != nil {
					judged++
				}
			})
		}
		var syntaxError *diag.Error
		if errors.As(err, &syntaxError) {
			message = syntaxError.Render()
		}
		if fails && (message == "" || !strings.Contains(message, strings.TrimSpace(wanted))) {
			t.Errorf("line %d: wanted an error with %q, got %q", number+1, strings.TrimSpace(wanted), message)
		}
		if !fails && message != "" {
			t.Errorf("line %d: %s", number+1, message)
		}
		if fails {
			judged++
		}
		piece = ""
	}
	if judged == 0 {
		t.Error("the file judges nothing")
	}
}

func TestAnErrorKeepsWhatCameBefore(t *testing.T) {
	s := session(false)
	events, out := runText(t, s, "a = 2\na + 1\nb = a / 0\nc = 3\n")
	if !out.Failed || out.Missed {
		t.Fatalf("%+v", out)
	}
	if len(events) != 3 || events[1].Shown == nil || !isNumber(events[1].Shown.Value, 3, 1) {
		t.Fatalf("%d events", len(events))
	}
	last := events[2]
	if last.Error == nil || last.Line != 3 || caret(last.Error) != "/" || !strings.Contains(last.Error.Message, "zero") {
		t.Fatalf("%v %q", last.Error, caret(last.Error))
	}
	if _, ok := s.Lookup("a"); !ok {
		t.Error("a is lost")
	}
	if _, ok := s.Lookup("c"); ok {
		t.Error("c was bound after the error")
	}
}

func TestStatementsBeforeASyntaxErrorRun(t *testing.T) {
	events, out := runText(t, session(false), "1 + 1\n2 + * 3\n")
	if !out.Failed || len(events) != 2 || events[0].Shown == nil || events[1].Error == nil || events[1].Line != 2 {
		t.Fatalf("%+v %+v", out, events)
	}
}

func TestANameIsBoundOnceInAFile(t *testing.T) {
	e := failure(t, session(false), "x = 1\ny = 2\nx = 3\n")
	if caret(e) != "x" || !contains(e.Render(), "test.gain:3:1", "line 1", "x = 1") {
		t.Error(e.Render())
	}
}

func TestThePromptBindsAgainAndTakesBack(t *testing.T) {
	s := session(true)
	atPrompt(t, s, "x = 1\nx = 2\n")
	if v, _ := s.Lookup("x"); !isNumber(v, 2, 1) {
		t.Fatalf("x is %v", v)
	}
	if name, ok := s.TakeBack(); name != "x" || !ok {
		t.Fatal(name, ok)
	}
	if v, _ := s.Lookup("x"); !isNumber(v, 1, 1) {
		t.Fatalf("x is %v", v)
	}
	s.TakeBack()
	if _, ok := s.Lookup("x"); ok {
		t.Fatal("x is still bound")
	}
	if _, ok := s.TakeBack(); ok {
		t.Fatal("took back what was never bound")
	}
}

func TestAFailedStatementChangesNothing(t *testing.T) {
	s := session(true)
	atPrompt(t, s, "x = 1\n")
	if out := atPrompt(t, s, "x = 1/0\n"); !out.Failed {
		t.Fatal("did not fail")
	}
	if v, _ := s.Lookup("x"); !isNumber(v, 1, 1) {
		t.Fatalf("x is %v", v)
	}
	if names := s.Names(); len(names) != 1 || names[0].Name != "x" || names[0].Line != 1 {
		t.Fatalf("%+v", names)
	}
}

func TestErrorsPointAtTheirPlace(t *testing.T) {
	for _, c := range []struct{ text, caret, message, help string }{
		{"1 + (2 * [1, 2, 3]ᵀ * [1, 2]) ", "*", "", ""},
		{"sqr(4)", "sqr", "no function sqr", "sqrt"},
		{"1 + sqr", "sqr", "sqr is not known", "sqrt"},
		{"sqrt(1, 2)", "2", "takes 1 argument, and 2 are given", "sqrt(x)"},
		{"sqrt()", "sqrt", "needs x", "sqrt(x)"},
		{"sqrt(-4)", "-4", "negative", ""},
		{"sqrt(\"four\")", `"four"`, "", ""},
		{"scaled(1, bye: 2)", "bye", "no argument bye", "by"},
		{"scaled(1, x: 2)", "x", "x is given twice", ""},
		{"scaled(3, kind: \"doubel\")", `"doubel"`, "", "double"},
		{"refuse(1, [3])", "[3]", "mode at 3", ""},
		{"x = 3\nx(2)", "x", "not a function", ""},
		{"[1, 2](1)", "", "", ""},
		{"frequency_of()", "frequency_of", "frequency: …", ""},
		{"1 + 3 Hz", "Hz", "Hz", "rad/s"},
		{"s = 3", "s", "variable of polynomials", "model"},
		{"boom(1)", "boom", "defect of the program", "report"},
		{"nothing(1)", "nothing", "defect of the program", "report"},
		{"[x / 0 for each x of [1, 2]]", "/", "zero", ""},
		{"[1 for each x of 3]", "3", "", ""},
		{"define f(x, x) = x", "x", "stands twice", ""},
		{"define f(x) = x + [1, 2][7]\nf(2)", "7", "", ""},
		{"uses_unknown(1)", "uses_unknown", "not_there is not known", ""},
		{"if 3 { 1 } else { 2 }", "3", "condition is needed", ""},
		{"1 in mm", "mm", "", ""},
		{"require 1", "1", "condition is needed", ""},
		{"claim 3 is sqrt(9)", "sqrt(9)", "printed", "require"},
		{"inverted(0)", "inverted", "zero", "inverted"},
	} {
		e := failure(t, session(false), c.text)
		if c.caret != "" && caret(e) != c.caret || !strings.Contains(e.Message, c.message) || !strings.Contains(e.Help, c.help) {
			t.Errorf("%s: caret under %q\n%s", c.text, caret(e), e.Render())
		}
		for _, leak := range []string{"*value.", "goroutine", "interface {}", "runtime error", "file.Error", "nil"} {
			if strings.Contains(e.Render(), leak) {
				t.Errorf("%s: shows %q:\n%s", c.text, leak, e.Render())
			}
		}
	}
}

func TestNotesAreEvents(t *testing.T) {
	events, _ := runText(t, session(false), "sqrt = 3\nremark(\"look\")\nx = 1/100 s\n")
	var notes []string
	for _, e := range events {
		if e.Note != "" {
			notes = append(notes, e.Note)
		}
	}
	if len(notes) != 3 || !strings.Contains(notes[0], "built-in") || notes[1] != "look" || !strings.Contains(notes[2], "0.01 s") {
		t.Errorf("%q", notes)
	}
}

func TestFunctions(t *testing.T) {
	for _, c := range []struct {
		text     string
		num, den int64
	}{
		{"define f(x, y) = x - y, \"difference\"\nf(y: 1, x: 5)", 4, 1},
		{"define factorial(n) = if n <= 1 { 1 } else { n * factorial(n - 1) }\nfactorial(20)", 2432902008176640000, 1},
		{"define even(n) = if n == 0 { true } else { odd(n - 1) }\ndefine odd(n) = if n == 0 { false } else { even(n - 1) }\nif even(40) { 1 } else { 0 }", 1, 1},
		{"define half(x) = x / 2\ntwice(half, 12)", 3, 1},
		{"twice(squared, 3)", 81, 1},
		{"cubed(1/2)", 1, 8},
		{"answer", 42, 1},
		{"squared = 3\ncubed(2) + squared", 11, 1}, // the library does not see the user's names
		{"define g(x) = total(x, 2, 3)\ng(1)", 6, 1},
		{"total(1, 2, 3, 4)", 10, 1},
		{"scaled(x: 2, by: 5)", 10, 1},
		{"x = 7\ndefine h(x) = [x * y for each y of [1, 2, 3]][3]\nh(10) + x", 37, 1},
		{"[x for each x of [[y for each y of [1, 2, 3] where y > 1][1], 5]][1]", 2, 1},
	} {
		if v := shown(t, session(false), c.text); !isNumber(v, c.num, c.den) {
			t.Errorf("%s: %v", c.text, v)
		}
	}
}

func TestEndlessRecursionEnds(t *testing.T) {
	e := failure(t, session(false), "define f(x) = 1 + f(x + 1)\nf(1)")
	if e.Kind != diag.Limit || !strings.Contains(e.Message, "deep") {
		t.Error(e.Render())
	}
	shown(t, session(false), "define f(n) = if n == 0 { 0 } else { 1 + f(n - 1) }\nf(900)")
}

func TestStepsAndMemoryAreBounded(t *testing.T) {
	small := eval.New(eval.Options{Builtins: builtins(), Limits: eval.Limits{Steps: 10_000, Bytes: 1 << 20}})
	e := failure(t, small, "define f(n) = if n == 0 { 0 } else { f(n - 1) + f(n - 1) }\nf(60)")
	if e.Kind != diag.Limit || !strings.Contains(e.Message, "steps") {
		t.Error(e.Render())
	}
	for _, text := range []string{
		"ones(1000000)",
		"[ones(10000) for each k of whole_numbers(100)]",
		"ones(1000) * ones(1000)ᵀ",
	} {
		e := failure(t, small, text)
		if e.Kind != diag.Limit || !strings.Contains(e.Message, "memory") {
			t.Errorf("%s: %s", text, e.Render())
		}
	}
	// What a loop throws away is not held.
	shown(t, small, "[(ones(10000)ᵀ * ones(10000))[1, 1] for each k of whole_numbers(100)]")
}

func TestCancelStopsALoop(t *testing.T) {
	for _, text := range []string{
		"define f(n) = if n == 0 { 0 } else { f(n - 1) + f(n - 1) }\nf(100)",
		"[[x * y for each x of whole_numbers(2000)] for each y of whole_numbers(100000)]",
		"wait(1)",
		"deaf(1)", // a built-in that does not look at its context
		"define f(x) = deaf(x)\ntwice(f, 1)",
		"define f(x) = if x > 0 { f(x + 1) + f(x) } else { 0 }\ntwice(f, 1)",
		"A = ones(1900) * ones(1900)ᵀ\nA * A * A * A",
	} {
		// Alone it takes a few milliseconds; the bound only tells stopping from running on, whatever else the machine does.
		if took := stopAfter(t, text, 50*time.Millisecond); took > 5*time.Second {
			t.Errorf("%s: stopped after %v", text, took)
		}
	}
}

// stopAfter cancels a run and tells how long it went on after that.
func stopAfter(t *testing.T, text string, delay time.Duration) time.Duration {
	ctx, cancel := context.WithCancel(context.Background())
	s := eval.New(eval.Options{Builtins: builtins(), Limits: eval.Limits{Steps: -1, Depth: 1_000_000}})
	var stopped atomic.Int64
	start := time.Now()
	time.AfterFunc(delay, func() { stopped.Store(int64(time.Since(start))); cancel() })
	var last eval.Event
	out := s.RunText(ctx, diag.NewSource("test.gain", text), func(e eval.Event) { last = e })
	took := time.Since(start) - time.Duration(stopped.Load())
	if !out.Failed || last.Error == nil || last.Error.Kind != diag.Interrupted {
		t.Errorf("%s: %+v", text, last)
	}
	return took
}

func TestWallTimeIsBounded(t *testing.T) {
	s := eval.New(eval.Options{Builtins: builtins(), Limits: eval.Limits{Time: 50 * time.Millisecond}})
	start := time.Now()
	e := failure(t, s, "define f(n) = if n == 0 { 0 } else { f(n - 1) + f(n - 1) }\nf(100)")
	if e.Kind != diag.Limit || time.Since(start) > soon {
		t.Error(e.Render(), time.Since(start))
	}
}

func TestRequirements(t *testing.T) {
	for _, c := range []struct {
		text    string
		met     bool
		within  bool
		op      string
		because string
	}{
		{"require 0.1 + 0.2 == 0.3", true, false, "==", ""},
		{"require 2 < 1, \"why not\"", false, false, "<", ""},
		{"require sqrt(2)^2 == 2", true, true, "==", ""},
		{"require rounded(1, error: 0.01) >= 1.005", true, true, ">=", ""},
		{"require rounded(1, error: 0.01) >= 1.02", false, false, ">=", ""},
		{"require rounded(1, error: 0.01) != 1.005", false, true, "!=", ""},
		{"require 1 < 2 and 3 < 2", false, false, "<", "3 < 2"},
		{"require 1 < 2 or sqr > 2", true, false, "<", ""},
		{"require not (1 > 2)", true, false, ">", ""},
		{"require not (1 < 2)", false, false, "<", "1 < 2"},
		{"require stable(-1)", true, false, "", "grows"},
		{"require stable(1)", false, false, "", "grows"},
		{"require [[1, 2], [3, 4]] * [[1, 0], [0, 1]] == [[1, 2], [3, 4]]", true, false, "==", ""},
		{"require 1200 mm == 1.2 m", true, false, "==", ""},
		{"require (s + 1)*(s + 2) == s^2 + 3*s + 2", true, false, "==", ""},
	} {
		if strings.Contains(c.text, "sqr >") {
			continue // an unknown name is an error even where it would not be reached
		}
		events, out := runText(t, session(false), c.text)
		if out.Failed {
			t.Errorf("%s: %s", c.text, events[len(events)-1].Error.Render())
			continue
		}
		r := events[0].Requirement
		if r.Met != c.met || r.WithinRounding != c.within || r.Op != c.op || !strings.Contains(r.Because, c.because) || out.Missed == c.met {
			t.Errorf("%s: %+v", c.text, r)
		}
		if c.op != "" && (r.Left == nil || r.Right == nil) {
			t.Errorf("%s: no sides", c.text)
		}
	}
	events, _ := runText(t, session(false), "require 2 < 1,   \"why not\"  # remark")
	if r := events[0]; r.Requirement.Why != "why not" || r.Text != "2 < 1" || r.Line != 1 {
		t.Errorf("%+v", r)
	}
}

func TestUseRunsAFileOnceBelowTheRoot(t *testing.T) {
	dir := t.TempDir()
	for name, text := range map[string]string{
		"sub/parts.gain": "use \"more.gain\"\nuse \"../base.gain\"\npart = base + more\n",
		"sub/more.gain":  "more = 3\n",
		"base.gain":      "base = 4\n",
		"circle.gain":    "use \"sub/round.gain\"\n",
		"sub/round.gain": "use \"../circle.gain\"\n",
		"wrong.gain":     "good = 1\nbad = 1/0\n",
	} {
		path := filepath.Join(dir, name)
		if err := os.MkdirAll(filepath.Dir(path), 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	if err := os.Symlink("/etc/hostname", filepath.Join(dir, "link.gain")); err != nil {
		t.Fatal(err)
	}
	root, err := os.OpenRoot(dir)
	if err != nil {
		t.Fatal(err)
	}
	defer root.Close()
	fresh := func() *eval.Session { return eval.New(eval.Options{Builtins: builtins(), Root: root}) }
	if v := shown(t, fresh(), "use \"sub/parts.gain\"\nuse \"base.gain\"\npart"); !isNumber(v, 7, 1) {
		t.Errorf("part is %v", v)
	}
	for _, c := range []struct{ text, message string }{
		{"use \"circle.gain\"", "circle"},
		{"use \"test.gain\"", "circle"},
		{"use \"missing.gain\"", "no file missing.gain"},
		{"use \"../outside.gain\"", "outside"},
		{"use \"/etc/hostname\"", "outside"},
		{"use \"link.gain\"", "link.gain"},
		{"use \"sub\"", "not a file"},
		{"use \"\"", "empty"},
		{"base = 1\nuse \"base.gain\"", "bound already"},
	} {
		e := failure(t, fresh(), c.text)
		if !strings.Contains(e.Message, c.message) {
			t.Errorf("%s: %s", c.text, e.Render())
		}
	}
	s := fresh()
	e := failure(t, s, "use \"wrong.gain\"")
	if e.Source.Name != "wrong.gain" || caret(e) != "/" {
		t.Error(e.Render())
	}
	if _, ok := s.Lookup("good"); !ok {
		t.Error("what the file bound before its error is lost")
	}
	if e := failure(t, session(false), "use \"base.gain\""); e.Kind != diag.File {
		t.Error(e.Render())
	}
}

func TestWordsForLater(t *testing.T) {
	s := session(false)
	if got := strings.Join(s.Candidates("s"), " "); got != "scaled sqrt squared stable" {
		t.Errorf("candidates: %s", got)
	}
	v, ok := s.Lookup("squared")
	if fn, isFunction := v.(*value.Function); !ok || !isFunction || fn.Doc != "x to the second" {
		t.Errorf("%v", v)
	}
}
