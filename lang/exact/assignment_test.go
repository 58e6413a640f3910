package exact

import (
	"math/big"
	"testing"
)

func TestAssignsAgreesWithTheCharacteristicPolynomial(t *testing.T) {
	a := ints(3, 3, 0, 1, 0, 2, -1, 3, 1, 0, 4)
	b := ints(3, 1, 0, 1, 2)
	wanted := PolynomialWithRoots(big.NewRat(-1, 2), big.NewRat(-3, 1), big.NewRat(-5, 4))
	k, err := BassGura(a, b, wanted)
	if err != nil {
		t.Fatal(err)
	}
	if same, err := Assigns(a, b, k, wanted); err != nil || !same {
		t.Errorf("the assigned gain is not recognised: %v, %v", same, err)
	}
	product, err := b.Mul(k)
	if err != nil {
		t.Fatal(err)
	}
	loop, err := a.Sub(product)
	if err != nil {
		t.Fatal(err)
	}
	if !loop.CharacteristicPolynomial().Equal(wanted) {
		t.Error("the loop does not have the wanted polynomial")
	}
	other := k.Clone()
	other.Set(0, 1, new(big.Rat).Add(k.At(0, 1), big.NewRat(1, 1000000)))
	if same, err := Assigns(a, b, other, wanted); err != nil || same {
		t.Errorf("a changed gain passes: %v, %v", same, err)
	}
}
