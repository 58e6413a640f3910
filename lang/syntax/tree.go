// Package syntax turns text into statements with positions, and statements back into
// tidy text. It knows no values: numbers are exact rationals, names are text.
//
// Parse reads a script, ParseNotebook the gain blocks of a Markdown file, Tidy prints.
// Text that is too deep, too long or not UTF-8 is refused with a *diag.Error.
package syntax

import (
	"math/big"

	"gainwright/lang/diag"
)

// File is a parsed script or notebook.
type File struct {
	Source     *diag.Source
	Statements []Statement
	Blocks     []Block // of a notebook: the fenced blocks in order; nil for a script
	Notes      []Note  // what the reader of the text should know ("1/100 s is 1/(100 s)")
}

// Block is one fenced block of a notebook: Span covers its body.
type Block struct {
	Span  diag.Span
	First int // index in Statements of the block's first statement
	Count int // how many statements the block holds
}

// Note is a remark on the text that is no error.
type Note struct {
	Span diag.Span
	Text string
}

// Ident is a name where it stands in the text, NFKC-normalised.
type Ident struct {
	Name string
	Span diag.Span
}

// Statement is one of the statement types below.
type Statement interface{ Extent() diag.Span }

type (
	// Binding is NAME = EXPR.
	Binding struct {
		Name Ident
		Expr Expr
		Over *Over // NAME = sensitivity(EXPR) over …, else nil
		Span diag.Span
	}
	// Show is EXPR, EXPR in UNIT.
	Show struct {
		Expr Expr
		In   *Unit
		Over *Over
		Span diag.Span
	}
	// Require is require COND, "why".
	Require struct {
		Cond Expr
		Why  string
		Span diag.Span
	}
	// Claim is claim EXPR is LITERAL.
	Claim struct {
		Expr    Expr
		Printed Expr // numbers, lists, matrices, pairs, polynomials as printed; numbers keep their text
		In      *Unit
		Span    diag.Span
	}
	// Define is define NAME(PARAMS) = EXPR, "what it gives".
	Define struct {
		Name   Ident
		Params []Ident
		Body   Expr
		Doc    string
		Span   diag.Span
	}
	// Use is use "file.gain".
	Use struct {
		Path     string
		PathSpan diag.Span
		Span     diag.Span
	}
	// Model is model NAME { … }.
	Model struct {
		Name  Ident
		Items []Item
		Span  diag.Span
	}
	// Diagram is diagram NAME { … }.
	Diagram struct {
		Name  Ident
		Items []Item
		Span  diag.Span
	}
	// Study is study NAME = EXPR over MODEL, … samples N seed N at corners, or
	// study NAME = { name: EXPR, … } over ….
	Study struct {
		Name    Ident
		Entries []StudyEntry // one with an empty name for the single form
		Over    Over
		Span    diag.Span
	}
	// Schedule is schedule NAME = EXPR over MODEL.PARAMETER from A to B in N steps.
	Schedule struct {
		Name      Ident
		Expr      Expr
		Model     Ident
		Parameter Ident
		From, To  Expr
		Steps     Expr
		Span      diag.Span
	}
)

// StudyEntry is one expression of a study.
type StudyEntry struct {
	Name Ident
	Expr Expr
}

// Over names the models that a study or a sensitivity varies, and how.
type Over struct {
	Models  []Ident
	Samples Expr // nil when not given
	Seed    Expr // nil when not given
	Corners bool
	Span    diag.Span
}

// Extent gives the statement's place.
func (s *Binding) Extent() diag.Span  { return s.Span }
func (s *Show) Extent() diag.Span     { return s.Span } // Extent gives the statement's place.
func (s *Require) Extent() diag.Span  { return s.Span } // Extent gives the statement's place.
func (s *Claim) Extent() diag.Span    { return s.Span } // Extent gives the statement's place.
func (s *Define) Extent() diag.Span   { return s.Span } // Extent gives the statement's place.
func (s *Use) Extent() diag.Span      { return s.Span } // Extent gives the statement's place.
func (s *Model) Extent() diag.Span    { return s.Span } // Extent gives the statement's place.
func (s *Diagram) Extent() diag.Span  { return s.Span } // Extent gives the statement's place.
func (s *Study) Extent() diag.Span    { return s.Span } // Extent gives the statement's place.
func (s *Schedule) Extent() diag.Span { return s.Span } // Extent gives the statement's place.

// Item is one line of a model or a diagram.
type Item interface{ Extent() diag.Span }

type (
	// Given is given NAME = VALUE ± TOL.
	Given struct {
		Name      Ident
		Value     Expr
		Tolerance Expr // nil when none; a NumberLit with Percent set is relative to the nominal value
		Span      diag.Span
	}
	// Signals is input …, state … or output … : Role tells which.
	Signals struct {
		Role    string // "input", "state", "output"
		Entries []Signal
		Span    diag.Span
	}
	// Let is let NAME = EXPR, and in a diagram NAME = EXPR.
	Let struct {
		Name Ident
		Expr Expr
		Span diag.Span
	}
	// Rate is rate NAME = EXPR, or next NAME = EXPR when Next is set.
	Rate struct {
		Name Ident
		Expr Expr
		Next bool
		Span diag.Span
	}
	// Every is every T.
	Every struct {
		Period Expr
		Span   diag.Span
	}
	// Around is around rest, around NAME = VALUE, … find NAME, ….
	Around struct {
		Rest   bool
		Values []AroundValue
		Find   []Ident
		Span   diag.Span
	}
)

// Signal is one entry of an input, state or output line.
type Signal struct {
	Name  Ident
	Unit  *Unit // nil when not declared
	Range Expr  // nil when not given
	Expr  Expr  // of an output: the equation, nil when the output is a state
	Span  diag.Span
}

// AroundValue is NAME = VALUE of an around line.
type AroundValue struct {
	Name  Ident
	Value Expr
}

// Extent gives the item's place.
func (i *Given) Extent() diag.Span   { return i.Span }
func (i *Signals) Extent() diag.Span { return i.Span } // Extent gives the item's place.
func (i *Let) Extent() diag.Span     { return i.Span } // Extent gives the item's place.
func (i *Rate) Extent() diag.Span    { return i.Span } // Extent gives the item's place.
func (i *Every) Extent() diag.Span   { return i.Span } // Extent gives the item's place.
func (i *Around) Extent() diag.Span  { return i.Span } // Extent gives the item's place.

// Unit is a unit as written: N*m*s/rad.
type Unit struct {
	Text    string
	Factors []UnitFactor
	Span    diag.Span
}

// UnitFactor is a symbol with its exponent.
type UnitFactor struct {
	Symbol   string
	Exponent int
	Span     diag.Span
}

// Expr is one of the expression types below.
type Expr interface{ Extent() diag.Span }

type (
	// Number is a literal; Text is what was written, sign excluded.
	Number struct {
		Text      string
		Value     *big.Rat // per cent already divided by 100
		Percent   bool
		Imaginary bool
		Unit      *Unit
		Span      diag.Span
	}
	// Text is a quoted text.
	Text struct {
		Value string
		Span  diag.Span
	}
	// Boolean is true or false.
	Boolean struct {
		Value bool
		Span  diag.Span
	}
	// Name is a use of a name.
	Name struct {
		Name string
		Span diag.Span
	}
	// Unary is -X, not X or Xᵀ; Op is "-", "not" or "ᵀ".
	Unary struct {
		Op   string
		X    Expr
		At   diag.Span // of the operator
		Span diag.Span
	}
	// Binary is L Op R; Op is one of + - * / ^ ± == != < <= > >= and or.
	Binary struct {
		Op   string
		L, R Expr
		At   diag.Span // of the operator
		Span diag.Span
	}
	// Call is Function(Args).
	Call struct {
		Function Expr
		Args     []Argument
		Span     diag.Span
	}
	// Index is X[Subscripts].
	Index struct {
		X          Expr
		Subscripts []Subscript
		Span       diag.Span
	}
	// Field is X.Name.
	Field struct {
		X    Expr
		Name Ident
		Span diag.Span
	}
	// List is [Elements].
	List struct {
		Elements []Expr
		Span     diag.Span
	}
	// ForEach is [Body for each Variable of In where Where].
	ForEach struct {
		Body     Expr
		Variable Ident
		In       Expr
		Where    Expr // nil when not given
		Span     diag.Span
	}
	// If is if Cond { Then } else { Else }.
	If struct {
		Cond, Then, Else Expr
		Span             diag.Span
	}
)

// Argument is one argument of a call; Name is nil for a positional one.
type Argument struct {
	Name  *Ident
	Value Expr
}

// Subscript is one index, or the range Low..High when High is not nil.
type Subscript struct {
	Low, High Expr
}

// Extent gives the expression's place.
func (e *Number) Extent() diag.Span  { return e.Span }
func (e *Text) Extent() diag.Span    { return e.Span } // Extent gives the expression's place.
func (e *Boolean) Extent() diag.Span { return e.Span } // Extent gives the expression's place.
func (e *Name) Extent() diag.Span    { return e.Span } // Extent gives the expression's place.
func (e *Unary) Extent() diag.Span   { return e.Span } // Extent gives the expression's place.
func (e *Binary) Extent() diag.Span  { return e.Span } // Extent gives the expression's place.
func (e *Call) Extent() diag.Span    { return e.Span } // Extent gives the expression's place.
func (e *Index) Extent() diag.Span   { return e.Span } // Extent gives the expression's place.
func (e *Field) Extent() diag.Span   { return e.Span } // Extent gives the expression's place.
func (e *List) Extent() diag.Span    { return e.Span } // Extent gives the expression's place.
func (e *ForEach) Extent() diag.Span { return e.Span } // Extent gives the expression's place.
func (e *If) Extent() diag.Span      { return e.Span } // Extent gives the expression's place.
