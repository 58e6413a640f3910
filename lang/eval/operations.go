package eval

import (
	"github.com/expr-lang/expr/builtin"
	"github.com/expr-lang/expr/vm"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// operations are the functions that lowered expressions call. The first argument is
// always the *frame. Their names cannot be typed.
var operations = functionTable(map[string]func(f *frame, args []any) (any, error){
	"·add":       arithmetic(value.Add),
	"·subtract":  arithmetic(value.Subtract),
	"·multiply":  multiply,
	"·divide":    arithmetic(value.Divide),
	"·power":     arithmetic(value.Power),
	"·pair":      arithmetic(value.PlusMinus),
	"·equal":     comparison("=="),
	"·unequal":   comparison("!="),
	"·less":      comparison("<"),
	"·atmost":    comparison("<="),
	"·greater":   comparison(">"),
	"·atleast":   comparison(">="),
	"·negate":    unary(value.Negate),
	"·transpose": unary(value.Transpose),
	"·not":       not,
	"·bool":      truth,
	"·truth":     func(_ *frame, args []any) (any, error) { return value.Boolean(args[0].(bool)), nil },
	"·local":     func(f *frame, args []any) (any, error) { return f.locals[args[0].(int)], nil },
	"·name":      name,
	"·field":     field,
	"·index":     index,
	"·list":      list,
	"·matrix":    matrix,
	"·each":      each,
	"·call":      call,
})

func functionTable(table map[string]func(f *frame, args []any) (any, error)) map[string]*builtin.Function {
	out := make(map[string]*builtin.Function, len(table))
	for name, fn := range table {
		out[name] = &builtin.Function{Name: name, Func: func(args ...any) (any, error) {
			f := args[0].(*frame)
			if err := f.task.step(); err != nil {
				return nil, err
			}
			return fn(f, args[1:])
		}}
	}
	return out
}

// charged accounts for a result and returns it.
func charged(f *frame, v value.Value, err error) (any, error) {
	if err != nil {
		return nil, err
	}
	if err := f.task.charge(sizeOf(v)); err != nil {
		return nil, err
	}
	return v, nil
}

func arithmetic(op func(a, b value.Value) (value.Value, error)) func(*frame, []any) (any, error) {
	return func(f *frame, args []any) (any, error) {
		v, err := f.compute(op, args[0].(value.Value), args[1].(value.Value))
		return charged(f, v, err)
	}
}

// compute carries out an operation, interruptibly when it may take long.
func (f *frame) compute(op func(a, b value.Value) (value.Value, error), a, b value.Value) (value.Value, error) {
	if !heavy(a) && !heavy(b) {
		return op(a, b)
	}
	return f.task.interruptible("this operation", nil, func() (value.Value, error) { return op(a, b) })
}

func unary(op func(a value.Value) (value.Value, error)) func(*frame, []any) (any, error) {
	return func(f *frame, args []any) (any, error) {
		v, err := op(args[0].(value.Value))
		return charged(f, v, err)
	}
}

func multiply(f *frame, args []any) (any, error) {
	a, b := args[0].(value.Value), args[1].(value.Value)
	bytes := productBytes(a, b)
	if err := f.task.charge(bytes); err != nil {
		return nil, err
	}
	f.task.held -= bytes
	v, err := f.compute(value.Multiply, a, b)
	return charged(f, v, err)
}

func comparison(op string) func(*frame, []any) (any, error) {
	return func(_ *frame, args []any) (any, error) {
		holds, err := value.Compare(op, args[0].(value.Value), args[1].(value.Value))
		if err != nil {
			return nil, err
		}
		return holds, nil
	}
}

func not(_ *frame, args []any) (any, error) {
	b, err := asTruth(args[0].(value.Value))
	if err != nil {
		return nil, err
	}
	return value.Boolean(!b), nil
}

func truth(_ *frame, args []any) (any, error) {
	b, err := asTruth(args[0].(value.Value))
	if err != nil {
		return nil, err
	}
	return b, nil
}

// asTruth gives the truth of a truth value or of a report that stands for one.
func asTruth(v value.Value) (bool, error) {
	switch v := v.(type) {
	case value.Boolean:
		return bool(v), nil
	case *value.Report:
		if v.Holds != nil {
			return *v.Holds, nil
		}
		return false, diag.New(diag.Type, "this report stands for neither true nor false").
			WithHelp("compare one of its fields")
	}
	return false, diag.New(diag.Type, "a condition is needed here, and this is %s", value.Describe(v)).
		WithHelp("write a comparison, such as x > 0")
}

func name(f *frame, args []any) (any, error) {
	site := args[0].(*nameSite)
	v, err := f.task.session.find(f, site.name, site.library)
	if err != nil {
		return nil, err
	}
	return v, nil
}

func field(f *frame, args []any) (any, error) {
	owner, name := args[1].(value.Value), args[0].(string)
	if _, ok := owner.(*value.Report); !ok {
		v, err := value.Field(owner, name)
		return charged(f, v, err)
	}
	// A report's field may be worked out only now.
	v, err := f.task.interruptible(name, nil, func() (value.Value, error) { return value.Field(owner, name) })
	return charged(f, v, err)
}

// indexSite is the place of X[…]: the spans of its subscripts, and which are ranges.
type indexSite struct {
	object diag.Span
	spans  []diag.Span
	ranges []bool
}

func index(f *frame, args []any) (any, error) {
	site := args[0].(*indexSite)
	subscripts := make([]value.Subscript, len(site.spans))
	next := 2
	for i := range subscripts {
		subscripts[i].Low = args[next].(value.Value)
		next++
		if site.ranges[i] {
			subscripts[i].High = args[next].(value.Value)
			next++
		}
	}
	v, at, err := value.Index(args[1].(value.Value), subscripts)
	if err != nil {
		if at >= 0 && at < len(site.spans) {
			err = placedAt(err, site.spans[at])
		}
		return nil, err
	}
	return charged(f, v, nil)
}

// loopSite is [BODY for each VARIABLE of … where …], its parts compiled once.
type loopSite struct {
	variable    string
	in          diag.Span
	body, where *program
}

func each(f *frame, args []any) (any, error) {
	site := args[0].(*loopSite)
	items, err := value.Elements(args[1].(value.Value))
	if err != nil {
		return nil, placedAt(err, site.in)
	}
	inner := &frame{task: f.task, overlay: f.overlay}
	inner.locals = append(f.locals[:len(f.locals):len(f.locals)], nil)
	last := len(inner.locals) - 1
	var body, where vm.VM
	out := make([]value.Value, 0, min(len(items), 1024))
	for _, item := range items {
		inner.locals[last] = item
		if site.where != nil {
			held := f.task.held
			keep, err := site.where.runOn(&where, inner)
			if err != nil {
				return nil, err
			}
			f.task.held = held
			if !keep.(bool) {
				continue
			}
		}
		held := f.task.held
		v, err := site.body.runOn(&body, inner)
		if err != nil {
			return nil, err
		}
		f.task.keep(held, v.(value.Value))
		if err := f.task.charge(16); err != nil {
			return nil, err
		}
		out = append(out, v.(value.Value))
	}
	v, err := value.Collect(out)
	if err != nil {
		return nil, err
	}
	return charged(f, v, nil)
}
