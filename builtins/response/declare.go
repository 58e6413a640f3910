package response

import (
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

var responseBuiltin = &value.Builtin{
	Name: "response", Family: "response",
	Params: []value.Param{
		{Name: "plant", Shape: value.ASystem, Doc: "the system, or the model, with n states, m inputs, p outputs"},
		{Name: "to", Shape: value.Anything, Named: true, Optional: true, Default: "\"step\"; with from or noise alone nothing",
			Doc: "what drives it: \"step\", \"impulse\", \"ramp\", a number or quantity (a step that high), a list of samples (a matrix with a column for each input drives all), or a function of t"},
		{Name: "input", Shape: value.Anything, Named: true, Optional: true, Default: "the only one; with one reference that", Doc: "which input or reference is driven, by name or number"},
		{Name: "amplitude", Shape: value.Anything, Named: true, Optional: true, Default: "1 in the input's unit", Doc: "height of the step, area of the impulse (height of its one sample when sampled), slope of the ramp per second"},
		{Name: "from", Shape: value.Anything, Named: true, Optional: true, Default: "the operating point", Doc: "a value for each state at the start"},
		{Name: "until", Shape: value.ATime, Named: true, Optional: true, Default: "when the modes that show have died down, rounded up", Doc: "how long"},
		{Name: "points", Shape: value.AWhole, Named: true, Optional: true, Default: "401, more for many swings; every sample of a sampled system", Doc: "how many instants, evenly spaced; figures do not depend on it"},
		{Name: "limit", Shape: value.Anything, Named: true, Optional: true, Default: "none", Doc: "what the inputs can reach: one number or quantity (for ± it), [low, high], or one of these for each input"},
		{Name: "gain", Shape: value.AGain, Named: true, Optional: true, Default: "none: no law", Doc: "K of the law u = −K·x + N·r"},
		{Name: "reference", Shape: value.AGain, Named: true, Optional: true, Default: "none", Doc: "N of the law; its columns are references that input: can name"},
		{Name: "observer", Shape: value.AGain, Named: true, Optional: true, Default: "none: the law knows x", Doc: "L: the law acts on the estimate, which is told the limited input"},
		{Name: "feedback", Shape: value.Anything, Named: true, Optional: true, Default: "none", Doc: "a system H for the law u = −H·(y − r); r is driven by input: \"r_\" and the output's name"},
		{Name: "every", Shape: value.ARate, Named: true, Optional: true, Default: "the sample time the gains or H were made for", Doc: "how often the law acts; between, a continuous plant moves under the held input"},
		{Name: "noise", Shape: value.Anything, Named: true, Optional: true, Default: "none", Doc: "W (n×n), or [W, V] with the measurement's V (p×p): covariances at each sample, of a continuous process intensities"},
		{Name: "enters", Shape: value.AMatrix, Named: true, Optional: true, Default: "the states themselves", Doc: "G, how process noise enters: W is then that of its sources"},
		{Name: "seed", Shape: value.AWhole, Named: true, Optional: true, Default: "1", Doc: "where the drawing starts: the same seed, the same noise"},
		{Name: "nonlinear", Shape: value.ABoolean, Named: true, Optional: true, Default: "false", Doc: "true runs the model's own equations instead of its matrices"},
	},
	Result:  "response: signals by name, r[\"x\"], at r.instants",
	Summary: "how outputs, inputs and states run in time, alone or in a loop",
	Doc: "Signals are outputs, inputs (as the plant gets them), states and estimates (marked x̂), in declared units, counted from the plant's operating point; from and the drive are counted from it too, limits are those of the input itself. " +
		"r[\"x\"] is a list, r[\"x\", 3] one value; r.instants are the times and r.at_limit the times an input spent at its limit. " +
		"The drive is added at a plant's input, or is the reference r or that of a plant made with_integrators. \"impulse\" sets the states to B times its area at once; of a sampled system it is one sample. A list for a continuous system is spread evenly over until and joined by straight lines, of a sampled one it is a value a sample; its last value is kept. " +
		"A function of t is given t in s, or a plain number where it refuses that.\n\n" +
		"Linear systems are moved by exponentials, exactly to rounding at any spacing; a time at which an input reaches or leaves its limit is located in between. " +
		"A sampled law (every:, or gains made for a sampled plant) reads the outputs at its samples and holds its input; an observer then predicts with the sampled plant. The drive goes through the same samples; an impulse at a plant's input comes just before the first. " +
		"nonlinear: true integrates the equations by Dormand & Prince's pair at a tolerance of 1e-11 and again at half of it: the difference is the error that is shown. Process noise of a continuous nonlinear plant is drawn once for each instant (each sample of a law) and scaled by the time between. " +
		"Outputs of a sampled system include the measurement's noise; those of a continuous plant under a sampled law do not, though the law gets it.",
	Examples: []value.Example{
		{Input: "r = response(plant([[-2]], [[2]], [[1]]), to: \"step\", until: 1 s, points: 3)\nr[\"y\"]", Output: "≈ [0, 0.63212, 0.86466]"},
		{Input: "P = plant([[0, 1], [0, 0]], [[0], [1]], [[1, 0]], inputs: [\"F in N\"])\nr = response(P, gain: [[2, 3]], from: [1, 0], limit: 1 N)\nr.at_limit", Output: "≈  times at a limit\n  input  limit  reached  left\n  ────────────────────────────────\n  F      -1 N   0 s      0.30278 s"},
	},
	Errors: []string{"a drive for several inputs that names none", "a list for a continuous system without until", "limits on inputs of an algebraic loop", "an impulse on a model's own equations, or one that limits would cut",
		"measurement noise of a continuous law", "nonlinear without a model", "more than 20 million numbers"},
	Source:  "exponentials: Franklin, Powell & Workman 1998, section 4.3; Dormand & Prince 1980, J. Comput. Appl. Math. 6, with the continuous extension of Hairer, Nørsett & Wanner 1993; noise: Van Loan 1978, IEEE Trans. Automatic Control 23",
	SeeAlso: []string{"figures", "closed", "compensator", "sampled"},
	Func:    respond,
}

func respond(c *value.Call) (value.Value, error) {
	q, err := readRequest(c)
	if err != nil {
		return nil, err
	}
	if q.drive.kind == impulse && q.limited && q.channels[q.drive.channel].kind == atInput && !(q.plant.Every != nil) && !q.closed {
		return nil, value.Errf(diag.Type, "limit", "an impulse is larger than every limit")
	}
	var r *value.Response
	switch {
	case q.clock > 0:
		r, err = q.clockedResponse()
	case q.dynamics != nil:
		r, err = q.nonlinearResponse()
	default:
		r, err = q.linearResponse()
	}
	if err != nil {
		return nil, err
	}
	r.Notes = append(q.notes, r.Notes...)
	return r, nil
}
