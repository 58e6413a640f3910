package figure

import (
	"math"
	"math/cmplx"
	"testing"

	"gainwright/lang/value"
)

// TestRequiredRegionIsPainted looks at the paper all over the field: it is white where a
// pole p has the damping −Re p/|p| and the decay −Re p that are required, and tinted
// elsewhere; of a sampled plant p = ln z/T.
func TestRequiredRegionIsPainted(t *testing.T) {
	const every = 0.1
	for _, q := range []struct{ damping, decay float64 }{{0, 0}, {0.5, 0}, {0, 2}, {0.5, 1}, {0.05, 0.2}, {0.9, 3}} {
		for _, sampled := range []bool{false, true} {
			r := &value.Report{Title: PoleMapTitle, Columns: []string{"what", "place"},
				Rows: [][]value.Value{{value.Text("pole"), value.Complex{C: complex(-1, 5)}}, {value.Text("pole"), value.Complex{C: complex(-1, -5)}}},
				Fields: []value.Named{{Name: "damping", Value: value.Float(q.damping)},
					{Name: "decay", Value: value.Float(q.decay)}}}
			left, right, up := math.Min(-1, -q.decay), 0.0, 5.0
			if sampled {
				r.Rows = [][]value.Value{{value.Text("pole"), value.Float(0.5)}}
				r.Fields = append(r.Fields, value.Named{Name: "every", Value: value.Quantity{Magnitude: value.Float(every), Unit: value.Second()}})
				left, right, up = -1, 1, 1
			}
			d, ok := drawPoleMap(r)
			if !ok {
				t.Fatal("no drawing")
			}
			picture := d.painted()
			x, y := mapAxes(left, right, up)
			may := func(px, py float64) bool {
				p := complex(x.low+(px-x.from)/(x.to-x.from)*(x.high-x.low), y.low+(py-y.from)/(y.to-y.from)*(y.high-y.low))
				if sampled {
					p = cmplx.Log(p) / every
				}
				return -real(p) >= q.decay && -real(p) >= q.damping*cmplx.Abs(p)
			}
			seen := map[bool]int{}
			for px := x.from + 6; px < x.to-6; px += 7 {
				for py := y.to + 6; py < y.from-6; py += 7 {
					want := may(px, py)
					if may(px-3, py) != want || may(px+3, py) != want || may(px, py-3) != want || may(px, py+3) != want {
						continue // at the edge
					}
					red, green, blue, _ := picture.At(int(px*pixelsPerUnit), int(py*pixelsPerUnit)).RGBA()
					white, tinted := red>>8 == 0xff && blue>>8 == 0xff, red>>8 > 0xf0 && red > green && green > blue
					if !white && !tinted {
						continue // a line or a sign
					}
					seen[white]++
					if white != want {
						t.Errorf("damping %g, decay %g, sampled %v: at %.0f, %.0f the paper is white: %v", q.damping, q.decay, sampled, px, py, white)
					}
				}
			}
			if seen[true] < 50 || seen[false] < 100 {
				t.Errorf("damping %g, decay %g, sampled %v: %d white and %d tinted places", q.damping, q.decay, sampled, seen[true], seen[false])
			}
		}
	}
}
