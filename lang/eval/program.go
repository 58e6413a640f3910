package eval

import (
	"errors"
	"fmt"
	"sync"

	"github.com/expr-lang/expr/ast"
	"github.com/expr-lang/expr/builtin"
	"github.com/expr-lang/expr/checker"
	"github.com/expr-lang/expr/compiler"
	"github.com/expr-lang/expr/conf"
	"github.com/expr-lang/expr/file"
	"github.com/expr-lang/expr/parser"
	"github.com/expr-lang/expr/vm"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// program is a compiled expression. It keeps no state between runs.
type program struct {
	code   *vm.Program
	source *diag.Source
}

// newConfig gives expr our functions and none of its own: no built-ins, no environment
// type, no patchers, no constant folding.
func newConfig() *conf.Config {
	return &conf.Config{Functions: operations, Builtins: map[string]*builtin.Function{}}
}

// compile lowers, checks and compiles an expression; on failure it returns nil and l.err says why.
func (l *lowering) compile(e syntax.Expr, condition bool) *program {
	var node ast.Node
	if condition {
		node = l.condition(e)
	} else {
		node = l.value(e)
	}
	if l.err != nil {
		return nil
	}
	tree := &parser.Tree{Node: node}
	config := l.session.config
	if _, err := checker.Check(tree, config); err != nil {
		l.fail(internal("checking an expression", err), e.Extent())
		return nil
	}
	code, err := compiler.Compile(tree, config)
	if err != nil {
		l.fail(internal("compiling an expression", err), e.Extent())
		return nil
	}
	return &program{code: code, source: l.source}
}

// internal is a defect of ours; the cause is kept but not shown.
func internal(doing string, cause error) *diag.Error {
	e := diag.New(diag.Internal, "a defect of the program itself, met while %s", doing).
		WithHelp("please report it together with this line")
	e.Cause = cause
	return e
}

// machines are reused, because each grows a stack.
var machines = sync.Pool{New: func() any { return new(vm.VM) }}

// run evaluates the program. The result is a value.Value, or a bool of a condition.
func (p *program) run(f *frame) (any, *diag.Error) {
	machine := machines.Get().(*vm.VM)
	defer machines.Put(machine)
	return p.runOn(machine, f)
}

// runOn evaluates on a machine that a loop reuses.
func (p *program) runOn(machine *vm.VM, f *frame) (any, *diag.Error) {
	out, err := machine.Run(p.code, f)
	if err != nil {
		return nil, p.strip(err)
	}
	return out, nil
}

// value evaluates a program that is no condition.
func (p *program) value(f *frame) (value.Value, *diag.Error) {
	out, err := p.run(f)
	if err != nil {
		return nil, err
	}
	v, ok := out.(value.Value)
	if !ok || v == nil {
		return nil, internal("evaluating an expression", fmt.Errorf("no value: %T", out)).In(p.source)
	}
	return v, nil
}

// strip finds the cause inside the machine's error and gives it the machine's place.
func (p *program) strip(err error) *diag.Error {
	var placed *file.Error
	var span diag.Span
	if errors.As(err, &placed) {
		span = diag.Span{Start: placed.Location.From, End: placed.Location.To}
	}
	var known *diag.Error
	if !errors.As(err, &known) {
		known = internal("evaluating an expression", err)
	}
	if known.Source != nil {
		return known
	}
	// The error may be a shared one of another package: give the place to a copy.
	placedCopy := *known
	return placedCopy.At(span).In(p.source)
}

// evaluate compiles and runs an expression of a statement.
func (s *Session) evaluate(t *task, src *diag.Source, e syntax.Expr) (value.Value, *diag.Error) {
	return s.evaluateIn(&frame{task: t}, src, e, nil)
}

// evaluateIn compiles and runs an expression with local names, whose values stand in
// the frame in the same order.
func (s *Session) evaluateIn(f *frame, src *diag.Source, e syntax.Expr, locals []string) (value.Value, *diag.Error) {
	l := &lowering{session: s, source: src, locals: locals}
	p := l.compile(e, false)
	if l.err != nil {
		return nil, l.err
	}
	return p.value(f)
}
