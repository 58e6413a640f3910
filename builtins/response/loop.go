package response

import (
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// channel is a place where the drive can enter.
type channel struct {
	value.Signal
	kind  channelKind
	index int
}

type channelKind int

const (
	atInput      channelKind = iota // v, added at a plant input
	atReference                     // r of the law
	atIntegrator                    // w, a reference of the plant's integrators
)

// places is how the drive enters: a column a channel.
type places struct{ v, r, w grid }

// close forms the loop with all inputs free: z' (or z⁺) = closedA·z + closedB·drive over
// z = (x, q), outputs and inputs below each other closedC·z + closedD·drive.
func (q *request) close() error {
	for i, s := range q.plant.Inputs {
		q.channels = append(q.channels, channel{s, atInput, i})
	}
	for i, s := range q.law.refs {
		q.channels = append(q.channels, channel{s, atReference, i})
	}
	for i, s := range q.enterRefs {
		q.channels = append(q.channels, channel{s, atIntegrator, i})
	}
	q.through = unit(q.m)
	if through := q.law.outputGain.times(q.d); !through.isZero() {
		q.algebraicLoop = true
		var ok bool
		if q.through, ok = unit(q.m).minus(through).inverse(); !ok {
			return value.Errf(diag.Numerical, "feedback", "the loop through the direct terms has no solution: I + D_H·D is singular")
		}
	}
	if q.algebraicLoop && q.hybrid() {
		return value.Errf(diag.Numerical, "feedback", "the sampled law answers at once to outputs that answer at once to it: there is no output just before the sample")
	}
	a, b := q.a, q.b
	if q.hybrid() {
		if q.enters.c > 0 {
			return value.Errf(diag.Type, "plant", "integrators of a continuous plant cannot be fed by a sampled law; sample the plant first, then give it integrators")
		}
		var err error
		if a, b, err = q.heldPlant(q.clock); err != nil {
			return err
		}
	}
	l := q.law
	into := q.places()
	sx := q.through.times(l.stateGain.plus(l.outputGain.times(q.c)))
	sq := q.through.times(l.toU)
	sd := q.through.times(into.v.plus(l.refG.times(into.r)))
	yx, yq, yd := q.c.plus(q.d.times(sx)), q.d.times(sq), q.d.times(sd)
	n, k := q.n, l.own.r
	q.closedA, q.closedB = newGrid(n+k, n+k), newGrid(n+k, len(q.channels))
	q.closedA.put(0, 0, a.plus(b.times(sx)))
	q.closedA.put(0, n, b.times(sq))
	q.closedA.put(n, 0, l.fromY.times(yx).plus(l.fromU.times(sx)))
	q.closedA.put(n, n, l.own.plus(l.fromY.times(yq)).plus(l.fromU.times(sq)))
	q.closedB.put(0, 0, b.times(sd).plus(q.enters.times(into.w)))
	q.closedB.put(n, 0, l.fromY.times(yd).plus(l.fromU.times(sd)).plus(l.fromR.times(into.r)).plus(l.fromW.times(into.w)))
	q.closedC, q.closedD = newGrid(q.p+q.m, n+k), newGrid(q.p+q.m, len(q.channels))
	q.closedC.put(0, 0, yx)
	q.closedC.put(0, n, yq)
	q.closedC.put(q.p, 0, sx)
	q.closedC.put(q.p, n, sq)
	q.closedD.put(0, 0, yd)
	q.closedD.put(q.p, 0, sd)
	return nil
}

// places tells where each channel enters.
func (q *request) places() places {
	k := len(q.channels)
	into := places{newGrid(q.m, k), newGrid(len(q.law.refs), k), newGrid(q.enters.c, k)}
	for j, ch := range q.channels {
		g := map[channelKind]grid{atInput: into.v, atReference: into.r, atIntegrator: into.w}[ch.kind]
		g.v[ch.index*k+j] = 1
	}
	return into
}

// readChannels finds the channel that input: names, or the only one.
func (q *request) readChannels() error {
	q.drive.channel = -1
	names := make([]string, len(q.channels))
	for i, ch := range q.channels {
		names[i] = ch.Name
	}
	if v, ok := q.call.Args["input"]; ok {
		switch x := v.(type) {
		case value.Text:
			for i, name := range names {
				if name == string(x) {
					q.drive.channel = i
					return nil
				}
			}
			e := value.Errf(diag.Name, "input", "there is no input named %q", string(x))
			if near := value.Nearest(string(x), names); near != "" {
				return e.WithHelp("did you mean %q?", near)
			}
			return e.WithHelp("the drive can enter at %s", listed(names))
		case value.Number:
			if k, ok := x.Whole(); ok && k >= 1 && k <= len(names) {
				q.drive.channel = k - 1
				return nil
			}
		}
		return value.Errf(diag.Type, "input", "input needs the name of an input, or its number from 1 to %d", len(names))
	}
	switch {
	case q.call.Has("reference") && len(q.law.refs) == 1:
		q.drive.channel = q.m
	case len(q.channels) == 1 || q.m == 1 && !q.call.Has("reference") && len(q.enterRefs) == 0:
		q.drive.channel = 0
	case len(q.enterRefs) == 1 && q.closed:
		q.drive.channel = len(q.channels) - 1
	}
	return nil
}

func listed(names []string) string {
	out := ""
	for i, name := range names {
		if i > 0 {
			out += ", "
		}
		out += `"` + name + `"`
	}
	return out
}

// needsChannel refuses a drive that does not say where it enters.
func (q *request) needsChannel() error {
	if q.drive.channel >= 0 {
		return nil
	}
	names := make([]string, len(q.channels))
	for i, ch := range q.channels {
		names[i] = ch.Name
	}
	if len(names) == 0 {
		return value.Errf(diag.Shape, "plant", "the system has no input; from: [...] shows its free motion")
	}
	return value.Errf(diag.Type, "to", "there are several inputs; say which one is driven").
		WithHelp("with input: %q, or another of %s", names[0], listed(names))
}

// signals lists what a response records, with names that differ: outputs, inputs, states,
// estimates, references; and the traces to fill.
func (q *request) traces(count int) []value.Trace {
	var out []value.Trace
	add := func(role string, signals []value.Signal) {
		for _, s := range signals {
			out = append(out, value.Trace{Name: s.Name, Unit: s.Unit, Role: role, Values: make([]float64, count)})
		}
	}
	add("output", q.plant.Outputs)
	add("input", q.plant.Inputs)
	add("state", q.plant.States)
	add("estimate", q.law.states)
	for i := range q.m {
		if q.limited {
			low, high := q.low[i], q.high[i]
			out[q.p+i].Low, out[q.p+i].High = &low, &high
		}
		out[q.p+i].Held = q.clock > 0
	}
	return out
}

// spectrum gives the free loop's eigenvalues; certified when the loop is the plant alone.
func (q *request) spectrum() ([]system.Root, error) {
	if !q.closed && !q.hybrid() {
		return system.Eigenvalues(q.plant.A)
	}
	return system.Eigenvalues(value.FloatMatrix(q.closedA.r, q.closedA.c, q.closedA.v, largest(q.closedA.v)*0x1p-50))
}
