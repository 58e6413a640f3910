package render

import (
	"fmt"
	"strconv"
	"strings"

	"gainwright/lang/value"
)

// force works a deferred value out; nil stays nil.
func force(v value.Value) value.Value {
	if v == nil {
		return nil
	}
	return value.Force(v)
}

// layValue lays any value out.
func layValue(v value.Value, in *value.Unit, o Options) laid {
	if f, ok := v.(*value.Fractions); ok {
		o.Fractions, v = true, f.Value
	}
	v = force(v)
	if in != nil {
		// What cannot be shown in the unit was refused when it was evaluated.
		if converted, err := value.In(v, *in); err == nil {
			v = converted
		}
	}
	switch x := v.(type) {
	case nil:
		return laid{sign: unsigned, inline: "nothing"}
	case value.Number:
		return layNumber(x, "", o)
	case value.Quantity:
		return layNumber(x.Magnitude, x.Unit.Text, o)
	case value.Complex:
		return layComplex(x, o)
	case value.Text:
		return laid{sign: unsigned, inline: quoted(string(x))}
	case value.Boolean:
		return laid{sign: unsigned, inline: strconv.FormatBool(bool(x))}
	case *value.List:
		return layList(x, o)
	case *value.Matrix:
		return layMatrix(x, o)
	case *value.Polynomial:
		return layPolynomial(x, o)
	case *value.Transfer:
		return layTransfer(x, o)
	case *value.Plant:
		return layPlant(x, o)
	case *value.Gain:
		return layGain(x, o)
	case *value.Report:
		return layReport(x, o)
	case *value.Model:
		return layModel(x, o)
	case *value.Function:
		return layFunction(x)
	case *value.Response:
		return layResponse(x, o)
	case *value.Study:
		return layStudy(x, o)
	case value.HasFields:
		return layFields(x, o)
	}
	return laid{sign: unsigned, inline: "a " + string(v.Kind())}
}

// quoted writes a text as the language reads it.
func quoted(s string) string {
	return `"` + strings.NewReplacer(`\`, `\\`, `"`, `\"`).Replace(oneLine(s)) + `"`
}

// inlineValue is a value on one line, with the sign it would need.
func inlineValue(v value.Value, o Options) (string, sign) {
	switch x := force(v).(type) {
	case nil:
		return "", unsigned
	case value.Number, value.Quantity, value.Complex, value.Text, value.Boolean, *value.Polynomial, *value.Function:
		l := layValue(x, nil, o)
		return l.inline, l.sign
	case *value.List:
		return listText(x, o)
	case *value.Matrix:
		return matrixText(x, o)
	case *value.Transfer:
		if len(x.Entries) == 1 && len(x.Entries[0]) == 1 {
			return ratioText(x.Entries[0][0], o)
		}
	case *value.Gain:
		return matrixText(x.Values, o)
	case *value.Plant:
		return plantHeadline(x), unsigned
	case *value.Report:
		if x.Holds != nil {
			return strconv.FormatBool(*x.Holds), unsigned
		}
		if text, s, ok := shortFields(x.Fields, o); ok {
			return text, s
		}
		if x.Title != "" {
			return x.Title, unsigned
		}
	}
	return "a " + string(v.Kind()), unsigned
}

// shortFields writes a small report's fields on one line.
func shortFields(fields []value.Named, o Options) (string, sign, bool) {
	if len(fields) == 0 || len(fields) > 4 {
		return "", unsigned, false
	}
	parts := make([]string, 0, len(fields))
	s := unsigned
	for _, f := range fields {
		switch x := force(f.Value).(type) {
		case value.Number, value.Quantity, value.Complex, value.Text, value.Boolean:
		case *value.List:
			if isLarge(x) || len(x.Items) > 8 {
				return "", unsigned, false
			}
		default:
			return "", unsigned, false
		}
		text, t := inlineValue(f.Value, o)
		if plain, ok := force(f.Value).(value.Text); ok {
			text = oneLine(string(plain))
		}
		s = s.both(t)
		parts = append(parts, f.Name+" "+text)
	}
	return strings.Join(parts, ", "), s, true
}

const inlineMatrixEntries = 16

// matrixText writes a small matrix in the form the language reads, a large one by its size.
func matrixText(m *value.Matrix, o Options) (string, sign) {
	rows, cols := m.Dims()
	if rows*cols == 0 || rows*cols > inlineMatrixEntries {
		return fmt.Sprintf("a %d × %d matrix", rows, cols), unsigned
	}
	s := unsigned
	lines := make([]string, rows)
	for i := range rows {
		parts := make([]string, cols)
		for j := range cols {
			var t sign
			parts[j], t = entryText(matrixNumber(m, i, j), o)
			s = s.both(t)
		}
		lines[i] = "[" + strings.Join(parts, ", ") + "]"
	}
	return "[" + strings.Join(lines, ", ") + "]", s
}

// entryText is an element of a list or a matrix on one line: decimals, one number only.
func entryText(v value.Value, o Options) (string, sign) {
	switch x := v.(type) {
	case value.Number:
		f := figureOf(x, o)
		if o.Fractions && x.Exact != nil {
			f = asFraction(f, x.Exact)
		}
		return f.text(), f.sign
	case value.Complex:
		re, im := complexFigures(x, o)
		return complexText(re, im), re.sign.both(im.sign)
	}
	return inlineValue(v, o)
}

// listText writes a list on one line; neighbouring conjugates become one entry with ±.
func listText(l *value.List, o Options) (string, sign) {
	parts, s := listParts(l, o)
	if l.Pair && len(parts) == 1 {
		return parts[0], s
	}
	return "[" + strings.Join(parts, ", ") + "]", s
}

func listParts(l *value.List, o Options) ([]string, sign) {
	var parts []string
	s := unsigned
	for i := 0; i < len(l.Items); i++ {
		var text string
		var t sign
		if i+1 < len(l.Items) {
			if c, ok := areConjugates(l.Items[i], l.Items[i+1]); ok {
				text, t = pairText(c, o)
				parts, s = append(parts, text), s.both(t)
				i++
				continue
			}
		}
		text, t = entryText(l.Items[i], o)
		parts, s = append(parts, text), s.both(t)
	}
	return parts, s
}

// isLarge tells whether a value needs lines of its own.
func isLarge(v value.Value) bool {
	switch x := force(v).(type) {
	case *value.Matrix, *value.Gain, *value.Plant, *value.Report, *value.Model:
		return true
	case *value.Transfer:
		return len(x.Entries) != 1 || len(x.Entries[0]) != 1
	case *value.List:
		for _, item := range x.Items {
			if isLarge(item) {
				return true
			}
		}
		return false
	case value.Number, value.Quantity, value.Complex, value.Text, value.Boolean, *value.Polynomial, *value.Function, nil:
		return false
	}
	return true
}

// lists longer than this are abridged
const mostItems = 200

func layList(l *value.List, o Options) laid {
	if len(l.Items) == 0 {
		return laid{sign: unsigned, inline: "[]"}
	}
	if !isLarge(l) {
		return layFlatList(l, o)
	}
	out := laid{sign: unsigned, title: "a list of " + strconv.Itoa(len(l.Items))}
	for i, item := range l.Items {
		if i == mostItems && !o.InFull {
			out.lines = append(out.lines, fmt.Sprintf("… and %d more", len(l.Items)-i))
			break
		}
		out.lines = append(out.lines, labelled("["+strconv.Itoa(i+1)+"]", layValue(item, nil, o.narrower(2)), o.narrower(2))...)
	}
	return out
}

func layFlatList(l *value.List, o Options) laid {
	if len(l.Items) > mostItems && !o.InFull {
		cut := &value.List{Items: l.Items[:mostItems]}
		parts, s := listParts(cut, o)
		return laid{sign: s.both(keptExact), inline: "[" + strings.Join(parts, ", ") + ", …]",
			remarks: []string{fmt.Sprintf("the first %d of %d", mostItems, len(l.Items))}}
	}
	text, s := listText(l, o)
	return laid{sign: s, inline: text, remarks: digitRemark(listDigits(l), o)}
}

// listDigits is how many digits hold of the floating numbers of a list, the worst one
// counted, except those that are nothing but rounding.
func listDigits(l *value.List) int {
	digits := 17
	for _, item := range l.Items {
		switch x := item.(type) {
		case value.Number:
			if x.Exact == nil && x.F != 0 && x.Err < abs(x.F) {
				digits = min(digits, holding(x.F, x.Err))
			}
		case value.Complex:
			if !x.IsExact() {
				digits = min(digits, max(0, holding(modulus(x.C), x.Err)))
			}
		}
	}
	return digits
}

func layFunction(f *value.Function) laid {
	text := f.Name + "(" + strings.Join(f.Params, ", ") + ")"
	if f.Doc != "" {
		text += ": " + oneLine(f.Doc)
	}
	return laid{sign: unsigned, inline: "the function " + text}
}

// how much of a value a list of names shows
const summaryCells = 60

// Summary is a value on one short line with its sign, as in a list of names.
func Summary(v value.Value, o Options) string {
	text, s := inlineValue(v, o)
	if s == roughly || s == keptExact {
		text = "≈ " + text
	}
	return shortened(text, summaryCells)
}

// Table is a report's table alone.
func Table(r *value.Report, o Options) string {
	return strings.Join(newTable(r, o).lines(o.width()), "\n") + "\n"
}
