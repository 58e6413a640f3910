package eval

import (
	"context"
	"errors"
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// callSite is a call where it stands in the text.
type callSite struct {
	name    string // of the called function; "" when the callee is an expression
	local   int    // the local that is called, or −1
	library bool
	span    diag.Span
	callee  diag.Span
	args    []argumentSite
}

type argumentSite struct {
	name     string // "" for a positional one
	nameSpan diag.Span
	span     diag.Span
}

// call is the operation of every call.
func call(f *frame, args []any) (any, error) {
	site := args[0].(*callSite)
	args = args[1:]
	callee, err := resolveCallee(f, site, &args)
	if err != nil {
		return nil, err
	}
	fn, ok := callee.(*value.Function)
	if !ok {
		if len(args) == 0 && len(site.args) == 0 && site.name != "" {
			return nil, notAFunction(site, callee).WithHelp("write %s without parentheses", site.name)
		}
		return nil, notAFunction(site, callee)
	}
	values := make([]value.Value, len(args))
	for i, a := range args {
		values[i] = a.(value.Value)
	}
	v, err := f.task.session.callFunction(f, fn, site, values)
	if err != nil {
		return nil, err
	}
	return v, nil
}

func resolveCallee(f *frame, site *callSite, args *[]any) (value.Value, *diag.Error) {
	switch {
	case site.local >= 0:
		return f.locals[site.local], nil
	case site.name == "":
		callee := (*args)[0].(value.Value)
		*args = (*args)[1:]
		return callee, nil
	}
	s := f.task.session
	// A built-in is called by its table entry, so that one without parameters is not evaluated first.
	if b, ok := s.builtins[site.name]; ok {
		_, bound := s.names[site.name]
		_, replaced := f.overlay[site.name]
		if site.library || !bound && !replaced {
			return s.function(b), nil
		}
	}
	if !s.known(site.name, site.library) && f.overlay[site.name] == nil {
		return nil, s.unknownFunction(site.name, nil).At(site.callee)
	}
	return s.find(f, site.name, site.library)
}

func notAFunction(site *callSite, v value.Value) *diag.Error {
	what := "this"
	if site.name != "" {
		what = site.name
	}
	e := diag.New(diag.Type, "%s is %s, not a function", what, value.Describe(v)).At(site.callee)
	switch v.(type) {
	case *value.Matrix, *value.List, *value.Gain:
		e.WithHelp("an entry is picked with brackets: %s[1]", what)
	case *value.Polynomial, *value.Transfer, *value.Plant, *value.Model:
		e.WithHelp("its value at a point is at(%s, x)", what)
	case value.Number, value.Complex, value.Quantity:
		e.WithHelp("a product is written with *")
	}
	return e
}

// callFunction calls a built-in or a defined function with arguments placed by the site.
func (s *Session) callFunction(f *frame, fn *value.Function, site *callSite, args []value.Value) (value.Value, *diag.Error) {
	if fn.Builtin != nil {
		return s.callBuiltin(f, fn.Builtin, site, args)
	}
	d, ok := fn.Body.(*definition)
	if !ok {
		return nil, internal("calling "+fn.Name, nil).At(site.callee)
	}
	return s.callDefined(f, fn, d, site, args)
}

// bound is an argument that found its parameter.
type bound struct {
	param *value.Param
	value value.Value
	span  diag.Span
	spans []diag.Span // of each value of a variadic one
}

// coerce converts the argument to what the parameter asks for; of any number of values, each.
func (b bound) coerce() (value.Value, error) {
	if !b.param.Variadic {
		return value.Coerce(*b.param, b.value)
	}
	list := b.value.(*value.List)
	out := &value.List{Items: make([]value.Value, len(list.Items))}
	for i, item := range list.Items {
		v, err := value.Coerce(*b.param, item)
		if err != nil {
			return nil, placedAt(err, b.spans[i])
		}
		out.Items[i] = v
	}
	return out, nil
}

func (s *Session) callBuiltin(f *frame, b *value.Builtin, site *callSite, args []value.Value) (value.Value, *diag.Error) {
	params, bare := chooseForm(b, site, args)
	placed, err := place(b.Name, params, site, args)
	if err != nil {
		return nil, err
	}
	ties := &ties{task: f.task}
	call := s.newCall(f, b, site, ties)
	call.IsBare = bare
	spans := make(map[string]diag.Span, len(placed))
	for _, p := range placed {
		v, err := p.coerce()
		if err != nil {
			return nil, asError(err, b.Name).At(p.span)
		}
		if (b.Family == "frequency" || b.Family == "response") && untimed(p.value, v) {
			call.Note("no sample time is given, and 1 s is taken; timed(G, every: 5 ms) states one")
		}
		call.Args[p.param.Name] = v
		spans[p.param.Name] = p.span
	}
	held := f.task.held
	v, failure := f.task.interruptible(b.Name, ties, func() (value.Value, error) { return b.Func(call) })
	if f.task.ctx.Err() != nil {
		return nil, f.task.stopError().At(site.callee)
	}
	if failure != nil {
		return nil, pointed(failure, b.Name, spans, site)
	}
	f.task.held = held
	if err := value.Finite(v); err != nil {
		return nil, asError(err, b.Name).At(site.callee)
	}
	if err := f.task.charge(sizeOf(v)); err != nil {
		return nil, asError(err, b.Name).At(site.callee)
	}
	return v, nil
}

// untimed tells whether a transfer function of z without a sample time became a plant.
func untimed(before, after value.Value) bool {
	_, isPlant := after.(*value.Plant)
	switch x := before.(type) {
	case *value.Transfer:
		return isPlant && x.Variable == "z" && x.Every == nil
	case *value.Polynomial:
		return isPlant && x.Variable == "z" && x.Degree() > 0
	}
	return false
}

// newCall makes what a built-in is given.
func (s *Session) newCall(f *frame, b *value.Builtin, site *callSite, ties *ties) *value.Call {
	t := f.task
	return &value.Call{
		Context: t.ctx, Builtin: b, Args: map[string]value.Value{}, Root: s.root,
		Note: func(text string) {
			if t.note != nil {
				ties.call(func() { t.note(text) })
			}
		},
		Progress: func(done, total int) {
			if s.progress != nil {
				ties.call(func() { s.progress(done, total) })
			}
		},
		Charge: ties.charge,
		Apply: func(fn *value.Function, args ...value.Value) (value.Value, error) {
			return ties.apply(func() (value.Value, *diag.Error) { return s.apply(f, fn, site, args) })
		},
	}
}

// pointed places a built-in's error at the argument at fault, or at the call.
func pointed(failure error, name string, spans map[string]diag.Span, site *callSite) *diag.Error {
	e := asError(failure, name)
	if e.Source != nil {
		return e
	}
	if span, ok := spans[e.Param]; ok && e.Param != "" {
		return e.At(span)
	}
	return e.At(site.callee)
}

// asError turns an error of a lower package into ours, on a copy that may be given a place.
func asError(err error, name string) *diag.Error {
	var known *diag.Error
	if errors.As(err, &known) {
		c := *known
		return &c
	}
	if errors.Is(err, context.Canceled) || errors.Is(err, context.DeadlineExceeded) {
		return diag.New(diag.Interrupted, "stopped")
	}
	e := diag.New(diag.Numerical, "%s: %s", name, err.Error())
	e.Cause = err
	return e
}

// chooseForm picks the parameters: those with bare matrices when there are such and the
// first argument is no system.
func chooseForm(b *value.Builtin, site *callSite, args []value.Value) (params []value.Param, bare bool) {
	if b.Bare == nil || len(args) == 0 {
		return b.Params, false
	}
	if site.argument(0).name != "" {
		for i, a := range site.args {
			if len(b.Params) > 0 && a.name == b.Params[0].Name {
				return choose(b, args[i])
			}
		}
		return b.Bare, true
	}
	return choose(b, args[0])
}

func choose(b *value.Builtin, first value.Value) ([]value.Param, bool) {
	switch first.(type) {
	case *value.Plant, *value.Model, *value.Transfer:
		return b.Params, false
	case *value.Polynomial:
		if len(b.Bare) > 0 && b.Bare[0].Shape != value.APolynomial && b.Bare[0].Shape != value.Anything {
			return b.Params, false
		}
	}
	return b.Bare, true
}

// named tells whether an argument is given by name.
func (c *callSite) named() bool {
	for _, a := range c.args {
		if a.name != "" {
			return true
		}
	}
	return false
}

// argument gives the i-th argument's place; calls made by the program itself have none.
func (c *callSite) argument(i int) argumentSite {
	if i < len(c.args) {
		return c.args[i]
	}
	return argumentSite{span: c.callee}
}

// place puts arguments to parameters: positional ones in order, then by name.
func place(name string, params []value.Param, site *callSite, args []value.Value) ([]bound, *diag.Error) {
	placed := make([]bound, 0, len(args))
	given := make(map[string]bool, len(args))
	next := 0
	for i, v := range args {
		a := site.argument(i)
		if a.name != "" {
			p := findParam(params, a.name)
			if p == nil {
				return nil, unknownArgument(name, params, a)
			}
			if given[p.Name] {
				return nil, diag.New(diag.Name, "%s is given twice", p.Name).At(a.nameSpan)
			}
			given[p.Name] = true
			placed = append(placed, bound{param: p, value: v, span: a.span})
			continue
		}
		for next < len(params) && params[next].Named {
			next++
		}
		if next == len(params) {
			return nil, tooMany(name, params, len(args)).At(a.span)
		}
		p := &params[next]
		if p.Variadic {
			if !given[p.Name] {
				given[p.Name] = true
				placed = append(placed, bound{param: p, value: &value.List{}, span: a.span})
			}
			last := &placed[len(placed)-1]
			list := last.value.(*value.List)
			list.Items = append(list.Items, v)
			last.span = last.span.Join(a.span)
			last.spans = append(last.spans, a.span)
			continue
		}
		next++
		given[p.Name] = true
		placed = append(placed, bound{param: p, value: v, span: a.span})
	}
	for i := range params {
		if p := &params[i]; !p.Optional && !p.Variadic && !given[p.Name] {
			return nil, missing(name, params, p).At(site.callee)
		}
	}
	return placed, nil
}

func findParam(params []value.Param, name string) *value.Param {
	for i := range params {
		if params[i].Name == name {
			return &params[i]
		}
	}
	return nil
}

func unknownArgument(name string, params []value.Param, a argumentSite) *diag.Error {
	all := make([]string, 0, len(params))
	for _, p := range params {
		all = append(all, p.Name)
	}
	e := diag.New(diag.Name, "%s has no argument %s", name, a.name).At(a.nameSpan)
	if near := nearest(a.name, append([]string(nil), all...)); near != "" {
		return e.WithHelp("is %s meant?", near)
	}
	if len(all) == 0 {
		return e.WithHelp("it takes none")
	}
	return e.WithHelp("it takes %s", strings.Join(all, ", "))
}

// outline writes a call's form: "assign_poles(P, poles, method: …)".
func outline(name string, params []value.Param) string {
	parts := make([]string, 0, len(params))
	for _, p := range params {
		switch {
		case p.Named:
			parts = append(parts, p.Name+": …")
		case p.Variadic:
			parts = append(parts, p.Name+", …")
		default:
			parts = append(parts, p.Name)
		}
	}
	return name + "(" + strings.Join(parts, ", ") + ")"
}

func tooMany(name string, params []value.Param, given int) *diag.Error {
	takes := 0
	for _, p := range params {
		if !p.Named {
			takes++
		}
	}
	e := diag.New(diag.Type, "%s takes %s, and %d are given", name, count(takes, "argument"), given)
	return e.WithHelp("it is written %s", outline(name, params))
}

func missing(name string, params []value.Param, p *value.Param) *diag.Error {
	e := diag.New(diag.Type, "%s needs %s", name, p.Name)
	if p.Named {
		e = diag.New(diag.Type, "%s needs %s: …", name, p.Name)
	}
	return e.WithHelp("it is written %s", outline(name, params))
}
