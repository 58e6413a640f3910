package figure

import (
	"math"
	"slices"
	"testing"
)

// TestCrossings: a level is passed between two points or on one; what touches it or stays
// on it does not pass, nor what is not known on one side.
func TestCrossings(t *testing.T) {
	nan := math.NaN()
	for _, c := range []struct{ y, at []float64 }{
		{[]float64{1, -1, -2}, []float64{math.Sqrt2}},
		{[]float64{1, 0, -1}, []float64{2}},
		{[]float64{-1, 0, 1, 1}, []float64{2}},
		{[]float64{1, 0, 1}, nil},
		{[]float64{1, 0, 0, -1}, nil},
		{[]float64{1, nan, -1}, nil},
		{[]float64{0, -1, -1}, nil},
		{[]float64{3, -1, 3}, []float64{math.Pow(2, 0.75), math.Pow(2, 1.25)}},
	} {
		x := []float64{1, 2, 4, 8}[:len(c.y)]
		got := crossings(x, c.y, 0)
		if !slices.EqualFunc(got, c.at, func(a, b float64) bool { return math.Abs(a-b) < 1e-12 }) {
			t.Errorf("%v passes 0 at %v, not at %v", c.y, got, c.at)
		}
	}
}
