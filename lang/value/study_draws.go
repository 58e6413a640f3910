package value

// Draw sets the parameters of a sample: 0 is the nominal one, those from Samples on are
// the corners (the first parameter changes slowest, low ends first), and the others are
// uniform between the tolerance's ends: a tolerance states two ends and nothing else, and
// of all distributions between them the uniform one assumes least. A draw depends on
// seed, sample number, model and parameter alone.
func (s *Study) Draw(sample int, out []float64) {
	k := len(s.Parameters)
	for j := range s.Parameters {
		p := &s.Parameters[j]
		switch {
		case sample == 0:
			out[j] = p.Nominal
		case sample >= s.Samples:
			out[j] = p.Low
			if (sample-s.Samples)>>(k-1-j)&1 == 1 {
				out[j] = p.High
			}
		default:
			out[j] = p.Low + (p.High-p.Low)*p.uniform(s.Seed, sample)
		}
	}
}

// uniform gives a number in (0, 1): the upper 53 bits, plus one half, of the hash of
// Steele, Lea & Flood 2014 (the finaliser of SplitMix64) over the 64-bit FNV-1a hash of
// "model.parameter" (Fowler, Noll & Vo), the seed and the sample number.
func (p *StudyParameter) uniform(seed int64, sample int) float64 {
	h := uint64(14695981039346656037)
	hash := func(text string) {
		for i := range len(text) {
			h = (h ^ uint64(text[i])) * 1099511628211
		}
	}
	hash(p.Model)
	hash(".")
	hash(p.Name)
	h = finish(h ^ finish(uint64(seed)+0x9e3779b97f4a7c15))
	h = finish(h + uint64(sample)*0x9e3779b97f4a7c15)
	return (float64(h>>11) + 0.5) * 0x1p-53
}

func finish(z uint64) uint64 {
	z = (z ^ z>>30) * 0xbf58476d1ce4e5b9
	z = (z ^ z>>27) * 0x94d049bb133111eb
	return z ^ z>>31
}
