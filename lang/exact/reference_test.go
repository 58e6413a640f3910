package exact

import (
	"bytes"
	"encoding/json"
	"fmt"
	"math/big"
	"os"
	"testing"
)

type reference struct {
	Header                                      map[string]string
	Matrices, Polynomials, Zeros, Jordan, Roots []map[string]any
}

func symbolicReference(t *testing.T) reference {
	t.Helper()
	raw, err := os.ReadFile("testdata/sympy_reference.json")
	if err != nil {
		t.Fatal(err)
	}
	var r reference
	decoder := json.NewDecoder(bytes.NewReader(raw))
	decoder.UseNumber()
	if err := decoder.Decode(&r); err != nil {
		t.Fatal(err)
	}
	for _, key := range []string{"tool", "version", "command", "date"} {
		if r.Header[key] == "" {
			t.Fatalf("the header lacks %q", key)
		}
	}
	for name, list := range map[string][]map[string]any{
		"matrices": r.Matrices, "polynomials": r.Polynomials, "zeros": r.Zeros, "jordan": r.Jordan, "roots": r.Roots} {
		if len(list) == 0 {
			t.Fatalf("no reference for %s", name)
		}
	}
	return r
}

func TestMatricesAgreeWithReference(t *testing.T) {
	for k, c := range symbolicReference(t).Matrices {
		id := fmt.Sprintf("matrix %d", k)
		m := matrixOf(c["matrix"])
		reduced, pivots := m.Echelon()
		checkMatrix(t, id, reduced, nil, matrixOf(c["echelon"]))
		if fmt.Sprint(pivots) != fmt.Sprint(c["pivots"]) || fmt.Sprint(m.Rank()) != fmt.Sprint(c["rank"]) {
			t.Errorf("%s: pivots %v, rank %d", id, pivots, m.Rank())
		}
		if want, ok := c["determinant"]; ok {
			if d, err := m.Determinant(); err != nil || d.Cmp(rat(want)) != 0 {
				t.Errorf("%s: determinant %v (%v), want %v", id, d, err, want)
			}
			checkPolynomial(t, id, m.CharacteristicPolynomial(), polynomialOf(c["characteristic"]))
			inverse, err := m.Inverse()
			if want, ok := c["inverse"]; ok {
				checkMatrix(t, id, inverse, err, matrixOf(want))
			} else if err != ErrSingular {
				t.Errorf("%s: inverse %v (%v), want singular", id, inverse, err)
			}
		}
	}
}

func TestPolynomialsAgreeWithReference(t *testing.T) {
	for k, c := range symbolicReference(t).Polynomials {
		id := fmt.Sprintf("polynomial %d", k)
		p, q := polynomialOf(c["p"]), polynomialOf(c["q"])
		checkPolynomial(t, id, p.Mul(q), polynomialOf(c["product"]))
		checkPolynomial(t, id, p.Gcd(q), polynomialOf(c["gcd"]))
		quotient, rest, err := p.DivMod(q)
		if err != nil {
			t.Fatal(err)
		}
		checkPolynomial(t, id, quotient, polynomialOf(c["quotient"]))
		checkPolynomial(t, id, rest, polynomialOf(c["remainder"]))
		checkFactors(t, id, p.SquareFree(), c["squarefree"])
		factors, complete := p.Factorize()
		if !complete {
			t.Errorf("%s: the factors are not known to be irreducible", id)
		}
		checkFactors(t, id, factors, c["factors"])
		if got := fmt.Sprint(p.RealRootsBetween(nil, nil)); got != fmt.Sprint(c["real_roots"]) {
			t.Errorf("%s: %s real roots, want %v", id, got, c["real_roots"])
		}
	}
}

func checkFactors(t *testing.T, id string, got []Factor, want any) {
	t.Helper()
	expected := map[string]string{}
	for _, f := range want.([]any) {
		f := f.(map[string]any)
		expected[polynomialOf(f["factor"]).String()] = fmt.Sprint(f["multiplicity"])
	}
	if len(got) != len(expected) {
		t.Errorf("%s: %d factors, want %d", id, len(got), len(expected))
	}
	for _, f := range got {
		if expected[f.Polynomial.String()] != fmt.Sprint(f.Multiplicity) {
			t.Errorf("%s: factor %v with multiplicity %d is not expected", id, f.Polynomial, f.Multiplicity)
		}
	}
}

// The reference forms the greatest common divisor of all minors of the system
// matrix: another way than the staircase reduction.
func TestZerosAgreeWithReference(t *testing.T) {
	singular := 0
	for k, c := range symbolicReference(t).Zeros {
		id := fmt.Sprintf("zeros %d", k)
		b, out := matrixOf(c["B"]), matrixOf(c["C"])
		z, err := InvariantZeros(matrixOf(c["A"]), b, out, matrixOf(c["D"]))
		if err != nil {
			t.Fatal(err)
		}
		checkPolynomial(t, id, z.Polynomial, polynomialOf(c["zeros"]))
		if fmt.Sprint(z.NormalRank) != fmt.Sprint(c["normal_rank"]) {
			t.Errorf("%s: normal rank %d, want %v", id, z.NormalRank, c["normal_rank"])
		}
		if z.Singular != (z.NormalRank < min(b.cols, out.rows)) {
			t.Errorf("%s: singular %v", id, z.Singular)
		}
		if z.Singular {
			singular++
		}
	}
	if singular == 0 {
		t.Error("no singular system matrix among the cases")
	}
}

func TestJordanSizesAgreeWithReferenceRanks(t *testing.T) {
	for k, c := range symbolicReference(t).Jordan {
		m, p := matrixOf(c["matrix"]), polynomialOf(c["factor"])
		sizes, ok, err := JordanSizes(m, p)
		if err != nil || !ok {
			t.Fatalf("jordan %d: %v %v", k, ok, err)
		}
		for power, want := range c["ranks"].([]any) {
			rank := m.rows
			for _, size := range sizes {
				rank -= min(size, power)
			}
			if fmt.Sprint(rank) != fmt.Sprint(want) {
				t.Errorf("jordan %d: blocks %v give rank %d of power %d, want %v", k, sizes, rank, power, want)
			}
		}
	}
}

// Every reference root, known to 40 digits, lies in its disc.
func TestRootDiscsHoldReferenceRoots(t *testing.T) {
	for k, c := range symbolicReference(t).Roots {
		for _, digits := range []int{4, 17, 30} {
			found, err := polynomialOf(c["p"]).Roots(digits)
			if err != nil {
				t.Fatal(err)
			}
			held := map[int]bool{}
			for _, w := range c["roots"].([]any) {
				re, _, _ := big.ParseFloat(w.([]any)[0].(string), 10, 200, big.ToNearestEven)
				im, _, _ := big.ParseFloat(w.([]any)[1].(string), 10, 200, big.ToNearestEven)
				for i, r := range found {
					distance := magnitude(new(big.Float).SetPrec(400).Sub(re, r.Re), new(big.Float).SetPrec(400).Sub(im, r.Im))
					slack := new(big.Float).Mul(magnitude(re, im), big.NewFloat(1e-38))
					if distance.Cmp(slack.Add(slack, big.NewFloat(r.Radius))) <= 0 {
						held[i] = true
					}
				}
			}
			if len(held) != len(found) || len(found) != len(c["roots"].([]any)) {
				t.Errorf("roots %d to %d digits: %d of %d discs hold a reference root", k, digits, len(held), len(found))
			}
		}
	}
}
