package syntax

import (
	"errors"
	"strings"
	"testing"

	"gainwright/lang/diag"
)

// errorCases are texts that are refused, with the place, the message and the help line;
// they also seed the fuzz targets.
var errorCases = []struct {
	text          string
	line, column  int
	message, help string
}{
	{"x = (1 + 2", 1, 11, ") is missing at the end", "( of line 1, column 5 is not closed"},
	{"x = (1 + 2\ny = 3", 2, 1, "an operator is missing between 2 and y", "a product is written 2 * y; ( of line 1, column 5 is not closed"},
	{"A = [1, 2\nB = 3", 2, 3, "= stands inside an expression", "equality is ==; [ of line 1, column 5 is not closed"},
	{"f(a, b", 1, 7, ") is missing at the end", "( of line 1, column 2 is not closed"},
	{"x = ((1 + 2)\n", 1, 13, ") is missing at the end", "( of line 1, column 5 is not closed"},
	{"A = [[1, 2], [3, 4]", 1, 20, "] is missing at the end", "[ of line 1, column 5 is not closed"},
	{"model c {", 1, 10, "} is missing at the end", "{ of line 1, column 9 is not closed"},
	{"model c {\n given a = 1\n", 2, 13, "} is missing at the end", "{ of line 1, column 9 is not closed"},
	{"study s = {", 1, 12, "} is missing at the end", "{ of line 1, column 11 is not closed"},
	{"diagram d { e = r", 1, 18, "} is missing at the end", "{ of line 1, column 11 is not closed"},
	{"[1, 2)", 1, 6, "] is missing before )", "[ of line 1, column 1 is not closed"},
	{"(1, 2]", 1, 3, "a comma stands only between entries, arguments and the parts of some statements", "a list is written [a, b]"},
	{"x = 1,5", 1, 6, "a comma stands only between entries, arguments and the parts of some statements", "decimals are written with a point: 1.5"},
	{"f(1}", 1, 4, ") is missing before }", "( of line 1, column 2 is not closed"},
	{"if a { 1 )", 1, 10, "} is missing before )", "{ of line 1, column 6 is not closed"},
	{")", 1, 1, ") closes nothing", ""},
	{"x = 3)", 1, 6, ") closes nothing", ""},
	{"}", 1, 1, "} closes nothing", ""},
	{"x = 3 4", 1, 7, "an operator is missing between 3 and 4", "a product is written 3 * 4"},
	{"x = 3 \"a\"", 1, 7, "an operator is missing before the text in quotes", ""},
	{"A B", 1, 3, "an operator is missing between A and B", "a product is written A * B; a unit stands only after a number"},
	{"a b c", 1, 3, "an operator is missing between a and b", "a product is written a * b; a unit stands only after a number"},
	{"x = 2(3 + 4)", 1, 6, "an operator is missing between 2 and (", "a product is written with *"},
	{"(a + b)(c + d)", 1, 8, "an operator is missing between ) and (", "a product is written with *"},
	{"[1, 2](3)", 1, 7, "an operator is missing between ] and (", "a product is written with *"},
	{"(a + b) m", 1, 9, "an operator is missing between ) and m", "a product is written with *; a unit stands only after a number"},
	{"5 % 3", 1, 5, "an operator is missing between % and 3", "a product is written with *; % is per cent"},
	{"5 x_1", 1, 3, "an operator is missing between 5 and x_1", "a product is written 5 * x_1"},
	{"5 sin(x)", 1, 3, "an operator is missing between 5 and sin", "a product is written 5 * sin"},
	{"5kg", 1, 2, "kg touches the number", "a unit stands after a space: 5 kg; a product needs its sign: 5*kg"},
	{"2x", 1, 2, "x touches the number", "a unit stands after a space: 2 x; a product needs its sign: 2*x"},
	{"0x10", 1, 2, "x10 touches the number", "a unit stands after a space: 0 x10; a product needs its sign: 0*x10"},
	{"3j", 1, 2, "j touches the number", "the imaginary unit is i, as in 3i"},
	{"f(a b)", 1, 5, "a comma or an operator is missing between a and b", ""},
	{"f(a: 1 b: 2)", 1, 8, "a comma or an operator is missing between 1 and b", ""},
	{"[1 2; 3 4]", 1, 4, "a comma or an operator is missing between 1 and 2", "entries are separated by commas, rows are lists: [[1, 2], [3, 4]]"},
	{"[1, 2; 3, 4]", 1, 6, "; separates no entries", "entries are separated by commas, rows are lists: [[1, 2], [3, 4]]"},
	{"[1;]", 1, 3, "; separates no entries", "entries are separated by commas, rows are lists: [[1, 2], [3, 4]]"},
	{"x; y", 1, 2, "; has no meaning here", "a statement has a line of its own; values are shown unless they are bound to a name"},
	{"A[1 2]", 1, 5, "a comma or an operator is missing between 1 and 2", ""},
	{"A'", 1, 2, "' is no operator", "transpose is Aᵀ or transpose(A); a prime in a name is ′"},
	{"(A)'", 1, 4, "' is no operator", "transpose is Aᵀ or transpose(A); a prime in a name is ′"},
	{"'abc'", 1, 1, "' has no meaning here", "texts stand between straight double quotes: \"…\""},
	{"“abc”", 1, 1, "“ has no meaning here", "texts stand between straight quotes: \"…\""},
	{"\"abc", 1, 1, "the text has no closing quote", "a text ends with \" on the line it starts; write \\n for a line break in it"},
	{"\"abc\\", 1, 1, "the text has no closing quote", "a text ends with \" on the line it starts; write \\n for a line break in it"},
	{"\"a\\q\"", 1, 3, "\\q has no meaning in a text", "after \\ stands one of \" \\ n; a backslash itself is written \\\\"},
	{"a && b", 1, 3, "&& is no operator", "both conditions: and"},
	{"a || b", 1, 3, "|| is no operator", "either condition: or"},
	{"!a", 1, 1, "! has no meaning here", "a condition is turned over by not; unequal is written !="},
	{"~a", 1, 1, "~ has no meaning here", "a condition is turned over by not; unequal is written !="},
	{"2**3", 1, 2, "** is no operator", "powers are written ^"},
	{"A.*B", 1, 2, ".* is no operator", "entry by entry: hadamard(A, B)"},
	{"2.*B", 1, 2, "a number does not end with a point", "write 2 * …; entry by entry: hadamard(A, B)"},
	{"A ./ B", 1, 3, "./ is no operator", "entry by entry: hadamard(A, B), [1/x for each x of L]"},
	{"A.^2", 1, 2, ".^ is no operator", "entry by entry: [x^2 for each x of L]"},
	{"x // y", 1, 3, "// is no operator", "a comment starts with #"},
	{"/* x */", 1, 1, "/* is no operator", "a comment starts with #"},
	{"a <> b", 1, 3, "<> is no operator", "unequal is written !="},
	{"a =< b", 1, 3, "=< is no operator", "at most is written <="},
	{"a => b", 1, 3, "=> is no operator", "at least is written >="},
	{"x := 3", 1, 3, ":= is no operator", "a name is bound by ="},
	{"x += 1", 1, 3, "+= is no operator", "a name is bound once; bind a new one by ="},
	{"f = x -> x", 1, 7, "-> is no operator", "a function is written define f(x) = …"},
	{"x++", 1, 2, "++ is no operator", "write + once"},
	{"|x|", 1, 1, "| has no meaning here", "the magnitude is abs(x); either condition: or"},
	{"x \\ y", 1, 3, "\\ has no meaning here", "a linear system is solved by solve(A, b)"},
	{"√x", 1, 1, "√ has no meaning here", "the root is sqrt(x)"},
	{"∞", 1, 1, "∞ has no meaning here", "there is no literal for infinity"},
	{"2 × 3", 1, 3, "× has no meaning here", "products are written *"},
	{"2·x", 1, 2, "· has no meaning here", "products are written *"},
	{"45°", 1, 3, "° has no meaning here", "degrees are deg, degrees Celsius degC"},
	{"x²", 1, 2, "² has no meaning here", "powers of values are written x^2; raised digits stand in units only"},
	{"% hi", 1, 1, "% stands where a value is expected", "per cent follows a number; a comment starts with #"},
	{"x = y % z", 1, 7, "% has no meaning here", "per cent follows a number, as in 5%; a comment starts with #"},
	{"3 – 2", 1, 3, "– has no meaning here", "the minus sign is -"},
	{"$x", 1, 1, "$ has no meaning here", "names are made of letters, digits and _"},
	{"x @ y", 1, 3, "@ has no meaning here", "names are made of letters, digits and _"},
	{"x ? y : z", 1, 3, "? has no meaning here", "a choice is written if C { A } else { B }"},
	{"`x`", 1, 1, "` has no meaning here", "this looks like a Markdown notebook: its name should end in .md"},
	{"{1, 2}", 1, 1, "{ begins no value", "lists are written [a, b]; parentheses are ( )"},
	{"x = {", 1, 5, "{ begins no value", "lists are written [a, b]; parentheses are ( )"},
	{"…", 1, 1, "… has no meaning here", "a statement goes on after an open ( or [, a trailing operator or a trailing comma"},
	{"́", 1, 1, "a combining mark without a letter (U+0301)", "a combining mark stands after a letter"},
	{"٣", 1, 1, "٣ is no digit of a number", "numbers are written with the digits 0 to 9"},
	{"\x01", 1, 1, "a control character (U+0001)", "delete it"},
	{"x\rtwo", 1, 2, "a carriage return inside a line", "lines end with a line feed"},
	{"a\u200bb", 1, 2, "an invisible character (U+200B)", "delete it"},
	{"\u202ea", 1, 1, "an invisible character that turns the reading direction (U+202E)", "such characters can make a text look different from what is computed: delete it"},
	{"x = \"\u2066\"", 1, 6, "an invisible character that turns the reading direction (U+2066)", "such characters can make a text look different from what is computed: delete it"},
	{"# \u2067", 1, 3, "an invisible character that turns the reading direction (U+2067)", "such characters can make a text look different from what is computed: delete it"},
	{"require x = 3", 1, 11, "= stands inside an expression", "equality is =="},
	{"if x = 3 { 1 } else { 2 }", 1, 6, "= stands inside an expression", "equality is =="},
	{"f(x = 3)", 1, 5, "= stands inside a call", "an argument is named by a colon: name: value; equality is =="},
	{"x = y = 3", 1, 7, "= stands inside an expression", "equality is =="},
	{"f(x) = x^2", 1, 6, "= binds one name, which stands alone before it", "a function is written define f(x) = …; equality is =="},
	{"A[1] = 2", 1, 6, "= binds one name, which stands alone before it", "values do not change; bind a new one to a name; equality is =="},
	{"a.b = 2", 1, 5, "= binds one name, which stands alone before it", "values do not change; bind a new one to a name; equality is =="},
	{"[a, b] = f(x)", 1, 8, "= binds one name, which stands alone before it", "one name a line; parts are read by L[i]; equality is =="},
	{"(x) = 3", 1, 5, "= binds one name, which stands alone before it", "x is bound by x = … without parentheses; equality is =="},
	{"3 = x", 1, 3, "= binds one name, which stands alone before it", "equality is =="},
	{"= 3", 1, 1, "a value is missing before =", ""},
	{"in = 3", 1, 1, "in is a word of the language and cannot be a name", ""},
	{"true = 3", 1, 1, "true is a word of the language and cannot be a name", ""},
	{"not = 3", 1, 1, "not is a word of the language and cannot be a name", ""},
	{"let = 3\nlet x = 3", 2, 5, "an operator is missing between let and x", "let stands in model NAME { … }; elsewhere write NAME = EXPR"},
	{"1.", 1, 2, "a number does not end with a point", "write 1.0 or 1"},
	{"1.e3", 1, 2, "a number does not end with a point", "write 1.0 or 1"},
	{"x = .5", 1, 5, "a number does not start with a point", "write 0.5 for the number; a field has a name"},
	{"K.1", 1, 2, "a number does not start with a point", "write 0.1 for the number; a field has a name"},
	{"1.2.3", 1, 4, "a number has one point at most, and none in its exponent", ""},
	{"1e2.5", 1, 4, "a number has one point at most, and none in its exponent", ""},
	{"1e", 1, 2, "e touches the number", "a unit stands after a space: 1 e; a product needs its sign: 1*e"},
	{"1e99999", 1, 1, "the exponent is beyond ±10000", ""},
	{"1..2", 1, 2, "a range stands only as a subscript", "A[1..3, 2]"},
	{"x = 1..3", 1, 6, "a range stands only as a subscript", "A[1..3, 2]"},
	{"x =", 1, 4, "a value is missing after =", "the value begins on the line of its ="},
	{"x = 1 +", 1, 8, "a value is missing after +", ""},
	{"x = \n3", 1, 4, "a value is missing after =", "the value begins on the line of its ="},
	{"* 3", 1, 1, "a value is missing before *", ""},
	{"+3", 1, 1, "a value is missing before +", "a value has no plus sign of its own: leave it out"},
	{"2^", 1, 3, "a value is missing after ^", ""},
	{"2^+1", 1, 3, "a value is missing before +", "a value has no plus sign of its own: leave it out"},
	{"()", 1, 2, "a value is missing before )", ""},
	{"f(,)", 1, 3, "a value is missing before ,", ""},
	{"[1,,2]", 1, 4, "a value is missing before ,", ""},
	{"[,]", 1, 2, "a value is missing before ,", ""},
	{"A[]", 1, 3, "an index is missing before ]", "a whole row is row(A, i), a whole column column(A, j)"},
	{"A[1, ]", 1, 6, "an index is missing before ]", "a whole row is row(A, i), a whole column column(A, j)"},
	{"A[:, 1]", 1, 3, "an index is missing before :", "a whole row is row(A, i), a whole column column(A, j)"},
	{"A[1:2]", 1, 4, ": has no meaning here", "a range of subscripts is A[1..3, 2]; a named argument f(name: value)"},
	{"A.", 1, 3, "the name of a field is missing after the point", "as in K.poles"},
	{"A.(x)", 1, 3, "the name of a field is missing after the point", "as in K.poles"},
	{"x = 3 .y", 1, 7, "a number or a text has no fields", "as in K.poles"},
	{"x = \"a\".b", 1, 8, "a number or a text has no fields", "as in K.poles"},
	{"a < b < c", 1, 7, "comparisons are not chained", "write a < b and b < c"},
	{"a == b != c", 1, 8, "comparisons are not chained", "write a == b and b != c"},
	{"a == not b", 1, 6, "a value is missing before not", "not looser than comparisons: put (not …) in parentheses"},
	{"a ± b ± c", 1, 7, "± stands once between two values", ""},
	{"2 m*sin(x)", 1, 5, "sin stands where a unit is read", "a product after a unit needs blanks: 2 m * sin(…)"},
	{"3 N/m*x", 1, 6, "a unit with a product after its / can be read in two ways", "bring the factor before the /, or put the divisor in parentheses: N*s/m, N/(m*s); a product with a name needs blanks: 3 m * x"},
	{"5 m^n", 1, 4, "the exponent of a unit is a whole number", "m^2, m^-1 or m²; a power of a quantity needs parentheses: (2 m)^n"},
	{"5 m^1.5", 1, 4, "the exponent of a unit is a whole number", "m^2, m^-1 or m²; a power of a quantity needs parentheses: (2 m)^n"},
	{"5 m^100", 1, 4, "the exponent of a unit is beyond ±99", ""},
	{"5 m ^2", 1, 5, "it is unclear whether ^ belongs to the unit or to the whole quantity", "m^2 without blanks is a unit; a power of the whole is (2 m)^2"},
	{"5 m^2^3", 1, 6, "it is unclear whether ^ belongs to the unit or to the whole quantity", "m^2 without blanks is a unit; a power of the whole is (2 m)^2"},
	{"x in", 1, 5, "a unit is missing after in", "as in 9.81 m/s^2, rad/s or 1/s, without blanks"},
	{"x in m s", 1, 8, "an operator is missing between m and s", "a product is written m * s; a unit stands only after a number"},
	{"x in 5", 1, 6, "a unit is missing after in", "as in 9.81 m/s^2, rad/s or 1/s, without blanks"},
	{"x = 3 m in mm", 1, 9, "in UNIT is for showing a value", "bind it, then show it: x in …"},
	{"(x in m)", 1, 4, "in UNIT stands only at the end of a statement that shows a value", "EXPR in UNIT"},
	{"f(x in m)", 1, 5, "in UNIT stands only at the end of a statement that shows a value", "EXPR in UNIT"},
	{"claim K is poles(P)", 1, 12, "this is no printed number", "a claim compares with numbers, lists, matrices and polynomials as they are printed; two computed values are compared by require"},
	{"claim K", 1, 8, "\"is\" is expected before the end of the text", "claim EXPR is LITERAL"},
	{"claim K [1]", 1, 12, "\"is\" is expected before the end of the text", "claim EXPR is LITERAL"},
	{"claim x is [1, \"a\"]", 1, 16, "this is no printed number", "a claim compares with numbers, lists, matrices and polynomials as they are printed; two computed values are compared by require"},
	{"claim x is a == b", 1, 12, "this is no printed number", "a claim compares with numbers, lists, matrices and polynomials as they are printed; two computed values are compared by require"},
	{"claim a < b is 3", 1, 9, "\"is\" is expected before <", "claim EXPR is LITERAL"},
	{"x is 3", 1, 3, "is belongs to a claim", "claim EXPR is LITERAL"},
	{"claim x is true", 1, 12, "this is no printed number", "a claim compares with numbers, lists, matrices and polynomials as they are printed; two computed values are compared by require"},
	{"define f = 3", 1, 10, "\"(\" is expected before =", "define f(x, y) = EXPR, \"what it gives\""},
	{"define f(x, x) = x", 1, 13, "the parameter x stands twice", ""},
	{"define f(x) x", 1, 13, "\"=\" is expected before x", "define f(x, y) = EXPR, \"what it gives\""},
	{"define f(1) = 2", 1, 10, "a parameter is expected before the number 1", ""},
	{"define f(x = 2) = x", 1, 12, "a parameter has no value of its own", "define f(x, y) = EXPR, \"what it gives\""},
	{"define in(x) = 2", 1, 8, "in is a word of the language and cannot be a name", ""},
	{"use 3", 1, 5, "an operator is missing between use and 3", "use \"file.gain\""},
	{"use file", 1, 5, "an operator is missing between use and file", "use \"file.gain\""},
	{"use \"a\" \"b\"", 1, 9, "an operator is missing before the text in quotes", ""},
	{"model c\n{", 1, 8, "\"{\" is expected before the line's end", "model NAME { … }"},
	{"model 3 {}", 1, 7, "an operator is missing between model and 3", "model NAME { … }"},
	{"model c { x = 3 }", 1, 11, "an equation of a model begins with a word that says what it is", "write let x = …, or given x = … for a parameter"},
	{"model c { foo x }", 1, 11, "foo begins no item of a model", "an item begins with given, input, state, output, let, rate, next, every or around"},
	{"model c { rat x = 3 }", 1, 11, "rat begins no item of a model", "did you mean rate? an item begins with given, input, state, output, let, rate, next, every or around"},
	{"model c { input F in N = 3 }", 1, 24, "only an output has an equation of its own", "its motion is written rate F = …, a rest value around F = …"},
	{"model c { state x range 1 range 2 }", 1, 27, "range is given twice", ""},
	{"model c { input F N }", 1, 19, "N stands where in, range or the line's end is expected", "input NAME in UNIT range R, …"},
	{"model c { given x }", 1, 19, "\"=\" is expected before }", "given NAME = VALUE ± TOLERANCE"},
	{"model c { given x = 1 given y = 2 }", 1, 23, "given begins another item", "each item has its own line, or stands after ;"},
	{"model c { around x }", 1, 20, "\"=\" is expected before }", "around rest, around x = VALUE, …, around x = VALUE find u"},
	{"model c { around rest x = 3 }", 1, 23, "a comma is missing after rest", "around rest, around x = VALUE, …, around x = VALUE find u"},
	{"model c { 3 }", 1, 11, "an item of the model is expected before the number 3", "an item begins with given, input, state, output, let, rate, next, every or around"},
	{"model c {} x = 3", 1, 12, "a line's end is missing after }", ""},
	{"given x = 3", 1, 7, "an operator is missing between given and x", "given NAME = VALUE stands in model NAME { … }"},
	{"state x in m", 1, 7, "an operator is missing between state and x", "state … stands in model NAME { … }"},
	{"rate x = 3", 1, 6, "an operator is missing between rate and x", "rate NAME = EXPR stands in model NAME { … }"},
	{"around rest", 1, 8, "an operator is missing between around and rest", "around … stands in model NAME { … }"},
	{"every 5 ms", 1, 7, "an operator is missing between every and 5", "every T stands in model NAME { … }"},
	{"diagram d { e }", 1, 15, "\"=\" is expected before }", "a diagram holds input …, output … and NAME = EXPR"},
	{"diagram d { state x }", 1, 19, "\"=\" is expected before x", "a diagram holds input …, output … and NAME = EXPR"},
	{"diagram d { 3 }", 1, 13, "an item of the diagram is expected before the number 3", "input r; e = r - y; output y"},
	{"study s", 1, 8, "\"=\" is expected before the end of the text", "study NAME = EXPR over MODEL samples N seed N at corners"},
	{"study s = f(m)", 1, 15, "\"over\" is expected before the end of the text", "study NAME = EXPR over MODEL samples N seed N at corners"},
	{"study s = f(m) over m over n", 1, 23, "over is given twice", ""},
	{"study s = f(m) over m samples", 1, 30, "a value is missing after samples", ""},
	{"study s = f(m) over m at 3", 1, 26, "\"corners\" is expected before the number 3", "study NAME = EXPR over MODEL samples N seed N at corners"},
	{"study s = f(m) over", 1, 20, "a model's name is expected before the end of the text", ""},
	{"study s = {} over m", 1, 12, "the study has no result", "study NAME = { name: EXPR, … } over MODEL"},
	{"study s = {a: 1, a: 2} over m", 1, 18, "the result a stands twice", ""},
	{"study s = {a} over m", 1, 13, "\":\" is expected before }", "study NAME = { name: EXPR, … } over MODEL"},
	{"study s = {a: 1 b: 2} over m", 1, 17, "an operator is missing between 1 and b", "a product is written 1 * b"},
	{"f(m) over m", 1, 6, "over belongs to a study, a schedule or sensitivity(…)", "study NAME = EXPR over MODEL samples N seed N at corners; sensitivity(EXPR) over MODEL"},
	{"sensitivity(f(m)) over m samples 3", 1, 19, "a sensitivity has no samples, seed or corners", "it looks at the nominal values; study NAME = EXPR over MODEL samples N seed N at corners draws samples"},
	{"schedule K = f(m) over m", 1, 25, "\".\" is expected before the end of the text", "schedule NAME = EXPR over MODEL.PARAMETER from A to B in N steps"},
	{"schedule K = f(m) over m.l from 1 to 2", 1, 39, "\"in\" is expected before the end of the text", "schedule NAME = EXPR over MODEL.PARAMETER from A to B in N steps"},
	{"schedule K = f(m) over m.l from 1 m 2 m", 1, 37, "\"to\" is expected before the number 2", "schedule NAME = EXPR over MODEL.PARAMETER from A to B in N steps"},
	{"schedule K = f(m) over m.l from 1 to 2 in 3", 1, 44, "\"steps\" is expected before the end of the text", "schedule NAME = EXPR over MODEL.PARAMETER from A to B in N steps"},
	{"f(a: 1, 2)", 1, 9, "an argument without a name after named ones", "name it, or move it to the front"},
	{"f(a: 1, a: 2)", 1, 9, "the argument a is given twice", ""},
	{"if a { 1 }", 1, 11, "\"else\" is expected before the end of the text", "if C { A } else { B }"},
	{"if a 1", 1, 6, "\"{\" is expected before the number 1", "if C { A } else { B }"},
	{"if a { 1 } else 2", 1, 17, "\"{\" is expected before the number 2", "if C { A } else { B }"},
	{"if a { 1 }\nelse { 2 }", 1, 11, "\"else\" is expected before the line's end", "if C { A } else { B }"},
	{"else", 1, 1, "a value is missing before else", "if C { A } else { B }"},
	{"[x for x of L]", 1, 8, "\"each\" is expected before x", "[E for each x of L where C]"},
	{"[x for each x in L]", 1, 15, "\"of\" is expected before in", "[E for each x of L where C]"},
	{"[1, 2 for each x of L]", 1, 7, "for each stands after the only element of a list", "[E for each x of L where C]"},
	{"for", 1, 1, "a value is missing before for", "[E for each x of L where C]"},
	{"[x for each if of L]", 1, 13, "if is a word of the language and cannot be a name", ""},
	{"x = 3 else", 1, 7, "else without its if", "if C { A } else { B }"},
	{"f(not)", 1, 6, "a value is missing before )", ""},
	{"\xff", 1, 1, "byte 1 of the text (0xFF) is not UTF-8", "save the file as UTF-8"},
	{"x = 3\xff", 1, 6, "byte 6 of the text (0xFF) is not UTF-8", "save the file as UTF-8"},
	{"# a\n# \xff", 2, 3, "byte 7 of the text (0xFF) is not UTF-8", "save the file as UTF-8"},
	{"x\x00", 1, 2, "this is a binary file, not a text (byte 2 is zero)", ""},
}

func TestErrors(t *testing.T) {
	for _, c := range errorCases {
		_, err := Parse(diag.NewSource("f", c.text))
		var e *diag.Error
		if !errors.As(err, &e) {
			t.Errorf("%q is accepted (%v)", c.text, err)
			continue
		}
		line, column := e.Source.Position(e.Span.Start)
		if line != c.line || column != c.column || e.Message != c.message || e.Help != c.help {
			t.Errorf("%q\n gives %d:%d: %s | %s\n  want %d:%d: %s | %s", c.text, line, column, e.Message, e.Help, c.line, c.column, c.message, c.help)
		}
		if rendered := e.Render(); !strings.Contains(rendered, "^") || strings.Contains(rendered, "%!") {
			t.Errorf("%q is shown as\n%s", c.text, rendered)
		}
	}
}

func TestSpanOfAnErrorIsThePartAtFault(t *testing.T) {
	for text, want := range map[string]string{
		"x = 3 abc_1": "abc_1", "claim x is f(3)": "f(3)", "f(a: 1, b + 2)": "b + 2", "a && b": "&&",
		"5kg": "kg", "x = \"abc": "\"abc", "x = 1e99999": "1e99999", "2 m*sin(x)": "sin",
	} {
		_, err := Parse(diag.NewSource("f", text))
		var e *diag.Error
		if !errors.As(err, &e) || text[e.Span.Start:e.Span.End] != want {
			t.Errorf("%q: %v", text, err)
		}
	}
}

func TestLimits(t *testing.T) {
	deep := "the expression is nested more than 200 deep"
	for _, c := range []struct{ text, message string }{
		{strings.Repeat("(", 10_000), deep},
		{strings.Repeat("[", 10_000), deep},
		{strings.Repeat("-", 10_000) + "1", deep},
		{strings.Repeat("not ", 10_000) + "a", deep},
		{strings.Repeat("2^", 10_000) + "1", deep},
		{strings.Repeat("f(", 10_000), deep},
		{strings.Repeat("a[", 10_000), deep},
		{strings.Repeat("if a { ", 10_000), deep},
		{strings.Repeat("if a { 1 } else ", 10_000), deep},
		{"a" + strings.Repeat("+1", 10_000), "the expression has more than 4000 operations in a row"},
		{"a" + strings.Repeat(".b", 10_000), "the expression has more than 4000 operations in a row"},
		{"a" + strings.Repeat("ᵀ", 10_000), "the expression has more than 4000 operations in a row"},
		{"a" + strings.Repeat("(1)", 10_000), "the expression has more than 4000 operations in a row"},
		{"[" + strings.Repeat("1,", 250_000) + "]", "the statement has more than 200000 values and operators"},
		{"f(" + strings.Repeat("1,", 250_000) + ")", "the statement has more than 200000 values and operators"},
		{strings.Repeat("1\n", 100_001), "the text has more than 100000 statements"},
		{strings.Repeat("1", 10_001), "a number of more than 10000 digits"},
		{"0." + strings.Repeat("1", 10_001), "a number of more than 10000 digits"},
		{"1e-10001", "the exponent is beyond ±10000"},
		{"1e" + strings.Repeat("9", 10_001), "the exponent is beyond ±10000"},
		{strings.Repeat("1e10000\n", 300), "the long numbers of this text have more than 2000000 digits together"},
		{strings.Repeat("a", 257), "a name is longer than 256 bytes"},
		{"# " + strings.Repeat("a", 1<<20), "a line is longer than 1048576 bytes"},
		{strings.Repeat("#\n", 9<<20), "the text is longer than 16 MiB"},
		{"1 m^" + strings.Repeat("9", 10_000), "the exponent of a unit is beyond ±99"},
	} {
		_, err := Parse(diag.NewSource("f", c.text))
		var e *diag.Error
		if !errors.As(err, &e) || e.Message != c.message || e.Kind != diag.Limit {
			t.Errorf("%.20q…: %v, want %s", c.text, err, c.message)
		}
	}
}

func TestWithinLimits(t *testing.T) {
	for _, text := range []string{
		strings.Repeat("(", 190) + "1" + strings.Repeat(")", 190),
		"a" + strings.Repeat(" + 1", 3_900),
		"x = 1e10000", "x = " + strings.Repeat("7", 10_000),
		"[" + strings.Repeat("1, ", 190_000) + "]",
	} {
		if _, err := Parse(diag.NewSource("f", text)); err != nil {
			t.Errorf("%.20q…: %v", text, err)
		}
	}
}

func TestScriptThatIsANotebook(t *testing.T) {
	const help = "this looks like a Markdown notebook: its name should end in .md"
	for _, text := range []string{
		"# Title\n\nSome prose here.\n\n```gain\nx = 3\n```\n",
		"---\ntitle: A\n---\nSome prose\n",
	} {
		_, err := Parse(diag.NewSource("f.gain", text))
		var e *diag.Error
		if !errors.As(err, &e) || e.Help != help {
			t.Errorf("%q: %v", text, err)
		}
	}
}
