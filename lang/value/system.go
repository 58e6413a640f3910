package value

// Signal is a named state, input or output with its declared unit and working range.
type Signal struct {
	Name  string
	Unit  Unit
	Range *Number // in the declared unit; nil when not given
}

// Plant is a system in state space, x' = A x + B u, y = C x + D u (or x⁺ when Every is
// set), in the declared units of its signals.
type Plant struct {
	A, B, C, D              *Matrix // n×n, n×m, p×n, p×m; zero sizes legal
	Every                   *Number // the sample time in seconds; nil when continuous
	States, Inputs, Outputs []Signal
	X0, U0, Y0              []Number // the operating point in declared units; nil when at zero
	Transformation          *Matrix  // x̄ = T x of the form this plant was brought to; nil
	Origin                  *Model   // the model it was linearised from; nil
	Title                   string   // what it is, for the header: "controller form"
	Extra                   []Named  // further fields (a reduced plant's bound, Hankel singular values)
	Notes                   []string
}

// Transfer is a matrix of rational functions in s, or in z with a sample time.
type Transfer struct {
	Variable        string // "s" or "z"
	Every           *Number
	Entries         [][]Ratio
	Inputs, Outputs []Signal
	Notes           []string
}

// Ratio is numerator over denominator; the denominator is monic.
type Ratio struct{ Num, Den *Polynomial }

// Gain is a matrix of gains that keeps what it belongs to.
type Gain struct {
	Role                      string  // "state feedback", "observer", "reference"
	Values                    *Matrix // named rows and columns
	Plant                     *Plant
	RowSignals, ColumnSignals []Signal
	X0, U0                    []Number
	Poles                     []Value // the poles it really gives
	Wanted                    []Value // the poles asked for; nil when none were
	Sensitivity               *Number // κ(X), or the largest eigenvalue condition number; nil when unknown
	Residual, Condition       *Number
	Cost                      *Matrix // the Riccati solution; nil
	Method                    string
	Free                      bool // several gains give the same poles
	Extra                     []Named
	Notes                     []string
	// Rounding tells where the gain, rounded, would miss its poles (a Text, empty for nothing); it is worked out when the gain is shown.
	Rounding *Deferred
}

// Remarks gives the notes with what rounding would do.
func (g *Gain) Remarks() []string {
	if g.Rounding == nil {
		return g.Notes
	}
	if t, ok := Force(g.Rounding).(Text); ok && t != "" {
		return append(g.Notes[:len(g.Notes):len(g.Notes)], string(t))
	}
	return g.Notes
}

// Named is a field of a report.
type Named struct {
	Name  string
	Value Value
}

// Report is a set of named fields, and a table when Columns is set.
type Report struct {
	Title   string
	Fields  []Named
	Columns []string  // column heads, units in square brackets: "time constant [s]"
	Rows    [][]Value // a nil cell is blank; a Text cell is shown without quotes
	Holds   *bool     // the report's truth in require; nil when it has none
	Basis   *Response // what the report was read off, to be drawn beside it; nil for nothing
	Notes   []string
}

// Model is a plant given by its equations; the eval side that builds it fills Plant,
// and keeps in Source what it needs to linearise again.
type Model struct {
	Name   string
	Plant  *Plant
	Source any
	Extra  []Named // given, equations, what is free
	Notes  []string
}

// Kind tells the kind.
func (*Plant) Kind() Kind    { return KPlant }
func (*Transfer) Kind() Kind { return KTransfer } // Kind tells the kind.
func (*Gain) Kind() Kind     { return KGain }     // Kind tells the kind.
func (*Report) Kind() Kind   { return KReport }   // Kind tells the kind.
func (*Model) Kind() Kind    { return KModel }    // Kind tells the kind.
