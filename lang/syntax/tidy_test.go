package syntax

import (
	"strings"
	"testing"

	"gainwright/lang/diag"
)

var tidyCases = []struct{ text, want string }{
	{"", ""},
	{"\n\n\n", ""},
	{"x=1", "x = 1\n"},
	{"\n\n x  =  1 \n\n\n\ny=2\n\n", "x = 1\n\ny = 2\n"},
	{"x=a+b-c*d/e^f", "x = a + b - c*d/e^f\n"},
	{"x=a *b/ c", "x = a * b / c\n"},
	{"x = - a ^ - b", "x = -a^-b\n"},
	{"x = ( a+b ) [ 1 , 2 ] . rank", "x = (a + b)[1, 2].rank\n"},
	{"f( a , b:2 , )", "f(a, b: 2,)\n"},
	{"A [ 1 .. 2 , 3 ] ᵀ", "A[1..2, 3]ᵀ\n"},
	{"5  kg+5 %*5%+3i", "5 kg + 5 %*5% + 3i\n"},
	{"1.50E+3+007", "1.50E+3 + 007\n"},
	{"x  in   mm", "x in mm\n"},
	{"3 m·s⁻¹", "3 m·s⁻¹\n"},
	{"−2+/-3i", "-2 +/- 3i\n"},
	{"-2±3i", "-2 ± 3i\n"},
	{"a≤b and not(c≠d)", "a <= b and not (c != d)\n"},
	{"x₁=ω′", "x₁ = ω′\n"},
	{"if  a>0{1}else{2}", "if a > 0 { 1 } else { 2 }\n"},
	{"if a {\n1\n} else {\n2\n}", "if a {\n  1\n} else {\n  2\n}\n"},
	{"[x^2  for each x of L where x>2]", "[x^2 for each x of L where x > 2]\n"},
	{"require x>=3,\"why\"", "require x >= 3, \"why\"\n"},
	{"require  - x>3", "require - x > 3\n"},
	{"require -x>3", "require -x > 3\n"},
	{"define f( x,y )=x+y,\"sum\"", "define f(x, y) = x + y, \"sum\"\n"},
	{"claim  K is [ [1 ,2] ]", "claim K is [[1, 2]]\n"},
	{"model m{}", "model m {}\n"},
	{"model m {given a=1;given b=2}", "model m { given a = 1; given b = 2 }\n"},
	{"diagram d{\ninput r\noutput y\ne=r-y\n}", "diagram d {\n  input  r\n  output y\n  e = r - y\n}\n"},
	{"model m {\n\n\n  given a=1\n\n\n  given b=2\n\n}", "model m {\n  given a = 1\n\n  given b = 2\n}\n"},
	{"study s={a:f(m),b:g(m)}over m at corners", "study s = { a: f(m), b: g(m) } over m at corners\n"},
	{"study s={\na:f(m)\nb:g(m)\n}over m", "study s = {\n  a: f(m)\n  b: g(m)\n} over m\n"},
	{"schedule K=f(m)over m . l from 3 m to 9 m in 7 steps", "schedule K = f(m) over m.l from 3 m to 9 m in 7 steps\n"},
	// lines that go on
	{"x = a+\nb", "x = a +\n    b\n"},
	{"require x,\n\"why\"", "require x,\n    \"why\"\n"},
	{"model m {\nrate x=a+\nb\n}", "model m {\n  rate x = a +\n      b\n}\n"},
	{"A=[[1,2],\n[3,4]]", "A = [[1, 2],\n     [3, 4]]\n"},
	{"A=[\n[1,2]\n[3,4]\n]", "A = [\n  [1, 2]\n  [3, 4]\n]\n"},
	{"x=f(a,[\n1\n2\n])", "x = f(a, [\n  1\n  2\n])\n"},
	{"x=f(a,\nb)", "x = f(a,\n      b)\n"},
	{"L=[a\n-b\n- c]", "L = [a\n     -b\n     - c]\n"},
	{"質=[1,\n2]", "質 = [1,\n      2]\n"},
	// comments
	{"#a\n  #b  \nx=1#c", "#a\n#b\nx = 1  #c\n"},
	{"x=1 # a\nlonger=2 # b\n\ny=3 # c", "x = 1       # a\nlonger = 2  # b\n\ny = 3  # c\n"},
	{"x=1 # a\nlonger=2\ny=3 # c", "x = 1  # a\nlonger = 2\ny = 3  # c\n"},
	{"model m { # head\n# own\ngiven a=1 # a\n# last\n}", "model m {  # head\n  # own\n  given a = 1  # a\n  # last\n}\n"},
	{"x=[ # head\n1 # one\n# own\n2]", "x = [  # head\n  1    # one\n  # own\n  2]\n"},
	{"x = a + # why\n# more\nb", "x = a +  # why\n    # more\n    b\n"},
	{"x = 1 # a\n# b", "x = 1  # a\n# b\n"},
	// line ends
	{"x=1\r\ny=2 # c\r\n", "x = 1\r\ny = 2  # c\r\n"},
	{"\ufeffx=1", "x = 1\n"},
	{craneText, craneTidy},
}

func TestTidy(t *testing.T) {
	for _, c := range tidyCases {
		got, err := Tidy(diag.NewSource("f.gain", c.text))
		if err != nil {
			t.Errorf("%q: %v", c.text, err)
			continue
		}
		if got != c.want {
			t.Errorf("%q\n gives %q\nnot    %q", c.text, got, c.want)
		}
		checkTidy(t, "f.gain", c.text)
	}
}

func TestTidyKeepsEveryStatement(t *testing.T) {
	for _, c := range statementCases {
		if c.want != "" {
			checkTidy(t, "f.gain", c.text)
		}
	}
	checkTidy(t, "f.gain", modelText)
}

func TestTidyAlignsCommentsOnlyAfterShortLines(t *testing.T) {
	long := "x = " + strings.Repeat("a + ", 20) + "a"
	got, err := Tidy(diag.NewSource("f", "y=1 # a\n"+long+" # b\n"))
	if want := "y = 1  # a\n" + long + "  # b\n"; err != nil || got != want {
		t.Errorf("%v\n%s", err, got)
	}
}

func TestTidyRefusesWhatDoesNotParse(t *testing.T) {
	for _, name := range []string{"f.gain", "f.md"} {
		got, err := Tidy(diag.NewSource(name, "```gain\nx = )\n```\n"))
		if _, ok := err.(*diag.Error); !ok || got != "" {
			t.Errorf("%s: %q, %v", name, got, err)
		}
	}
}

func TestTidyNotebook(t *testing.T) {
	got, err := Tidy(diag.NewSource("n.md", notebookText))
	if err != nil {
		t.Fatal(err)
	}
	want := notebookText
	for _, change := range [][2]string{
		{"M=1200 kg   # trolley\nA=[[0 , 1],\n[-2,-3]]\n", "M = 1200 kg  # trolley\nA = [[0, 1],\n     [-2, -3]]\n"},
		{"\n\n   model  c{\n     given M=3 kg±5 %\n   # inside\n\n\n   state   x  in m\n   output  y=x\n   }\n\n",
			"\n   model c {\n     given M = 3 kg ± 5 %\n     # inside\n\n     state  x in m\n     output y = x\n   }\n"},
		{"> z=1+\n> 2\n>\n>\n> w=f( a:3 ,b:-2 )\n", "> z = 1 +\n>     2\n>\n> w = f(a: 3, b: -2)\n"},
		{"last=1", "last = 1"},
	} {
		if !strings.Contains(want, change[0]) {
			t.Fatalf("the notebook does not hold %q", change[0])
		}
		want = strings.Replace(want, change[0], change[1], 1)
	}
	if got != want {
		t.Errorf("got\n%s\nwant\n%s", got, want)
	}
	checkTidy(t, "n.md", notebookText)
	checkTidy(t, "n.md", strings.ReplaceAll(notebookText, "\n", "\r\n"))
}

// checkTidy checks that a text that parses stays the same to the parser when it is
// formatted, keeps its comments, and does not change when it is formatted again.
func checkTidy(t *testing.T, name, text string) {
	t.Helper()
	parse := Parse
	if IsNotebook(name) {
		parse = ParseNotebook
	}
	before, err := parse(diag.NewSource(name, text))
	if err != nil {
		t.Fatalf("%q: %v", text, err)
	}
	once, err := Tidy(diag.NewSource(name, text))
	if err != nil {
		t.Fatalf("%q cannot be formatted: %v", text, err)
	}
	after, err := parse(diag.NewSource(name, once))
	if err != nil {
		t.Fatalf("%q\nbecomes %q, which is refused: %v", text, once, err)
	}
	if a, b := dumpFile(before), dumpFile(after); a != b || len(before.Notes) != len(after.Notes) {
		t.Fatalf("%q\nbecomes %q\nwhich is\n%snot\n%s", text, once, b, a)
	}
	if a, b := strings.Count(text, "#"), strings.Count(once, "#"); a != b {
		t.Fatalf("%q\nbecomes %q: %d signs # become %d", text, once, a, b)
	}
	twice, err := Tidy(diag.NewSource(name, once))
	if err != nil || twice != once {
		t.Fatalf("%q\nonce  %q\ntwice %q (%v)", text, once, twice, err)
	}
}
