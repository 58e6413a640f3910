package prompt

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"regexp"
	"strconv"
	"strings"
	"sync"

	"gainwright/lang/diag"
	"gainwright/lang/render"
	"gainwright/lang/value"
)

// sentences are the patterns of what the prompt knows besides statements. None of them is
// an expression: two words do not follow each other in one. They are compiled when the
// first line is read, since a file that is run needs none.
type sentences struct{ explain, list, back, keep, digits, leave *regexp.Regexp }

var patterns = sync.OnceValue(func() sentences {
	return sentences{
		explain: regexp.MustCompile(`^explain\s+([\pL_][\pL\pM\pN_′]*)$`),
		list:    regexp.MustCompile(`^list\s+names$`),
		back:    regexp.MustCompile(`^take\s+back$`),
		keep:    regexp.MustCompile(`^keep\s+in\s+(\S.*)$`),
		digits:  regexp.MustCompile(`^show\s+(\d{1,4})\s+digits?$`),
		leave:   regexp.MustCompile(`^leave\s+session$`),
	}
})

// most digits a binary64 number has
const mostDigits = 17

// sentence does what a sentence says; false when the text is none.
func (t *talk) sentence(text string) bool {
	p := patterns()
	switch {
	case p.leave.MatchString(text):
		t.leaving = true
	case p.list.MatchString(text):
		t.listNames()
	case p.back.MatchString(text):
		t.takeBack()
	case p.explain.MatchString(text):
		t.explain(p.explain.FindStringSubmatch(text)[1])
	case p.digits.MatchString(text):
		t.showDigits(p.digits.FindStringSubmatch(text)[1])
	case p.keep.MatchString(text) && !t.isShowInUnit(text):
		t.keep(strings.Trim(p.keep.FindStringSubmatch(text)[1], `"`))
	default:
		return false
	}
	return true
}

// isShowInUnit tells whether "keep in m" shows a value named keep in a unit.
func (t *talk) isShowInUnit(text string) bool {
	_, bound := t.Session.Lookup("keep")
	return bound && !strings.HasSuffix(strings.Trim(text, `"`), ".gain")
}

func (t *talk) fail(err *diag.Error) {
	t.failed = true
	t.printer.Failure(err)
}

func (t *talk) showDigits(text string) {
	n, err := strconv.Atoi(text)
	if err != nil || n < 1 || n > mostDigits {
		t.fail(diag.New(diag.Limit, "between 1 and %d digits can be shown, not %s", mostDigits, text))
		return
	}
	t.digits = n
}

// listNames shows what is bound, each on a line.
func (t *talk) listNames() {
	names := t.Session.Names()
	if len(names) == 0 {
		fmt.Fprintln(t.Out, "no name is bound")
		return
	}
	r := &value.Report{Columns: []string{"name", "kind", "value"}}
	for _, n := range names {
		r.Rows = append(r.Rows, []value.Value{value.Text(n.Name), value.Text(n.Value.Kind()),
			value.Text(render.Summary(n.Value, t.printer.Options))})
	}
	fmt.Fprint(t.Out, render.Table(r, t.printer.Options))
}

// takeBack undoes the last input that bound something, and forgets what came after it.
func (t *talk) takeBack() {
	for i := len(t.kept) - 1; i >= 0; i-- {
		names := t.kept[i].names
		if len(names) == 0 {
			continue
		}
		for range names {
			t.Session.TakeBack()
		}
		t.kept = t.kept[:i]
		for _, name := range names {
			if v, ok := t.boundValue(name); ok {
				fmt.Fprintf(t.Out, "%s is again %s\n", name, render.Summary(v, t.printer.Options))
			} else {
				fmt.Fprintf(t.Out, "%s is no longer bound\n", name)
			}
		}
		return
	}
	fmt.Fprintln(t.Out, "there is nothing to take back")
}

func (t *talk) boundValue(name string) (value.Value, bool) {
	for _, n := range t.Session.Names() {
		if n.Name == name {
			return n.Value, true
		}
	}
	return nil, false
}

func (t *talk) explain(word string) {
	for _, b := range t.Table {
		if b.Name == word {
			fmt.Fprint(t.Out, render.Explain(b, t.printer.Options))
			return
		}
	}
	v, ok := t.Session.Lookup(word)
	if f, isFunction := v.(*value.Function); ok && isFunction {
		fmt.Fprint(t.Out, render.ExplainFunction(f, t.printer.Options))
		return
	}
	if ok {
		fmt.Fprintf(t.Out, "%s is a %s: %s\n", word, v.Kind(), render.Summary(v, t.printer.Options))
		return
	}
	if s, ok := render.StatementNamed(word); ok {
		fmt.Fprint(t.Out, render.ExplainStatement(s, t.printer.Options))
		return
	}
	err := diag.New(diag.Name, "there is no word %s", word)
	if near := value.Nearest(word, t.Session.Candidates("")); near != "" {
		err = err.WithHelp("is %s meant?", near)
	} else if names := render.Mentions(t.Table, word); len(names) > 0 {
		err = err.WithHelp("it occurs under %s", strings.Join(names, ", "))
	}
	t.fail(err)
}

// keep writes the accepted statements as a file; one that exists is never overwritten.
func (t *talk) keep(name string) {
	if !strings.HasSuffix(name, ".gain") {
		t.fail(diag.New(diag.File, "the name of the file must end in .gain").WithHelp("keep in %s.gain", strings.TrimSuffix(name, ".")))
		return
	}
	if len(t.kept) == 0 {
		fmt.Fprintln(t.Out, "there is nothing to keep yet")
		return
	}
	text, doubled := fileText(t.kept)
	f, err := t.Root.OpenFile(name, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o644)
	switch {
	case errors.Is(err, fs.ErrExist):
		t.fail(diag.New(diag.File, "%s exists and is not overwritten", name).WithHelp("choose another name"))
		return
	case err != nil:
		t.fail(diag.New(diag.File, "%s cannot be written: %v", name, cause(err)))
		return
	}
	_, err = f.WriteString(text)
	if closed := f.Close(); err == nil {
		err = closed
	}
	if err != nil {
		t.fail(diag.New(diag.File, "%s cannot be written: %v", name, cause(err)))
		return
	}
	lines := "1 line"
	if n := strings.Count(text, "\n"); n != 1 {
		lines = fmt.Sprintf("%d lines", n)
	}
	fmt.Fprintf(t.Out, "%s written, %s\n", name, lines)
	for _, d := range doubled {
		fmt.Fprintf(t.Out, "  %s was bound twice and used in between; a file binds a name once, so rename one of them there\n", d)
	}
}

func cause(err error) error {
	var path *fs.PathError
	if errors.As(err, &path) {
		return path.Err
	}
	return err
}

// fileText joins the accepted statements. A binding that a later one replaced is left
// out where nothing between them uses the name; doubled lists the names where something does.
func fileText(kept []accepted) (text string, doubled []string) {
	var b strings.Builder
	for i, a := range kept {
		replaced, used := replacement(kept, i)
		if replaced && !used {
			continue
		}
		if replaced {
			doubled = append(doubled, a.names[0])
			fmt.Fprintf(&b, "# %s is bound again below\n", a.names[0])
		}
		b.WriteString(a.text)
		b.WriteByte('\n')
	}
	return b.String(), doubled
}

// replacement tells whether the one name that kept[i] binds is bound again later, and
// whether it is used before that, in the later binding too.
func replacement(kept []accepted, i int) (replaced, used bool) {
	if len(kept[i].names) != 1 {
		return false, false
	}
	name := kept[i].names[0]
	mention := regexp.MustCompile(`(^|[^\pL\pM\pN_′])` + regexp.QuoteMeta(name) + `($|[^\pL\pM\pN_′])`)
	for _, later := range kept[i+1:] {
		binds := len(later.names) == 1 && later.names[0] == name
		mentions := len(mention.FindAllStringIndex(later.text, 3))
		if binds {
			return true, used || mentions > 1
		}
		used = used || mentions > 0
	}
	return false, false
}
