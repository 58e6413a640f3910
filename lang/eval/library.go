package eval

import (
	"io/fs"
	"regexp"
	"sort"
	"sync"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// library is the part of the vocabulary that is written in the language. Its files are
// scanned for the names they define when a name is found nowhere else, and a definition
// is compiled when it is first used.
type library struct {
	files   fs.FS
	scan    sync.Once
	where   map[string]string // name → file
	parsed  map[string]*syntax.File
	values  map[string]value.Value
	pending map[string]bool // constants being evaluated
	broken  *diag.Error
}

// a definition or a constant at the start of a line; statements of the library begin there
var definitionLine = regexp.MustCompile(`(?m)^(?:define[ \t]+([\pL_][\pL\pM\pN_′]*)[ \t]*\(|([\pL_][\pL\pM\pN_′]*)[ \t]*=[^=])`)

func (l *library) index() map[string]string {
	l.scan.Do(func() {
		l.where = map[string]string{}
		l.parsed = map[string]*syntax.File{}
		l.values = map[string]value.Value{}
		l.pending = map[string]bool{}
		if l.files == nil {
			return
		}
		names, err := fs.Glob(l.files, "*.gain")
		if err != nil {
			l.broken = internal("listing the library", err)
			return
		}
		for _, name := range names {
			text, err := fs.ReadFile(l.files, name)
			if err != nil {
				l.broken = internal("reading the library", err)
				return
			}
			for _, m := range definitionLine.FindAllStringSubmatch(string(text), -1) {
				l.where[m[1]+m[2]] = name
			}
		}
	})
	return l.where
}

func (l *library) has(name string) bool {
	_, ok := l.index()[name]
	return ok
}

// list gives the names in alphabetical order.
func (l *library) list() []string {
	out := make([]string, 0, len(l.index()))
	for name := range l.index() {
		out = append(out, name)
	}
	sort.Strings(out)
	return out
}

// Library lists the functions of the library with their documentation, in alphabetical order.
func (s *Session) Library() ([]*value.Function, error) {
	var out []*value.Function
	for _, name := range s.library.list() {
		fn, err := s.library.function(s, name)
		if err != nil {
			return nil, err
		}
		if fn != nil {
			out = append(out, fn)
		}
	}
	return out, nil
}

// statement gives the statement that defines a name, or nil.
func (l *library) statement(name string) (syntax.Statement, *syntax.File, *diag.Error) {
	path, ok := l.index()[name]
	if l.broken != nil || !ok {
		return nil, nil, l.broken
	}
	file := l.parsed[path]
	if file == nil {
		text, err := fs.ReadFile(l.files, path)
		if err != nil {
			return nil, nil, internal("reading the library", err)
		}
		parsed, failure := parseText(path, string(text))
		if failure != nil {
			return nil, nil, failure
		}
		file, l.parsed[path] = parsed, parsed
	}
	for _, st := range file.Statements {
		switch st := st.(type) {
		case *syntax.Define:
			if st.Name.Name == name {
				return st, file, nil
			}
		case *syntax.Binding:
			if st.Name.Name == name {
				return st, file, nil
			}
		}
	}
	return nil, nil, nil
}

// function gives a library function, nil when the name is none.
func (l *library) function(s *Session, name string) (*value.Function, *diag.Error) {
	if !l.has(name) {
		return nil, nil
	}
	if v, ok := l.values[name]; ok {
		fn, _ := v.(*value.Function)
		return fn, nil
	}
	st, file, err := l.statement(name)
	if err != nil {
		return nil, err
	}
	def, ok := st.(*syntax.Define)
	if !ok {
		return nil, nil
	}
	fn, err := s.define(file.Source, def, true)
	if err != nil {
		return nil, err
	}
	l.values[name] = fn
	return fn, nil
}

// lookup gives a library function or constant, nil when the name is none.
func (l *library) lookup(s *Session, t *task, name string) (value.Value, *diag.Error) {
	if !l.has(name) {
		return nil, l.broken
	}
	if v, ok := l.values[name]; ok {
		return v, nil
	}
	if fn, err := l.function(s, name); fn != nil || err != nil {
		return fn, err
	}
	st, file, err := l.statement(name)
	if err != nil {
		return nil, err
	}
	bound, ok := st.(*syntax.Binding)
	if !ok {
		return nil, nil
	}
	if l.pending[name] {
		return nil, diag.New(diag.Internal, "the library's %s depends on itself", name)
	}
	l.pending[name] = true
	defer delete(l.pending, name)
	lower := &lowering{session: s, source: file.Source, library: true, lenient: true}
	p := lower.compile(bound.Expr, false)
	if lower.err != nil {
		return nil, lower.err
	}
	v, err := p.value(&frame{task: t})
	if err == nil {
		l.values[name] = v
	}
	return v, err
}
