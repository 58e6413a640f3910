package eval

import (
	"context"
	"math"
	"runtime"
	"sync"
	"sync/atomic"

	"gainwright/lang/diag"
	"gainwright/lang/model"
	"gainwright/lang/value"
)

// samples computed between two looks at whether to stop
const samplesAtOnce = 32

// worker computes samples on one goroutine with a session, registers and room of its own.
type worker struct {
	study      *study
	task       *task
	overlay    map[string]value.Value
	draw       []float64
	evaluators []*model.Evaluator
	flats      []*model.Flat
	parameters [][]float64
}

func (s *study) worker(ctx context.Context, session *Session) *worker {
	w := &worker{study: s, overlay: map[string]value.Value{}, draw: make([]float64, len(s.value.Parameters))}
	w.task = &task{session: session, ctx: ctx, close: func() {}}
	for _, m := range s.models {
		var e *model.Evaluator
		var f *model.Flat
		if m.program != nil {
			e, f = m.program.Evaluator(), m.program.NewFlat()
		}
		w.evaluators = append(w.evaluators, e)
		w.flats = append(w.flats, f)
		w.parameters = append(w.parameters, append([]float64{}, m.nominal...))
	}
	return w
}

// twin is a session for another goroutine: it sees the same names, which must not change
// meanwhile, and has compiled functions of the library and bookkeeping of its own.
func (s *Session) twin() *Session {
	t := New(Options{Builtins: s.table, Library: s.library.files, Root: s.root, Folder: s.folder})
	t.limits, t.names, t.eigenvalues = s.limits, s.names, s.eigenvalues
	return t
}

// linearise sets the parameters of a sample and finds every model's operating point and
// matrices. It gives the model that has none and why.
func (w *worker) linearise(sample int) (failed *studied, why error) {
	w.study.value.Draw(sample, w.draw)
	for k, m := range w.study.models {
		for j, at := range m.varied {
			w.parameters[k][at] = w.draw[m.first+j]
		}
	}
	return w.linearised()
}

// linearised finds every model's operating point and matrices for the parameters set.
func (w *worker) linearised() (failed *studied, why error) {
	for k, m := range w.study.models {
		if w.evaluators[k] == nil {
			continue
		}
		if err := w.evaluators[k].Linearise(w.parameters[k], w.flats[k]); err != nil {
			return m, err
		}
	}
	return nil, nil
}

// place makes a sample the meaning of the models' names.
func (w *worker) place(sample int) (failed *studied, why error) {
	if failed, why := w.linearise(sample); failed != nil {
		return failed, why
	}
	return w.named()
}

// placeParameters makes the models with the parameters set the meaning of their names.
func (w *worker) placeParameters() (failed *studied, why error) {
	if failed, why := w.linearised(); failed != nil {
		return failed, why
	}
	return w.named()
}

// named makes what was linearised the meaning of the models' names.
func (w *worker) named() (failed *studied, why error) {
	for k, m := range w.study.models {
		v, err := m.with(w.parameters[k], w.flats[k])
		if err != nil {
			return m, err
		}
		w.overlay[m.name] = v
	}
	return nil, nil
}

// with gives the model's value for other parameters; flat is its linearisation, or nil
// when that is still to be made.
func (m *studied) with(parameters []float64, flat *model.Flat) (*value.Model, error) {
	if flat == nil {
		numbers := make([]value.Number, len(parameters))
		for k, p := range parameters {
			numbers[k] = value.Number{F: p}
		}
		other, err := m.model.With(numbers)
		if err != nil {
			return nil, err
		}
		return other.Value(), nil
	}
	source := *m.model
	source.Givens = append([]model.Given{}, m.model.Givens...)
	given := &value.Report{}
	for k := range source.Givens {
		g := &source.Givens[k]
		g.Nominal, g.Tolerance = value.Number{F: parameters[k]}, nil
		var v value.Value = g.Nominal
		if !g.Unit.IsNone() {
			v = value.Quantity{Magnitude: g.Nominal, Unit: g.Unit}
		}
		given.Fields = append(given.Fields, value.Named{Name: g.Name, Value: v})
	}
	out := &value.Model{Name: m.name, Plant: m.model.PlantOf(flat), Source: &source}
	out.Plant.Origin = out
	for _, f := range m.value.Extra {
		if f.Name == "given" {
			f.Value = given
		}
		out.Extra = append(out.Extra, f)
	}
	return out, nil
}

// evaluate evaluates an expression for the sample that was placed. What the samples
// before it held and the steps they took do not count.
func (w *worker) evaluate(e entry) (v value.Value, err *diag.Error) {
	defer func() {
		if p := recover(); p != nil {
			v, err = nil, internal("computing a sample", nil)
		}
	}()
	w.task.steps, w.task.held, w.task.depth = 0, 0, 0
	return e.code.value(&frame{task: w.task, overlay: w.overlay})
}

// ordinary computes a sample by the evaluator; a result that does not exist is NaN.
func (w *worker) ordinary(sample, at int) (why *diag.Error) {
	results := w.study.value.Results
	fail := func(k int, err *diag.Error) {
		results[k].Values[at] = math.NaN()
		if why == nil {
			why = err
		}
	}
	if m, err := w.place(sample); m != nil {
		for k := range results {
			fail(k, diag.New(diag.Numerical, "%s: %s", m.name, err))
		}
		return why
	}
	for k, e := range w.study.entries {
		v, err := w.evaluate(e)
		if err != nil {
			fail(k, err)
			continue
		}
		f, failure := numberIn(v, &results[k])
		if failure != nil {
			fail(k, asError(failure, "study"))
			continue
		}
		results[k].Values[at] = f
	}
	return why
}

// explainFailures finds out what the first failed sample of each result met.
func (s *study) explainFailures(w *worker) {
	if w.task.ctx.Err() != nil {
		return
	}
	for k := range s.value.Results {
		r := &s.value.Results[k]
		if r.Failed == 0 {
			continue
		}
		r.Failure = "the result is not a number"
		if m, err := w.place(r.FirstFailed); m != nil {
			r.Failure = m.name + ": " + err.Error()
		} else if v, err := w.evaluate(s.entries[k]); err != nil {
			r.Failure = err.Message
		} else if _, failure := numberIn(v, r); failure != nil {
			r.Failure = asError(failure, "study").Message
		}
	}
}

// spread computes the samples from … to − 1 on all processors. done is how many of them,
// from the first on without a gap, are there; the error says why it stopped early.
func (s *study) spread(t *task, first *worker, flat *flatProgram, from, to int) (done int, stopped *diag.Error) {
	count := (to - from + samplesAtOnce - 1) / samplesAtOnce
	finished := make([]bool, count)
	var next, computed atomic.Int64
	var wait sync.WaitGroup
	crew := min(runtime.GOMAXPROCS(0), count)
	for i := range crew {
		w := first
		if i > 0 {
			session := s.session
			if flat == nil {
				session = session.twin()
			}
			w = s.worker(t.ctx, session)
		}
		machine := flat.machine(w)
		wait.Add(1)
		go func() {
			defer wait.Done()
			for {
				chunk := int(next.Add(1)) - 1
				if chunk >= count || t.ctx.Err() != nil {
					return
				}
				low, high := from+chunk*samplesAtOnce, min(from+(chunk+1)*samplesAtOnce, to)
				for sample := low; sample < high; sample++ {
					if machine != nil {
						machine.sample(sample, sample-from)
					} else {
						w.ordinary(sample, sample-from)
					}
				}
				if t.ctx.Err() != nil {
					return // a computation that was cut off is no failed sample
				}
				finished[chunk] = true
				n := computed.Add(int64(high - low))
				if s.session.progress != nil {
					s.session.progress(int(n), to-from)
				}
			}
		}()
	}
	wait.Wait()
	for done = 0; done < count && finished[done]; done++ {
	}
	done = min(done*samplesAtOnce, to-from)
	if done < to-from {
		return done, t.stopError()
	}
	return done, nil
}
