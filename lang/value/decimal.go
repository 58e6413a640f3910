package value

import (
	"math/big"
	"strconv"
	"strings"
)

// Decimal writes an exact number as a decimal fraction when that ends ("-0.125"), else as
// a fraction of whole numbers ("24/7"); terminates tells which.
func Decimal(r *big.Rat) (text string, terminates bool) {
	if r.IsInt() {
		return r.Num().String(), true
	}
	d := new(big.Int).Set(r.Denom())
	twos := int(d.TrailingZeroBits())
	d.Rsh(d, uint(twos))
	fives, ok := powerOfFive(d)
	if !ok {
		return r.RatString(), false
	}
	places := max(twos, fives)
	scaled := new(big.Int).Exp(big.NewInt(10), big.NewInt(int64(places)), nil)
	scaled.Mul(scaled, r.Num()).Quo(scaled, r.Denom())
	digits := new(big.Int).Abs(scaled).String()
	if len(digits) <= places {
		digits = strings.Repeat("0", places+1-len(digits)) + digits
	}
	text = digits[:len(digits)-places] + "." + digits[len(digits)-places:]
	if r.Sign() < 0 {
		text = "-" + text
	}
	return text, true
}

// powerOfFive gives k when d is 5ᵏ.
func powerOfFive(d *big.Int) (int, bool) {
	// 5ᵏ has ⌊k·log₂5⌋+1 bits: at most two candidates for k
	estimate := int(float64(d.BitLen()-1) / 2.321928094887362)
	for k := max(0, estimate-1); k <= estimate+1; k++ {
		if new(big.Int).Exp(big.NewInt(5), big.NewInt(int64(k)), nil).Cmp(d) == 0 {
			return k, true
		}
	}
	return 0, false
}

// brief writes a number for messages: exactly when that is short, else with 6 digits.
func brief(n Number) string {
	if n.Exact != nil && ratBits(n.Exact) < 60 {
		if text, ok := Decimal(n.Exact); ok && len(text) <= 12 {
			return text
		} else if !ok && len(text) <= 9 {
			return text
		}
	}
	return strconv.FormatFloat(n.Float64(), 'g', 6, 64)
}
