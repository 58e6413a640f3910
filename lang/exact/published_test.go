package exact

import (
	"bytes"
	"encoding/json"
	"fmt"
	"math"
	"math/big"
	"math/cmplx"
	"os"
	"path/filepath"
	"testing"
)

type publishedCase struct {
	ID, Function, Source, Provenance string
	Inputs, Expect                   map[string]any
	Tolerance                        map[string]any
}

func publishedCases(t *testing.T, function string) []publishedCase {
	t.Helper()
	files, err := filepath.Glob("../../testdata/published/*.json")
	if err != nil {
		t.Fatal(err)
	}
	var out []publishedCase
	for _, file := range files {
		raw, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		var cases []publishedCase
		decoder := json.NewDecoder(bytes.NewReader(raw))
		decoder.UseNumber()
		if err := decoder.Decode(&cases); err != nil {
			t.Fatalf("%s: %v", file, err)
		}
		for _, c := range cases {
			if c.Source == "" {
				t.Fatalf("%s names no source", c.ID)
			}
			if c.Function == function {
				out = append(out, c)
			}
		}
	}
	if len(out) == 0 {
		t.Fatalf("no case for %q", function)
	}
	return out
}

// rat reads a number: strings are exact, JSON numbers the nearest binary64 value.
func rat(x any) *big.Rat {
	switch x := x.(type) {
	case string:
		r, ok := new(big.Rat).SetString(x)
		if !ok {
			panic("not a number: " + x)
		}
		return r
	case json.Number:
		f, err := x.Float64()
		if err != nil {
			panic(err)
		}
		return new(big.Rat).SetFloat64(f)
	}
	panic(fmt.Sprintf("not a number: %v", x))
}

// decimal reads a number as the decimal fraction that is written.
func decimal(x any) *big.Rat {
	r, ok := new(big.Rat).SetString(fmt.Sprint(x))
	if !ok {
		panic(fmt.Sprintf("not a number: %v", x))
	}
	return r
}

func rats(x any) []*big.Rat {
	var out []*big.Rat
	for _, e := range x.([]any) {
		out = append(out, rat(e))
	}
	return out
}

func matrixOf(x any) *Matrix {
	var rows [][]*big.Rat
	for _, row := range x.([]any) {
		rows = append(rows, rats(row))
	}
	m, err := FromRows(rows)
	if err != nil {
		panic(err)
	}
	return m
}

func polynomialOf(x any) Polynomial { return NewPolynomial(rats(x)...) }

// wantedPolynomial multiplies the wanted poles out; with pairs set an entry
// with an imaginary part stands for itself and its conjugate.
func wantedPolynomial(c publishedCase) Polynomial {
	p := Constant(ratOne)
	for _, e := range c.Inputs["poles"].([]any) {
		re, im := rat(e.([]any)[0]), rat(e.([]any)[1])
		if im.Sign() == 0 {
			p = p.Mul(NewPolynomial(ratOne, new(big.Rat).Neg(re)))
			continue
		}
		norm := new(big.Rat).Add(new(big.Rat).Mul(re, re), new(big.Rat).Mul(im, im))
		p = p.Mul(NewPolynomial(ratOne, new(big.Rat).Mul(re, big.NewRat(-2, 1)), norm))
	}
	return p
}

func complexList(x any) []complex128 {
	var out []complex128
	for _, e := range x.([]any) {
		re, _ := rat(e.([]any)[0]).Float64()
		im, _ := rat(e.([]any)[1]).Float64()
		out = append(out, complex(re, im))
	}
	return out
}

// checkRoots compares certified roots with a list, greedily, relative to max(1, |root|).
func checkRoots(t *testing.T, id string, p Polynomial, want []complex128, tolerance float64) {
	t.Helper()
	found, err := p.Roots(17)
	if err != nil {
		t.Errorf("%s: %v", id, err)
		return
	}
	var got []complex128
	for _, r := range found {
		for range r.Multiplicity {
			got = append(got, r.Value)
		}
	}
	if len(got) != len(want) {
		t.Errorf("%s: %d roots, want %d", id, len(got), len(want))
		return
	}
	for _, w := range want {
		best, distance := -1, math.Inf(1)
		for k, g := range got {
			if d := cmplx.Abs(g - w); d < distance {
				best, distance = k, d
			}
		}
		if distance > tolerance*math.Max(1, cmplx.Abs(w)) {
			t.Errorf("%s: root %v is missing, the nearest is %v", id, w, got[best])
		}
		got[best] = cmplx.Inf()
	}
}

func checkPolynomial(t *testing.T, id string, got, want Polynomial) {
	t.Helper()
	if !got.Equal(want) {
		t.Errorf("%s: %v, want %v", id, got, want)
	}
}

func checkMatrix(t *testing.T, id string, got *Matrix, err error, want *Matrix) {
	t.Helper()
	if err != nil || !got.Equal(want) {
		t.Errorf("%s: %v (%v), want %v", id, got, err, want)
	}
}

func closedLoop(a, b, k *Matrix) Polynomial {
	return must(a.Sub(must(b.Mul(k)))).CharacteristicPolynomial()
}

func TestPublishedCharacteristicPolynomials(t *testing.T) {
	for _, c := range publishedCases(t, "characteristic polynomial and poles") {
		p := matrixOf(c.Inputs["A"]).CharacteristicPolynomial()
		checkPolynomial(t, c.ID, p, polynomialOf(c.Expect["coefficients"]))
		checkRoots(t, c.ID, p, complexList(c.Expect["poles"]), 1e-10)
	}
}

func TestPublishedReachability(t *testing.T) {
	for _, c := range publishedCases(t, "reachability rank") {
		a, b := matrixOf(c.Inputs["A"]), matrixOf(c.Inputs["B"])
		checkRank(t, c, a, b, "unreachable_modes")
		for j := range b.cols {
			if want, ok := c.Expect[fmt.Sprintf("rank_input_%d", j+1)]; ok {
				if got, err := ReachableRank(a, b.Columns(j)); err != nil || fmt.Sprint(got) != fmt.Sprint(want) {
					t.Errorf("%s: rank from input %d is %d (%v), want %v", c.ID, j+1, got, err, want)
				}
			}
		}
		if want, ok := c.Expect["controllability_indices"]; ok {
			if s, err := ReachableSplit(a, b); err != nil || fmt.Sprint(s.Indices) != fmt.Sprint(want) {
				t.Errorf("%s: indices %v (%v), want %v", c.ID, s.Indices, err, want)
			}
		}
	}
}

func checkRank(t *testing.T, c publishedCase, a, b *Matrix, modes string) {
	t.Helper()
	want := int(rat(c.Expect["rank"]).Num().Int64())
	if got, err := ReachableRank(a, b); err != nil || got != want {
		t.Errorf("%s: rank %d (%v), want %d", c.ID, got, err, want)
	}
	if r, err := ReachabilityMatrix(a, b); err != nil || r.Rank() != want {
		t.Errorf("%s: rank of the matrix %d (%v), want %d", c.ID, r.Rank(), err, want)
	}
	missing, err := UnreachablePolynomial(a, b)
	if err != nil {
		t.Errorf("%s: %v", c.ID, err)
	}
	checkRoots(t, c.ID, missing, complexList(c.Expect[modes]), 1e-12)
}

func TestPublishedObservability(t *testing.T) {
	for _, c := range publishedCases(t, "observability rank") {
		checkRank(t, c, matrixOf(c.Inputs["A"]).Transpose(), matrixOf(c.Inputs["C"]).Transpose(), "unobservable_modes")
	}
}

func TestPublishedKalmanSplit(t *testing.T) {
	for _, c := range publishedCases(t, "Kalman decomposition") {
		a, b, cc := matrixOf(c.Inputs["A"]), matrixOf(c.Inputs["B"]), matrixOf(c.Inputs["C"])
		s, err := KalmanSplit(a, b, cc)
		if err != nil {
			t.Fatal(err)
		}
		names := []string{"reachable_observable", "reachable_unobservable", "unreachable_observable", "unreachable_unobservable"}
		for part, name := range names {
			if got := fmt.Sprint(s.Sizes[part]); got != fmt.Sprint(c.Expect[name]) {
				t.Errorf("%s: %s has size %s, want %v", c.ID, name, got, c.Expect[name])
			}
			checkPolynomial(t, c.ID, s.Polynomials[part], PolynomialWithRoots(rats(c.Expect["modes"].(map[string]any)[name])...))
		}
		g, err := Transfer(a, b, cc, NewMatrix(1, 1))
		if err != nil {
			t.Fatal(err)
		}
		want := c.Expect["minimal_transfer_function"].(map[string]any)
		checkPolynomial(t, c.ID, g[0][0].Num, polynomialOf(want["num"]))
		checkPolynomial(t, c.ID, g[0][0].Den, polynomialOf(want["den"]))
	}
}

func TestPublishedPoleAssignment(t *testing.T) {
	for _, c := range publishedCases(t, "pole assignment, single input (Bass-Gura)") {
		a, b := matrixOf(c.Inputs["A"]), matrixOf(c.Inputs["B"])
		checkPolynomial(t, c.ID, a.CharacteristicPolynomial(), polynomialOf(c.Expect["open_loop_polynomial"]))
		wanted := wantedPolynomial(c)
		checkPolynomial(t, c.ID, wanted, polynomialOf(c.Expect["desired_polynomial"]))
		for name, method := range map[string]func(a, b *Matrix, p Polynomial) (*Matrix, error){
			"Bass–Gura": BassGura, "Ackermann": Ackermann, "reachable part": AssignReachable,
		} {
			k, err := method(a, b, wanted)
			checkMatrix(t, c.ID+" "+name, k, err, matrixOf(c.Expect["K"]))
			checkPolynomial(t, c.ID, closedLoop(a, b, k), wanted)
		}
		r, _ := ReachabilityMatrix(a, b)
		if d, err := r.Determinant(); err != nil || d.Cmp(rat(c.Expect["reachability_determinant"])) != 0 {
			t.Errorf("%s: determinant %v (%v)", c.ID, d, err)
		}
	}
}

func TestPublishedFixedModes(t *testing.T) {
	for _, c := range publishedCases(t, "pole assignment with an unreachable mode") {
		a, b, wanted := matrixOf(c.Inputs["A"]), matrixOf(c.Inputs["B"]), wantedPolynomial(c)
		k, err := AssignReachable(a, b, wanted)
		if c.Expect["possible"] == false {
			refusal, ok := err.(*UnreachableError)
			if !ok {
				t.Errorf("%s: %v (%v), want a refusal", c.ID, k, err)
				continue
			}
			checkRoots(t, c.ID, refusal.Lost, complexList(c.Expect["fixed_modes"]), 0)
			continue
		}
		checkMatrix(t, c.ID, k, err, matrixOf(c.Expect["K_minimum_norm"]))
		checkPolynomial(t, c.ID, closedLoop(a, b, k), polynomialOf(c.Expect["closed_loop_polynomial"]))
	}
}

func TestPublishedObservers(t *testing.T) {
	for _, c := range publishedCases(t, "observer gain") {
		a, out := matrixOf(c.Inputs["A"]), matrixOf(c.Inputs["C"])
		l, err := BassGura(a.Transpose(), out.Transpose(), wantedPolynomial(c))
		checkMatrix(t, c.ID, l.Transpose(), err, matrixOf(c.Expect["L"]))
		checkPolynomial(t, c.ID, must(a.Sub(must(l.Transpose().Mul(out)))).CharacteristicPolynomial(), polynomialOf(c.Expect["error_polynomial"]))
	}
	for _, c := range publishedCases(t, "reduced-order observer") {
		a := matrixOf(c.Inputs["A"])
		n := a.rows
		l, err := BassGura(a.Slice(1, n, 1, n).Transpose(), a.Slice(0, 1, 1, n).Transpose(), wantedPolynomial(c))
		checkMatrix(t, c.ID, l.Transpose(), err, matrixOf(c.Expect["L"]))
	}
}

func TestPublishedIntegralActionAndPrefilter(t *testing.T) {
	for _, c := range publishedCases(t, "pole assignment with integral action") {
		a, b, out := matrixOf(c.Inputs["A"]), matrixOf(c.Inputs["B"]), matrixOf(c.Inputs["C"])
		n := a.rows
		big := must(Stack(must(Augment(a, NewMatrix(n, 1))), must(Augment(out.Neg(), NewMatrix(1, 1)))))
		drive := must(Stack(b, NewMatrix(1, 1)))
		k, err := BassGura(big, drive, wantedPolynomial(c))
		checkMatrix(t, c.ID, k.Slice(0, 1, 0, n), err, matrixOf(c.Expect["K"]))
		if k.At(0, n).Cmp(rat(c.Expect["Ki"])) != 0 {
			t.Errorf("%s: Ki = %v", c.ID, k.At(0, n))
		}
	}
	for _, c := range publishedCases(t, "static prefilter for unit DC gain") {
		a, b, out := matrixOf(c.Inputs["A"]), matrixOf(c.Inputs["B"]), matrixOf(c.Inputs["C"])
		k, err := BassGura(a, b, wantedPolynomial(c))
		checkMatrix(t, c.ID, k, err, matrixOf(c.Expect["K"]))
		x, err := must(a.Sub(must(b.Mul(k)))).Solve(b)
		if err != nil {
			t.Fatal(err)
		}
		gain := must(out.Mul(x)).At(0, 0)
		if n := new(big.Rat).Inv(new(big.Rat).Neg(gain)); n.Cmp(rat(c.Expect["N"])) != 0 {
			t.Errorf("%s: N = %v", c.ID, n)
		}
	}
}

func TestPublishedTransferFunctions(t *testing.T) {
	for _, c := range publishedCases(t, "transfer function") {
		a, b, out, d := matrixOf(c.Inputs["A"]), matrixOf(c.Inputs["B"]), matrixOf(c.Inputs["C"]), matrixOf(c.Inputs["D"])
		numerators, denominator, err := Numerators(a, b, out, d)
		if err != nil {
			t.Fatal(err)
		}
		checkPolynomial(t, c.ID, denominator, polynomialOf(c.Expect["common_denominator"]))
		g, err := Transfer(a, b, out, d)
		if err != nil {
			t.Fatal(err)
		}
		for i, row := range c.Expect["numerators"].([]any) {
			for j, num := range row.([]any) {
				checkPolynomial(t, c.ID, numerators[i][j], polynomialOf(num))
				want := c.Expect["reduced"].([]any)[i].([]any)[j].(map[string]any)
				checkPolynomial(t, c.ID, g[i][j].Num, polynomialOf(want["num"]))
				checkPolynomial(t, c.ID, g[i][j].Den, polynomialOf(want["den"]))
			}
		}
		am, bm, cm, dm, err := Realize(g)
		if err != nil {
			t.Fatal(err)
		}
		back, _ := Transfer(am, bm, cm, dm)
		for i := range g {
			for j := range g[i] {
				if !back[i][j].Equal(g[i][j]) {
					t.Errorf("%s: realized entry [%d, %d] is %v", c.ID, i+1, j+1, back[i][j])
				}
			}
		}
	}
}

func TestPublishedZeros(t *testing.T) {
	for _, c := range publishedCases(t, "transmission zeros") {
		z, err := TransmissionZeros(matrixOf(c.Inputs["A"]), matrixOf(c.Inputs["B"]), matrixOf(c.Inputs["C"]), matrixOf(c.Inputs["D"]))
		if err != nil {
			t.Fatal(err)
		}
		if got := fmt.Sprint(z.NormalRank); got != fmt.Sprint(c.Expect["normal_rank_of_transfer_matrix"]) || z.Singular {
			t.Errorf("%s: normal rank %s, singular %v", c.ID, got, z.Singular)
		}
		checkRoots(t, c.ID, z.Polynomial, complexList(c.Expect["zeros"]), 1e-12)
	}
}

// The poles that printed gains really give are roots of an exact polynomial of
// exactly the printed decimals, whatever the conditioning.
func TestPublishedRoundedGains(t *testing.T) {
	for _, c := range publishedCases(t, "a colleague's rounded numbers") {
		a := decimals(c.Inputs["A"])
		var loop *Matrix
		if k, ok := c.Inputs["printed_K"]; ok {
			loop = must(a.Sub(must(decimals(c.Inputs["B"]).Mul(decimals(k)))))
			if c.Expect["cause"] == "sign convention" {
				loop = must(a.Add(must(decimals(c.Inputs["B"]).Mul(decimals(k)))))
			}
		} else {
			loop = must(a.Sub(must(decimals(c.Inputs["printed_L"]).Mul(decimals(c.Inputs["C"])))))
		}
		checkRoots(t, c.ID, loop.CharacteristicPolynomial(), complexList(c.Expect["closed_loop_poles"]), 1e-12)
	}
	for _, c := range publishedCases(t, "pole assignment, several inputs") {
		loop := must(matrixOf(c.Inputs["A"]).Sub(must(matrixOf(c.Inputs["B"]).Mul(matrixOf(c.Expect["example_gain"])))))
		checkRoots(t, c.ID, loop.CharacteristicPolynomial(), complexList(c.Expect["closed_loop_poles"]), 1e-5)
		checkRoots(t, c.ID, matrixOf(c.Inputs["A"]).CharacteristicPolynomial(), complexList(c.Expect["open_loop_poles"]), 1e-12)
	}
}

func decimals(x any) *Matrix {
	var rows [][]*big.Rat
	for _, row := range x.([]any) {
		var out []*big.Rat
		for _, e := range row.([]any) {
			out = append(out, decimal(e))
		}
		rows = append(rows, out)
	}
	m, err := FromRows(rows)
	if err != nil {
		panic(err)
	}
	return m
}
