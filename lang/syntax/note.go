package syntax

import (
	"fmt"
	"math/big"
)

// noteDivisor remarks that the unit in 1/100 s belongs to the 100.
func (p *parser) noteDivisor(b *Binary) {
	r, ok := b.R.(*Number)
	if !ok || r.Unit == nil || p.scan.text[r.Span.Start] == '(' {
		return
	}
	x, sign := b.L, ""
	if u, ok := x.(*Unary); ok && u.Op == "-" {
		x, sign = u.X, "-"
	}
	l, ok := x.(*Number)
	if !ok || l.Unit != nil || r.Value.Sign() == 0 || len(l.Text)+len(r.Text) > ordinaryDigits {
		return
	}
	unit := r.Unit.Text
	meant := fmt.Sprintf("%s%s %s / %s", sign, l.Text, unit, r.Text)
	quotient := new(big.Rat).Quo(l.Value, r.Value)
	if places, exact := quotient.FloatPrec(); exact && places <= 12 && quotient.Num().BitLen() < 64 {
		meant = sign + quotient.FloatString(places) + " " + unit
	}
	p.file.Notes = append(p.file.Notes, Note{Span: b.Span, Text: fmt.Sprintf(
		"%s is %s%s/(%s %s), because a unit belongs to its number; for the other reading write %s",
		p.written(b.Span), sign, l.Text, r.Text, unit, meant)})
}
