package prompt

import (
	"sort"
	"strings"
	"unicode"

	"gainwright/lang/value"
)

// greek are the letters by their names; the name with a capital gives the capital.
var greek = map[string]string{
	"alpha": "α", "beta": "β", "gamma": "γ", "delta": "δ", "epsilon": "ε", "zeta": "ζ",
	"eta": "η", "theta": "θ", "iota": "ι", "kappa": "κ", "lambda": "λ", "mu": "μ",
	"nu": "ν", "xi": "ξ", "omicron": "ο", "pi": "π", "rho": "ρ", "sigma": "σ",
	"tau": "τ", "upsilon": "υ", "phi": "φ", "chi": "χ", "psi": "ψ", "omega": "ω",
}

// words that begin a statement, and the sentences
var beginnings = []string{"require ", "claim ", "define ", "model ", "diagram ", "study ", "schedule ", "use ",
	"explain ", "list names", "take back", "keep in ", "show ", "leave session"}

// complete offers what the word before the cursor can become. On an empty word it offers
// nothing, since pasted tabs ask too.
func (t *talk) complete(line string, pos int) (head string, offers []string, tail string) {
	runes := []rune(line)
	pos = min(pos, len(runes))
	start := pos
	for start > 0 && isNameRune(runes[start-1]) {
		start--
	}
	head, tail = string(runes[:start]), string(runes[pos:])
	word := string(runes[start:pos])
	if word == "" || insideQuotes(head) {
		return head, nil, tail
	}
	if strings.HasSuffix(head, ".") {
		return head, t.fields(head, word), tail
	}
	if letter, ok := greekLetter(word); ok && !t.isKnown(word) {
		return head, []string{letter}, tail
	}
	if strings.TrimSpace(head) == "explain" {
		return head, t.Session.Candidates(word), tail
	}
	offers = t.arguments(head, word)
	if strings.TrimSpace(head) == "" {
		offers = append(offers, withPrefix(beginnings, word)...)
	}
	return head, append(offers, t.Session.Candidates(word)...), tail
}

func isNameRune(r rune) bool {
	return r == '_' || r == '′' || unicode.IsLetter(r) || unicode.IsMark(r) || unicode.IsNumber(r)
}

func insideQuotes(head string) bool { return strings.Count(head, `"`)%2 == 1 }

func greekLetter(word string) (string, bool) {
	if letter, ok := greek[word]; ok {
		return letter, true
	}
	lower := strings.ToLower(word[:1]) + word[1:]
	if letter, ok := greek[lower]; ok && lower != word {
		return strings.ToUpper(letter), true
	}
	return "", false
}

// isKnown tells whether a Greek letter's name is already a name, such as pi.
func (t *talk) isKnown(word string) bool {
	_, ok := t.Session.Lookup(word)
	return ok
}

// fields offers the fields of the value before the point.
func (t *talk) fields(head, word string) []string {
	before := strings.TrimSuffix(head, ".")
	start := len(before)
	for i, r := range before {
		if isNameRune(r) {
			start = min(start, i)
		} else {
			start = len(before)
		}
	}
	v, ok := t.boundValue(before[start:])
	if !ok {
		return nil
	}
	f, ok := v.(value.HasFields)
	if !ok {
		return nil
	}
	return withPrefix(f.FieldNames(), word)
}

// arguments offers the named arguments of the call that the cursor is in.
func (t *talk) arguments(head, word string) []string {
	name := calledName(head)
	if name == "" {
		return nil
	}
	var names []string
	for _, b := range t.Table {
		if b.Name != name {
			continue
		}
		for _, p := range append(append([]value.Param{}, b.Params...), b.Bare...) {
			if p.Named && !strings.Contains(head, p.Name+":") {
				names = append(names, p.Name+": ")
			}
		}
	}
	sort.Strings(names)
	return withPrefix(names, word)
}

// calledName is the name before the innermost open bracket, or "".
func calledName(head string) string {
	depth := 0
	runes := []rune(head)
	for i := len(runes) - 1; i >= 0; i-- {
		switch runes[i] {
		case ')', ']', '}':
			depth++
		case '[', '{':
			depth--
		case '(':
			depth--
			if depth < 0 {
				start := i
				for start > 0 && isNameRune(runes[start-1]) {
					start--
				}
				return string(runes[start:i])
			}
		}
	}
	return ""
}

func withPrefix(words []string, prefix string) []string {
	var out []string
	seen := map[string]bool{}
	for _, w := range words {
		if strings.HasPrefix(w, prefix) && !seen[w] {
			seen[w] = true
			out = append(out, w)
		}
	}
	return out
}
