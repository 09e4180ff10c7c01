//go:build amd64 && !purego

#include "textflag.h"
#include "go_asm.h"

// func subtractAVX2(u *Product)
//
// Eight rows by four columns at a time, then single columns. DI C, SI A; R11 and R12 walk
// through A and B; R8 step of k in B, R14 and R15 one and three steps of j in B; AX panels
// left, CX columns left in the panel, R13 and BX hops left, DX columns of C left.
TEXT ·subtractAVX2(SB), NOSPLIT, $80-8
	STMXCSR mxcsr-8(SP)
	MOVL mxcsr-8(SP), AX
	ORL  $0x8040, AX // results and operands below 2^-1022 count as zero
	MOVL AX, flush-16(SP)
	LDMXCSR flush-16(SP)
	MOVQ u+0(FP), R9
	MOVQ Product_C(R9), DI
	MOVQ Product_A(R9), SI
	MOVQ Product_Blocks(R9), CX
	MOVQ CX, blocks-24(SP)
	MOVQ Product_AShrink(R9), CX
	SHLQ $3, CX
	MOVQ CX, shrinkA-32(SP)
	MOVQ Product_BShrink(R9), CX
	SHLQ $3, CX
	MOVQ CX, shrinkB-64(SP)
	MOVQ Product_BCol(R9), R14
	SHLQ $3, R14
	LEAQ (R14)(R14*2), R15
	MOVQ Product_BRow(R9), R8
	SHLQ $3, R8

block:
	MOVQ DI, R10 // walks through the columns of C
	MOVQ Product_B(R9), CX
	MOVQ CX, startB-40(SP)
	MOVQ Product_Cols(R9), DX

columns:
	MOVQ SI, R11
	MOVQ startB-40(SP), R12
	MOVQ Product_Panels(R9), AX
	MOVQ Product_AHop(R9), R13
	MOVQ Product_BHop(R9), BX
	SHLQ $3, R13
	SHLQ $3, BX
	CMPQ DX, $4
	JLT  panel1init
	VMOVUPD 0(R10), Y0
	VMOVUPD 32(R10), Y1
	VMOVUPD 64(R10), Y2
	VMOVUPD 96(R10), Y3
	VMOVUPD 128(R10), Y4
	VMOVUPD 160(R10), Y5
	VMOVUPD 192(R10), Y6
	VMOVUPD 224(R10), Y7

panel:
	MOVQ Product_Width(R9), CX
	MOVQ R11, walkA-48(SP)
	MOVQ R12, walkB-56(SP)

unit:
	VMOVUPD 0(R11), Y8
	VMOVUPD 32(R11), Y9
	VBROADCASTSD (R12), Y10
	VBROADCASTSD (R12)(R14*1), Y11
	VFNMADD231PD Y8, Y10, Y0
	VFNMADD231PD Y9, Y10, Y1
	VBROADCASTSD (R12)(R14*2), Y12
	VFNMADD231PD Y8, Y11, Y2
	VFNMADD231PD Y9, Y11, Y3
	VBROADCASTSD (R12)(R15*1), Y13
	VFNMADD231PD Y8, Y12, Y4
	VFNMADD231PD Y9, Y12, Y5
	VFNMADD231PD Y8, Y13, Y6
	VFNMADD231PD Y9, Y13, Y7
	ADDQ $64, R11
	ADDQ R8, R12
	DECQ CX
	JNZ  unit
	MOVQ walkA-48(SP), R11
	MOVQ walkB-56(SP), R12
	ADDQ R13, R11
	ADDQ BX, R12
	SUBQ shrinkA-32(SP), R13
	SUBQ shrinkB-64(SP), BX
	DECQ AX
	JNZ  panel
	VMOVUPD Y0, 0(R10)
	VMOVUPD Y1, 32(R10)
	VMOVUPD Y2, 64(R10)
	VMOVUPD Y3, 96(R10)
	VMOVUPD Y4, 128(R10)
	VMOVUPD Y5, 160(R10)
	VMOVUPD Y6, 192(R10)
	VMOVUPD Y7, 224(R10)
	ADDQ $256, R10
	LEAQ (R14*4), CX
	ADDQ CX, startB-40(SP)
	SUBQ $4, DX
	JNZ  columns
	JMP  next

panel1init:
	VMOVUPD 0(R10), Y0
	VMOVUPD 32(R10), Y1

panel1:
	MOVQ Product_Width(R9), CX
	MOVQ R11, walkA-48(SP)
	MOVQ R12, walkB-56(SP)

unit1:
	VBROADCASTSD (R12), Y10
	VFNMADD231PD 0(R11), Y10, Y0
	VFNMADD231PD 32(R11), Y10, Y1
	ADDQ $64, R11
	ADDQ R8, R12
	DECQ CX
	JNZ  unit1
	MOVQ walkA-48(SP), R11
	MOVQ walkB-56(SP), R12
	ADDQ R13, R11
	ADDQ BX, R12
	SUBQ shrinkA-32(SP), R13
	SUBQ shrinkB-64(SP), BX
	DECQ AX
	JNZ  panel1
	VMOVUPD Y0, 0(R10)
	VMOVUPD Y1, 32(R10)
	ADDQ $64, R10
	ADDQ R14, startB-40(SP)
	DECQ DX
	JNZ  columns

next:
	MOVQ Product_CStep(R9), CX
	LEAQ (DI)(CX*8), DI
	MOVQ Product_AStep(R9), CX
	LEAQ (SI)(CX*8), SI
	DECQ blocks-24(SP)
	JNZ  block
	LDMXCSR mxcsr-8(SP)
	VZEROUPPER
	RET

#define PIVOT(o, z) \
	VBROADCASTSD o(SI), Y8 \
	VMULPD Y8, z, z

#define TERM(o, j, z) \
	VBROADCASTSD o(SI), Y8 \
	VFNMADD231PD Y8, j, z

// func solveRightAVX2(x, l *float64, blocks int)
//
// Four rows at a time: column k is Yk. The halves of blocks are independent of each other,
// so that their chains of operations overlap.
TEXT ·solveRightAVX2(SB), NOSPLIT, $16-24
	STMXCSR mxcsr-8(SP)
	MOVL mxcsr-8(SP), AX
	ORL  $0x8040, AX
	MOVL AX, flush-16(SP)
	LDMXCSR flush-16(SP)
	MOVQ x+0(FP), DI
	MOVQ l+8(FP), SI
	MOVQ blocks+16(FP), CX
	SHLQ $1, CX
	MOVQ $32, DX // to the other half of the block, then to the next block

half:
	VMOVUPD 0(DI), Y0
	VMOVUPD 64(DI), Y1
	VMOVUPD 128(DI), Y2
	VMOVUPD 192(DI), Y3
	VMOVUPD 256(DI), Y4
	VMOVUPD 320(DI), Y5
	VMOVUPD 384(DI), Y6
	VMOVUPD 448(DI), Y7
	PIVOT(0, Y0)
	TERM(8, Y0, Y1)
	TERM(16, Y0, Y2)
	TERM(24, Y0, Y3)
	TERM(32, Y0, Y4)
	TERM(40, Y0, Y5)
	TERM(48, Y0, Y6)
	TERM(56, Y0, Y7)
	PIVOT(72, Y1)
	TERM(80, Y1, Y2)
	TERM(88, Y1, Y3)
	TERM(96, Y1, Y4)
	TERM(104, Y1, Y5)
	TERM(112, Y1, Y6)
	TERM(120, Y1, Y7)
	PIVOT(144, Y2)
	TERM(152, Y2, Y3)
	TERM(160, Y2, Y4)
	TERM(168, Y2, Y5)
	TERM(176, Y2, Y6)
	TERM(184, Y2, Y7)
	PIVOT(216, Y3)
	TERM(224, Y3, Y4)
	TERM(232, Y3, Y5)
	TERM(240, Y3, Y6)
	TERM(248, Y3, Y7)
	PIVOT(288, Y4)
	TERM(296, Y4, Y5)
	TERM(304, Y4, Y6)
	TERM(312, Y4, Y7)
	PIVOT(360, Y5)
	TERM(368, Y5, Y6)
	TERM(376, Y5, Y7)
	PIVOT(432, Y6)
	TERM(440, Y6, Y7)
	PIVOT(504, Y7)
	VMOVUPD Y0, 0(DI)
	VMOVUPD Y1, 64(DI)
	VMOVUPD Y2, 128(DI)
	VMOVUPD Y3, 192(DI)
	VMOVUPD Y4, 256(DI)
	VMOVUPD Y5, 320(DI)
	VMOVUPD Y6, 384(DI)
	VMOVUPD Y7, 448(DI)
	ADDQ DX, DI
	XORQ $(32^480), DX
	DECQ CX
	JNZ  half
	LDMXCSR mxcsr-8(SP)
	VZEROUPPER
	RET

// func mulSubAVX2(y, p, x *float64, blocks, n int)
TEXT ·mulSubAVX2(SB), NOSPLIT, $0-40
	MOVQ y+0(FP), DI
	MOVQ p+8(FP), SI
	MOVQ x+16(FP), DX
	MOVQ blocks+24(FP), CX
	MOVQ n+32(FP), R8

block:
	VMOVUPD 0(DI), Y0
	VMOVUPD 32(DI), Y1
	XORQ    AX, AX

column:
	VBROADCASTSD (DX)(AX*8), Y2
	VFNMADD231PD 0(SI), Y2, Y0
	VFNMADD231PD 32(SI), Y2, Y1
	ADDQ $64, SI
	INCQ AX
	CMPQ AX, R8
	JLT  column
	VMOVUPD Y0, 0(DI)
	VMOVUPD Y1, 32(DI)
	ADDQ $64, DI
	DECQ CX
	JNZ  block
	VZEROUPPER
	RET

// Fold the eight lanes in lo, hi and add the sum to the value at s.
#define FOLD(lo, hi, xlo, s) \
	VADDPD       hi, lo, lo     \
	VEXTRACTF128 $1, lo, X15    \
	VADDPD       X15, xlo, xlo  \
	VPERMILPD    $1, xlo, X15   \
	VADDSD       X15, xlo, xlo  \
	VADDSD       s, xlo, xlo    \
	VMOVSD       xlo, s

// func mulTransSubAVX2(s, p, y *float64, blocks, n int)
//
// Four columns at a time, then single ones.
TEXT ·mulTransSubAVX2(SB), NOSPLIT, $0-40
	MOVQ s+0(FP), DI
	MOVQ p+8(FP), SI
	MOVQ y+16(FP), DX
	MOVQ blocks+24(FP), CX
	MOVQ n+32(FP), R8
	MOVQ R8, R9
	SHLQ $6, R9 // bytes in a block

columns:
	MOVQ SI, R10
	MOVQ DX, R11
	MOVQ CX, R12
	VXORPD Y0, Y0, Y0
	VXORPD Y1, Y1, Y1
	CMPQ R8, $4
	JLT  single
	VXORPD Y2, Y2, Y2
	VXORPD Y3, Y3, Y3
	VXORPD Y4, Y4, Y4
	VXORPD Y5, Y5, Y5
	VXORPD Y6, Y6, Y6
	VXORPD Y7, Y7, Y7

four:
	VMOVUPD 0(R11), Y8
	VMOVUPD 32(R11), Y9
	VFNMADD231PD 0(R10), Y8, Y0
	VFNMADD231PD 32(R10), Y9, Y1
	VFNMADD231PD 64(R10), Y8, Y2
	VFNMADD231PD 96(R10), Y9, Y3
	VFNMADD231PD 128(R10), Y8, Y4
	VFNMADD231PD 160(R10), Y9, Y5
	VFNMADD231PD 192(R10), Y8, Y6
	VFNMADD231PD 224(R10), Y9, Y7
	ADDQ $64, R11
	ADDQ R9, R10
	DECQ R12
	JNZ  four
	FOLD(Y0, Y1, X0, 0(DI))
	FOLD(Y2, Y3, X2, 8(DI))
	FOLD(Y4, Y5, X4, 16(DI))
	FOLD(Y6, Y7, X6, 24(DI))
	ADDQ $256, SI
	ADDQ $32, DI
	SUBQ $4, R8
	JNZ  columns
	VZEROUPPER
	RET

single:
	VMOVUPD 0(R11), Y8
	VMOVUPD 32(R11), Y9
	VFNMADD231PD 0(R10), Y8, Y0
	VFNMADD231PD 32(R10), Y9, Y1
	ADDQ $64, R11
	ADDQ R9, R10
	DECQ R12
	JNZ  single
	FOLD(Y0, Y1, X0, 0(DI))
	ADDQ $64, SI
	ADDQ $8, DI
	DECQ R8
	JNZ  columns
	VZEROUPPER
	RET
