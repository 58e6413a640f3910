package reach

import (
	"fmt"
	"math"
	"math/cmplx"
	"strings"

	"gainwright/builtins/system"
	"gainwright/lang/value"
)

// row words one mode.
func (m *mode) row(p *value.Plant) []value.Value {
	z := m.root
	v := z.Value
	sampled := p.Every != nil
	if sampled {
		v = cmplx.Log(v) / complex(p.Every.Float64(), 0)
	}
	dead := sampled && z.Value == 0
	cells := []value.Value{value.Text(m.verdict(sampled)), value.Text(marks(m.by)), value.Text(marks(m.shown)), m.pole(), nil, nil, nil}
	if dead {
		return cells
	}
	rel := 0.0
	if a := cmplx.Abs(z.Value); a > 0 {
		rel = z.Err / a
	}
	still := m.integrates(sampled) || onEdge(z, sampled)
	if !still && real(v) != 0 {
		cells[4] = value.FloatErr(1/math.Abs(real(v)), rel*cmplx.Abs(v)/(real(v)*real(v)))
		if r := z.Re; !sampled && r != nil && r.Exact.Sign() != 0 {
			inverse := newRat().Inv(r.Exact)
			cells[4] = value.Rat(inverse.Abs(inverse))
		}
	}
	if imag(v) != 0 {
		cells[5] = value.FloatErr(2*math.Pi/math.Abs(imag(v)), rel*2*math.Pi*cmplx.Abs(v)/(imag(v)*imag(v)))
	}
	switch {
	case m.open(sampled):
		cells[5], cells[6] = nil, nil
	case m.integrates(sampled), onEdge(z, sampled):
		cells[6] = value.Int(0)
	case imag(v) == 0 && real(v) < 0:
		cells[6] = value.Int(1)
	case imag(v) == 0:
		cells[6] = value.Int(-1)
	default:
		cells[6] = value.FloatErr(-real(v)/cmplx.Abs(v), 2*rel)
	}
	return cells
}

// pole is the pole of the row, a pair as one list a ± bi.
func (m *mode) pole() value.Value {
	if !m.pair {
		return m.root.Number()
	}
	return &value.List{Items: []value.Value{conjugated(m.root).Number(), m.root.Number()}, Pair: true}
}

func (m *mode) integrates(sampled bool) bool {
	still := complex128(0)
	if sampled {
		still = 1
	}
	return cmplx.Abs(m.root.Value-still) <= m.root.Err && m.root.Err < 1e-6
}

// open tells whether the error of a mode reaches the axis or the circle from so far that nothing is known of its growth.
func (m *mode) open(sampled bool) bool {
	r := m.root
	return r.Re == nil && !m.integrates(sampled) && onEdge(r, sampled) && r.Err > 1e-6*cmplx.Abs(r.Value)
}

// onEdge tells whether a mode lies on the axis or the circle within its error.
func onEdge(r system.Root, sampled bool) bool {
	if r.Re != nil {
		if sampled {
			return squaredModulus(r) == 0
		}
		return r.Re.Exact.Sign() == 0
	}
	if sampled {
		return math.Abs(cmplx.Abs(r.Value)-1) <= r.Err
	}
	return math.Abs(real(r.Value)) <= r.Err
}

// verdict words how a mode behaves and whether it is moved and seen.
func (m *mode) verdict(sampled bool) string {
	var how string
	swings := m.pair
	switch {
	case sampled && m.root.Value == 0:
		how = "gone in a step"
	case m.integrates(sampled):
		how = "integrates"
	case m.open(sampled):
		how = "grows or decays: not known within its error"
	case onEdge(m.root, sampled):
		how = "swings for ever"
	case Decays(m.root, sampled):
		how = "decays"
		if swings {
			how = "swings, decays"
		}
	default:
		how = "grows"
		if swings {
			how = "swings, grows"
		}
	}
	if sampled && !m.pair && real(m.root.Value) < 0 {
		how += ", changing sign"
	}
	if m.count > 1 {
		how += fmt.Sprintf(", %d times", m.count)
		if len(m.chain) > 0 {
			var lengths []string
			for _, k := range m.chain {
				lengths = append(lengths, fmt.Sprint(k))
			}
			word := "chain of "
			if len(m.chain) > 1 {
				word = "chains of "
			}
			how += " (" + word + strings.Join(lengths, ", ") + ")"
		}
	}
	if m.moved[0] == m.count && m.seen[0] == m.count {
		return how
	}
	return how + "; " + m.access()
}

// access words whether the mode is moved and seen.
func (m *mode) access() string {
	state := func(k [2]int, verb string) string {
		switch {
		case k[0] == k[1]:
			return verb
		case k[0] == 0:
			return "not " + verb
		}
		return fmt.Sprintf("%d of %d %s", k[0], k[1], verb)
	}
	moved, seen := state(m.moved, "moved"), state(m.seen, "seen")
	if m.moved[0] == 0 && m.seen[0] == 0 {
		return "neither moved nor seen"
	}
	return moved + ", " + seen
}

// strengthText writes a strength to two digits, 7.9e-5 rather than 7.9e-05.
func strengthText(x float64) string {
	text := fmt.Sprintf("%.2g", x)
	text = strings.Replace(text, "e-0", "e-", 1)
	return strings.Replace(strings.Replace(text, "e+0", "e", 1), "e+", "e", 1)
}

func marks(list []mark) string {
	if len(list) == 0 {
		return "nothing"
	}
	var words []string
	for _, k := range list {
		w := k.name
		if k.strength >= 0 {
			w += " " + strengthText(k.strength)
		}
		if k.part {
			w += " (in part)"
		}
		words = append(words, w)
	}
	return strings.Join(words, ", ")
}
