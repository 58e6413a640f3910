package builtins_test

import (
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"math"
	"math/big"
	"math/rand/v2"
	"os"
	"os/exec"
	"testing"

	"gainwright/builtins"
	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/value"
	"gainwright/stdlib"
)

// problem is one question to the outside references; its matrices hold numbers and texts of fractions.
type problem map[string]any

// answer is what they say: the truth, and SciPy's binary64 answer where there is one.
type answer struct {
	True        [][]string
	Scipy       [][]float64
	Rank        int
	Polynomial  []string
	Numerator   []string
	Denominator []string
}

// ask puts problems to testdata/references/reference.py.
func ask(t *testing.T, problems []problem) []answer {
	t.Helper()
	return askScript(t, "reference.py", problems)
}

// askScript puts problems to a script of testdata/references. Without Python, SciPy, mpmath and
// sympy the test is skipped, or fails where REQUIRE_REFERENCES is set.
func askScript(t *testing.T, script string, problems []problem) []answer {
	t.Helper()
	missing := func(why string) {
		if os.Getenv("REQUIRE_REFERENCES") != "" {
			t.Fatal(why)
		}
		t.Skip(why)
	}
	python := "/usr/bin/python3"
	if _, err := os.Stat(python); err != nil {
		if python, err = exec.LookPath("python3"); err != nil {
			missing("no Python on this machine")
		}
	}
	if out, err := exec.Command(python, "-c", "import scipy, mpmath, sympy").CombinedOutput(); err != nil {
		missing("SciPy, mpmath or sympy is missing: " + string(out))
	}
	data, err := json.Marshal(problems)
	if err != nil {
		t.Fatal(err)
	}
	c := exec.Command(python, "../testdata/references/"+script)
	c.Env = append(os.Environ(), "OPENBLAS_NUM_THREADS=1")
	c.Stdin = bytes.NewReader(data)
	var out, errOut bytes.Buffer
	c.Stdout, c.Stderr = &out, &errOut
	if err := c.Run(); err != nil {
		t.Fatalf("%v\n%s", err, errOut.String())
	}
	var answers []answer
	if err := json.Unmarshal(out.Bytes(), &answers); err != nil {
		t.Fatal(err)
	}
	return answers
}

// bound runs a text and gives what a name holds afterwards.
func bound(t *testing.T, text, name string) value.Value {
	t.Helper()
	session := eval.New(eval.Options{Builtins: builtins.Table(), Library: stdlib.Files})
	session.RunText(context.Background(), diag.NewSource("test", text), func(e eval.Event) {
		if e.Error != nil {
			t.Fatalf("%s\n%s", text, e.Error.Render())
		}
	})
	v, ok := session.Lookup(name)
	if !ok {
		t.Fatalf("%s is not bound", name)
	}
	return value.Force(v)
}

// put writes a matrix of a problem in the language.
func put(p problem, name string) string {
	data, err := json.Marshal(p[name])
	if err != nil {
		panic(err)
	}
	return literal(data)
}

// hard is a problem with what makes it hard and the statement that solves it.
type hard struct {
	name    string
	p       problem
	text    string  // binds X
	atLeast float64 // digits that ours must hold
}

// relative is the largest error of a matrix, relative to its largest true entry.
func relative(got []float64, want [][]string) float64 {
	largest, worst := new(big.Float), new(big.Float)
	k := 0
	for _, row := range want {
		for _, s := range row {
			w, _, err := big.ParseFloat(s, 10, 200, big.ToNearestEven)
			if err != nil {
				panic(err)
			}
			d := new(big.Float).SetPrec(200).Sub(w, big.NewFloat(got[k]))
			if d.Abs(d).Cmp(worst) > 0 {
				worst.Copy(d)
			}
			if a := new(big.Float).Abs(w); a.Cmp(largest) > 0 {
				largest.Copy(a)
			}
			k++
		}
	}
	f, _ := worst.Quo(worst, largest).Float64()
	return f
}

func flat(m [][]float64) []float64 {
	var all []float64
	for _, row := range m {
		all = append(all, row...)
	}
	return all
}

// fraction writes ε and combinations of it exactly.
func fractions(rows ...[]string) [][]string { return rows }

// hardProblems are ill-conditioned problems in the manner of the collections of Benner, Laub &
// Mehrmann 1995 (Riccati; data from memory), Ward 1977 (exponentials; from memory) and invented ones.
func hardProblems() []hard {
	care := func(name string, a, b, q, r [][]string, digits float64) hard {
		p := problem{"kind": "care", "A": a, "B": b, "Q": q, "R": r}
		return hard{name, p, "X = quadratic_gain(plant(" + put(p, "A") + ", " + put(p, "B") + "), states: " + put(p, "Q") + ", inputs: " + put(p, "R") + ").cost", digits}
	}
	dare := func(name string, a, b, q, r [][]string, digits float64) hard {
		p := problem{"kind": "dare", "A": a, "B": b, "Q": q, "R": r}
		return hard{name, p, "X = quadratic_gain(plant(" + put(p, "A") + ", " + put(p, "B") + ", every: 1), states: " + put(p, "Q") + ", inputs: " + put(p, "R") + ").cost", digits}
	}
	expo := func(name string, a [][]string, digits float64) hard {
		p := problem{"kind": "exponential", "A": a}
		return hard{name, p, "X = exponential(" + put(p, "A") + ")", digits}
	}
	f := fractions
	one, unit := f([]string{"1"}), f([]string{"1", "0"}, []string{"0", "1"})
	return []hard{
		care("Riccati, weak input 1e-4", f([]string{"1", "0"}, []string{"0", "-2"}), f([]string{"1/10000"}, []string{"0"}), f([]string{"1", "1"}, []string{"1", "1"}), one, 9),
		care("Riccati, weak coupling 1e-6", f([]string{"0", "1/1000000"}, []string{"0", "0"}), f([]string{"0"}, []string{"1"}), unit, one, 12),
		care("Riccati, near the axis 1e-4", f([]string{"29999/10000", "1"}, []string{"4", "19999/10000"}), f([]string{"1"}, []string{"1"}), f([]string{"-109996/10000", "-49998/10000"}, []string{"-49998/10000", "-19998/10000"}), one, 7),
		care("Riccati, near the axis 1e-6", f([]string{"2999999/1000000", "1"}, []string{"4", "1999999/1000000"}), f([]string{"1"}, []string{"1"}), f([]string{"-10999996/1000000", "-4999998/1000000"}, []string{"-4999998/1000000", "-1999998/1000000"}), one, 5),
		care("Riccati, states apart by 1e9", f([]string{"0", "1", "0"}, []string{"0", "0", "1000000000"}, []string{"0", "0", "-1"}), f([]string{"0"}, []string{"0"}, []string{"1/1000000000"}), f([]string{"1", "0", "0"}, []string{"0", "1", "0"}, []string{"0", "0", "1"}), one, 12),
		dare("Riccati sampled, weak coupling 1e-5", f([]string{"0", "1/100000"}, []string{"0", "0"}), f([]string{"0"}, []string{"1"}), unit, one, 14),
		dare("Riccati sampled, slow and fast", f([]string{"999999/1000000", "1"}, []string{"0", "1/1000"}), f([]string{"0"}, []string{"1/100"}), f([]string{"1", "0"}, []string{"0", "0"}), one, 8),
		expo("exponential, Ward 1", f([]string{"4", "2", "0"}, []string{"1", "4", "1"}, []string{"1", "1", "4"}), 14),
		expo("exponential, Ward 3", f([]string{"-131", "19", "18"}, []string{"-390", "56", "54"}, []string{"-387", "57", "52"}), 9),
		expo("exponential, Ward 4", ward4(), 13),
		expo("exponential, far from normal", f([]string{"1", "1000000"}, []string{"0", "-1"}), 14),
		expo("exponential, 1e26 and 1e-26", f([]string{"0", "1e26", "0"}, []string{"1e-26", "0", "1"}, []string{"0", "0", "-1/3"}), 12),
	}
}

// ward4 is the 10×10 shift with 1e-10 in the corner.
func ward4() [][]string {
	m := make([][]string, 10)
	for i := range m {
		m[i] = make([]string, 10)
		for j := range m[i] {
			m[i][j] = "0"
		}
		if i < 9 {
			m[i][i+1] = "1"
		}
	}
	m[9][0] = "1e-10"
	return m
}

func TestAccuracyBesideMpmathAndSciPy(t *testing.T) {
	cases := hardProblems()
	problems := make([]problem, len(cases))
	for i, c := range cases {
		problems[i] = c.p
	}
	answers := ask(t, problems)
	table := "\nrelative error of the largest entry, against 60 digits\n"
	for i, c := range cases {
		m := bound(t, c.text, "X").(*value.Matrix)
		got, _ := m.Floats()
		ours := relative(got, answers[i].True)
		theirs := math.Inf(1)
		if answers[i].Scipy != nil {
			theirs = relative(flat(answers[i].Scipy), answers[i].True)
		}
		claimed := m.Digits()
		table += fmt.Sprintf("%-36s ours %8.1e  SciPy %8.1e  digits claimed %5.1f\n", c.name, ours, theirs, claimed)
		if ours > 10*theirs && ours > 1e-14 {
			t.Errorf("%s: error %.1e is more than ten times SciPy's %.1e", c.name, ours, theirs)
		}
		if ours > math.Pow(10, -c.atLeast) {
			t.Errorf("%s: error %.1e, want %g digits", c.name, ours, c.atLeast)
		}
		if held := -math.Log10(math.Max(ours, 1e-17)); claimed > held+1 && !math.IsInf(claimed, 1) {
			t.Errorf("%s: claims %.1f digits, holds %.1f", c.name, claimed, held)
		}
	}
	t.Log(table)
}

// randomFraction is a short random fraction.
func randomFraction(r *rand.Rand) string {
	return fmt.Sprintf("%d/%d", r.IntN(41)-20, 1+r.IntN(12))
}

func randomRows(r *rand.Rand, n, m int) [][]string {
	rows := make([][]string, n)
	for i := range rows {
		for range m {
			rows[i] = append(rows[i], randomFraction(r))
		}
	}
	return rows
}

// TestExactAnswersBesideSympy compares gains, ranks, characteristic polynomials and transfer functions of seeded random fractions.
func TestExactAnswersBesideSympy(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 14))
	var problems []problem
	for i := range 8 {
		n := 2 + i%3
		p := problem{"kind": "gain", "A": randomRows(r, n, n), "B": randomRows(r, n, 1)}
		var poles []string
		for range n {
			poles = append(poles, fmt.Sprintf("-%d/%d", 1+r.IntN(20), 1+r.IntN(5)))
		}
		p["poles"] = poles
		problems = append(problems, p, problem{"kind": "transfer", "A": randomRows(r, n, n), "B": randomRows(r, n, 1), "C": randomRows(r, 1, n)})
	}
	for i, a := range ask(t, problems) {
		p := problems[i]
		if p["kind"] == "transfer" {
			text := "G = transfer(plant(" + put(p, "A") + ", " + put(p, "B") + ", " + put(p, "C") + "))\nn = coefficients(G.numerator)\nd = coefficients(G.denominator)"
			sameFractions(t, bound(t, text, "n"), a.Numerator)
			sameFractions(t, bound(t, text, "d"), a.Denominator)
			continue
		}
		text := "A = " + put(p, "A") + "\nB = " + put(p, "B") + "\nr = reachability(A, B).rank\nc = coefficients(characteristic_polynomial(A))"
		sameFractions(t, &value.List{Items: []value.Value{bound(t, text, "r")}}, []string{fmt.Sprint(a.Rank)})
		if a.True == nil {
			continue
		}
		sameFractions(t, bound(t, text, "c"), a.Polynomial)
		gain := bound(t, text+"\nK = assign_poles(A, B, "+put(p, "poles")+")", "K").(*value.Gain)
		row := &value.List{}
		_, n := gain.Values.Dims()
		for j := range n {
			row.Items = append(row.Items, gain.Values.At(0, j))
		}
		sameFractions(t, row, a.True[0])
	}
}

func sameFractions(t *testing.T, v value.Value, want []string) {
	t.Helper()
	items := v.(*value.List).Items
	if len(items) != len(want) {
		t.Fatalf("%d numbers, want %d", len(items), len(want))
	}
	for i, w := range want {
		r, ok := new(big.Rat).SetString(w)
		x, isNumber := items[i].(value.Number)
		if !ok || !isNumber || x.Exact == nil || x.Exact.Cmp(r) != 0 {
			t.Errorf("number %d is %v, want %s", i+1, items[i], w)
		}
	}
}

// TestZerosAndPolesBesideReferences compares zeros and eigenvalues of seeded random plants with 50 and 80 digits.
func TestZerosAndPolesBesideReferences(t *testing.T) {
	r := rand.New(rand.NewPCG(2, 71))
	var problems []problem
	var texts []string
	for i := range 4 {
		n := 3 + i
		p := problem{"kind": "zeros", "A": randomRows(r, n, n), "B": randomRows(r, n, 2), "C": randomRows(r, 2, n), "D": [][]string{{"0", "0"}, {"0", "0"}}}
		problems = append(problems, p)
		texts = append(texts, "X = transmission_zeros(plant(floating("+put(p, "A")+"), "+put(p, "B")+", "+put(p, "C")+"))")
		q := problem{"kind": "eigenvalues", "A": randomRows(r, n, n)}
		problems = append(problems, q)
		texts = append(texts, "X = eigenvalues(floating("+put(q, "A")+"))")
	}
	for i, a := range ask(t, problems) {
		got := numbers(bound(t, texts[i], "X"))
		if len(got) != len(a.True) {
			t.Errorf("%v: %d numbers, want %d", problems[i]["kind"], len(got), len(a.True))
			continue
		}
		used := make([]bool, len(got))
		for _, w := range a.True {
			var re, im float64
			fmt.Sscan(w[0], &re)
			fmt.Sscan(w[1], &im)
			best := -1
			for j, g := range got {
				if !used[j] && (best < 0 || math.Hypot(real(g)-re, imag(g)-im) < math.Hypot(real(got[best])-re, imag(got[best])-im)) {
					best = j
				}
			}
			used[best] = true
			if d := math.Hypot(real(got[best])-re, imag(got[best])-im); d > 1e-9*math.Max(1, math.Hypot(re, im)) {
				t.Errorf("%v: %v, want %g %+gi", problems[i]["kind"], got[best], re, im)
			}
		}
	}
}
