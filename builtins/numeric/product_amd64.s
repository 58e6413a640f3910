#include "textflag.h"

// func tileProduct(k int, a, b, c *float64)
//
// c[4][12] = Σ over l < k of a[l][4] ⊗ b[l][12]; needs AVX2 and FMA.
// Y0 … Y11 accumulate, three registers a row; Y12 … Y14 hold a row of b.
TEXT ·tileProduct(SB), NOSPLIT, $0-32
	MOVQ k+0(FP), CX
	MOVQ a+8(FP), SI
	MOVQ b+16(FP), DI
	MOVQ c+24(FP), DX
	VXORPD Y0, Y0, Y0
	VXORPD Y1, Y1, Y1
	VXORPD Y2, Y2, Y2
	VXORPD Y3, Y3, Y3
	VXORPD Y4, Y4, Y4
	VXORPD Y5, Y5, Y5
	VXORPD Y6, Y6, Y6
	VXORPD Y7, Y7, Y7
	VXORPD Y8, Y8, Y8
	VXORPD Y9, Y9, Y9
	VXORPD Y10, Y10, Y10
	VXORPD Y11, Y11, Y11
	TESTQ CX, CX
	JLE  done

loop:
	VMOVUPD      (DI), Y12
	VMOVUPD      32(DI), Y13
	VMOVUPD      64(DI), Y14
	VBROADCASTSD (SI), Y15
	VFMADD231PD  Y12, Y15, Y0
	VFMADD231PD  Y13, Y15, Y1
	VFMADD231PD  Y14, Y15, Y2
	VBROADCASTSD 8(SI), Y15
	VFMADD231PD  Y12, Y15, Y3
	VFMADD231PD  Y13, Y15, Y4
	VFMADD231PD  Y14, Y15, Y5
	VBROADCASTSD 16(SI), Y15
	VFMADD231PD  Y12, Y15, Y6
	VFMADD231PD  Y13, Y15, Y7
	VFMADD231PD  Y14, Y15, Y8
	VBROADCASTSD 24(SI), Y15
	VFMADD231PD  Y12, Y15, Y9
	VFMADD231PD  Y13, Y15, Y10
	VFMADD231PD  Y14, Y15, Y11
	ADDQ         $32, SI
	ADDQ         $96, DI
	DECQ         CX
	JNE          loop

done:
	VMOVUPD Y0, (DX)
	VMOVUPD Y1, 32(DX)
	VMOVUPD Y2, 64(DX)
	VMOVUPD Y3, 96(DX)
	VMOVUPD Y4, 128(DX)
	VMOVUPD Y5, 160(DX)
	VMOVUPD Y6, 192(DX)
	VMOVUPD Y7, 224(DX)
	VMOVUPD Y8, 256(DX)
	VMOVUPD Y9, 288(DX)
	VMOVUPD Y10, 320(DX)
	VMOVUPD Y11, 352(DX)
	VZEROUPPER
	RET

// func processorFeatures(leaf, subleaf uint32) (eax, ebx, ecx, edx uint32)
TEXT ·processorFeatures(SB), NOSPLIT, $0-24
	MOVL leaf+0(FP), AX
	MOVL subleaf+4(FP), CX
	CPUID
	MOVL AX, eax+8(FP)
	MOVL BX, ebx+12(FP)
	MOVL CX, ecx+16(FP)
	MOVL DX, edx+20(FP)
	RET

// func enabledRegisters() (low, high uint32)
TEXT ·enabledRegisters(SB), NOSPLIT, $0-8
	XORL CX, CX
	XGETBV
	MOVL AX, low+0(FP)
	MOVL DX, high+4(FP)
	RET
