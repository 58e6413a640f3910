package model

import (
	"errors"
	"math"
	"math/big"

	"gainwright/lang/value"
)

// Program is the model as straight-line float64 code. It is immutable and may be shared;
// each goroutine works with an Evaluator of its own.
type Program struct {
	states, inputs, outputs int
	parameters              []Parameter
	registers               int
	constants               []loaded
	parameterAt, stateAt    []int32 // registers; −1 where nothing uses the value
	inputAt                 []int32
	tables                  []*table
	setup                   []instruction // what depends on the parameters alone
	rates, outs             code
	everything              []instruction // rates, outputs and derivatives
	a, b, c, d              []entry
	x0, u0                  []float64 // the nominal operating point
	plan                    plan
	sampled                 bool
}

// Parameter describes one parameter of a model for sampling; all in Unit.
type Parameter struct {
	Name               string
	Unit               value.Unit
	Nominal, Low, High float64
}

// loaded is a constant in its register.
type loaded struct {
	register int32
	value    float64
}

// instruction computes one register from up to three.
type instruction struct {
	operation    operation
	out, a, b, c int32
	index        int32 // of a table
	exponent     float64
}

// code computes results that stand in registers afterwards.
type code struct {
	steps   []instruction
	results []int32
}

// entry is where in a row-major matrix a register goes.
type entry struct{ at, register int32 }

// further operations of the compiled program: powers that need no general power
const (
	opSquare operation = iota + 64
	opCube
	opInverse
)

// compile writes the program; nil when the derivatives would be too large.
func (m *Model) compile() *Program {
	n, inputs := len(m.States), len(m.Inputs)
	roots := append(append([]id{}, m.rates...), m.outputs...)
	derivatives, ok := m.g.differentiate(n, roots)
	if !ok {
		return nil
	}
	p := &Program{states: n, inputs: inputs, outputs: len(m.outputs), sampled: m.Every != nil, tables: m.g.tables}
	for _, g := range m.Givens {
		p.parameters = append(p.parameters, Parameter{g.Name, g.Unit, g.Nominal.Float64(), g.Low().Float64(), g.High().Float64()})
	}
	c := &compiler{g: m.g, p: p}
	all := append([]id{}, roots...)
	for _, list := range derivatives {
		for _, d := range list {
			all = append(all, d.node)
		}
	}
	c.assign(all)
	p.rates, p.outs = c.code(m.rates), c.code(m.outputs)
	p.everything = c.steps(all)
	for i, list := range derivatives {
		for _, d := range list {
			r := c.register[d.node]
			row, matrix, column, width := i, &p.a, d.variable, n
			if i >= n {
				row, matrix = i-n, &p.c
			}
			if d.variable >= n {
				column, width = d.variable-n, inputs
				matrix = map[bool]*[]entry{true: &p.b, false: &p.d}[i < n]
			}
			*matrix = append(*matrix, entry{int32(row*width + column), r})
		}
	}
	return p
}

// compiler gives every node that is needed a register.
type compiler struct {
	g        *graph
	p        *Program
	register []int32
	varies   []bool // depends on states or inputs
}

func (c *compiler) assign(roots []id) {
	p := c.p
	needed := c.g.reach(roots...)
	c.register, c.varies = make([]int32, len(c.g.nodes)), make([]bool, len(c.g.nodes))
	missing := func(n int) []int32 {
		out := make([]int32, n)
		for k := range out {
			out[k] = -1
		}
		return out
	}
	p.parameterAt, p.stateAt, p.inputAt = missing(len(p.parameters)), missing(p.states), missing(p.inputs)
	for k := range c.g.nodes {
		if !needed[k] {
			continue
		}
		n := &c.g.nodes[k]
		r := int32(p.registers)
		p.registers++
		c.register[k] = r
		switch n.operation {
		case opConstant:
			p.constants = append(p.constants, loaded{r, n.amount.float()})
			continue
		case opParameter:
			p.parameterAt[n.index] = r
			continue
		case opState:
			p.stateAt[n.index], c.varies[k] = r, true
			continue
		case opInput:
			p.inputAt[n.index], c.varies[k] = r, true
			continue
		}
		for _, o := range n.operands() {
			c.varies[k] = c.varies[k] || c.varies[o]
		}
		if !c.varies[k] {
			p.setup = append(p.setup, c.instruction(n, r))
		}
	}
}

func (c *compiler) code(roots []id) code {
	out := code{steps: c.steps(roots)}
	for _, r := range roots {
		out.results = append(out.results, c.register[r])
	}
	return out
}

// steps lists the instructions for the roots, without those of the setup.
func (c *compiler) steps(roots []id) []instruction {
	var out []instruction
	for k, needed := range c.g.reach(roots...) {
		if n := &c.g.nodes[k]; needed && c.varies[k] && n.operation != opState && n.operation != opInput {
			out = append(out, c.instruction(n, c.register[k]))
		}
	}
	return out
}

func (c *compiler) instruction(n *node, out int32) instruction {
	i := instruction{operation: n.operation, out: out, index: int32(n.index)}
	for k, o := range n.operands() {
		*[...]*int32{&i.a, &i.b, &i.c}[k] = c.register[o]
	}
	if n.operation == opPower {
		i.exponent, _ = n.exponent.Float64()
		for o, e := range map[operation]*big.Rat{opSquare: big.NewRat(2, 1), opCube: big.NewRat(3, 1), opInverse: big.NewRat(-1, 1), opSqrt: half} {
			if n.exponent.Cmp(e) == 0 {
				i.operation = o
			}
		}
	}
	return i
}

// Evaluator runs a program; it holds the registers and is used by one goroutine at a time.
type Evaluator struct {
	p         *Program
	registers []float64
	x, u      []float64
	solver    *solver
}

// The errors of Linearise; they are shared values, so that failed samples cost no memory.
var (
	ErrNoRest    = errors.New("no point of rest was found near the nominal one")
	ErrNotFinite = errors.New("the equations have no finite value there")
)

// Program gives the compiled equations; nil for a model whose derivatives would need more
// than two million operations.
func (m *Model) Program() *Program { return m.program }

// Parameters lists the parameters in the order of the values that the methods take.
func (p *Program) Parameters() []Parameter { return p.parameters }

// Sizes gives the numbers of states, inputs and outputs.
func (p *Program) Sizes() (states, inputs, outputs int) { return p.states, p.inputs, p.outputs }

// Sampled tells whether Rates gives the next state instead of the rate.
func (p *Program) Sampled() bool { return p.sampled }

// Nominal lists the nominal values of the parameters.
func (p *Program) Nominal() []float64 {
	out := make([]float64, len(p.parameters))
	for k, q := range p.parameters {
		out[k] = q.Nominal
	}
	return out
}

// Evaluator makes the registers for one goroutine, with the nominal parameters set.
func (p *Program) Evaluator() *Evaluator {
	e := &Evaluator{p: p, registers: make([]float64, p.registers), x: make([]float64, p.states), u: make([]float64, p.inputs)}
	for _, c := range p.constants {
		e.registers[c.register] = c.value
	}
	e.SetParameters(p.Nominal())
	e.solver = newSolver(p)
	return e
}

// SetParameters sets the parameters, in their units and the order of Parameters.
func (e *Evaluator) SetParameters(values []float64) {
	for k, r := range e.p.parameterAt {
		if r >= 0 {
			e.registers[r] = values[k]
		}
	}
	e.run(e.p.setup)
}

func (e *Evaluator) load(x, u []float64) {
	for k, r := range e.p.stateAt {
		if r >= 0 {
			e.registers[r] = x[k]
		}
	}
	for k, r := range e.p.inputAt {
		if r >= 0 {
			e.registers[r] = u[k]
		}
	}
}

// Rates gives the rates (for a sampled model the next values) of the states, in their
// units (per second), for the parameters set last. out has the length of the states.
// Nothing is allocated; a value that does not exist is NaN or infinite.
func (e *Evaluator) Rates(x, u, out []float64) {
	e.load(x, u)
	e.run(e.p.rates.steps)
	for k, r := range e.p.rates.results {
		out[k] = e.registers[r]
	}
}

// Outputs gives the outputs in their units, as Rates does.
func (e *Evaluator) Outputs(x, u, out []float64) {
	e.load(x, u)
	e.run(e.p.outs.steps)
	for k, r := range e.p.outs.results {
		out[k] = e.registers[r]
	}
}

// Flat is a linearised model in plain numbers, row-major, all in declared units.
type Flat struct {
	A, B, C, D []float64 // n×n, n×m, p×n, p×m
	X0, U0, Y0 []float64 // the operating point
	Rates      []float64 // the rates there; for a sampled model the next values
}

// NewFlat makes room for a linearised model.
func (p *Program) NewFlat() *Flat {
	n, m, q := p.states, p.inputs, p.outputs
	return &Flat{A: make([]float64, n*n), B: make([]float64, n*m), C: make([]float64, q*n), D: make([]float64, q*m),
		X0: make([]float64, n), U0: make([]float64, m), Y0: make([]float64, q), Rates: make([]float64, n)}
}

// Linearise finds the operating point for the parameters, from the nominal one, and gives
// the matrices there. It allocates nothing. The errors are ErrNoRest and ErrNotFinite.
func (e *Evaluator) Linearise(parameters []float64, out *Flat) error {
	e.SetParameters(parameters)
	copy(e.x, e.p.x0)
	copy(e.u, e.p.u0)
	if !e.solver.find(e) {
		return ErrNoRest
	}
	return e.LineariseAt(e.x, e.u, out)
}

// LineariseAt gives the matrices at a point for the parameters set last.
func (e *Evaluator) LineariseAt(x, u []float64, out *Flat) error {
	e.derivatives(x, u)
	copy(out.X0, x)
	copy(out.U0, u)
	e.gather(e.p.a, out.A)
	e.gather(e.p.b, out.B)
	e.gather(e.p.c, out.C)
	e.gather(e.p.d, out.D)
	sum := 0.0
	for k, r := range e.p.rates.results {
		out.Rates[k] = e.registers[r]
		sum += out.Rates[k] * 0
	}
	for k, r := range e.p.outs.results {
		out.Y0[k] = e.registers[r]
		sum += out.Y0[k] * 0
	}
	for _, m := range [...][]float64{out.A, out.B, out.C, out.D} {
		for _, x := range m {
			sum += x * 0 // 0, or NaN once a value is not finite
		}
	}
	if math.IsNaN(sum) {
		return ErrNotFinite
	}
	return nil
}

func (e *Evaluator) derivatives(x, u []float64) {
	e.load(x, u)
	e.run(e.p.everything)
}

func (e *Evaluator) gather(entries []entry, out []float64) {
	for _, t := range entries {
		out[t.at] = e.registers[t.register] + 0 // never −0
	}
}
