package prompt

import (
	"io"
	"strings"
	"testing"
	"testing/fstest"

	"github.com/google/go-cmp/cmp"

	"gainwright/lang/eval"
	"gainwright/lang/render"
	"gainwright/lang/value"
)

func testTable() []*value.Builtin {
	same := func(c *value.Call) (value.Value, error) { return c.Args["number"], nil }
	return []*value.Builtin{
		{Name: "pole_pair", Params: []value.Param{{Name: "damping", Shape: value.AReal, Named: true, Optional: true},
			{Name: "frequency", Shape: value.AFrequency, Named: true, Optional: true}}, Func: same},
		{Name: "pole_count", Params: []value.Param{{Name: "number", Shape: value.AReal}}, Func: same},
		{Name: "pi", Func: func(*value.Call) (value.Value, error) { return value.Pi(), nil }},
	}
}

func newTalk(t *testing.T, lines ...string) *talk {
	t.Helper()
	table := testTable()
	x := &talk{Options: Options{
		Session: eval.New(eval.Options{Builtins: table, Library: fstest.MapFS{}, Interactive: true}),
		Table:   table, Out: io.Discard, Look: func() render.Options { return render.Options{} },
	}, printer: &render.Printer{Out: io.Discard, Bindings: true}, reader: newPlainReader(strings.NewReader(""))}
	for _, l := range lines {
		x.lines++
		x.take(l)
	}
	if x.failed {
		t.Fatalf("%q failed", lines)
	}
	return x
}

func TestCompletion(t *testing.T) {
	x := newTalk(t, "omega_max = 3", "trolley = 2", "z1 = 2 + 3i")
	for _, c := range []struct {
		before, after string
		offers        []string
	}{
		{"", "", nil},
		{"1 + ", "", nil},
		{"\t", "", nil},
		{"tro", "", []string{"trolley"}},
		{"2*tro", " + 1", []string{"trolley"}},
		{"omega", "", []string{"ω"}},
		{"Omega", "", []string{"Ω"}},
		{"omega_", "", []string{"omega_max"}},
		{"pi", "", []string{"pi"}},
		{"po", "", []string{"pole_count", "pole_pair"}},
		{"pole_pair(d", "", []string{"damping: "}},
		{"pole_pair(damping: 0.7, f", "", []string{"frequency: "}},
		{"pole_pair(damping: 0.7, d", "", nil},
		{"2 * pole_count(pole_pair(f", "", []string{"frequency: "}},
		{"req", "", []string{"require "}},
		{"x = req", "", nil},
		{"explain pole_p", "", []string{"pole_pair"}},
		{"z1.im", "", []string{"imaginary"}},
		{"nothing.im", "", nil},
		{`use "tro`, "", nil},
		{"ταχ", "", nil},
	} {
		head, offers, tail := x.complete(c.before+c.after, len([]rune(c.before)))
		if d := cmp.Diff(c.offers, offers); d != "" {
			t.Errorf("%q: %s", c.before, d)
		}
		if !strings.HasPrefix(c.before, head) || tail != c.after {
			t.Errorf("%q: head %q, tail %q", c.before, head, tail)
		}
	}
}

func TestKeptFileLeavesOutWhatWasReplaced(t *testing.T) {
	one := func(text string, names ...string) accepted { return accepted{text, names} }
	for _, c := range []struct {
		name    string
		kept    []accepted
		text    string
		doubled []string
	}{
		{"plain", []accepted{one("a = 1", "a"), one("a + 1")}, "a = 1\na + 1\n", nil},
		{"replaced unused", []accepted{one("a = 1", "a"), one("b = 2", "b"), one("a = 3", "a")}, "b = 2\na = 3\n", nil},
		{"replaced by itself", []accepted{one("a = 1", "a"), one("a = a + 1", "a")}, "# a is bound again below\na = 1\na = a + 1\n", []string{"a"}},
		{"used in between", []accepted{one("a = 1", "a"), one("b = 2*a", "b"), one("a = 3", "a")},
			"# a is bound again below\na = 1\nb = 2*a\na = 3\n", []string{"a"}},
		{"a longer name is another", []accepted{one("a = 1", "a"), one("b = a2", "b"), one("a = 3", "a")}, "b = a2\na = 3\n", nil},
	} {
		text, doubled := fileText(c.kept)
		if text != c.text || !cmp.Equal(doubled, c.doubled) {
			t.Errorf("%s: %q, %v", c.name, text, doubled)
		}
	}
}

func TestSentencesAreNoExpressions(t *testing.T) {
	x := newTalk(t)
	for _, text := range []string{"list names", "take  back", "show 4 digits", "show 1 digit", "explain pi", "leave session"} {
		if !x.sentence(text) {
			t.Errorf("%q is not understood", text)
		}
	}
	for _, text := range []string{"list", "take = 3", "show digits", "explain", "explain(pi)", "keep", "leave", "list names of"} {
		if x.sentence(text) {
			t.Errorf("%q is taken for a sentence", text)
		}
	}
	bound := newTalk(t, "keep = 3 mm")
	if bound.sentence("keep in m") {
		t.Error("a quantity named keep cannot be shown in a unit")
	}
}

func TestTakeBackForgetsWhatCameAfter(t *testing.T) {
	x := newTalk(t, "a = 1", "a + 1", "a = 2", "a + 2", "take back")
	if v, ok := x.boundValue("a"); !ok || render.Inline(v, render.Options{}) != "1" {
		t.Errorf("a is %v", v)
	}
	if text, _ := fileText(x.kept); text != "a = 1\na + 1\n" {
		t.Errorf("kept: %q", text)
	}
	x.take("take back")
	if _, ok := x.boundValue("a"); ok {
		t.Error("a is still bound")
	}
	x.take("take back")
	if len(x.kept) != 0 {
		t.Errorf("kept: %v", x.kept)
	}
}

func TestPlainReaderRefusesEndlessLines(t *testing.T) {
	r := newPlainReader(io.LimitReader(endless{}, 64<<20))
	if _, err := r.line(""); err == nil {
		t.Error("a line without an end was read")
	}
}

type endless struct{}

func (endless) Read(p []byte) (int, error) {
	for i := range p {
		p[i] = 'x'
	}
	return len(p), nil
}
