package syntax

import (
	"strings"
	"testing"

	"gainwright/lang/diag"
)

func parsed(t *testing.T, text string) *File {
	t.Helper()
	f, err := Parse(diag.NewSource("f.gain", text))
	if err != nil {
		t.Fatalf("%s\n%s", text, err.(*diag.Error).Render())
	}
	return f
}

// statementCases are texts of one statement with what they mean; they also seed the fuzz targets.
var statementCases = []struct{ text, want string }{
	// precedence, tightest first
	{"-2^2", "show (- (2 ^ 2))"},
	{"2^-1", "show (2 ^ (- 1))"},
	{"2^-x^2", "show (2 ^ (- (x ^ 2)))"},
	{"2^3^4", "show (2 ^ (3 ^ 4))"},
	{"Aᵀ^2", "show ((ᵀ A) ^ 2)"},
	{"A^2ᵀ", "show (A ^ (ᵀ 2))"},
	{"-a*b", "show ((- a) * b)"},
	{"a*-b", "show (a * (- b))"},
	{"a/b*c", "show ((a / b) * c)"},
	{"a - b + c", "show ((a - b) + c)"},
	{"a + b*c", "show (a + (b * c))"},
	{"a - -b", "show (a - (- b))"},
	{"1 + 2 ± 3i", "show ((1 + 2) ± 3i)"},
	{"-2 +/- 3i", "show ((- 2) ± 3i)"},
	{"-2+/-3i", "show ((- 2) ± 3i)"},
	{"a ± b == c ± d", "show ((a ± b) == (c ± d))"},
	{"not a < b", "show (not (a < b))"},
	{"not a and b", "show ((not a) and b)"},
	{"a and b or c and d", "show ((a and b) or (c and d))"},
	{"a <= b and b != c", "show ((a <= b) and (b != c))"},
	{"a ≤ b", "show (a <= b)"},
	{"a ≥ −b", "show (a >= (- b))"},
	{"a ≠ b", "show (a != b)"},
	{"(a + b)*c", "show ((a + b) * c)"},
	{"not not a", "show (not (not a))"},
	// numbers
	{"0.1 + 1.2e-3 + 24/7", "show ((0.1 + 1.2e-3) + (24 / 7))"},
	{"1.5E3", "show 1.5E3"},
	{"5%", "show 5%"},
	{"5 %", "show 5%"},
	{"3i*2", "show (3i * 2)"},
	{"1e2i", "show 1e2i"},
	// units
	{"9.81 m/s^2", "show 9.81<m s^-2>"},
	{"9.81 m/s²", "show 9.81<m s^-2>"},
	{"0.08 N*m*s/rad", "show 0.08<N m s rad^-1>"},
	{"0.08 N·m·s/rad", "show 0.08<N m s rad^-1>"},
	{"3 m*s^-1", "show 3<m s^-1>"},
	{"3 m·s⁻¹", "show 3<m s^-1>"},
	{"3 1/s", "show 3<s^-1>"},
	{"3 m/s/s", "show 3<m s^-1 s^-1>"},
	{"3 J/(kg*K)", "show 3<J kg^-1 K^-1>"},
	{"3 µm", "show 3<μm>"}, // micro sign (U+00B5) and Greek letter are one
	{"3 μm", "show 3<μm>"},
	{"3\u00a0m", "show 3<m>"}, // no-break space
	{"5 m/2", "show (5<m> / 2)"},
	{"5 m/(a + b)", "show (5<m> / (a + b))"},
	{"5 m * x", "show (5<m> * x)"},
	{"5 m*2", "show (5<m> * 2)"},
	{"5 m^2*3", "show (5<m^2> * 3)"},
	{"(5 m)^2", "show (5<m> ^ 2)"},
	{"2i rad/s", "show 2i<rad s^-1>"},
	{"[1 m, 2 s]", "show [1<m>, 2<s>]"},
	{"f(3 kg, t: 4 s)", "show f(3<kg>, t: 4<s>)"},
	{"1 in mm", "show 1 in <mm>"},
	{"1 m in mm", "show 1<m> in <mm>"},
	{"x in 1/s", "show x in <s^-1>"},
	{"x in m/s^2", "show x in <m s^-2>"},
	{"x in %", "show x in <%>"},
	{"1 and 2", "show (1 and 2)"},
	// names
	{"x₁ + x1", "show (x1 + x1)"},
	{"ω′ = 3", "bind ω′ = 3"},
	{"x̂ = ŷ", "bind x̂ = ŷ"},
	{"ẋ", "show ẋ"},
	{"質量 * 2", "show (質量 * 2)"},
	{"_a2", "show _a2"},
	{"μ = µ", "bind μ = μ"},
	{"Kᵀ*x", "show ((ᵀ K) * x)"},
	{"Kᵀᵀ", "show (ᵀ (ᵀ K))"},
	// texts
	{`"a \"b\" \\ c\nd"`, `show "a \"b\" \\ c\nd"`},
	{`"# no comment"`, `show "# no comment"`},
	{"true and false", "show (true and false)"},
	// calls, indices, fields
	{"f()", "show f()"},
	{"f(a, b: 2, c: 3,)", "show f(a, b: 2, c: 3)"},
	{"f(in: 3, to: \"step\")", "show f(in: 3, to: \"step\")"},
	{"f(a,\n  b:\n 3\n)", "show f(a, b: 3)"},
	{"A[i, j]", "show A[i, j]"},
	{"A[1..2, 3]", "show A[1..2, 3]"},
	{"A[1..n-1, 2 .. 3]", "show A[1..(n - 1), 2..3]"},
	{`P["a", "F"]`, `show P["a", "F"]`},
	{"crane.given.M", "show crane.given.M"},
	{"s.largest.at", "show s.largest.at"},
	{"f(x).y[1](z)", "show f(x).y[1](z)"},
	{"[1, 2][1]", "show [1, 2][1]"},
	{"(A*B).rank", "show (A * B).rank"},
	{"at(p, 2)", "show at(p, 2)"},
	// lists
	{"[]", "show []"},
	{"[1, 2, ]", "show [1, 2]"},
	{"[[0, 1], [-2, -3]]", "show [[0, 1], [(- 2), (- 3)]]"},
	{"[[0, 1]\n[-2, -3]]", "show [[0, 1], [(- 2), (- 3)]]"},
	{"[\n 1\n 2,\n\n 3\n]", "show [1, 2, 3]"},
	{"[1 # one\n # two\n 3]", "show [1, 3]"},
	{"[a\n + b]", "show [(a + b)]"},
	{"[a +\n b]", "show [(a + b)]"},
	{"[a\n - b]", "show [(a - b)]"},
	{"[a\n -b]", "show [a, (- b)]"},
	{"[a\n * b\n c]", "show [(a * b), c]"},
	{"[a\n and b]", "show [(a and b)]"},
	{"[(a\n -b)]", "show [(a - b)]"},
	{"[f(a,\n b)\n c]", "show [f(a, b), c]"},
	{"[A\n [1]]", "show [A, [1]]"},
	{"[1\n, 2]", "show [1, 2]"},
	{"[3 m\n 4 m]", "show [3<m>, 4<m>]"},
	{"A[1\n2]", "show A[1, 2]"},
	{"[x^2 for each x of L]", "show [(x ^ 2) for x of L where -]"},
	{"[x^2 for each x of L where x > 2 and x < 5]", "show [(x ^ 2) for x of L where ((x > 2) and (x < 5))]"},
	{"[x\n for each x\n of L\n where x > 2\n]", "show [x for x of L where (x > 2)]"},
	// if
	{"if a > 0 { 1 } else { 2 }", "show {(a > 0) ? 1 : 2}"},
	{"x = 1 + if a { 1 } else if b { 2 } else { 3 }", "bind x = (1 + {a ? 1 : {b ? 2 : 3}})"},
	{"if a {\n 1\n} else {\n 2\n}", "show {a ? 1 : 2}"},
	// lines
	{"a +\n\n b", "show (a + b)"},
	{"a and # why\n b", "show (a and b)"},
	{"(a\n+ b)", "show (a + b)"},
	{"x = (1\n)", "bind x = 1"},
	{"x = 1 # note", "bind x = 1"},
	{"\ufeffx = 1\r\n", "bind x = 1"},
	// statements
	{"require x >= 3, \"why\"", `require (x >= 3) "why"`},
	{"require x >= 3,\n  \"why\"", `require (x >= 3) "why"`},
	{"require (x > 3)", `require (x > 3) ""`},
	{"require(x > 3)", `require (x > 3) ""`},
	{"require -x > 3", `require ((- x) > 3) ""`},
	{"require not a", `require (not a) ""`},
	{"claim K is [[959.1, 2991, -1.881e4, -7694]]", "claim K is [[959.1, 2991, (- 1.881e4), (- 7694)]]"},
	{"claim x is 12.350 kg", "claim x is 12.350<kg>"},
	{"claim x is 12.350 in kg", "claim x is 12.350 in <kg>"},
	{"claim poles(P) is [-1, -2 ± 3i]", "claim poles(P) is [(- 1), ((- 2) ± 3i)]"},
	{"claim x is 24/7", "claim x is (24 / 7)"},
	{"claim x is 5%", "claim x is 5%"},
	{"claim p is s^2 + 2*s + 1", "claim p is (((s ^ 2) + (2 * s)) + 1)"},
	{"claim G is (s + 2)/(s^2 + 3*s + 2)", "claim G is ((s + 2) / (((s ^ 2) + (3 * s)) + 2))"},
	{"claim x is -1 + 2i", "claim x is ((- 1) + 2i)"},
	{"claim [1, 2] is [1, 2]", "claim [1, 2] is [1, 2]"},
	{"define f(x, y) = x + y, \"the sum\"", `define f(x y) = (x + y) "the sum"`},
	{"define f() = 3", `define f() = 3 ""`},
	{"use \"arm.gain\"", `use "arm.gain"`},
	{"model m {}", "model m"},
	{"sensitivity(f(m)) over m", "show sensitivity(f(m)) over m"},
	{"x = sensitivity(f(m)) over m, n", "bind x = sensitivity(f(m)) over m n"},
	{"study s = f(m) over m", "study s {: f(m)} over m"},
	{"study s = f(m) over m, n samples 2000 seed 4 at corners", "study s {: f(m)} over m n samples 2000 seed 4 corners"},
	{"study s = f(m) at corners seed 2 over m samples k + 1", "study s {: f(m)} over m samples (k + 1) seed 2 corners"},
	{"study s = { a: f(m), b: g(m) } over m", "study s {a: f(m)} {b: g(m)} over m"},
	{"study s = {\n a: 1\n b: 2,\n c: 3; d: 4\n} over m", "study s {a: 1} {b: 2} {c: 3} {d: 4} over m"},
	{"schedule K = f(m) over m.l from 3 m to 9 m in 7 steps", "schedule K = f(m) over m.l from 3<m> to 9<m> in 7"},
	{"schedule K = f(m) over m.l from a to b in n steps", "schedule K = f(m) over m.l from a to b in n"},
	{"schedule K = f(m) over m.l from 1 to 2 in n + 1 steps", "schedule K = f(m) over m.l from 1 to 2 in (n + 1)"},
	// statement words as names
	{"model = 3", "bind model = 3"},
	{"require = 3", "bind require = 3"},
	{"every = 3", "bind every = 3"},
	{"model", "show model"},
	{"model + 1", "show (model + 1)"},
	{"model in mm", "show model in <mm>"},
	{"require - x", "show (require - x)"},
	{"require-x", "show (require - x)"},
	{"claim[1]", "show claim[1]"},
	{"claim == 3", "show (claim == 3)"},
	{"use(3)", "show use(3)"},
	{"study(3)", "show study(3)"},
	{"define or model", "show (define or model)"},
	{"at + over*state", "show (at + (over * state))"},
	{"each.where = 3 == 3", ""},
	{"model model {}", "model model"},
	{"study over = f(m) over m", "study over {: f(m)} over m"},
	{"study over over = 3", ""},
}

func TestStatements(t *testing.T) {
	for _, c := range statementCases {
		if c.want == "" {
			if f, err := Parse(diag.NewSource("f", c.text)); err == nil {
				t.Errorf("%q is read as %s", c.text, dumpFile(f))
			}
			continue
		}
		f := parsed(t, c.text)
		if got := strings.TrimSuffix(dumpFile(f), "\n"); got != c.want {
			t.Errorf("%q\n is %s\nnot %s", c.text, got, c.want)
		}
	}
}

const modelText = `model crane {
  given M = 1200 kg ± 5%  # trolley
  given g = 9.81 m/s^2; given e = 3 +/- 0.1, h = 2
  input F in N range 3000
  input h
  state x in m range 10, v in m/s range 2,
        a in rad range 0.1 rad
  output x, a
  output y in mm = 1000*x, z range 3 = x in m

  let d = M +
    m
  rate x = v
  next v = (F - c*v
    + m) / d
  every 5 ms
  around rest
  around rest, l = 3 m
  around x = 0.2 m, F = 4 N
  around x = 3 m, v = 2 m/s find F, G
  around rest = 3 find find
  around x = 3 find y
}`

func TestModel(t *testing.T) {
	want := `model crane; given M = 1200<kg> ± 5%; given g = 9.81<m s^-2> ± -; given e = 3 ± 0.1; given h = 2 ± -` +
		`; input F in <N> range 3000,; input h,` +
		`; state x in <m> range 10, v in <m s^-1> range 2, a in <rad> range 0.1<rad>,` +
		`; output x, a,; output y in <mm> = (1000 * x), z in <m> range 3 = x,` +
		`; let d = (M + m); rate x = v (next false); rate v = (((F - (c * v)) + m) / d) (next true); every 5<ms>` +
		`; around (rest true) find ; around (rest true) l = 3<m> find ` +
		`; around (rest false) x = 0.2<m> F = 4<N> find ; around (rest false) x = 3<m> v = 2<m s^-1> find F G` +
		`; around (rest false) rest = 3 find find; around (rest false) x = 3 find y` + "\n"
	if got := dumpFile(parsed(t, modelText)); got != want {
		t.Errorf("got\n%s\nwant\n%s", got, want)
	}
}

func TestDiagram(t *testing.T) {
	text := "diagram loop { input r; e = r - y; u = H * e; y = P * u; output y, u }\n" +
		"diagram d {\n input r in m range 2\n\n input = 3;;\n output = input\n}"
	want := "diagram loop; input r,; let e = (r - y); let u = (H * e); let y = (P * u); output y, u,\n" +
		"diagram d; input r in <m> range 2,; let input = 3; let output = input\n"
	if got := dumpFile(parsed(t, text)); got != want {
		t.Errorf("got\n%s\nwant\n%s", got, want)
	}
}

func TestSpansCoverTheirText(t *testing.T) {
	text := "# head\nx = (a + b) * c # tail\nmodel m {\n rate x = 3 m/s\n}\n"
	f := parsed(t, text)
	cut := func(s diag.Span) string { return text[s.Start:s.End] }
	b := f.Statements[0].(*Binding)
	product := b.Expr.(*Binary)
	rate := f.Statements[1].(*Model).Items[0].(*Rate)
	for _, c := range []struct {
		span diag.Span
		want string
	}{
		{b.Span, "x = (a + b) * c"}, {b.Name.Span, "x"}, {product.Span, "(a + b) * c"},
		{product.L.Extent(), "(a + b)"}, {product.At, "*"},
		{product.L.(*Binary).At, "+"},
		{f.Statements[1].Extent(), "model m {\n rate x = 3 m/s\n}"},
		{rate.Span, "rate x = 3 m/s"}, {rate.Expr.Extent(), "3 m/s"},
		{rate.Expr.(*Number).Unit.Span, "m/s"}, {rate.Expr.(*Number).Unit.Factors[1].Span, "s"},
	} {
		if got := cut(c.span); got != c.want {
			t.Errorf("span of %q holds %q", c.want, got)
		}
	}
}

func TestNumbersAreExact(t *testing.T) {
	for text, want := range map[string]string{
		"0.1": "1/10", "1.2e-3": "3/2500", "5%": "1/20", "1e3": "1000/1", "007.50": "15/2",
	} {
		n := parsed(t, text).Statements[0].(*Show).Expr.(*Number)
		if got := n.Value.String(); got != want {
			t.Errorf("%s is %s, want %s", text, got, want)
		}
	}
}

func TestNotesOnDivisors(t *testing.T) {
	for text, want := range map[string]string{
		"1/100 s":       "1/100 s is 1/(100 s), because a unit belongs to its number; for the other reading write 0.01 s",
		"x = 1 / 100 s": "1 / 100 s is 1/(100 s), because a unit belongs to its number; for the other reading write 0.01 s",
		"-1/100 s":      "-1/100 s is -1/(100 s), because a unit belongs to its number; for the other reading write -0.01 s",
		"1/3 m/s":       "1/3 m/s is 1/(3 m/s), because a unit belongs to its number; for the other reading write 1 m/s / 3",
		"1/(100 s)":     "",
		"1 m/100 s":     "",
		"x/100 s":       "",
		"1/100":         "",
		"1/0 s":         "",
	} {
		f := parsed(t, text)
		got := ""
		if len(f.Notes) > 0 {
			got = f.Notes[0].Text
		}
		if got != want {
			t.Errorf("%s: note %q, want %q", text, got, want)
		}
	}
}

func TestStatementsBeforeAnErrorAreKept(t *testing.T) {
	f, err := Parse(diag.NewSource("f", "a = 1\nb = 2\nc = )\nd = 4"))
	if err == nil || len(f.Statements) != 2 {
		t.Fatalf("%d statements, error %v", len(f.Statements), err)
	}
	f, err = Parse(diag.NewSource("f", "a = 1\nb = \"\xff\""))
	if err == nil || len(f.Statements) != 1 {
		t.Fatalf("%d statements, error %v", len(f.Statements), err)
	}
}

func TestIncomplete(t *testing.T) {
	for _, c := range []struct {
		text string
		want bool
	}{
		{"x = 3", false}, {"", false}, {"# only a comment", false},
		{"x = (1 + 2", true}, {"x = [1, 2", true}, {"x = [1, 2\n", true}, {"f(a,", true}, {"f(", true}, {"A[", true},
		{"model m {", true}, {"model m {\n given x = 3", true}, {"model m {\n}", false}, {"diagram d { input r;", true},
		{"study s = {", true}, {"study s = { a: 1,", true}, {"study s = 3 over m,", true}, {"study s = 3 over", false},
		{"if a {", true}, {"if a { 1", true}, {"if a { 1 }", false}, {"[x for each x of", true},
		{"x = 1 +", true}, {"x = 1 + # why", true}, {"x = 1 +\n", true}, {"a and", true}, {"a ==", true}, {"-", true}, {"not", true},
		{"x =", false}, {"x = 3,", false}, {"require x > 3,", true}, {"define f(x) = x,", true},
		{"f(\"abc", false}, {"(1, 2", false}, {"[1 2", false}, {"(1 + )", false}, {"model m", false}, {"claim x", false}, {"x in", false},
		{"x = 3 ±", true}, {"(\xff", false}, {strings.Repeat("(", 10_000), false},
	} {
		if got := Incomplete(c.text); got != c.want {
			t.Errorf("Incomplete(%.40q) = %v", c.text, got)
		}
	}
}

func TestParseUnit(t *testing.T) {
	for text, want := range map[string]string{
		"N*m/rad": "N m rad^-1", "1/s": "s^-1", "m²": "m^2", "%": "%", "": "error", "m s": "error", "3": "error",
		"m/s*kg": "error", "m^": "error", "m^1.5": "error", "m^100": "error", "/s": "error", " m": "error", "m_1": "error",
	} {
		u, err := ParseUnit(text)
		got := "error"
		if err == nil {
			got = dumpUnit(u)
		}
		if got != want {
			t.Errorf("ParseUnit(%q) = %s (%v), want %s", text, got, err, want)
		}
	}
}

func TestValidName(t *testing.T) {
	for _, c := range []struct {
		text, name string
		valid      bool
	}{
		{"x", "x", true}, {"x₁", "x1", true}, {"ω′", "ω′", true}, {"model", "model", true}, {"ｘ", "x", true}, {"x″", "x′′", true},
		{"", "", false}, {"1x", "", false}, {"in", "in", false}, {"a b", "a", false}, {"Kᵀ", "K", false}, {"x\xff", "", false},
	} {
		name, valid := ValidName(c.text)
		if valid != c.valid || valid && name != c.name {
			t.Errorf("ValidName(%q) = %q, %v", c.text, name, valid)
		}
	}
}
