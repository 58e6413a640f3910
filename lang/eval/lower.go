package eval

import (
	"github.com/expr-lang/expr/ast"
	"github.com/expr-lang/expr/file"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// deepest nesting of an expression that is lowered; expr's checker and compiler recurse.
const deepestExpression = 10_000

// lowering turns one expression into an expr tree. Every operator becomes a call to a
// function whose name begins with a character that no name of the language has, so that
// expr's own arithmetic, its built-in functions and its variables cannot be reached.
// The location of every node is its byte span in the user's text.
type lowering struct {
	session *Session
	source  *diag.Source
	locals  []string // parameters and loop variables in scope; a later one hides an earlier
	lenient bool     // unknown names are left to run time: bodies that may call later definitions
	library bool     // names are those of the embedded library, not the user's
	inCall  int      // calls whose arguments are being lowered: Hz is legal there alone
	depth   int
	err     *diag.Error
}

func (l *lowering) fail(err *diag.Error, span diag.Span) ast.Node {
	if l.err == nil {
		l.err = err.At(span).In(l.source)
	}
	return &ast.NilNode{}
}

func located(n ast.Node, span diag.Span) ast.Node {
	n.SetLocation(file.Location{From: span.Start, To: span.End})
	return n
}

// operation is a call of one of the functions of operations.go; the frame comes first.
func operation(name string, at diag.Span, args ...ast.Node) ast.Node {
	all := make([]ast.Node, 0, len(args)+1)
	all = append(all, located(&ast.IdentifierNode{Value: "$env"}, at))
	all = append(all, args...)
	callee := located(&ast.IdentifierNode{Value: name}, at)
	return located(&ast.CallNode{Callee: callee, Arguments: all}, at)
}

func constant(v any, at diag.Span) ast.Node { return located(&ast.ConstantNode{Value: v}, at) }

// binaryOperations names the function of each operator that is not lazy.
var binaryOperations = map[string]string{
	"+": "·add", "-": "·subtract", "*": "·multiply", "/": "·divide", "^": "·power", "±": "·pair",
	"==": "·equal", "!=": "·unequal", "<": "·less", "<=": "·atmost", ">": "·greater", ">=": "·atleast",
}

// value lowers an expression to a node that gives a value.Value.
func (l *lowering) value(e syntax.Expr) ast.Node {
	l.depth++
	defer func() { l.depth-- }()
	if l.depth > deepestExpression {
		return l.fail(diag.New(diag.Limit, "the expression is nested too deeply"), e.Extent())
	}
	if l.err != nil {
		return &ast.NilNode{}
	}
	switch e := e.(type) {
	case *syntax.Number:
		return l.number(e)
	case *syntax.Text:
		return constant(value.Text(e.Value), e.Span)
	case *syntax.Boolean:
		return constant(value.Boolean(e.Value), e.Span)
	case *syntax.Name:
		return l.name(e)
	case *syntax.Unary:
		return l.unary(e)
	case *syntax.Binary:
		if e.Op == "and" || e.Op == "or" {
			return operation("·truth", e.At, l.condition(e))
		}
		return l.binary(e)
	case *syntax.Call:
		return l.call(e)
	case *syntax.Index:
		return l.index(e)
	case *syntax.Field:
		x := l.value(e.X)
		return operation("·field", e.Name.Span, constant(e.Name.Name, e.Name.Span), x)
	case *syntax.List:
		return l.list(e)
	case *syntax.ForEach:
		return l.forEach(e)
	case *syntax.If:
		return located(&ast.ConditionalNode{Cond: l.condition(e.Cond), Exp1: l.value(e.Then), Exp2: l.value(e.Else)}, e.Span)
	}
	return l.fail(diag.New(diag.Internal, "an expression of an unknown form"), e.Extent())
}

// condition lowers an expression to a node that gives a Go bool, as expr's lazy nodes need.
func (l *lowering) condition(e syntax.Expr) ast.Node {
	l.depth++
	defer func() { l.depth-- }()
	if l.depth > deepestExpression {
		return l.fail(diag.New(diag.Limit, "the expression is nested too deeply"), e.Extent())
	}
	if b, ok := e.(*syntax.Binary); ok && (b.Op == "and" || b.Op == "or") {
		return located(&ast.BinaryNode{Operator: b.Op, Left: l.condition(b.L), Right: l.condition(b.R)}, b.At)
	}
	return operation("·bool", e.Extent(), l.value(e))
}

func (l *lowering) number(e *syntax.Number) ast.Node {
	v, err := literal(e)
	if err != nil {
		return l.fail(err, e.Span)
	}
	if q, ok := v.(value.Quantity); ok && q.Unit.IsHertz() && l.inCall == 0 {
		return l.fail(hertzElsewhere(e.Unit.Text), e.Unit.Span)
	}
	return constant(v, e.Span)
}

func (l *lowering) name(e *syntax.Name) ast.Node {
	for i := len(l.locals) - 1; i >= 0; i-- {
		if l.locals[i] == e.Name {
			return operation("·local", e.Span, constant(i, e.Span))
		}
	}
	if !l.lenient && !l.session.known(e.Name, l.library) {
		return l.fail(l.session.unknownName(e.Name, l.locals), e.Span)
	}
	return operation("·name", e.Span, constant(&nameSite{name: e.Name, library: l.library}, e.Span))
}

func (l *lowering) unary(e *syntax.Unary) ast.Node {
	switch e.Op {
	case "not":
		return operation("·not", e.At, l.value(e.X))
	case "ᵀ":
		return operation("·transpose", e.At, l.value(e.X))
	}
	return operation("·negate", e.At, l.value(e.X))
}

func (l *lowering) binary(e *syntax.Binary) ast.Node {
	name, ok := binaryOperations[e.Op]
	if !ok {
		return l.fail(diag.New(diag.Syntax, "%s is no operator", e.Op), e.At)
	}
	left := l.value(e.L)
	return operation(name, e.At, left, l.value(e.R))
}

func (l *lowering) call(e *syntax.Call) ast.Node {
	site := &callSite{span: e.Span, callee: e.Function.Extent(), local: -1, library: l.library}
	var args []ast.Node
	if name, ok := e.Function.(*syntax.Name); ok {
		site.name = name.Name
		for i := len(l.locals) - 1; i >= 0 && site.local < 0; i-- {
			if l.locals[i] == name.Name {
				site.local = i
			}
		}
		if site.local < 0 && !l.lenient && !l.session.known(name.Name, l.library) {
			return l.fail(l.session.unknownFunction(name.Name, l.locals), name.Span)
		}
	} else {
		args = append(args, l.value(e.Function))
	}
	l.inCall++
	defer func() { l.inCall-- }()
	for _, a := range e.Args {
		arg := argumentSite{span: a.Value.Extent()}
		if a.Name != nil {
			arg.name, arg.nameSpan = a.Name.Name, a.Name.Span
		}
		site.args = append(site.args, arg)
		args = append(args, l.value(a.Value))
	}
	return operation("·call", e.Function.Extent(), append([]ast.Node{constant(site, e.Span)}, args...)...)
}

func (l *lowering) index(e *syntax.Index) ast.Node {
	site := &indexSite{object: e.X.Extent()}
	args := []ast.Node{constant(site, e.Span), l.value(e.X)}
	for _, s := range e.Subscripts {
		span := s.Low.Extent()
		args = append(args, l.value(s.Low))
		if s.High != nil {
			span = span.Join(s.High.Extent())
			args = append(args, l.value(s.High))
		}
		site.spans = append(site.spans, span)
		site.ranges = append(site.ranges, s.High != nil)
	}
	return operation("·index", e.Span, args...)
}

// list lowers a literal. One whose elements are row literals is a matrix where its
// entries can stand in one; its rows are kept apart in the site, because the tokens 0
// and 1 mean blocks there.
func (l *lowering) list(e *syntax.List) ast.Node {
	site := &listSite{}
	args := []ast.Node{nil}
	add := func(x syntax.Expr) {
		zero, one := blockToken(x)
		site.entries = append(site.entries, entrySite{span: x.Extent(), zero: zero, one: one})
		args = append(args, l.value(x))
	}
	name := "·list"
	if isRows(e) {
		name = "·matrix"
		for _, row := range e.Elements {
			row := row.(*syntax.List)
			site.widths = append(site.widths, len(row.Elements))
			site.rows = append(site.rows, row.Span)
			for _, x := range row.Elements {
				add(x)
			}
		}
	} else {
		for _, x := range e.Elements {
			add(x)
		}
	}
	args[0] = constant(site, e.Span)
	return operation(name, e.Span, args...)
}

// isRows tells whether a list literal is written as rows. A literal whose rows are
// themselves written as rows is a list of matrices.
func isRows(e *syntax.List) bool {
	if len(e.Elements) == 0 {
		return false
	}
	for _, x := range e.Elements {
		row, ok := x.(*syntax.List)
		if !ok || isRows(row) {
			return false
		}
	}
	return true
}

// blockToken tells whether an entry is written as the bare 0 or 1.
func blockToken(e syntax.Expr) (zero, one bool) {
	n, ok := e.(*syntax.Number)
	if !ok || n.Unit != nil || n.Imaginary || n.Percent {
		return false, false
	}
	return n.Text == "0", n.Text == "1"
}

func (l *lowering) forEach(e *syntax.ForEach) ast.Node {
	in := l.value(e.In)
	inner := &lowering{session: l.session, source: l.source, lenient: l.lenient, library: l.library, depth: l.depth, inCall: l.inCall}
	inner.locals = append(l.locals[:len(l.locals):len(l.locals)], e.Variable.Name)
	site := &loopSite{variable: e.Variable.Name, in: e.In.Extent()}
	site.body = inner.compile(e.Body, false)
	if e.Where != nil {
		site.where = inner.compile(e.Where, true)
	}
	if inner.err != nil {
		return l.fail(inner.err, e.Span)
	}
	return operation("·each", e.Span, constant(site, e.Span), in)
}
