package exact

import (
	"fmt"
	"math/big"
	"math/rand/v2"
	"testing"
)

// plantInFourParts hides parts of the given sizes behind a change of
// coordinates: the block pattern guarantees nothing about minimality of the
// blocks, so each is built reachable and observable in itself, with its own
// range of poles.
func plantInFourParts(random *rand.Rand, sizes [4]int) (a, b, c *Matrix) {
	n := sizes[0] + sizes[1] + sizes[2] + sizes[3]
	a, b, c = NewMatrix(n, n), NewMatrix(n, 2), NewMatrix(2, n)
	var start [5]int
	for k, size := range sizes {
		start[k+1] = start[k] + size
	}
	partOf := func(i int) int {
		for k := range sizes {
			if i < start[k+1] {
				return k
			}
		}
		return -1
	}
	coupled := map[[2]int]bool{{0, 2}: true, {1, 0}: true, {1, 2}: true, {1, 3}: true, {3, 2}: true}
	for i := range n {
		for j := range n {
			if coupled[[2]int{partOf(i), partOf(j)}] {
				a.Set(i, j, big.NewRat(random.Int64N(5)-2, 1))
			}
		}
		a.Set(i, i, big.NewRat(int64(-3*i-1-10*partOf(i)), 2)) // distinct poles
		if part := partOf(i); part == 0 || part == 1 {
			b.Set(i, random.IntN(2), big.NewRat(random.Int64N(3)+1, 1))
		}
		if part := partOf(i); part == 0 || part == 2 {
			c.Set(random.IntN(2), i, big.NewRat(random.Int64N(3)+1, 1))
		}
	}
	t := randomInvertible(random, n)
	inverse, err := t.Inverse()
	if err != nil {
		panic(err)
	}
	return must(must(t.Mul(a)).Mul(inverse)), must(t.Mul(b)), must(c.Mul(inverse))
}

func TestKalmanSplitFindsTheHiddenParts(t *testing.T) {
	random := rand.New(rand.NewPCG(11, 1))
	for range 60 {
		sizes := [4]int{random.IntN(3), random.IntN(3), random.IntN(3), random.IntN(3)}
		a, b, c := plantInFourParts(random, sizes)
		s, err := KalmanSplit(a, b, c)
		if err != nil {
			t.Fatal(err)
		}
		if s.Sizes != sizes {
			t.Fatalf("sizes %v, put in %v", s.Sizes, sizes)
		}
		checkTransformation(t, s.T, s.Inverse, a, s.A)
		if !must(s.T.Mul(b)).Equal(s.B) || !must(c.Mul(s.Inverse)).Equal(s.C) {
			t.Fatal("B or C is not the transformed one")
		}
		product := Constant(ratOne)
		for part := MovedAndSeen; part <= Neither; part++ {
			product = product.Mul(s.Polynomials[part])
		}
		checkPolynomial(t, "product of the parts", product, a.CharacteristicPolynomial())
		checkZeroBlocks(t, s)
		am, bm, cm, err := MinimalRealization(a, b, c)
		if err != nil {
			t.Fatal(err)
		}
		checkSameTransfer(t, [4]*Matrix{a, b, c, NewMatrix(2, 2)}, [4]*Matrix{am, bm, cm, NewMatrix(2, 2)})
	}
}

func checkTransformation(t *testing.T, forward, inverse, a, abar *Matrix) {
	t.Helper()
	if !must(forward.Mul(inverse)).Equal(Identity(a.rows)) {
		t.Fatalf("T·T⁻¹ = %v", must(forward.Mul(inverse)))
	}
	if got := must(must(forward.Mul(a)).Mul(inverse)); !got.Equal(abar) {
		t.Fatalf("T·A·T⁻¹ = %v, said to be %v", got, abar)
	}
}

func checkZeroBlocks(t *testing.T, s *Parts) {
	t.Helper()
	at := func(p Part) (int, int) { return s.start(p), s.start(p) + s.Sizes[p] }
	zero := func(i, j Part) {
		r0, r1 := at(i)
		c0, c1 := at(j)
		if !s.A.Slice(r0, r1, c0, c1).IsZero() {
			t.Fatalf("block [%d, %d] of A is not zero: %v", i+1, j+1, s.A)
		}
	}
	for _, pair := range [][2]Part{{0, 1}, {0, 3}, {2, 0}, {2, 1}, {2, 3}, {3, 0}, {3, 1}} {
		zero(pair[0], pair[1])
	}
	if !s.Inputs(SeenOnly).IsZero() || !s.Inputs(Neither).IsZero() || !s.Outputs(MovedOnly).IsZero() || !s.Outputs(Neither).IsZero() {
		t.Fatal("an input reaches, or an output sees, a part that it must not")
	}
}

func checkSameTransfer(t *testing.T, p, q [4]*Matrix) {
	t.Helper()
	g, err1 := Transfer(p[0], p[1], p[2], p[3])
	h, err2 := Transfer(q[0], q[1], q[2], q[3])
	if err1 != nil || err2 != nil {
		t.Fatal(err1, err2)
	}
	for i := range g {
		for j := range g[i] {
			if !g[i][j].Equal(h[i][j]) {
				t.Fatalf("entry [%d, %d]: %v and %v", i+1, j+1, g[i][j], h[i][j])
			}
		}
	}
}

func TestReachableSplit(t *testing.T) {
	random := rand.New(rand.NewPCG(12, 1))
	for range 60 {
		sizes := [4]int{random.IntN(4), 0, 0, random.IntN(4)}
		a, b, _ := plantInFourParts(random, sizes)
		s, err := ReachableSplit(a, b)
		if err != nil {
			t.Fatal(err)
		}
		r, n := sizes[0], a.rows
		total := 0
		for _, k := range s.Indices {
			total += k
		}
		if s.Rank != r || total != r || s.Basis.Rank() != r || s.Basis.cols != r {
			t.Fatalf("rank %d, indices %v, basis %v; %d states put in", s.Rank, s.Indices, s.Basis, r)
		}
		abar := must(Stack(must(Augment(s.A11, s.A12)), must(Augment(NewMatrix(n-r, r), s.A22))))
		checkTransformation(t, s.T, s.Inverse, a, abar)
		if !must(s.T.Mul(b)).Equal(must(Stack(s.B1, NewMatrix(n-r, 2)))) {
			t.Fatal("T·B is not [B1; 0]")
		}
		missing, err := UnreachablePolynomial(a, b)
		if err != nil {
			t.Fatal(err)
		}
		checkPolynomial(t, "missing modes", missing, s.Missing)
		matrix, err := ReachabilityMatrix(a, b)
		if err != nil || !matrix.Columns(firstIndependent(matrix)...).Equal(s.Basis) {
			t.Fatalf("the basis is not made of the first independent columns: %v", err)
		}
	}
}

func firstIndependent(m *Matrix) []int {
	_, pivots := m.Echelon()
	return pivots
}

func TestGainsReproduceTheWantedPolynomial(t *testing.T) {
	random := rand.New(rand.NewPCG(13, 1))
	for range 60 {
		n := 1 + random.IntN(8)
		a, b, wanted := randomMatrix(random, n, n), randomMatrix(random, n, 1), decimalPolynomial(n, random.Uint64())
		if rank, _ := ReachableRank(a, b); rank < n {
			continue
		}
		k, err := BassGura(a, b, wanted)
		if err != nil {
			t.Fatal(err)
		}
		checkPolynomial(t, "closed loop", closedLoop(a, b, k), wanted)
		other, err := Ackermann(a, b, wanted)
		checkMatrix(t, "Ackermann", other, err, k)
		f, err := ControllerForm(a, b)
		if err != nil {
			t.Fatal(err)
		}
		checkTransformation(t, f.T, f.Inverse, a, f.A)
		if !must(f.T.Mul(b)).Equal(f.Vector) || !f.A.Equal(companion(a.CharacteristicPolynomial())) || !f.Vector.Equal(Identity(n).Columns(n-1)) {
			t.Fatalf("controller form %v %v", f.A, f.Vector)
		}
		g, err := ObserverForm(a.Transpose(), b.Transpose())
		if err != nil {
			t.Fatal(err)
		}
		checkTransformation(t, g.T, g.Inverse, a.Transpose(), g.A)
		if !must(b.Transpose().Mul(g.Inverse)).Equal(g.Vector) {
			t.Fatalf("observer form %v %v", g.A, g.Vector)
		}
	}
}

// Along unreachable directions the gain is free; no other gain of the family is shorter.
func TestLeastGainWithFixedModes(t *testing.T) {
	random := rand.New(rand.NewPCG(14, 1))
	for range 40 {
		sizes := [4]int{1 + random.IntN(3), 0, 0, 1 + random.IntN(3)}
		a, b, _ := plantInFourParts(random, sizes)
		b = must(b.Mul(Column(ratOne, big.NewRat(3, 7))))
		s, err := ReachableSplit(a, b)
		if err != nil {
			t.Fatal(err)
		}
		wanted := s.Missing.Mul(decimalPolynomial(s.Rank, random.Uint64()))
		k, err := AssignReachable(a, b, wanted)
		if err != nil {
			t.Fatal(err)
		}
		checkPolynomial(t, "closed loop", closedLoop(a, b, k), wanted)
		// The shortest row lies in the span of the reachable directions.
		if must(Augment(s.Basis, k.Transpose())).Rank() != s.Rank {
			t.Fatalf("the gain %v has a part along directions in which it is free", k)
		}
		other := decimalPolynomial(a.rows, random.Uint64())
		if _, rest, _ := other.DivMod(s.Missing); !rest.IsZero() {
			_, err := AssignReachable(a, b, other)
			refusal, ok := err.(*UnreachableError)
			if !ok || !refusal.Unreachable.Equal(s.Missing) {
				t.Fatalf("wanted %v without the fixed modes %v: %v", other, s.Missing, err)
			}
		}
	}
}

func TestRepeatedFixedModeWantedOnce(t *testing.T) {
	a, b := ints(3, 3, -1, 0, 0, 0, -1, 0, 0, 0, 2), ints(3, 1, 0, 0, 1)
	_, err := AssignReachable(a, b, PolynomialWithRoots(big.NewRat(-1, 1), big.NewRat(-5, 1), big.NewRat(-6, 1)))
	refusal, ok := err.(*UnreachableError)
	if !ok || !refusal.Lost.Equal(PolynomialOfIntegers(1, 1)) {
		t.Fatalf("%v, want a refusal that names one mode at −1", err)
	}
	k, err := AssignReachable(a, b, PolynomialWithRoots(big.NewRat(-1, 1), big.NewRat(-1, 1), big.NewRat(-6, 1)))
	checkMatrix(t, "least gain", k, err, ints(1, 3, 0, 0, 8))
}

func TestRealizationsAreMinimalAndRoundTrip(t *testing.T) {
	random := rand.New(rand.NewPCG(15, 1))
	for range 30 {
		n, m, p := random.IntN(5), 1+random.IntN(3), 1+random.IntN(3)
		a, b, c, d := randomMatrix(random, n, n), randomMatrix(random, n, m), randomMatrix(random, p, n), randomMatrix(random, p, m)
		g, err := Transfer(a, b, c, d)
		if err != nil {
			t.Fatal(err)
		}
		ar, br, cr, dr, err := Realize(g)
		if err != nil {
			t.Fatal(err)
		}
		checkSameTransfer(t, [4]*Matrix{a, b, c, d}, [4]*Matrix{ar, br, cr, dr})
		s, err := KalmanSplit(a, b, c)
		if err != nil || ar.rows != s.Sizes[MovedAndSeen] {
			t.Fatalf("realized with %d states, %d are minimal (%v)", ar.rows, s.Sizes[MovedAndSeen], err)
		}
	}
}

func TestResolventTimesItsMatrix(t *testing.T) {
	random := rand.New(rand.NewPCG(16, 1))
	for n := range 7 {
		a := randomMatrix(random, n, n)
		numerators, denominator, err := Resolvent(a)
		if err != nil {
			t.Fatal(err)
		}
		for i := range n {
			for j := range n {
				var sum Polynomial
				for k := range n {
					entry := Constant(new(big.Rat).Neg(a.At(i, k)))
					if i == k {
						entry = entry.Add(PolynomialOfIntegers(1, 0))
					}
					sum = sum.Add(entry.Mul(numerators[k][j]))
				}
				want := Polynomial{}
				if i == j {
					want = denominator
				}
				checkPolynomial(t, fmt.Sprintf("entry [%d, %d]", i, j), sum, want)
			}
		}
	}
}

// Zeros put in through the numerators of independent channels come back after
// mixing inputs, outputs and states; feedback and output injection leave them.
func TestInvariantZerosAreInvariant(t *testing.T) {
	random := rand.New(rand.NewPCG(17, 1))
	for range 25 {
		n, m, p := 1+random.IntN(6), 1+random.IntN(3), 1+random.IntN(3)
		a, b, c, d := randomMatrix(random, n, n), randomMatrix(random, n, m), randomMatrix(random, p, n), randomMatrix(random, p, m)
		if random.IntN(2) == 0 {
			d = NewMatrix(p, m)
		}
		want, err := InvariantZeros(a, b, c, d)
		if err != nil {
			t.Fatal(err)
		}
		f, l := randomMatrix(random, m, n), randomMatrix(random, n, p)
		af, cf := must(a.Add(must(b.Mul(f)))), must(c.Add(must(d.Mul(f))))
		al, bl := must(af.Add(must(l.Mul(cf)))), must(b.Add(must(l.Mul(d))))
		u, y := randomInvertible(random, m), randomInvertible(random, p)
		got, err := InvariantZeros(al, must(bl.Mul(u)), must(y.Mul(cf)), must(must(y.Mul(d)).Mul(u)))
		if err != nil || !got.Polynomial.Equal(want.Polynomial) || got.NormalRank != want.NormalRank || got.Singular != want.Singular {
			t.Fatalf("%v became %v (%v)", want, got, err)
		}
		if m == p && !want.Singular {
			checkDeterminant(t, a, b, c, d, want.Polynomial)
		}
	}
}

// For a square plant det [sI − a, b; −c, d] is the zero polynomial up to a factor.
func checkDeterminant(t *testing.T, a, b, c, d *Matrix, zeros Polynomial) {
	t.Helper()
	var ratio *big.Rat
	for k := range a.rows + 2 {
		x := big.NewRat(int64(7*k+3), 5)
		top := must(Augment(must(Identity(a.rows).Scale(x).Sub(a)), b))
		value, err := must(Stack(top, must(Augment(c.Neg(), d)))).Determinant()
		if err != nil {
			t.Fatal(err)
		}
		at := zeros.Eval(x)
		if at.Sign() == 0 || value.Sign() == 0 {
			if at.Sign() != value.Sign() {
				t.Fatalf("at %v the determinant is %v, the zero polynomial %v", x, value, at)
			}
			continue
		}
		if r := new(big.Rat).Quo(value, at); ratio == nil {
			ratio = r
		} else if r.Cmp(ratio) != 0 {
			t.Fatalf("determinant and zero polynomial %v are not proportional", zeros)
		}
	}
}

func TestTransmissionZerosLeaveHiddenModesOut(t *testing.T) {
	a, b, c := ints(2, 2, -1, 0, 0, -2), ints(2, 1, 1, 0), ints(1, 2, 1, 1)
	d := ints(1, 1, 1)
	all, err := InvariantZeros(a, b, c, d)
	if err != nil {
		t.Fatal(err)
	}
	checkPolynomial(t, "invariant", all.Polynomial, PolynomialOfIntegers(1, 4, 4)) // −2 twice: of the plant and hidden
	minimal, err := TransmissionZeros(a, b, c, d)
	if err != nil {
		t.Fatal(err)
	}
	checkPolynomial(t, "transmission", minimal.Polynomial, PolynomialOfIntegers(1, 2))
}
