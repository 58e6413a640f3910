package diag

import (
	"slices"
	"strings"
	"unicode/utf8"
)

// longestGuess is the length in characters beyond which no near name is sought, so that
// a huge word costs nothing.
const longestGuess = 64

// Nearest gives the candidate that a mistyped word most likely means, or "" when none is
// near. A candidate that differs only in capitals or in the order of its words
// (poles_assign for assign_poles) is taken first, else the one with the fewest slips:
// a letter left out, added, changed or swapped with its neighbour (Damerau 1964).
// The word itself is never its own suggestion. Ties go to the same first letter, then to
// the alphabet, so the answer does not depend on the candidates' order.
func Nearest(word string, candidates []string) string {
	n := utf8.RuneCountInString(word)
	if n == 0 || n > longestGuess {
		return ""
	}
	lower := strings.ToLower(word)
	parts := sortedParts(lower)
	best, bestCost := "", 4*slips(n)+4
	for _, c := range candidates {
		if c == word || c == "" || utf8.RuneCountInString(c) > longestGuess {
			continue
		}
		cost := nameCost(lower, parts, c, slips(n))
		if cost < bestCost || cost == bestCost && best != "" && c < best {
			best, bestCost = c, cost
		}
	}
	return best
}

// slips is how many slips a word of n letters may hold and still be recognised.
func slips(n int) int {
	switch {
	case n < 2:
		return 0
	case n < 5:
		return 1
	case n < 9:
		return 2
	}
	return 3
}

// nameCost orders candidates: capitals, then word order, then slips (four each, one more
// where the first letter differs); beyond the bound it is too large to win.
func nameCost(lower string, parts []string, candidate string, bound int) int {
	other := strings.ToLower(candidate)
	if other == lower {
		return 0
	}
	if len(parts) > 1 && slices.Equal(parts, sortedParts(other)) {
		return 1
	}
	d := slipDistance([]rune(lower), []rune(other))
	if d > bound {
		return 4*bound + 4
	}
	cost := 4 * d
	a, _ := utf8.DecodeRuneInString(lower)
	b, _ := utf8.DecodeRuneInString(other)
	if a != b {
		cost++
	}
	return cost
}

func sortedParts(word string) []string {
	parts := strings.Split(word, "_")
	slices.Sort(parts)
	return parts
}

// slipDistance is the optimal string alignment distance.
func slipDistance(a, b []rune) int {
	before, previous, current := make([]int, len(b)+1), make([]int, len(b)+1), make([]int, len(b)+1)
	for j := range previous {
		previous[j] = j
	}
	for i := 1; i <= len(a); i++ {
		current[0] = i
		for j := 1; j <= len(b); j++ {
			changed := previous[j-1]
			if a[i-1] != b[j-1] {
				changed++
			}
			current[j] = min(changed, previous[j]+1, current[j-1]+1)
			if i > 1 && j > 1 && a[i-1] == b[j-2] && a[i-2] == b[j-1] {
				current[j] = min(current[j], before[j-2]+1)
			}
		}
		before, previous, current = previous, current, before
	}
	return previous[len(b)]
}
