package builtins_test

import (
	"context"
	"encoding/json"
	"fmt"
	"math"
	"math/big"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"gainwright/builtins"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/value"
	"gainwright/stdlib"
)

// judged is a seeded random problem, the text that answers it in the language and what came of it.
type judged struct {
	p       problem
	text    string // binds X
	x       value.Value
	refused string

	low, high complex128 // the bracket, of a largest gain
}

// judgedProblems draws count problems of every kind.
func judgedProblems(count int) []judged {
	r := draw{rand.New(rand.NewPCG(1789, 14))}
	var all []judged
	add := func(kind string, p problem, text string) {
		p["kind"] = kind
		all = append(all, judged{p: p, text: "X = " + text})
	}
	for i := range count {
		n, sampled := 1+r.IntN(4), i%2 == 1
		units := []int{0, 0, 4, 12}[i%4]
		a, b, c, scale := r.plant(n, 1+r.IntN(2), 1, sampled, 4, units)
		one := mat.DenseCopyOf(b.Slice(0, n, 0, 1))
		q := r.weight(n, 3, false)
		shared := func() problem {
			return problem{"A": rowsOf(a), "B": rowsOf(b), "C": rowsOf(c), "Q": rowsOf(q), "sampled": sampled}
		}
		of := func(name string) string { return name + "(" + plantText(a, b, c, sampled) + ")" }
		add("eigenvalues", shared(), "eigenvalues("+floatText(a)+")")
		add("damping", shared(), of("least_damping"))
		add("decay", shared(), of("slowest_decay"))
		add("singular values", shared(), "singular_values("+floatText(a)+")")
		add("exponential", shared(), "exponential("+floatText(a)+")")
		add("noise gain", shared(), of("noise_gain"))
		add("gramian", shared(), of("reachability")+".gramian")
		add("hankel", shared(), of("hankel_singular_values"))
		add("hankel", shared(), fmt.Sprintf("reduced(%s, order: %d).hankel_singular_values", plantText(a, b, c, sampled), n-1))
		add("lyapunov", shared(), fmt.Sprintf("lyapunov(%s, %s, sampled: %t)", floatText(a), floatText(q), sampled))

		p := shared()
		p["B"] = rowsOf(one)
		add("largest gain", p, "largest_gain("+plantText(a, one, c, sampled)+")")
		p = shared()
		p["B"] = rowsOf(one)
		add("final value", p, "figures(response("+plantText(a, one, c, sampled)+")).final_value")
		if !sampled {
			p = shared()
			p["B"] = rowsOf(one)
			add("settling", p, "figures(response("+plantText(a, one, c, sampled)+")).settling")
			p = shared()
			p["B"] = rowsOf(one)
			w := math.Pow(10, 4*r.Float64()-3)
			p["frequencies"] = []float64{w, 10 * w}
			add("response", p, fmt.Sprintf("sweep(%s, from: %v, to: %v, points: 2).values", plantText(a, one, c, false), decimalText(w), decimalText(10*w)))
			every := math.Pow(10, 3*r.Float64()-3)
			p = shared()
			p["T"] = every
			held := fmt.Sprintf("sampled(%s, every: floating(%s))", plantText(a, b, c, false), decimalText(every))
			add("hold A", p, held+".A")
			add("hold B", map[string]any{"A": p["A"], "B": p["B"], "T": every}, held+".B")
		}
		g, h := r.graded(n, 9*r.Float64()), r.normal(n, 2)
		add("solve", problem{"A": rowsOf(g), "B": rowsOf(h)}, "solve("+floatText(g)+", "+floatText(h)+")")
		f := r.graded(2, 4*r.Float64())
		add("sylvester", problem{"A": rowsOf(g), "B": rowsOf(f), "C": rowsOf(h)}, "sylvester("+floatText(g)+", "+floatText(f)+", "+floatText(h)+")")
		r.addZeros(add, n+1, units)
		r.addGains(add, i, a, b, one, scale, sampled)
	}
	return all
}

func (r draw) addZeros(add func(string, problem, string), n, units int) {
	m := 1 + r.IntN(2)
	a, b, c, _ := r.plant(n, m, m, false, 3, units)
	d := mat.NewDense(m, m, nil)
	if r.Float64() < 0.3 {
		d.Set(0, 0, r.NormFloat64())
	}
	add("zeros", problem{"A": rowsOf(a), "B": rowsOf(b), "C": rowsOf(c), "D": rowsOf(d)},
		"transmission_zeros(plant("+floatText(a)+", "+floatText(b)+", "+floatText(c)+", "+floatText(d)+"))")
}

// addGains adds the quadratic gain and its equation's solution, the filter of the dual and a gain by pole assignment:
// shifted and unstable plants, singular A, indefinite weights, cross weights, R = 0 of sampled plants.
func (r draw) addGains(add func(string, problem, string), i int, a, b, one *mat.Dense, scale []float64, sampled bool) {
	n, m := b.Dims()
	family := i / 2 % 5
	a = mat.DenseCopyOf(a)
	if family != 1 && r.Float64() < 0.5 {
		for k := range n {
			a.Set(k, k, a.At(k, k)+math.Pow(10, 2*r.Float64()-2))
		}
	}
	if family == 1 {
		for k := range n {
			a.Set(k, 0, 0)
		}
	}
	q, weight, cross := r.weight(n, 3, family == 2 && n > 1), r.weight(m, 1, false), mat.NewDense(n, m, nil)
	q.Apply(func(i, j int, v float64) float64 { return v / scale[i] / scale[j] }, q)
	if family == 3 {
		cross.Apply(func(i, _ int, _ float64) float64 { return 1e-3 * r.NormFloat64() / scale[i] }, cross)
	}
	if family == 4 && sampled {
		weight.Zero()
	}
	shared := func() problem {
		return problem{"A": rowsOf(a), "B": rowsOf(b), "Q": rowsOf(q), "R": rowsOf(weight), "N": rowsOf(cross), "sampled": sampled}
	}
	first := mat.NewDense(n, 1, nil)
	first.Set(0, 0, 1)
	gain := fmt.Sprintf("quadratic_gain(%s, states: %s, inputs: %s, cross: %s)", plantText(a, b, mat.DenseCopyOf(first.T()), sampled), floatText(q), floatText(weight), floatText(cross))
	add("riccati gain", shared(), gain)
	add("riccati solution", shared(), gain+".cost")
	add("loop poles", shared(), gain)
	add("riccati poles", shared(), fmt.Sprintf("riccati(%s, %s, states: %s, inputs: %s, cross: %s, sampled: %t).poles",
		floatText(a), floatText(b), floatText(q), floatText(weight), floatText(cross), sampled))
	at, bt := mat.DenseCopyOf(a.T()), mat.DenseCopyOf(b.T())
	add("riccati gain", shared(), fmt.Sprintf("transpose(kalman_gain(%s, process: %s, measurement: %s, cross: %s).values)",
		plantText(at, first, bt, sampled), floatText(q), floatText(weight), floatText(cross)))
	add("riccati solution", shared(), fmt.Sprintf("riccati(%s, %s, states: %s, inputs: %s, cross: %s, sampled: %t).solution",
		floatText(a), floatText(b), floatText(q), floatText(weight), floatText(cross), sampled))

	wanted := make([]float64, n)
	list := ""
	for k := range wanted {
		wanted[k] = -float64(1+r.IntN(16*n))/4 - 4*float64(i%3)
		if k > 0 {
			list += ", "
		}
		list += decimalText(wanted[k])
	}
	p := problem{"A": rowsOf(a), "B": rowsOf(one), "poles": wanted}
	add("assign", p, "assign_poles("+floatText(a)+", "+floatText(one)+", ["+list+"])")
	add("loop poles", problem{"A": rowsOf(a), "B": rowsOf(b)}, "assign_poles("+floatText(a)+", "+floatText(b)+", ["+list+"])")
}

func decimalText(x float64) string { return literal(json.RawMessage(fmt.Sprintf("%v", x))) }

// answered runs the text of a problem.
func (j *judged) answered() {
	session := eval.New(eval.Options{Builtins: builtins.Table(), Library: stdlib.Files})
	session.RunText(context.Background(), diag.NewSource("test", j.text), func(e eval.Event) {
		if e.Error != nil {
			j.refused = e.Error.Message
		}
	})
	if v, ok := session.Lookup("X"); ok && j.refused == "" {
		j.x = value.Force(v)
	}
}

// claim is a number, or a matrix by its largest entry, with the digits that it claims.
type claim struct {
	value  complex128
	digits float64
}

// claims lists the numbers of an answer; a matrix claims as a whole.
func claims(v value.Value) []claim {
	switch v := value.Force(v).(type) {
	case value.Number:
		return []claim{{complex(v.Float64(), 0), v.Digits()}}
	case value.Quantity:
		return claims(v.Magnitude)
	case value.Complex:
		if v.IsExact() {
			return []claim{{v.Complex128(), math.Inf(1)}}
		}
		return []claim{{v.Complex128(), -math.Log10(v.Err / math.Hypot(real(v.C), imag(v.C)))}}
	case *value.List:
		var all []claim
		for _, x := range v.Items {
			all = append(all, claims(x)...)
		}
		return all
	}
	return nil
}

// isNumbers tells an answer from what is said in its place.
func isNumbers(v value.Value) bool {
	switch v.(type) {
	case value.Number, value.Quantity, value.Complex, *value.List, *value.Matrix, *value.Gain, *value.Report:
		return true
	}
	return false
}

// compare gives pairs of claimed digits and digits that hold; it is false when the counts differ.
func compare(v value.Value, want [][]string) (pairs [][2]float64, same bool) {
	if g, ok := v.(*value.Gain); ok {
		v = g.Values
	}
	if m, ok := v.(*value.Matrix); ok {
		re, _ := m.Floats()
		if !slices.ContainsFunc(want, func(row []string) bool { return slices.ContainsFunc(row, func(x string) bool { return x != "0.0" }) }) {
			return nil, true // relative to nothing
		}
		return [][2]float64{{m.Digits(), digitsOf(relative(re, want))}}, true
	}
	got := claims(v)
	if len(got) != len(want) {
		return nil, false
	}
	used := make([]bool, len(want))
	for _, c := range got {
		best, at := math.Inf(1), -1
		for k, w := range want {
			if d := distanceTo(c.value, w); !used[k] && (at < 0 || d < best) {
				best, at = d, k
			}
		}
		used[at] = true
		size := distanceTo(0, want[at])
		switch {
		case best == 0:
			best = 0
		case size == 0:
			best = math.Inf(1)
		default:
			best /= size
		}
		pairs = append(pairs, [2]float64{c.digits, digitsOf(best)})
	}
	return pairs, true
}

func field(r *value.Report, name string) value.Value {
	for _, f := range r.Fields {
		if f.Name == name {
			return value.Force(f.Value)
		}
	}
	return nil
}

func numberIn(text string) float64 {
	var x float64
	if _, err := fmt.Sscan(text, &x); err != nil {
		panic(err)
	}
	return x
}

func digitsOf(relative float64) float64 { return -math.Log10(math.Max(relative, 1e-17)) }

// distanceTo measures to a number of 40 digits, without cancellation.
func distanceTo(c complex128, want []string) float64 {
	var d [2]float64
	for k, x := range []float64{real(c), imag(c)} {
		w, _, err := big.ParseFloat(want[k], 10, 200, big.ToNearestEven)
		if err != nil {
			panic(err)
		}
		d[k], _ = w.Sub(w, new(big.Float).SetFloat64(x)).Float64()
	}
	return math.Hypot(d[0], d[1])
}

// TestClaimedDigits holds the digits that results claim to the truth: on seeded random problems of graded
// conditioning (invented data), through the language, never more than one digit too many.
func TestClaimedDigits(t *testing.T) {
	cases := judgedProblems(40)
	var problems []problem
	var asked []*judged
	type tally struct {
		refused, unsolved, compared, high int
		caution                           float64
	}
	tallies := map[string]*tally{}
	var kinds []string
	for k := range cases {
		j := &cases[k]
		kind := j.p["kind"].(string)
		if tallies[kind] == nil {
			tallies[kind] = &tally{}
			kinds = append(kinds, kind)
		}
		if j.answered(); !isNumbers(j.x) {
			tallies[kind].refused++
			continue
		}
		if kind == "loop poles" {
			g := j.x.(*value.Gain)
			re, _ := g.Values.Floats()
			rows, columns := g.Values.Dims()
			j.p["K"] = rowsOf(mat.NewDense(rows, columns, re))
			j.x = &value.List{Items: g.Poles}
		}
		if kind == "settling" {
			j.p["near"] = real(numbers(j.x)[0])
		}
		if kind == "largest gain" {
			r := j.x.(*value.Report)
			j.low, j.high, j.x = numbers(field(r, "low"))[0], numbers(field(r, "high"))[0], field(r, "value")
		}
		problems, asked = append(problems, j.p), append(asked, j)
	}
	total := 0
	for k, a := range askScript(t, "digits.py", problems) {
		j := asked[k]
		s := tallies[j.p["kind"].(string)]
		if a.True == nil {
			s.unsolved++
			continue
		}
		pairs, same := compare(j.x, a.True)
		if !same {
			t.Errorf("%s: the number of values differs from %d\n%s", j.p["kind"], len(a.True), j.text)
		}
		if j.high != 0 {
			if w := numberIn(a.True[0][0]); w < real(j.low)*(1-1e-14) || w > real(j.high)*(1+1e-14) {
				t.Errorf("the largest gain %v lies outside the bracket from %v to %v\n%s", w, real(j.low), real(j.high), j.text)
			}
		}
		for _, pair := range pairs {
			claimed, held := pair[0], pair[1]
			total++
			s.compared++
			s.caution += math.Min(held, 15.95) - math.Min(math.Max(claimed, 0), 15.95)
			if claimed > 0 && math.Min(claimed, 15.95) > held+1 {
				s.high++
				t.Errorf("%s: claims %.2f digits, %.2f hold\n%s", j.p["kind"], claimed, held, j.text)
			}
		}
	}
	slices.Sort(kinds)
	table := "\ndigits claimed beside digits that hold, against 60 digits\n"
	for _, kind := range kinds {
		s := tallies[kind]
		table += fmt.Sprintf("%-17s %4d compared, %d claim too much, %d refused, %d without truth, mean caution %.1f digits\n",
			kind, s.compared, s.high, s.refused, s.unsolved, s.caution/math.Max(1, float64(s.compared)))
		if 4*(s.refused+s.unsolved) > s.compared {
			t.Errorf("%s: too few comparisons", kind)
		}
	}
	t.Log(table)
	if total < 500 {
		t.Errorf("%d comparisons", total)
	}
}

// TestFiguresOfUncertainPoles asks for damping and decay where the poles' errors leave them open.
func TestFiguresOfUncertainPoles(t *testing.T) {
	open := "floating([[-4.376354494739576, -20472642.776490938], [8.087657885900612e-7, 3.7637308802580445]])"
	for text, want := range map[string]claim{
		"least_damping(" + open + ")":                                  {0, 0}, // its poles may lie at the origin: not an exact 0
		"least_damping(floating([[0, 1], [-1, -2]]))":                  {1, math.Inf(1)},
		"least_damping(floating([[0, 1], [0, -1]]))":                   {0, math.Inf(1)},
		"slowest_decay(plant([[0, 1], [0, 0]], [[0], [1]], every: 1))": {complex(math.Inf(1), 0), 0}, // all at z = 0
	} {
		x := bound(t, "X = "+text, "X").(value.Number)
		if digits := math.Max(x.Digits(), 0); x.Float64() != real(want.value) || digits != want.digits && !math.IsInf(x.Float64(), 0) {
			t.Errorf("%s is %v with %v digits, not %v with %v", text, x.Float64(), digits, real(want.value), want.digits)
		}
	}
}

// TestModesOfUncertainPoles: poles whose errors reach the axis from afar are neither one row nor said to swing for ever.
func TestModesOfUncertainPoles(t *testing.T) {
	a := "floating([[-7.197668726688194, 248571185.51741502, -979.1632258048669], " +
		"[-2.4540510654319082e-8, 0.7551910712517124, -3.344369217475545e-6], [-0.004785052590821206, 109555.89055120022, -0.7349969418680281]])"
	r := bound(t, "X = modes(plant("+a+", identity(3)))", "X").(*value.Report)
	if count := len(field(r, "poles").(*value.List).Items); count != 3 {
		t.Errorf("%d poles of 3 states", count)
	}
	open := 0
	for _, row := range r.Rows {
		if strings.Contains(string(row[0].(value.Text)), "not known") {
			open++
		}
		if strings.Contains(string(row[0].(value.Text)), "for ever") {
			t.Errorf("the verdict is %q", row[0])
		}
	}
	if open == 0 {
		t.Error("no verdict is left open")
	}
}

// TestExponentialOfRoundedData: the decimals of A are no binary64 numbers, and that alone costs four digits (true entry from mpmath, 60 digits).
func TestExponentialOfRoundedData(t *testing.T) {
	m := bound(t, "X = exponential([[-214.69157945083333, 2.182342007752038e-5], [-2130400306.5956743, 216.55093189636077]])", "X").(*value.Matrix)
	re, _ := m.Floats()
	if claimed, held := m.Digits(), digitsOf(math.Abs(re[2]+5312777570.794829706893324)/5312777570.794829706893324); claimed > held+1 {
		t.Errorf("claims %.2f digits, %.2f hold", claimed, held)
	}
}

// TestOverflowIsRefused: what leaves the range of binary64 numbers is an error, not a number; what underflows is 0 without harm.
func TestOverflowIsRefused(t *testing.T) {
	for _, text := range []string{
		"solve(floating([[1e-300]]), [[1e300]])",
		"lyapunov(floating([[-1e-300]]), [[1e300]])",
		"sylvester(floating([[1e-300]]), [[1e-300]], [[1e300]])",
		"noise_gain(plant(floating([[-1e-300]]), [[1e300]], [[1]]))",
		"largest_gain(plant(floating([[-1e-300]]), [[1e300]], [[1]]))",
		"hankel_singular_values(plant(floating([[-1e-300]]), [[1e200]], [[1e200]]))",
		"determinant(floating([[1e200, 0], [0, 1e200]]))",
	} {
		j := judged{text: "X = " + text}
		if j.answered(); j.refused == "" {
			t.Errorf("%s gives %v", text, j.x)
		}
	}
	held := bound(t, "X = sampled(plant(floating([[-1]]), [[1]]), every: 1000).B", "X").(*value.Matrix)
	if re, _ := held.Floats(); re[0] != 1 || held.Digits() < 12 {
		t.Errorf("a thousand time constants: %v with %.1f digits", re[0], held.Digits())
	}
}

// TestPowersOfManyStatesAreFloating: beyond the exact order powers of decimals are not carried exactly, which takes minutes at 400 states.
func TestPowersOfManyStatesAreFloating(t *testing.T) {
	n := system.ExactOrder + 10
	r := draw{rand.New(rand.NewPCG(4, 2))}
	m := r.normal(n, n)
	m.Apply(func(_, _ int, v float64) float64 { return math.Round(100*v) / 1000 }, m)
	a, err := json.Marshal(rowsOf(m))
	if err != nil {
		t.Fatal(err)
	}
	x := bound(t, fmt.Sprintf("X = reachability(%s, column(identity(%d), 1)).matrix", a, n), "X").(*value.Matrix)
	if _, columns := x.Dims(); columns != n || x.IsExact() {
		t.Errorf("%d columns, exact: %v", columns, x.IsExact())
	}
}
