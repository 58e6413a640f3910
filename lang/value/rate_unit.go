package value

import "strings"

// PerSecond is the unit of the rate of what is measured in u, written in u's own terms:
// mm gives mm/s, rad/s gives rad/s^2, degC gives K/s. The unit of plain numbers, which
// stands for no declared unit, stays what it is.
func (u Unit) PerSecond() Unit {
	if u.IsNone() {
		return u
	}
	text := u.Text
	over, under, divided := strings.Cut(text, "/")
	switch {
	case u.Offset != nil:
		text = "K/s"
	case !divided:
		text += "/s"
	case under == "s":
		text = over + "/s^2"
	case under == "s^2" || under == "s²":
		text = over + "/s^3"
	case strings.HasPrefix(under, "("):
		text = over + "/" + strings.TrimSuffix(under, ")") + "*s)"
	default:
		text = over + "/(" + strings.ReplaceAll(under, "/", "*") + "*s)"
	}
	factors := append(append([]UnitFactor(nil), u.factors...), UnitFactor{"s", -1})
	out := Unit{Text: text, Dim: u.Dim, Scale: u.scale(), Pi: u.Pi, factors: factors}
	if u.Offset != nil {
		out.factors = []UnitFactor{{"K", 1}, {"s", -1}}
	}
	out.Dim[2]--
	return out
}
