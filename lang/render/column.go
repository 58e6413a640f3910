package render

import (
	"strings"

	"gainwright/lang/value"
)

// entry is one number of a column: real, or complex when im is set.
type entry struct {
	re, im figure
	isPair bool // im counts
	both   bool // the number and its conjugate
	text   string
	isText bool
}

func (e entry) sign() sign {
	switch {
	case e.isText:
		return unsigned
	case e.isPair:
		return e.re.sign.both(e.im.sign)
	}
	return e.re.sign
}

// entryOf cuts a number or a complex number for a column.
func entryOf(v value.Value, o Options) entry {
	v = force(v)
	switch x := v.(type) {
	case value.Number:
		e := entry{re: figureOf(x, o)}
		if o.Fractions && x.Exact != nil {
			e.re = asFraction(e.re, x.Exact)
		}
		return e
	case value.Complex:
		re, im := complexFigures(x, o)
		return entry{re: re, im: im, isPair: true}
	}
	if l, ok := v.(*value.List); ok && len(l.Items) == 2 {
		if c, ok := areConjugates(l.Items[0], l.Items[1]); ok {
			re, im := complexFigures(c, o)
			return entry{re: re, im: im, isPair: true, both: true}
		}
	}
	text, _ := inlineValue(v, o)
	return entry{text: text, isText: true}
}

func signOf(entries []entry) sign {
	s := unsigned
	for _, e := range entries {
		s = s.both(e.sign())
	}
	return s
}

// alignColumn writes the entries with their decimal points under each other, all of one
// width; imaginary parts are aligned among themselves. Texts stay as they are.
func alignColumn(entries []entry) []string {
	re, im := make([]figure, 0, len(entries)), make([]figure, 0, len(entries))
	for _, e := range entries {
		if e.isText {
			continue
		}
		re = append(re, e.re)
		if e.isPair {
			im = append(im, e.im)
		}
	}
	reTexts, imTexts := alignedFigures(re, false), alignedFigures(im, true)
	reWidth, imWidth := widest(reTexts), widest(imTexts)
	out := make([]string, len(entries))
	r, m := 0, 0
	for i, e := range entries {
		if e.isText {
			out[i] = e.text
			continue
		}
		out[i] = padRight(reTexts[r], reWidth)
		r++
		switch {
		case e.isPair:
			operator := " + "
			switch {
			case e.both:
				operator = " ± "
			case e.im.isNegative():
				operator = " - "
			}
			out[i] += operator + padRight(imTexts[m], imWidth)
			m++
		case len(im) > 0:
			out[i] += strings.Repeat(" ", imWidth+3)
		}
	}
	if len(re) == len(entries) {
		w := widest(out)
		for i := range out {
			out[i] = padLeft(out[i], w)
		}
	}
	return out
}

func widest(texts []string) int {
	w := 0
	for _, t := range texts {
		w = max(w, cells(t))
	}
	return w
}

// alignedFigures writes figures with the points aligned; those that are too small or too
// large to be read otherwise in scientific notation.
func alignedFigures(figures []figure, imaginary bool) []string {
	texts := make([]string, len(figures))
	before, after := make([]string, len(figures)), make([]string, len(figures))
	wide := 0
	for i, f := range figures {
		if imaginary {
			f.negative = false
		}
		switch {
		case imaginary && f.fraction != "":
			texts[i] = f.imaginaryText()
		case f.wantsScientific():
			texts[i] = f.scientific()
		default:
			texts[i] = f.fixed()
		}
		if imaginary && f.fraction == "" {
			texts[i] += "i"
		}
		before[i], after[i] = texts[i], ""
		if p := strings.IndexAny(texts[i], ".e"); p >= 0 && f.word == "" {
			before[i], after[i] = texts[i][:p], texts[i][p:]
		} else if imaginary {
			before[i], after[i] = texts[i][:len(texts[i])-1], "i"
		}
		wide = max(wide, cells(before[i]))
	}
	tail := widest(after)
	for i := range texts {
		texts[i] = padRight(padLeft(before[i], wide)+after[i], wide+tail)
	}
	return texts
}
