package model

import (
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// around is what the model says about its operating point. Variables are the states,
// then the inputs.
type around struct {
	given  bool // an around stands in the model
	rest   bool
	pinned []*value.Number // by variable, in the declared unit; nil when not given
	find   []int           // variables to solve for
	at     place
}

func (b *builder) readAround() {
	n := len(b.States)
	a := &b.around
	a.pinned = make([]*value.Number, n+len(b.Inputs))
	a.at = b.here(b.statement.Name.Span)
	for _, item := range b.statement.Items {
		item, ok := item.(*syntax.Around)
		if !ok {
			continue
		}
		if a.given {
			failWith(b.here(item.Span), diag.New(diag.Name, "around stands twice in the model").WithHelp("first in line %d", b.line(a.at.span)))
		}
		a.given, a.rest, a.at = true, item.Rest, b.here(item.Span)
		for _, v := range item.Values {
			variable := b.variable(v.Name, "around "+v.Name.Name)
			if a.pinned[variable] != nil {
				fail(b.here(v.Name.Span), diag.Name, "around gives %s twice", v.Name.Name)
			}
			x := b.inDeclaredUnit(v.Value, b.signalOf(variable).Unit, v.Name.Name, false)
			a.pinned[variable] = &x
		}
		for _, name := range item.Find {
			variable := b.variable(name, "find "+name.Name)
			if a.pinned[variable] != nil {
				fail(b.here(name.Span), diag.Name, "%s has a value and cannot be solved for as well", name.Name)
			}
			for _, other := range a.find {
				if other == variable {
					fail(b.here(name.Span), diag.Name, "find names %s twice", name.Name)
				}
			}
			a.find = append(a.find, variable)
		}
	}
}

// variable finds the state or input of a name in an around.
func (b *builder) variable(name syntax.Ident, what string) int {
	d, ok := b.names[name.Name]
	switch {
	case ok && d.kind == isState:
		return d.index
	case ok && d.kind == isInput:
		return len(b.States) + d.index
	}
	e := diag.New(diag.Name, "%s: there is no state and no input %s", what, name.Name)
	switch {
	case ok && d.kind == isGiven:
		e = diag.New(diag.Name, "%s: %s is a given and has its value already", what, name.Name).
			WithHelp("it stands in line %d; to solve for it, declare it as an input", b.line(d.name.Span))
	case ok:
		e = diag.New(diag.Name, "%s: %s is %s and follows from the states and inputs", what, name.Name, d.kindName())
	default:
		var candidates []string
		for _, s := range append(append([]Signal{}, b.States...), b.Inputs...) {
			candidates = append(candidates, s.Name)
		}
		if near := nearestOf(name.Name, candidates); near != "" {
			e.WithHelp("is %s meant?", near)
		}
	}
	failWith(b.here(name.Span), e)
	return 0
}

// signalOf gives the state or input of a variable.
func (m *Model) signalOf(variable int) *Signal {
	if variable < len(m.States) {
		return &m.States[variable]
	}
	return &m.Inputs[variable-len(m.States)]
}

// scale is the working range of a variable, 1 of its unit when none is given.
func (m *Model) scale(variable int) float64 {
	if r := m.signalOf(variable).Range; r != nil {
		return r.Float64()
	}
	return 1
}

// names lists variables by name: "x", "x and v", "x, v and w".
func (m *Model) variableNames(variables []int) string {
	names := make([]string, len(variables))
	for k, v := range variables {
		names[k] = m.signalOf(v).Name
	}
	return listed(names)
}

func listed(names []string) string {
	if len(names) > 6 {
		names = append(append([]string{}, names[:5]...), countOf(len(names)-5, "more"))
		names[5] = strings.TrimSuffix(names[5], "s")
	}
	if len(names) < 2 {
		return strings.Join(names, "")
	}
	return strings.Join(names[:len(names)-1], ", ") + " and " + names[len(names)-1]
}
