package figure

import (
	"image/color"
	"strings"
)

// ink is how a class is drawn where no style sheet is read: the rules of figure.css for
// light paper, which a test holds together.
type ink struct {
	stroke, fill string // names of the palette; "" for none
	opacity      float64
	width        float64
	dashes       []float64
}

// palette is that of figure.css on light paper.
var palette = map[string]color.RGBA{
	"ink": rgb(0x22, 0x22, 0x22), "grid": rgb(0xd9, 0xd9, 0xd6), "soft": rgb(0x66, 0x66, 0x66), "paper": rgb(0xff, 0xff, 0xff),
	"one": rgb(0x17, 0x57, 0x7e), "two": rgb(0xb0, 0x4a, 0x1e), "three": rgb(0x4d, 0x73, 0x30), "four": rgb(0x6f, 0x4a, 0x8e),
	"shade": rgb(0xb0, 0x4a, 0x1e),
}

func rgb(r, g, b uint8) color.RGBA { return color.RGBA{R: r, G: g, B: b, A: 0xff} }

// inks holds the last word of a class's name.
var inks = map[string]ink{
	"grid":   {stroke: "grid", width: 1},
	"axis":   {stroke: "soft", width: 1},
	"one":    {stroke: "one", width: 1.7},
	"two":    {stroke: "two", width: 1.7, dashes: []float64{8, 3}},
	"three":  {stroke: "three", width: 1.7, dashes: []float64{2.5, 2.5}},
	"four":   {stroke: "four", width: 1.7, dashes: []float64{9, 3, 2, 3}},
	"limit":  {stroke: "two", width: 1.2, dashes: []float64{4, 3}},
	"shade":  {fill: "shade", opacity: 0.09},
	"band":   {fill: "three", opacity: 0.3},
	"bar":    {fill: "one", opacity: 0.55},
	"dot":    {fill: "one", opacity: 0.5},
	"corner": {stroke: "two", width: 1.4},
	"mark":   {stroke: "ink", fill: "paper", width: 1.4},
	"pole":   {stroke: "one", width: 1.8},
	"zero":   {stroke: "two", width: 1.6},
	"wanted": {stroke: "soft", width: 1.3},
	"quiet":  {fill: "soft"},
	"":       {fill: "ink"},
}

func inkOf(class string) ink {
	i := inks[class[strings.LastIndexByte(class, ' ')+1:]]
	if i.opacity == 0 {
		i.opacity = 1
	}
	return i
}
