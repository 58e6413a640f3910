package numeric

import (
	"gonum.org/v1/gonum/blas/blas64"
)

//go:noescape
func tileProduct(k int, a, b, c *float64)

//go:noescape
func processorFeatures(leaf, subleaf uint32) (eax, ebx, ecx, edx uint32)

//go:noescape
func enabledRegisters() (low, high uint32)

// wideRegisters tells whether the processor has AVX2 and FMA and the operating
// system saves their registers (Intel 64 and IA-32 Architectures Software
// Developer's Manual, volume 1, section 14.5.3).
func wideRegisters() bool {
	const fma, saved, avx, avx2 = 1 << 12, 1 << 27, 1 << 28, 1 << 5
	most, _, _, _ := processorFeatures(0, 0)
	if most < 7 {
		return false
	}
	_, _, features, _ := processorFeatures(1, 0)
	if features&(fma|saved|avx) != fma|saved|avx {
		return false
	}
	if low, _ := enabledRegisters(); low&6 != 6 {
		return false
	}
	_, extended, _, _ := processorFeatures(7, 0)
	return extended&avx2 != 0
}

func init() {
	if wideRegisters() {
		blas64.Use(tiledProducts{})
		products = tiledProducts{} // it was taken from blas64 before this ran
	}
}
