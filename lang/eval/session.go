package eval

import (
	"io/fs"
	"os"
	"sort"
	"sync/atomic"

	"github.com/expr-lang/expr/conf"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// Options make a session.
type Options struct {
	Builtins    []*value.Builtin // the table of built-ins; not copied, must not change
	Library     fs.FS            // definitions in the language itself, *.gain; read when first needed; may be nil
	Root        *os.Root         // the folder below which files may be read; nil when none may
	Folder      string           // the folder of the first file below Root, slashes; "" for Root itself
	Interactive bool             // the prompt: a name may be bound again, a binding can be taken back
	Limits      Limits
	Progress    func(done, total int) // hears from long built-ins and studies, from any goroutine; may be nil

	// Eigenvalues makes a function, for one goroutine, that finds the eigenvalues of a
	// row-major n×n matrix, which it destroys, for n up to EigenvalueLimit, without allocating;
	// false tells that it failed. Studies are slower without it.
	Eigenvalues     func() func(eigenvalues []complex128, matrix []float64) bool
	EigenvalueLimit int

	// Part of Parts is the share of every study that is computed; 0 for the whole.
	Part, Parts int

	// Computed gives the values of a study that was computed elsewhere, a row for each of
	// its results with a value for every sample; nil to compute studies here.
	Computed func(name string, s *value.Study) ([][]float64, error)
}

// Session holds the names that statements bind. It is used by one goroutine at a time.
type Session struct {
	builtins    map[string]*value.Builtin
	table       []*value.Builtin
	functions   map[*value.Builtin]*value.Function
	library     library
	root        *os.Root
	folder      string
	interactive bool
	limits      Limits
	progress    func(done, total int)
	eigenvalues eigenvalueKernel
	part, parts int
	computed    func(name string, s *value.Study) ([][]float64, error)
	config      *conf.Config

	names   map[string]*binding
	journal []change
	used    map[string]bool // files read by use, by their path below the root
	using   []string        // files being read, outermost first

	abandoned atomic.Int32 // computations given up that still run
}

// binding is what a name stands for and where it was bound.
type binding struct {
	value  value.Value
	source *diag.Source
	span   diag.Span
	doc    string
}

// change remembers what a binding replaced.
type change struct {
	name string
	old  *binding // nil when the name was free
}

// longest memory of bindings that can be taken back at the prompt
const longestJournal = 10_000

// New makes a session. It reads nothing and compiles nothing, so that the first
// statement starts at once.
func New(o Options) *Session {
	s := &Session{
		builtins:    make(map[string]*value.Builtin, len(o.Builtins)),
		table:       o.Builtins,
		functions:   map[*value.Builtin]*value.Function{},
		library:     library{files: o.Library},
		root:        o.Root,
		folder:      o.Folder,
		interactive: o.Interactive,
		limits:      o.Limits.filled(),
		progress:    o.Progress,
		eigenvalues: eigenvalueKernel{o.Eigenvalues, o.EigenvalueLimit},
		part:        o.Part,
		parts:       o.Parts,
		computed:    o.Computed,
		config:      newConfig(),
		names:       map[string]*binding{},
		used:        map[string]bool{},
	}
	for _, b := range o.Builtins {
		s.builtins[b.Name] = b
	}
	return s
}

// NameInfo describes a bound name.
type NameInfo struct {
	Name  string
	Value value.Value
	Doc   string // of a defined function
	Line  int    // where it was bound, from 1
	File  string
}

// Names lists the bound names in alphabetical order.
func (s *Session) Names() []NameInfo {
	out := make([]NameInfo, 0, len(s.names))
	for name, b := range s.names {
		info := NameInfo{Name: name, Value: b.value, Doc: b.doc}
		if b.source != nil {
			info.Line, _ = b.source.Position(b.span.Start)
			info.File = b.source.Name
		}
		out = append(out, info)
	}
	sort.Slice(out, func(i, j int) bool { return out[i].Name < out[j].Name })
	return out
}

// Lookup gives what a name stands for: a bound value, else a built-in or library function.
func (s *Session) Lookup(name string) (value.Value, bool) {
	if b, ok := s.names[name]; ok {
		return b.value, true
	}
	if b, ok := s.builtins[name]; ok {
		return s.function(b), true
	}
	if fn, err := s.library.function(s, name); err == nil && fn != nil {
		return fn, true
	}
	return nil, false
}

// TakeBack undoes the last binding: the name stands for what it stood for before, or for nothing.
func (s *Session) TakeBack() (name string, ok bool) {
	if len(s.journal) == 0 {
		return "", false
	}
	last := s.journal[len(s.journal)-1]
	s.undo(len(s.journal) - 1)
	return last.name, true
}

// undo takes back changes until mark are left.
func (s *Session) undo(mark int) {
	for len(s.journal) > mark {
		last := s.journal[len(s.journal)-1]
		s.journal = s.journal[:len(s.journal)-1]
		if last.old == nil {
			delete(s.names, last.name)
		} else {
			s.names[last.name] = last.old
		}
	}
}

// set binds a name and remembers what it replaced.
func (s *Session) set(name string, b *binding) {
	s.journal = append(s.journal, change{name, s.names[name]})
	s.names[name] = b
}

// trim forgets the oldest changes between statements.
func (s *Session) trim() {
	if len(s.journal) > 2*longestJournal {
		s.journal = append([]change(nil), s.journal[len(s.journal)-longestJournal:]...)
	}
}

// function wraps a built-in as a value, always the same one.
func (s *Session) function(b *value.Builtin) *value.Function {
	if f, ok := s.functions[b]; ok {
		return f
	}
	f := &value.Function{Name: b.Name, Doc: b.Summary, Builtin: b}
	for _, p := range b.Params {
		f.Params = append(f.Params, p.Name)
	}
	s.functions[b] = f
	return f
}
