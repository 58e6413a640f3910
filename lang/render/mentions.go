package render

import (
	"sort"
	"strings"

	"gainwright/lang/value"
)

// mostMentions is how many words Mentions names.
const mostMentions = 8

// Mentions names the words of the table in whose names, summaries or explanations a text
// occurs, those that say it soonest first.
func Mentions(table []*value.Builtin, text string) []string {
	text = strings.ToLower(strings.TrimSpace(text))
	if len(text) < 2 {
		return nil
	}
	type found struct {
		name string
		rank int
	}
	var all []found
	for _, b := range table {
		about := b.Doc
		for _, p := range allParams(b) {
			about += " " + p.Doc
		}
		for rank, where := range []string{strings.ReplaceAll(b.Name, "_", " "), b.Summary, about} {
			if strings.Contains(strings.ToLower(where), text) {
				all = append(all, found{b.Name, rank})
				break
			}
		}
	}
	sort.SliceStable(all, func(i, j int) bool { return all[i].rank < all[j].rank })
	var names []string
	for _, f := range all[:min(len(all), mostMentions)] {
		names = append(names, f.name)
	}
	return names
}
