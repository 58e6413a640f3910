package model

import (
	"testing"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// constants is a small world around a model: literals, their arithmetic, matrices, names
// with values and functions written as text.
type constants struct {
	names     map[string]value.Value
	functions map[string]Function
}

func (c *constants) Names() []string { return nil }

func (c *constants) Function(name string, _ bool) (Function, bool) {
	f, ok := c.functions[name]
	return f, ok
}

func (c *constants) Evaluate(source *diag.Source, e syntax.Expr, library bool) (value.Value, *diag.Error) {
	wrap := func(v value.Value, err error) (value.Value, *diag.Error) {
		if err != nil {
			return nil, asError(err).At(e.Extent()).In(source)
		}
		return v, nil
	}
	switch e := e.(type) {
	case *syntax.Number:
		if e.Unit == nil {
			return value.Rat(e.Value), nil
		}
		factors := make([]value.UnitFactor, len(e.Unit.Factors))
		for i, f := range e.Unit.Factors {
			factors[i] = value.UnitFactor{Symbol: f.Symbol, Exponent: f.Exponent}
		}
		u, err := value.Resolve(e.Unit.Text, factors)
		return wrap(value.Quantity{Magnitude: value.Rat(e.Value), Unit: u}, err)
	case *syntax.Text:
		return value.Text(e.Value), nil
	case *syntax.Name:
		if v, ok := c.names[e.Name]; ok {
			return v, nil
		}
		if e.Name == "pi" {
			return value.Pi(), nil
		}
		return nil, diag.New(diag.Name, "%s is not known", e.Name).At(e.Span).In(source)
	case *syntax.Unary:
		x, err := c.Evaluate(source, e.X, library)
		if err != nil {
			return nil, err
		}
		return wrap(value.Negate(x))
	case *syntax.Binary:
		l, err := c.Evaluate(source, e.L, library)
		if err != nil {
			return nil, err
		}
		r, err := c.Evaluate(source, e.R, library)
		if err != nil {
			return nil, err
		}
		return wrap(map[string]func(a, b value.Value) (value.Value, error){
			"+": value.Add, "-": value.Subtract, "*": value.Multiply, "/": value.Divide, "^": value.Power}[e.Op](l, r))
	case *syntax.List:
		var rows [][]value.Entry
		for _, x := range e.Elements {
			var row []value.Entry
			for _, y := range x.(*syntax.List).Elements {
				v, err := c.Evaluate(source, y, library)
				if err != nil {
					return nil, err
				}
				row = append(row, value.Entry{Value: v})
			}
			rows = append(rows, row)
		}
		v, _, err := value.MatrixLiteral(rows)
		return wrap(v, err)
	}
	return nil, diag.New(diag.Type, "this cannot stand outside").At(e.Extent()).In(source)
}

// define adds a function as the language would.
func (c *constants) define(t testing.TB, text string) {
	t.Helper()
	source := diag.NewSource("functions", text)
	file, err := syntax.Parse(source)
	if err != nil {
		t.Fatal(err)
	}
	if c.functions == nil {
		c.functions = map[string]Function{}
	}
	for _, st := range file.Statements {
		d := st.(*syntax.Define)
		f := Function{Body: d.Body, Source: source}
		for _, p := range d.Params {
			f.Params = append(f.Params, p.Name)
		}
		c.functions[d.Name.Name] = f
	}
}

// build parses the one statement of a text and builds it.
func build(t testing.TB, text string, outer Outer) (*Model, *diag.Error) {
	t.Helper()
	source := diag.NewSource("model.gain", text)
	file, err := syntax.Parse(source)
	if err != nil {
		t.Fatalf("%v\n%s", err, text)
	}
	if outer == nil {
		outer = &constants{}
	}
	return Build(source, file.Statements[0].(*syntax.Model), outer)
}

func mustBuild(t testing.TB, text string) *Model {
	t.Helper()
	m, err := build(t, text, nil)
	if err != nil {
		t.Fatalf("%s%s", err.Render(), text)
	}
	return m
}
