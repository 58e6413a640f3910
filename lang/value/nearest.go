package value

import "strings"

// Nearest gives the candidate nearest to a misspelt name, or "" when none is near: at most
// one change in three characters, counting insertions, deletions, replacements and
// exchanged neighbours (the restricted distance of Damerau 1964). Case counts half.
func Nearest(name string, candidates []string) string {
	best, bound := "", 2*max(1, len([]rune(name))/3)+1
	for _, c := range candidates {
		if c == name {
			continue
		}
		if d := distance([]rune(name), []rune(c), bound); d < bound {
			best, bound = c, d
		}
	}
	return best
}

// distance counts changes in halves: 2 for a change, 1 for a change of case only.
func distance(a, b []rune, bound int) int {
	if d := len(a) - len(b); 2*max(d, -d) >= bound || len(a) > 200 {
		return bound
	}
	rows := [3][]int{make([]int, len(b)+1), make([]int, len(b)+1), make([]int, len(b)+1)}
	for j := range rows[1] {
		rows[1][j] = 2 * j
	}
	for i := 1; i <= len(a); i++ {
		before, above, row := rows[(i+2)%3], rows[i%3], rows[(i+1)%3]
		row[0] = 2 * i
		for j := 1; j <= len(b); j++ {
			cost := 2
			switch {
			case a[i-1] == b[j-1]:
				cost = 0
			case strings.EqualFold(string(a[i-1]), string(b[j-1])):
				cost = 1
			}
			d := min(above[j-1]+cost, above[j]+2, row[j-1]+2)
			if i > 1 && j > 1 && a[i-1] == b[j-2] && a[i-2] == b[j-1] {
				d = min(d, before[j-2]+2)
			}
			row[j] = d
		}
	}
	return rows[(len(a)+1)%3][len(b)]
}
