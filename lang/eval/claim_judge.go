package eval

import (
	"math"
	"math/big"

	"gainwright/lang/value"
)

var (
	ratZero = new(big.Rat)
	ratOne  = big.NewRat(1, 1)
)

// judge compares with rational arithmetic, so that the ends of the interval, which
// belong to it, are met exactly. The distance is in units of the last place.
func (p printedNumber) judge(n value.Number) (verdict, float64) {
	computed, uncertainty, ok := enclosed(n)
	if !ok {
		return disagrees, math.Inf(1)
	}
	distance := new(big.Rat).Sub(computed, p.value)
	distance.Abs(distance)
	units := math.Inf(1)
	switch {
	case p.last.Sign() != 0:
		units, _ = new(big.Rat).Quo(distance, p.last).Float64()
	case distance.Sign() == 0:
		units = 0
	}
	far := new(big.Rat).Add(distance, uncertainty)
	near := new(big.Rat).Sub(distance, uncertainty)
	switch {
	case far.Cmp(p.half) <= 0:
		return agrees, units
	case near.Cmp(p.half) > 0:
		return disagrees, units
	}
	return undecided, units
}

// enclosed gives a number and its uncertainty as rationals; false for infinity.
func enclosed(n value.Number) (center, radius *big.Rat, ok bool) {
	if n.Exact != nil {
		return n.Exact, ratZero, true
	}
	center = new(big.Rat).SetFloat64(n.F)
	radius = new(big.Rat).SetFloat64(n.Err)
	return center, radius, center != nil && radius != nil
}

// combined is the verdict of several.
func combined(verdicts ...verdict) verdict {
	worst := agrees
	for _, v := range verdicts {
		worst = max(worst, v)
	}
	return worst
}
