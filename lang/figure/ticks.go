package figure

import (
	"math"
	"strconv"
	"strings"
)

// axis maps values to a length of the drawing, linearly or by logarithm.
type axis struct {
	low, high float64 // of the values
	from, to  float64 // in the drawing
	isLog     bool
	ticks     []tick
	fine      []float64 // places of lines without a label
	power     int       // labels are to be multiplied by 10^power
}

type tick struct {
	at    float64
	label string
}

func (a *axis) place(x float64) float64 {
	if a.isLog {
		return a.from + (math.Log10(x)-math.Log10(a.low))/(math.Log10(a.high)-math.Log10(a.low))*(a.to-a.from)
	}
	return a.from + (x/2-a.low/2)/(a.high/2-a.low/2)*(a.to-a.from)
}

// linear makes an axis with round ticks that begins and ends at one when wide is set.
func linear(low, high float64, about int, wide bool) *axis {
	if low == high {
		room := math.Abs(low) / 2
		if room == 0 {
			room = 1
		}
		low, high = low-room, high+room
	}
	step := roundStep((high/2 - low/2) / float64(about) * 2)
	first, last := math.Floor(low/step), math.Ceil(high/step)
	if !wide {
		first, last = math.Ceil(low/step-1e-9), math.Floor(high/step+1e-9)
	}
	a := &axis{low: low, high: high}
	if wide {
		a.low, a.high = first*step, last*step
	}
	return a.labelled(step, first, last)
}

// labelled puts ticks at the multiples first … last of step.
func (a *axis) labelled(step, first, last float64) *axis {
	largest := math.Max(math.Abs(first*step), math.Abs(last*step))
	if largest >= 1e5 || largest < 1e-2 && largest > 0 {
		a.power = int(math.Floor(math.Log10(largest)/3)) * 3
	}
	unit := math.Pow(10, float64(a.power))
	decimals := max(0, -int(math.Floor(math.Log10(step/unit)+1e-9)))
	if r := step / unit * math.Pow(10, float64(decimals)); math.Abs(r-math.Round(r)) > 1e-6 {
		decimals++
	}
	for k := first; k <= last && len(a.ticks) < 50; k++ {
		a.ticks = append(a.ticks, tick{k * step, signed(strconv.FormatFloat(k*step/unit, 'f', decimals, 64))})
	}
	return a
}

// roundStep is 1, 2 or 5 times a power of ten, at least x.
func roundStep(x float64) float64 {
	p := math.Pow(10, math.Floor(math.Log10(x)))
	for _, m := range []float64{1, 2, 5, 10} {
		if m*p >= x*(1-1e-9) {
			return m * p
		}
	}
	return 10 * p
}

// signed writes a minus as wide as a plus, and none before zero.
func signed(text string) string {
	if strings.Trim(text, "-0.") == "" {
		return strings.TrimPrefix(text, "-")
	}
	return strings.Replace(text, "-", "−", 1)
}

// logarithmic makes an axis with ticks at powers of ten, between them where the range is short.
func logarithmic(low, high float64) *axis {
	a := &axis{low: low, high: high, isLog: true}
	decades := math.Log10(high / low)
	multiples := []float64{1}
	if decades < 2.5 {
		multiples = []float64{1, 2, 5}
	}
	every := max(1, int(math.Ceil(decades/8)))
	for d := int(math.Floor(math.Log10(low))); d <= int(math.Ceil(math.Log10(high))); d++ {
		for m := 1; m < 10; m++ {
			x := float64(m) * math.Pow(10, float64(d))
			if x < low*(1-1e-9) || x > high*(1+1e-9) {
				continue
			}
			x = math.Min(math.Max(x, low), high)
			isLabelled := false
			for _, f := range multiples {
				isLabelled = isLabelled || f == float64(m) && (m > 1 || d%every == 0)
			}
			if isLabelled {
				a.ticks = append(a.ticks, tick{x, powerLabel(m, d)})
			} else if decades <= 6 {
				a.fine = append(a.fine, x)
			}
		}
	}
	if len(a.ticks) < 2 {
		b := linear(low, high, 5, false)
		a.ticks, a.fine, a.power = b.ticks, nil, b.power
	}
	return a
}

func powerLabel(m, d int) string {
	if d >= -3 && d <= 4 {
		return strconv.FormatFloat(float64(m)*math.Pow(10, float64(d)), 'f', max(0, -d), 64)
	}
	if m == 1 {
		return "10" + superscript(d)
	}
	return strconv.Itoa(m) + "·10" + superscript(d)
}

func superscript(n int) string {
	return strings.NewReplacer("-", "⁻", "0", "⁰", "1", "¹", "2", "²", "3", "³", "4", "⁴",
		"5", "⁵", "6", "⁶", "7", "⁷", "8", "⁸", "9", "⁹").Replace(strconv.Itoa(n))
}

// brief and briefer write a number with four and three digits.
func brief(x float64) string   { return rounded(x, 4) }
func briefer(x float64) string { return rounded(x, 3) }

// rounded writes a number with so many significant digits as on paper: a power of ten
// where the number would have many zeros.
func rounded(x float64, digits int) string {
	text := strconv.FormatFloat(x, 'e', digits-1, 64)
	mantissa, exponent, ok := strings.Cut(text, "e")
	if !ok { // it is not finite
		return signed(text)
	}
	power, _ := strconv.Atoi(exponent) // of ten, two or three digits
	if power < -4 || power > 5 {
		if strings.Contains(mantissa, ".") {
			mantissa = strings.TrimSuffix(strings.TrimRight(mantissa, "0"), ".")
		}
		return signed(mantissa) + "·10" + superscript(power)
	}
	near, _ := strconv.ParseFloat(text, 64)
	return signed(strconv.FormatFloat(near, 'f', -1, 64))
}

// heading is what stands at an axis: the name, and the unit with the power of ten.
func heading(name, unit string, power int) string {
	if power != 0 {
		unit = strings.TrimSpace("10" + superscript(power) + " " + unit)
	}
	if unit == "" {
		return name
	}
	return name + " [" + unit + "]"
}
