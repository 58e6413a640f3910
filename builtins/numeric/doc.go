// Package numeric holds the float64 algorithms.
package numeric
