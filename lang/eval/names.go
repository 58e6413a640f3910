package eval

import (
	"math/big"
	"slices"
	"sort"
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

// nameSite is a use of a name that is no parameter and no loop variable.
type nameSite struct {
	name    string
	library bool
}

// variables are the polynomial variables, which stand for themselves at top level.
var variables = map[string]*value.Polynomial{"s": variable("s"), "z": variable("z")}

func variable(name string) *value.Polynomial {
	p := exact.NewPolynomial(big.NewRat(1, 1), new(big.Rat))
	return &value.Polynomial{Variable: name, Exact: &p}
}

// find gives what a name stands for: the user's name, a variable, a built-in, the
// library. Library code does not see the user's names.
func (s *Session) find(f *frame, name string, fromLibrary bool) (value.Value, *diag.Error) {
	if !fromLibrary {
		if v, ok := f.overlay[name]; ok {
			f.task.reached = true
			return v, nil
		}
		if b, ok := s.names[name]; ok {
			return b.value, nil
		}
	}
	if p, ok := variables[name]; ok {
		return p, nil
	}
	if b, ok := s.builtins[name]; ok {
		return s.constantOrFunction(f, b)
	}
	v, err := s.library.lookup(s, f.task, name)
	if err != nil {
		return nil, err
	}
	if v != nil {
		return v, nil
	}
	return nil, s.unknownName(name, nil)
}

// constantOrFunction gives the value of a built-in without parameters, such as pi, or the function.
func (s *Session) constantOrFunction(f *frame, b *value.Builtin) (value.Value, *diag.Error) {
	if len(b.Params) > 0 || len(b.Bare) > 0 {
		return s.function(b), nil
	}
	return s.callBuiltin(f, b, &callSite{name: b.Name, local: -1}, nil)
}

// known tells whether a name stands for something.
func (s *Session) known(name string, fromLibrary bool) bool {
	if _, ok := s.names[name]; ok && !fromLibrary {
		return true
	}
	if _, ok := variables[name]; ok {
		return true
	}
	if _, ok := s.builtins[name]; ok {
		return true
	}
	return s.library.has(name)
}

func (s *Session) unknownName(name string, locals []string) *diag.Error {
	e := diag.New(diag.Name, "%s is not known", name)
	if near := s.near(name, locals); near != "" {
		return e.WithHelp("is %s meant?", near)
	}
	if name == "i" || name == "j" {
		return e.WithHelp("the imaginary unit is written 1i, as in 2 + 3i")
	}
	return e
}

func (s *Session) unknownFunction(name string, locals []string) *diag.Error {
	e := diag.New(diag.Name, "there is no function %s", name)
	if near := s.near(name, locals); near != "" {
		e.WithHelp("is %s meant?", near)
	} else if slices.Contains(fieldsAsFunctions, name) {
		e.WithHelp("it is a field, written behind a point: x.%s", name)
	}
	return e
}

// fieldsAsFunctions are fields that are easily taken for functions.
var fieldsAsFunctions = []string{"length", "degree", "values", "cost", "gramian", "distance", "missing", "overshoot", "settling", "states", "inputs", "outputs"}

func (s *Session) near(name string, locals []string) string {
	all := append([]string(nil), locals...)
	for n := range s.names {
		all = append(all, n)
	}
	for _, b := range s.table {
		all = append(all, b.Name)
	}
	all = append(all, s.library.list()...)
	return nearest(name, all)
}

// Candidates lists the names that begin with a prefix, for completion: bound names,
// built-ins and the library, in alphabetical order.
func (s *Session) Candidates(prefix string) []string {
	seen := map[string]bool{}
	add := func(n string) {
		if strings.HasPrefix(n, prefix) {
			seen[n] = true
		}
	}
	for n := range s.names {
		add(n)
	}
	for _, b := range s.table {
		add(b.Name)
	}
	for _, n := range s.library.list() {
		add(n)
	}
	out := make([]string, 0, len(seen))
	for n := range seen {
		out = append(out, n)
	}
	sort.Strings(out)
	return out
}

// nearest gives the candidate that a slip of the fingers would turn into name, or a
// candidate that contains it, or "".
func nearest(name string, candidates []string) string {
	sort.Strings(candidates)
	if len([]rune(name)) > 1 {
		if near := value.Nearest(name, candidates); near != "" {
			return near
		}
	}
	if len(name) >= 4 {
		for _, c := range candidates {
			if c != name && strings.Contains(c, name) {
				return c
			}
		}
	}
	return ""
}
