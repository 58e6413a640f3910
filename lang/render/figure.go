package render

import (
	"math"
	"math/big"
	"strconv"
	"strings"

	"gainwright/lang/value"
)

// figure is a number cut to significant digits, before a notation is chosen: the value is
// ± 0.d₁d₂d₃… × 10^(exponent+1), that is d₁.d₂d₃… × 10^exponent.
type figure struct {
	negative bool
	digits   string // d₁d₂…, "0" for zero
	exponent int
	word     string // "infinity" where there are no digits
	fraction string // the value as p/q, where it is to be shown so
	sign     sign
}

// largest exact whole numbers that are printed in full
const longestWhole = 15

// a fraction is short when its denominator has at most two digits and its numerator at most four
const (
	shortDenominator = 99
	shortNumerator   = 9999
)

// figureOf cuts a number to the digits asked for and to those that hold.
func figureOf(n value.Number, o Options) figure {
	if n.Exact != nil {
		return exactFigure(n.Exact, o.digits())
	}
	return floatFigure(n.F, n.Err, o.digits())
}

func exactFigure(r *big.Rat, digits int) figure {
	if r.Sign() == 0 {
		return figure{digits: "0"}
	}
	f := figure{negative: r.Sign() < 0}
	if r.IsInt() {
		text := strings.TrimPrefix(r.Num().String(), "-")
		if len(text) <= max(longestWhole, digits) {
			f.exponent = len(text) - 1
			f.digits = strings.TrimRight(text, "0")
			return f
		}
	}
	var cut bool
	f.digits, f.exponent, cut = decimalDigits(r, digits)
	if cut {
		f.sign = keptExact
	} else {
		f.digits = strings.TrimRight(f.digits, "0")
	}
	return f
}

// decimalDigits gives the first digits of |r|, rounded half away from zero, the decimal
// exponent of the first one, and whether something was cut.
func decimalDigits(r *big.Rat, digits int) (text string, exponent int, cut bool) {
	num, den := new(big.Int).Abs(r.Num()), r.Denom()
	// A first guess of the exponent from the bit lengths is at most one off.
	exponent = int(math.Floor(float64(num.BitLen()-den.BitLen()) * math.Log10(2)))
	for range 4 {
		q, rest := scaledQuotient(num, den, digits-1-exponent)
		text = q.String()
		switch {
		case len(text) > digits:
			exponent++
			continue
		case len(text) < digits:
			exponent--
			continue
		}
		return text, exponent, rest
	}
	return text, exponent, true
}

// scaledQuotient is num/den·10^power rounded half up, and whether it was rounded.
func scaledQuotient(num, den *big.Int, power int) (*big.Int, bool) {
	ten := new(big.Int).Exp(big.NewInt(10), big.NewInt(int64(max(power, -power))), nil)
	if power >= 0 {
		num = new(big.Int).Mul(num, ten)
	} else {
		den = new(big.Int).Mul(den, ten)
	}
	q, rest := new(big.Int).QuoRem(num, den, new(big.Int))
	if rest.Sign() == 0 {
		return q, false
	}
	if rest.Lsh(rest, 1).Cmp(den) >= 0 {
		q.Add(q, big.NewInt(1))
	}
	return q, true
}

func floatFigure(x, err float64, digits int) figure {
	f := figure{negative: math.Signbit(x), sign: roughly}
	switch {
	case math.IsNaN(x):
		return figure{word: "undefined", sign: unsigned}
	case math.IsInf(x, 0):
		f.word, f.sign = "infinity", exactly
		return f
	case x == 0 || math.Abs(x) <= err:
		f.digits, f.negative = "0", false
		if x == 0 && err == 0 {
			f.sign = exactly
		}
		return f
	}
	digits = min(digits, max(1, holding(x, err)))
	text := strconv.FormatFloat(math.Abs(x), 'e', digits-1, 64)
	mantissa, exponent, _ := strings.Cut(text, "e")
	f.exponent, _ = strconv.Atoi(exponent)
	f.digits = strings.Replace(mantissa, ".", "", 1)
	if err == 0 {
		// Data taken as it is: the text may well be the value.
		f.digits = trimZeros(f.digits)
		if r, ok := new(big.Rat).SetString(text); ok && r.Cmp(new(big.Rat).SetFloat64(math.Abs(x))) == 0 {
			f.sign = exactly
		}
	}
	return f
}

// holding is how many significant digits of x hold under an absolute error.
func holding(x, err float64) int {
	if err == 0 {
		return 17
	}
	return wholeDigits(-math.Log10(err / math.Abs(x)))
}

// wholeDigits counts whole digits; what the logarithm's rounding left is not lost.
func wholeDigits(digits float64) int { return int(math.Floor(digits + 1e-9)) }

func trimZeros(digits string) string {
	t := strings.TrimRight(digits, "0")
	if t == "" {
		return "0"
	}
	return t
}

// withFraction chooses to show an exact value as a fraction.
func (f figure) withFraction(r *big.Rat) figure {
	f.fraction, f.sign = r.RatString(), exactly
	return f
}

// isShortFraction tells whether a fraction says more than cut decimals.
func isShortFraction(r *big.Rat) bool {
	num, den := r.Num(), r.Denom()
	return den.IsInt64() && den.Int64() <= shortDenominator && num.IsInt64() &&
		num.Int64() <= shortNumerator && num.Int64() >= -shortNumerator
}

// wantsScientific tells whether the number is unreadable without a power of ten.
func (f figure) wantsScientific() bool {
	if f.word != "" || f.fraction != "" || f.digits == "0" {
		return false
	}
	if f.exponent < -4 {
		return true
	}
	if f.sign == exactly && f.exponent <= 6 {
		return false
	}
	if f.sign == exactly { // a large whole number: in full unless it is mostly zeros
		return len(f.digits) <= 5 || f.exponent > longestWhole
	}
	return f.exponent >= len(f.digits)
}

// text writes the number in the notation that suits it alone.
func (f figure) text() string {
	if f.wantsScientific() {
		return f.scientific()
	}
	return f.fixed()
}

func (f figure) minus() string {
	if f.negative {
		return "-"
	}
	return ""
}

// fixed writes without a power of ten.
func (f figure) fixed() string {
	switch {
	case f.word != "":
		return f.minus() + f.word
	case f.fraction != "":
		return f.fraction
	case f.digits == "0":
		return "0"
	case f.exponent < 0:
		return f.minus() + "0." + strings.Repeat("0", -f.exponent-1) + f.digits
	case f.exponent+1 >= len(f.digits):
		return f.minus() + f.digits + strings.Repeat("0", f.exponent+1-len(f.digits))
	}
	return f.minus() + f.digits[:f.exponent+1] + "." + f.digits[f.exponent+1:]
}

// scientific writes one digit before the point and a power of ten, left out when it is 10⁰.
func (f figure) scientific() string {
	if f.word != "" || f.fraction != "" || f.digits == "0" {
		return f.fixed()
	}
	s := f.minus() + f.digits[:1]
	if len(f.digits) > 1 {
		s += "." + f.digits[1:]
	}
	if f.exponent != 0 {
		s += "e" + strconv.Itoa(f.exponent)
	}
	return s
}
