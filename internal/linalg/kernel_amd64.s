//go:build amd64 && !noasm

#include "textflag.h"

// STEP adds the four products Y8·(b) to the compensated sums s, c: p the rounded
// product, e its error, then a two-sum of s and p.
#define STEP(b, s, c) \
	VMOVUPD (b)(AX*8), Y9     \
	VMULPD  Y9, Y8, Y10       \
	VFMSUB213PD Y10, Y8, Y9   \
	VADDPD  Y10, s, Y11       \
	VSUBPD  s, Y11, Y12       \
	VSUBPD  Y12, Y11, Y13     \
	VSUBPD  Y13, s, Y13       \
	VSUBPD  Y12, Y10, Y14     \
	VADDPD  Y14, Y13, Y13     \
	VADDPD  Y9, Y13, Y13      \
	VADDPD  Y13, c, c         \
	VMOVAPD Y11, s

// func dotLanes(a, b *float64, n int, l *lanes)
TEXT ·dotLanes(SB), NOSPLIT, $0-32
	MOVQ a+0(FP), SI
	MOVQ b+8(FP), R8
	MOVQ n+16(FP), CX
	MOVQ l+24(FP), DI
	VMOVUPD (DI), Y0
	VMOVUPD 32(DI), Y4
	XORQ AX, AX
one:
	VMOVUPD (SI)(AX*8), Y8
	STEP(R8, Y0, Y4)
	ADDQ $4, AX
	CMPQ AX, CX
	JLT  one
	VMOVUPD Y0, (DI)
	VMOVUPD Y4, 32(DI)
	VZEROUPPER
	RET

// func dotLanes4(a, b0, b1, b2, b3 *float64, n int, l *[4]lanes)
TEXT ·dotLanes4(SB), NOSPLIT, $0-56
	MOVQ a+0(FP), SI
	MOVQ b0+8(FP), R8
	MOVQ b1+16(FP), R9
	MOVQ b2+24(FP), R10
	MOVQ b3+32(FP), R11
	MOVQ n+40(FP), CX
	MOVQ l+48(FP), DI
	VMOVUPD (DI), Y0
	VMOVUPD 32(DI), Y4
	VMOVUPD 64(DI), Y1
	VMOVUPD 96(DI), Y5
	VMOVUPD 128(DI), Y2
	VMOVUPD 160(DI), Y6
	VMOVUPD 192(DI), Y3
	VMOVUPD 224(DI), Y7
	XORQ AX, AX
four:
	VMOVUPD (SI)(AX*8), Y8
	STEP(R8, Y0, Y4)
	STEP(R9, Y1, Y5)
	STEP(R10, Y2, Y6)
	STEP(R11, Y3, Y7)
	ADDQ $4, AX
	CMPQ AX, CX
	JLT  four
	VMOVUPD Y0, (DI)
	VMOVUPD Y4, 32(DI)
	VMOVUPD Y1, 64(DI)
	VMOVUPD Y5, 96(DI)
	VMOVUPD Y2, 128(DI)
	VMOVUPD Y6, 160(DI)
	VMOVUPD Y3, 192(DI)
	VMOVUPD Y7, 224(DI)
	VZEROUPPER
	RET

// func sumLanes(a, b *float64, n int, l *[4]float64)
TEXT ·sumLanes(SB), NOSPLIT, $0-32
	MOVQ a+0(FP), SI
	MOVQ b+8(FP), R8
	MOVQ n+16(FP), CX
	MOVQ l+24(FP), DI
	VMOVUPD (DI), Y0
	XORQ AX, AX
plain:
	VMOVUPD (SI)(AX*8), Y8
	VFMADD231PD (R8)(AX*8), Y8, Y0
	ADDQ $4, AX
	CMPQ AX, CX
	JLT  plain
	VMOVUPD Y0, (DI)
	VZEROUPPER
	RET

// func vectorUnits() bool
// Leaf 1: fused multiply-add (bit 12), saved state in use (27), AVX (28); the
// system saves the upper halves (bits 1 and 2 of the state mask); leaf 7: AVX2 (bit 5).
TEXT ·vectorUnits(SB), NOSPLIT, $0-1
	MOVB $0, ret+0(FP)
	MOVL $0, AX
	MOVL $0, CX
	CPUID
	CMPL AX, $7
	JLT  no
	MOVL $1, AX
	MOVL $0, CX
	CPUID
	MOVL CX, R8
	ANDL $0x18001000, R8
	CMPL R8, $0x18001000
	JNE  no
	MOVL $0, CX
	XGETBV
	ANDL $6, AX
	CMPL AX, $6
	JNE  no
	MOVL $7, AX
	MOVL $0, CX
	CPUID
	ANDL $0x20, BX
	JZ   no
	MOVB $1, ret+0(FP)
no:
	RET
