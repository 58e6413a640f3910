package value

import "gainwright/lang/diag"

// parallelPlants gives a + b: the same inputs, the outputs added in the units of a.
func parallelPlants(a, b *Plant) (*Plant, error) {
	if a.inputCount() != b.inputCount() || a.outputCount() != b.outputCount() {
		return nil, diag.New(diag.Shape, "the channels do not fit for adding: the left system has %s and %s, the right one %s and %s",
			count(a.inputCount(), "input"), count(a.outputCount(), "output"), count(b.inputCount(), "input"), count(b.outputCount(), "output"))
	}
	every, err := sharedEvery(a, b)
	if err != nil {
		return nil, err
	}
	in, err := unitFactors(a.Inputs, b.Inputs, "but the other system's")
	if err != nil {
		return nil, err
	}
	outFactors, err := unitFactors(b.Outputs, a.Outputs, "but the other system's")
	if err != nil {
		return nil, err
	}
	var x algebra
	bB, bC, bD := b.B, b.C, b.D
	if in != nil {
		bB, bD = x.product(bB, in), x.product(bD, in)
	}
	if outFactors != nil {
		bC, bD = x.product(outFactors, bC), x.product(outFactors, bD)
	}
	n, m := a.Order(), b.Order()
	out := &Plant{Every: every, Inputs: firstDeclared(a.Inputs, b.Inputs), Outputs: firstDeclared(a.Outputs, b.Outputs),
		A: x.join([][]*Matrix{{a.A, zeroMatrix(n, m)}, {zeroMatrix(m, n), b.A}}),
		B: x.join([][]*Matrix{{a.B}, {bB}}),
		C: x.join([][]*Matrix{{a.C, bC}}),
		D: x.sum(a.D, bD)}
	if x.err != nil {
		return nil, x.err
	}
	if a.isStatic() {
		out.Inputs, out.Outputs = b.Inputs, b.Outputs
	}
	out.States = uniqueSignals(a.States, b.States)
	return out, parallelPoint(out, a, b, in, outFactors)
}

// firstDeclared prefers, signal by signal, the one whose unit was given; the left one at a tie.
func firstDeclared(a, b []Signal) []Signal {
	out := append([]Signal(nil), a...)
	for k := range out {
		if k < len(b) && !out[k].declared() && b[k].declared() {
			out[k].Unit, out[k].Range = b[k].Unit, b[k].Range
		}
	}
	return out
}

func parallelPoint(out, a, b *Plant, in, outFactors *Matrix) error {
	out.X0 = joinPoint(a.X0, b.X0, a.Order(), b.Order())
	var err error
	aU0, aY0, bU0, bY0 := a.U0, a.Y0, b.U0, b.Y0
	if a.isStatic() {
		aU0 = bU0
		if aY0, err = applyTo(a.D, bU0); err != nil {
			return err
		}
	} else {
		if aU0, err = applyTo(in, aU0); err != nil {
			return err
		}
		if b.isStatic() {
			bU0 = aU0
			if bY0, err = applyTo(b.D, a.U0); err != nil {
				return err
			}
		}
	}
	if bY0, err = applyTo(outFactors, bY0); err != nil {
		return err
	}
	if out.U0 = a.U0; a.isStatic() {
		out.U0 = b.U0
	}
	if !samePoint(aU0, bU0) {
		out.Notes = append(out.Notes, "the operating points of the two systems' inputs differ; the left one is kept")
	}
	if aY0 == nil && bY0 == nil {
		return nil
	}
	out.Y0 = make([]Number, out.outputCount())
	for k := range out.Y0 {
		x, y := Int(0), Int(0)
		if k < len(aY0) {
			x = aY0[k]
		}
		if k < len(bY0) {
			y = bY0[k]
		}
		if out.Y0[k], err = addNumbers(x, y); err != nil {
			return err
		}
	}
	return nil
}

// scalePlant multiplies the outputs by a number; names stay.
func scalePlant(p *Plant, n Number) (*Plant, error) {
	c, err := scaleMatrix(p.C, toComplex(n))
	if err != nil {
		return nil, err
	}
	d, err := scaleMatrix(p.D, toComplex(n))
	if err != nil {
		return nil, err
	}
	out := &Plant{A: p.A, B: p.B, C: c, D: d, Every: p.Every, States: p.States, Inputs: p.Inputs, Outputs: p.Outputs, X0: p.X0, U0: p.U0}
	if p.Y0 != nil {
		out.Y0 = make([]Number, len(p.Y0))
		for k, y := range p.Y0 {
			if out.Y0[k], err = multiplyNumbers(y, n); err != nil {
				return nil, err
			}
		}
	}
	return out, nil
}

func negatePlant(p *Plant) (*Plant, error) { return scalePlant(p, Int(-1)) }

// invertPlant exchanges inputs and outputs; D must be invertible.
func invertPlant(p *Plant) (*Plant, error) {
	if p.inputCount() != p.outputCount() {
		return nil, diag.New(diag.Shape, "only a system with as many inputs as outputs has an inverse; this one has %s and %s",
			count(p.inputCount(), "input"), count(p.outputCount(), "output"))
	}
	inverse, err := InvertMatrix(p.D)
	if err != nil {
		return nil, diag.New(diag.Numerical, "the inverse of this plant is no plant: its D is singular, so the inverse would differentiate").
			WithHelp("transfer(P) has an inverse as a transfer function")
	}
	var x algebra
	negative := negateMatrix(inverse)
	out := &Plant{Every: p.Every, States: p.States, Inputs: p.Outputs, Outputs: p.Inputs, X0: p.X0, U0: p.Y0, Y0: p.U0, D: inverse,
		A: x.sum(p.A, x.product(p.B, negative, p.C)), B: x.product(p.B, inverse), C: x.product(negative, p.C)}
	return out, x.err
}

// powerPlant puts k copies in series.
func powerPlant(p *Plant, k int) (*Plant, error) {
	if p.inputCount() != p.outputCount() {
		return nil, diag.New(diag.Shape, "only a system with as many inputs as outputs has powers; this one has %s and %s",
			count(p.inputCount(), "input"), count(p.outputCount(), "output"))
	}
	if k < 0 {
		inverse, err := invertPlant(p)
		if err != nil {
			return nil, err
		}
		p, k = inverse, -k
	}
	if k == 0 {
		return staticPlant(IdentityMatrix(p.inputCount()), p.Inputs, p.Outputs), nil
	}
	if k > LargestDegree {
		return nil, diag.New(diag.Limit, "the exponent of a system is limited to %d", LargestDegree)
	}
	out := p
	for range k - 1 {
		var err error
		if out, err = seriesPlants(out, p); err != nil {
			return nil, err
		}
	}
	return out, nil
}

// transposePlant gives the dual system, whose transfer matrix is the transpose.
func transposePlant(p *Plant) *Plant {
	states := make([]Signal, len(p.States))
	for k, s := range p.States {
		states[k] = Signal{Name: s.Name, Unit: None()}
	}
	return &Plant{A: transposeMatrix(p.A), B: transposeMatrix(p.C), C: transposeMatrix(p.B), D: transposeMatrix(p.D),
		Every: p.Every, States: states, Inputs: p.Outputs, Outputs: p.Inputs, Title: "dual"}
}
