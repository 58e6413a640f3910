package figure

import (
	"html"
	"strings"
	"unicode"
)

// size of the letters, in the drawing's units
const letter = 12.0

// textWidth is an upper estimate of a text's width: the face differs from reader to reader.
func textWidth(s string) float64 {
	w := 0.0
	for _, r := range s {
		switch {
		case strings.ContainsRune("il.,;:'|![]() ·", r):
			w += 0.4
		case r < 0x250 && !unicode.IsUpper(r), strings.ContainsRune("⁰¹²³⁴⁵⁶⁷⁸⁹⁻", r):
			w += 0.64
		case r > 0x2e80:
			w += 1.1
		case r == 'm' || r == 'w' || unicode.IsUpper(r):
			w += 0.85
		default:
			w += 0.7
		}
	}
	return w * letter
}

// shortened cuts a text to a width with an ellipsis.
func shortened(s string, width float64) string {
	if textWidth(s) <= width {
		return s
	}
	runes := []rune(s)
	for len(runes) > 1 && textWidth(string(runes)+"…") > width {
		runes = runes[:len(runes)-1]
	}
	return string(runes) + "…"
}

// clean makes a text fit for XML: no control characters, markup escaped.
func clean(s string) string {
	return html.EscapeString(strings.Map(func(r rune) rune {
		switch {
		case r == '\t' || r == '\n' || r == '\r':
			return ' '
		case unicode.IsControl(r) || unicode.Is(unicode.Bidi_Control, r) || r == 0xfffe || r == 0xffff:
			return '·'
		}
		return r
	}, s))
}

var greek = map[string]string{
	"alpha": "α", "beta": "β", "gamma": "γ", "delta": "δ", "epsilon": "ε", "zeta": "ζ", "eta": "η", "theta": "θ",
	"kappa": "κ", "lambda": "λ", "mu": "μ", "nu": "ν", "xi": "ξ", "rho": "ρ", "sigma": "σ", "tau": "τ",
	"phi": "φ", "chi": "χ", "psi": "ψ", "omega": "ω", "Gamma": "Γ", "Delta": "Δ", "Theta": "Θ", "Lambda": "Λ",
	"Sigma": "Σ", "Phi": "Φ", "Psi": "Ψ", "Omega": "Ω",
}

// symbol writes a name as on paper: a Greek letter spelt out becomes one, digits after it
// a subscript.
func symbol(name string) string {
	end := strings.IndexFunc(name, func(r rune) bool { return !unicode.IsLetter(r) })
	word, rest := name, ""
	if end >= 0 {
		word, rest = name[:end], name[end:]
	}
	g, ok := greek[word]
	if !ok {
		return name
	}
	digits := strings.TrimPrefix(rest, "_")
	if digits != "" && strings.Trim(digits, "0123456789") == "" {
		return g + strings.Map(func(r rune) rune { return r - '0' + '₀' }, digits)
	}
	return g + rest
}
