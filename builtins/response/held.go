package response

import "gainwright/builtins/numeric"

// heldPath is the motion of a continuous plant under a sampled law: where each sample
// began, with what input, and how the plant moves from there.
type heldPath struct {
	q        *request
	clock    float64
	prop     *numeric.Propagator // of the linear plant over (x, u)
	starts   []float64           // (x, u) at each sample
	segments []*numeric.Segment  // of a model's own equations
	firsts   []int               // the first segment of each sample
}

// note keeps the start of a sample.
func (p *heldPath) note(x, u []float64) { p.starts = append(append(p.starts, x...), u...) }
