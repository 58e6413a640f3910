// Package eval runs statements: it lowers expressions to expr syntax trees, checks,
// compiles and runs them, and reports what they say as events.
package eval

import (
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// Event is one thing a run has to say, in the order of the text. Exactly one of the
// pointers is set, or Note is not empty.
type Event struct {
	Source *diag.Source // the file the statement stands in
	Span   diag.Span    // the statement
	Line   int          // its first line, from 1
	Text   string       // the statement's (or expression's) source text on one line

	Shown       *Shown
	Bound       *Bound
	Requirement *Requirement
	Claim       *Claim
	Error       *diag.Error
	Note        string
}

// Shown is a value to print, in the unit asked for when In is not nil.
type Shown struct {
	Value value.Value
	In    *value.Unit
}

// Bound is a name that was bound; only the prompt shows it.
type Bound struct {
	Name  string
	Value value.Value
}

// Requirement is the outcome of a require statement. Left, Op and Right are set for a
// comparison; Because explains a report's truth.
type Requirement struct {
	Met            bool
	WithinRounding bool         // the bound lies inside the value's own uncertainty
	NotJudged      bool         // on one part of a divided study
	Sampled        bool         // it was judged for every sample of a study
	Study          *value.Study // of one number, when Sampled; Bound is what its samples are held against, in its unit
	Bound          float64
	Left, Right    value.Value
	Op             string
	Why            string
	Because        string
}

// Claim is the outcome of a claim statement.
type Claim struct {
	Agrees     bool
	Undecided  bool
	WorstUnits float64 // the largest distance of all entries in units of the last printed place; +Inf where equality was demanded and fails
	Entries    []ClaimEntry
	Poles      []value.Value // of a gain: the poles that the printed numbers give
	Notes      []string
}

// ClaimEntry is an entry that disagrees or cannot be judged.
type ClaimEntry struct {
	At       []int  // row and column, or place in the list, from 1; empty for a number
	Part     string // "real" or "imaginary" of a complex number, else ""
	Name     string // the entry's row and column by name, of a gain
	Printed  string
	Computed value.Value
	Units    float64
	Cannot   string // why it cannot be judged, or empty
}
