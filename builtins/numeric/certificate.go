package numeric

import (
	"fmt"
	"math"
	"strings"
)

// unitRoundoff is 2⁻⁵³, the largest relative error of one rounding to binary64.
const unitRoundoff = 0x1p-53

// machineEpsilon is 2⁻⁵², the spacing of binary64 numbers just above 1.
const machineEpsilon = 0x1p-52

// mostDigits is −log₁₀ 2⁻⁵³ rounded down: no binary64 result holds more.
const mostDigits = 15.95

// Certificate says how a floating result was obtained and how far it may be
// believed.
type Certificate struct {
	// Method names the algorithm, for example "ordered Schur form of the
	// Hamiltonian, two Newton steps".
	Method string
	// Residual is the relative residual in the balanced coordinates; 0 when
	// there is none to speak of.
	Residual float64
	// Condition is the condition estimate: to first order the relative error
	// is Condition times the backward error. 0 means unknown; +Inf is allowed.
	Condition float64
	// Digits estimates how many decimal digits hold, relative to the largest
	// entry of the result, between 0 and 15.95. The rounding of the data to
	// binary64 is counted as an error of the data.
	Digits float64
	// Notes hold what a reader must know besides.
	Notes []string
}

// note appends a formatted remark.
func (c *Certificate) note(format string, arguments ...any) {
	c.Notes = append(c.Notes, fmt.Sprintf(format, arguments...))
}

// DigitsOf turns a relative backward error and a condition number into an
// estimate of the decimal digits that hold, clamped to 0 … 15.95. A backward
// error below 2⁻⁵³ counts as 2⁻⁵³, because the data were rounded; a condition
// number below 1 (unknown included) counts as 1.
func DigitsOf(backward, condition float64) float64 {
	if math.IsNaN(backward) || math.IsNaN(condition) {
		return 0
	}
	loss := math.Max(backward, unitRoundoff) * math.Max(condition, 1)
	if loss >= 1 {
		return 0
	}
	return math.Min(mostDigits, -math.Log10(loss))
}

// Refusal is the error for a question that has no answer, as opposed to one
// that was asked wrongly or whose computation failed. Reason is a sentence in
// the words of the trade; Modes name the offending eigenvalues.
type Refusal struct {
	Reason string
	Modes  []complex128
}

// Error gives the reason, followed by the modes when there are any.
func (r *Refusal) Error() string {
	if len(r.Modes) == 0 {
		return r.Reason
	}
	shown := make([]string, len(r.Modes))
	for i, mode := range r.Modes {
		shown[i] = modeText(mode)
	}
	return r.Reason + ": " + strings.Join(shown, ", ")
}

// modeText writes an eigenvalue with six significant digits.
func modeText(mode complex128) string {
	re, im := real(mode)+0, imag(mode)+0
	switch {
	case im == 0:
		return fmt.Sprintf("%.6g", re)
	case re == 0:
		return fmt.Sprintf("%.6gi", im)
	case im < 0:
		return fmt.Sprintf("%.6g - %.6gi", re, -im)
	}
	return fmt.Sprintf("%.6g + %.6gi", re, im)
}
