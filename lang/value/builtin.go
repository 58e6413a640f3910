package value

import (
	"context"
	"os"

	"gainwright/lang/diag"
)

// Builtin describes one built-in function; the table of them is the single list that
// calling, completion, explain, the reference page and near-name hints read.
type Builtin struct {
	Name     string
	Family   string  // the folder it lives in, for the reference page's chapters
	Params   []Param // positional in this order; those with Named set only by name
	Bare     []Param // the form with bare matrices, or nil: chosen when the first argument is no system
	Result   string  // what comes back, in a few words with shapes
	Summary  string  // at most 72 characters
	Doc      string  // shapes, units, definitions, in paragraphs
	Examples []Example
	Errors   []string // when it refuses
	Source   string   // a citation: author, year, equation or DOI; or "definition"
	SeeAlso  []string
	Func     func(c *Call) (Value, error)
}

// Example is a line (or several, joined by newlines) and what it shows.
type Example struct{ Input, Output string }

// Shape says what an argument must be; the caller converts and refuses, so that Func never does.
type Shape int

// The shapes of arguments. What is given is converted as said.
const (
	Anything    Shape = iota
	AReal             // Number (a dimensionless Quantity becomes its SI value; a 1×1 matrix its entry)
	AWhole            // Number that is an exact whole number
	ANumber           // Number or Complex
	AQuantity         // Number in SI after checking Param.Dim; plain numbers are taken as SI
	AFrequency        // Number in rad/s; Hz counts 2π, rpm and rad/s as they are
	ATime             // Number in s, positive
	ARate             // Number in s: a sample time (5 ms) or a rate (200 Hz → 1/200 s)
	AMatrix           // *Matrix (a number becomes 1×1, a list of numbers a column, a Gain its values)
	ASquare           // *Matrix, square
	AVector           // *Matrix with one column (a row is turned)
	APolynomial       // *Polynomial (a number becomes degree 0, a 1×1 polynomial Transfer its numerator)
	ASystem           // *Plant (a Model gives its plant; a Transfer is realised)
	ATransfer         // *Transfer (a number, a Polynomial, a Plant are converted)
	PoleList          // *List of Number and Complex, conjugates complete (pairs spliced)
	AList             // *List
	AText             // Text
	AChoice           // Text, one of Param.Choices
	ABoolean          // Boolean
	NameList          // *List of Text
	AGain             // *Gain, or a *Matrix for one without a plant
	AFunction         // *Function
)

// Param is one parameter.
type Param struct {
	Name     string
	Shape    Shape
	Named    bool // by name only
	Optional bool
	Variadic bool   // the last positional one: any number of values, given as *List
	Default  string // shown in the reference; the Func supplies it
	Choices  []string
	Dim      Dimension // of an AQuantity
	Doc      string
}

// Call is one call of a built-in, its arguments checked and converted.
type Call struct {
	Context  context.Context
	Builtin  *Builtin
	Args     map[string]Value // by parameter name; absent when not given
	IsBare   bool             // the form with bare matrices was chosen
	Root     *os.Root         // the folder of the run; nil when files are not allowed
	Note     func(text string)
	Progress func(done, total int)                            // may be called from long runs
	Charge   func(bytes int64) error                          // accounts memory; an error when the budget is spent
	Apply    func(fn *Function, args ...Value) (Value, error) // calls a function value
}

// Function is a function value: a built-in or one made by define.
type Function struct {
	Name    string
	Params  []string
	Doc     string
	Builtin *Builtin // nil for a defined one
	Body    any      // the evaluator's own
}

// Kind tells the kind.
func (*Function) Kind() Kind { return KFunction }

// Has tells whether an argument was given.
func (c *Call) Has(name string) bool { _, ok := c.Args[name]; return ok }

// Plant gives an ASystem argument.
func (c *Call) Plant(name string) *Plant { v, _ := c.Args[name].(*Plant); return v }

// Transfer gives an ATransfer argument.
func (c *Call) Transfer(name string) *Transfer { v, _ := c.Args[name].(*Transfer); return v }

// Matrix gives an AMatrix, ASquare or AVector argument, nil when absent.
func (c *Call) Matrix(name string) *Matrix { v, _ := c.Args[name].(*Matrix); return v }

// Polynomial gives an APolynomial argument.
func (c *Call) Polynomial(name string) *Polynomial { v, _ := c.Args[name].(*Polynomial); return v }

// Number gives a real argument (AReal, AWhole, AQuantity, AFrequency, ATime, ARate), zero when absent.
func (c *Call) Number(name string) Number { v, _ := c.Args[name].(Number); return v }

// Text gives an AText or AChoice argument, or the fallback when absent.
func (c *Call) Text(name, fallback string) string {
	if v, ok := c.Args[name].(Text); ok {
		return string(v)
	}
	return fallback
}

// Truth gives an ABoolean argument, false when absent.
func (c *Call) Truth(name string) bool { v, _ := c.Args[name].(Boolean); return bool(v) }

// List gives an AList, PoleList or NameList argument, nil when absent.
func (c *Call) List(name string) *List { v, _ := c.Args[name].(*List); return v }

// Errf makes an error that points at the argument of the named parameter ("" for the call).
func Errf(kind diag.Kind, param, format string, args ...any) *diag.Error {
	return diag.New(kind, format, args...).For(param)
}
