//go:build amd64 && !purego

#include "textflag.h"
#include "go_asm.h"

// Bits 15 and 6 of MXCSR: results and operands below 2^-1022 count as zero.
#define FLUSH_SUBNORMALS(save, work) \
	STMXCSR save     \
	MOVL    save, AX \
	ORL     $0x8040, AX \
	MOVL    AX, work \
	LDMXCSR work

// One inner index: R11 at A(·,k) of two blocks, (R12) at B(0,k), displacement B(j,k) = b + 8j.
#define COLUMN(b, lo, hi) \
	VBROADCASTSD b, Z18          \
	VFNMADD231PD Z16, Z18, lo    \
	VFNMADD231PD Z17, Z18, hi

#define COLUMN1(b, lo) \
	VFNMADD231PD.BCST b, Z16, lo

#define UNIT(o) \
	VMOVUPD o(R11), Z16          \
	VMOVUPD o(R11)(R10*1), Z17   \
	COLUMN(o+0(R12), Z0, Z8)     \
	COLUMN(o+8(R12), Z1, Z9)     \
	COLUMN(o+16(R12), Z2, Z10)   \
	COLUMN(o+24(R12), Z3, Z11)   \
	COLUMN(o+32(R12), Z4, Z12)   \
	COLUMN(o+40(R12), Z5, Z13)   \
	COLUMN(o+48(R12), Z6, Z14)   \
	COLUMN(o+56(R12), Z7, Z15)

#define UNIT1(o) \
	VMOVUPD o(R11), Z16      \
	COLUMN1(o+0(R12), Z0)    \
	COLUMN1(o+8(R12), Z1)    \
	COLUMN1(o+16(R12), Z2)   \
	COLUMN1(o+24(R12), Z3)   \
	COLUMN1(o+32(R12), Z4)   \
	COLUMN1(o+40(R12), Z5)   \
	COLUMN1(o+48(R12), Z6)   \
	COLUMN1(o+56(R12), Z7)

#define LOAD_C(base, z0, z1, z2, z3, z4, z5, z6, z7) \
	VMOVUPD   0(base), z0       \
	VMOVUPD.Z 64(base), K1, z1  \
	VMOVUPD.Z 128(base), K2, z2 \
	VMOVUPD.Z 192(base), K3, z3 \
	VMOVUPD.Z 256(base), K4, z4 \
	VMOVUPD.Z 320(base), K5, z5 \
	VMOVUPD.Z 384(base), K6, z6 \
	VMOVUPD.Z 448(base), K7, z7

#define STORE_C(base, z0, z1, z2, z3, z4, z5, z6, z7) \
	VMOVUPD z0, 0(base)       \
	VMOVUPD z1, K1, 64(base)  \
	VMOVUPD z2, K2, 128(base) \
	VMOVUPD z3, K3, 192(base) \
	VMOVUPD z4, K4, 256(base) \
	VMOVUPD z5, K5, 320(base) \
	VMOVUPD z6, K6, 384(base) \
	VMOVUPD z7, K7, 448(base)

// func subtractAVX512(u *Product)
//
// DI C, SI A, R9 and R10 steps of C and A; R11 and R12 walk through A and B, DX four columns
// after R12; R8 step of k in B, R14 and R15 one and three steps of j in B; AX panels left,
// CX columns left in the panel, R13 and BX hops left.
TEXT ·subtractAVX512(SB), NOSPLIT, $72-8
	FLUSH_SUBNORMALS(mxcsr-8(SP), flush-16(SP))
	MOVQ u+0(FP), BX

	// Mask of column j: all ones if j < Cols.
	KXORW K1, K1, K1
	KXORW K2, K2, K2
	KXORW K3, K3, K3
	KXORW K4, K4, K4
	KXORW K5, K5, K5
	KXORW K6, K6, K6
	KXORW K7, K7, K7
	MOVQ  Product_Cols(BX), CX
	CMPQ  CX, $2
	JLT   masked
	KXNORW K1, K1, K1
	JEQ   masked
	KXNORW K2, K2, K2
	CMPQ  CX, $4
	JLT   masked
	KXNORW K3, K3, K3
	JEQ   masked
	KXNORW K4, K4, K4
	CMPQ  CX, $6
	JLT   masked
	KXNORW K5, K5, K5
	JEQ   masked
	KXNORW K6, K6, K6
	CMPQ  CX, $8
	JLT   masked
	KXNORW K7, K7, K7

masked:
	MOVQ Product_C(BX), DI
	MOVQ Product_A(BX), SI
	MOVQ Product_CStep(BX), R9
	MOVQ Product_AStep(BX), R10
	SHLQ $3, R9
	SHLQ $3, R10
	MOVQ Product_Blocks(BX), CX
	MOVQ CX, blocks-24(SP)
	MOVQ Product_AShrink(BX), CX
	SHLQ $3, CX
	MOVQ CX, shrinkA-32(SP)
	MOVQ Product_BShrink(BX), CX
	SHLQ $3, CX
	MOVQ CX, shrinkB-64(SP)
	MOVQ Product_Width(BX), CX
	MOVQ CX, width-40(SP)
	MOVQ Product_BCol(BX), R14
	SHLQ $3, R14
	LEAQ (R14)(R14*2), R15
	MOVQ Product_BRow(BX), R8
	SHLQ $3, R8

tile:
	MOVQ u+0(FP), CX
	MOVQ SI, R11
	MOVQ Product_B(CX), R12
	MOVQ Product_Panels(CX), AX
	MOVQ Product_AHop(CX), R13
	MOVQ Product_BHop(CX), BX
	SHLQ $3, R13
	SHLQ $3, BX
	CMPQ blocks-24(SP), $2
	JLT  tile1

	LOAD_C(DI, Z0, Z1, Z2, Z3, Z4, Z5, Z6, Z7)
	ADDQ R9, DI
	LOAD_C(DI, Z8, Z9, Z10, Z11, Z12, Z13, Z14, Z15)
	SUBQ R9, DI

	// The usual case, whole panels of a factor, has fixed distances.
	CMPQ width-40(SP), $8
	JNE  panel
	CMPQ R14, $8
	JNE  panel
	CMPQ R8, $64
	JNE  panel

whole:
	PREFETCHT0 (R11)(R13*1)
	PREFETCHT0 64(R11)(R13*1)
	PREFETCHT0 128(R11)(R13*1)
	PREFETCHT0 192(R11)(R13*1)
	UNIT(0)
	UNIT(64)
	UNIT(128)
	UNIT(192)
	UNIT(256)
	UNIT(320)
	UNIT(384)
	UNIT(448)
	ADDQ R13, R11
	ADDQ BX, R12
	SUBQ shrinkA-32(SP), R13
	SUBQ shrinkB-64(SP), BX
	DECQ AX
	JNZ  whole
	JMP  store

panel:
	MOVQ width-40(SP), CX
	MOVQ R11, walkA-48(SP)
	MOVQ R12, walkB-56(SP)
	LEAQ (R12)(R14*4), DX

unit:
	VMOVUPD (R11), Z16
	VMOVUPD (R11)(R10*1), Z17
	COLUMN((R12), Z0, Z8)
	COLUMN((R12)(R14*1), Z1, Z9)
	COLUMN((R12)(R14*2), Z2, Z10)
	COLUMN((R12)(R15*1), Z3, Z11)
	COLUMN((DX), Z4, Z12)
	COLUMN((DX)(R14*1), Z5, Z13)
	COLUMN((DX)(R14*2), Z6, Z14)
	COLUMN((DX)(R15*1), Z7, Z15)
	ADDQ $64, R11
	ADDQ R8, R12
	ADDQ R8, DX
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

store:
	STORE_C(DI, Z0, Z1, Z2, Z3, Z4, Z5, Z6, Z7)
	ADDQ R9, DI
	STORE_C(DI, Z8, Z9, Z10, Z11, Z12, Z13, Z14, Z15)
	ADDQ R9, DI
	LEAQ (SI)(R10*2), SI
	SUBQ $2, blocks-24(SP)
	JNZ  tile
	JMP  done

tile1: // the last block, alone
	LOAD_C(DI, Z0, Z1, Z2, Z3, Z4, Z5, Z6, Z7)
	CMPQ width-40(SP), $8
	JNE  panel1
	CMPQ R14, $8
	JNE  panel1
	CMPQ R8, $64
	JNE  panel1

whole1:
	UNIT1(0)
	UNIT1(64)
	UNIT1(128)
	UNIT1(192)
	UNIT1(256)
	UNIT1(320)
	UNIT1(384)
	UNIT1(448)
	ADDQ R13, R11
	ADDQ BX, R12
	SUBQ shrinkA-32(SP), R13
	SUBQ shrinkB-64(SP), BX
	DECQ AX
	JNZ  whole1
	JMP  store1

panel1:
	MOVQ width-40(SP), CX
	MOVQ R11, walkA-48(SP)
	MOVQ R12, walkB-56(SP)
	LEAQ (R12)(R14*4), DX

unit1:
	VMOVUPD (R11), Z16
	COLUMN1((R12), Z0)
	COLUMN1((R12)(R14*1), Z1)
	COLUMN1((R12)(R14*2), Z2)
	COLUMN1((R12)(R15*1), Z3)
	COLUMN1((DX), Z4)
	COLUMN1((DX)(R14*1), Z5)
	COLUMN1((DX)(R14*2), Z6)
	COLUMN1((DX)(R15*1), Z7)
	ADDQ $64, R11
	ADDQ R8, R12
	ADDQ R8, DX
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

store1:
	STORE_C(DI, Z0, Z1, Z2, Z3, Z4, Z5, Z6, Z7)

done:
	LDMXCSR mxcsr-8(SP)
	VZEROUPPER
	RET

// Scale column j, whose earlier terms are in, and subtract it from column k.
#define PIVOT(o, lo, hi) \
	VBROADCASTSD o(SI), Z16 \
	VMULPD Z16, lo, lo      \
	VMULPD Z16, hi, hi

#define TERM(o, jlo, jhi, lo, hi) \
	VBROADCASTSD o(SI), Z16    \
	VFNMADD231PD Z16, jlo, lo  \
	VFNMADD231PD Z16, jhi, hi

// func solveRightAVX512(x, l *float64, blocks int)
TEXT ·solveRightAVX512(SB), NOSPLIT, $16-24
	FLUSH_SUBNORMALS(mxcsr-8(SP), flush-16(SP))
	MOVQ x+0(FP), DI
	MOVQ l+8(FP), SI
	MOVQ blocks+16(FP), CX

pair: // two blocks at a time hide the latency; an odd last block is paired with itself
	MOVQ DI, DX
	CMPQ CX, $2
	JLT  alone
	ADDQ $512, DX

alone:
	VMOVUPD 0(DI), Z0
	VMOVUPD 64(DI), Z1
	VMOVUPD 128(DI), Z2
	VMOVUPD 192(DI), Z3
	VMOVUPD 256(DI), Z4
	VMOVUPD 320(DI), Z5
	VMOVUPD 384(DI), Z6
	VMOVUPD 448(DI), Z7
	VMOVUPD 0(DX), Z8
	VMOVUPD 64(DX), Z9
	VMOVUPD 128(DX), Z10
	VMOVUPD 192(DX), Z11
	VMOVUPD 256(DX), Z12
	VMOVUPD 320(DX), Z13
	VMOVUPD 384(DX), Z14
	VMOVUPD 448(DX), Z15
	PIVOT(0, Z0, Z8)
	TERM(8, Z0, Z8, Z1, Z9)
	TERM(16, Z0, Z8, Z2, Z10)
	TERM(24, Z0, Z8, Z3, Z11)
	TERM(32, Z0, Z8, Z4, Z12)
	TERM(40, Z0, Z8, Z5, Z13)
	TERM(48, Z0, Z8, Z6, Z14)
	TERM(56, Z0, Z8, Z7, Z15)
	PIVOT(72, Z1, Z9)
	TERM(80, Z1, Z9, Z2, Z10)
	TERM(88, Z1, Z9, Z3, Z11)
	TERM(96, Z1, Z9, Z4, Z12)
	TERM(104, Z1, Z9, Z5, Z13)
	TERM(112, Z1, Z9, Z6, Z14)
	TERM(120, Z1, Z9, Z7, Z15)
	PIVOT(144, Z2, Z10)
	TERM(152, Z2, Z10, Z3, Z11)
	TERM(160, Z2, Z10, Z4, Z12)
	TERM(168, Z2, Z10, Z5, Z13)
	TERM(176, Z2, Z10, Z6, Z14)
	TERM(184, Z2, Z10, Z7, Z15)
	PIVOT(216, Z3, Z11)
	TERM(224, Z3, Z11, Z4, Z12)
	TERM(232, Z3, Z11, Z5, Z13)
	TERM(240, Z3, Z11, Z6, Z14)
	TERM(248, Z3, Z11, Z7, Z15)
	PIVOT(288, Z4, Z12)
	TERM(296, Z4, Z12, Z5, Z13)
	TERM(304, Z4, Z12, Z6, Z14)
	TERM(312, Z4, Z12, Z7, Z15)
	PIVOT(360, Z5, Z13)
	TERM(368, Z5, Z13, Z6, Z14)
	TERM(376, Z5, Z13, Z7, Z15)
	PIVOT(432, Z6, Z14)
	TERM(440, Z6, Z14, Z7, Z15)
	PIVOT(504, Z7, Z15)
	VMOVUPD Z0, 0(DI)
	VMOVUPD Z1, 64(DI)
	VMOVUPD Z2, 128(DI)
	VMOVUPD Z3, 192(DI)
	VMOVUPD Z4, 256(DI)
	VMOVUPD Z5, 320(DI)
	VMOVUPD Z6, 384(DI)
	VMOVUPD Z7, 448(DI)
	VMOVUPD Z8, 0(DX)
	VMOVUPD Z9, 64(DX)
	VMOVUPD Z10, 128(DX)
	VMOVUPD Z11, 192(DX)
	VMOVUPD Z12, 256(DX)
	VMOVUPD Z13, 320(DX)
	VMOVUPD Z14, 384(DX)
	VMOVUPD Z15, 448(DX)
	ADDQ $1024, DI
	SUBQ $2, CX
	JGT  pair
	LDMXCSR mxcsr-8(SP)
	VZEROUPPER
	RET

#define SCALE1(o, z) \
	VMULPD.BCST o(SI), z, z

#define TERM1(o, zk, z) \
	VFNMADD231PD.BCST o(SI), zk, z

// func solveRightTransAVX512(x, l *float64)
TEXT ·solveRightTransAVX512(SB), NOSPLIT, $16-16
	FLUSH_SUBNORMALS(mxcsr-8(SP), flush-16(SP))
	MOVQ x+0(FP), DI
	MOVQ l+8(FP), SI
	VMOVUPD 0(DI), Z0
	VMOVUPD 64(DI), Z1
	VMOVUPD 128(DI), Z2
	VMOVUPD 192(DI), Z3
	VMOVUPD 256(DI), Z4
	VMOVUPD 320(DI), Z5
	VMOVUPD 384(DI), Z6
	VMOVUPD 448(DI), Z7
	SCALE1(504, Z7)
	TERM1(440, Z7, Z6)
	TERM1(376, Z7, Z5)
	TERM1(312, Z7, Z4)
	TERM1(248, Z7, Z3)
	TERM1(184, Z7, Z2)
	TERM1(120, Z7, Z1)
	TERM1(56, Z7, Z0)
	SCALE1(432, Z6)
	TERM1(368, Z6, Z5)
	TERM1(304, Z6, Z4)
	TERM1(240, Z6, Z3)
	TERM1(176, Z6, Z2)
	TERM1(112, Z6, Z1)
	TERM1(48, Z6, Z0)
	SCALE1(360, Z5)
	TERM1(296, Z5, Z4)
	TERM1(232, Z5, Z3)
	TERM1(168, Z5, Z2)
	TERM1(104, Z5, Z1)
	TERM1(40, Z5, Z0)
	SCALE1(288, Z4)
	TERM1(224, Z4, Z3)
	TERM1(160, Z4, Z2)
	TERM1(96, Z4, Z1)
	TERM1(32, Z4, Z0)
	SCALE1(216, Z3)
	TERM1(152, Z3, Z2)
	TERM1(88, Z3, Z1)
	TERM1(24, Z3, Z0)
	SCALE1(144, Z2)
	TERM1(80, Z2, Z1)
	TERM1(16, Z2, Z0)
	SCALE1(72, Z1)
	TERM1(8, Z1, Z0)
	SCALE1(0, Z0)
	VMOVUPD Z0, 0(DI)
	VMOVUPD Z1, 64(DI)
	VMOVUPD Z2, 128(DI)
	VMOVUPD Z3, 192(DI)
	VMOVUPD Z4, 256(DI)
	VMOVUPD Z5, 320(DI)
	VMOVUPD Z6, 384(DI)
	VMOVUPD Z7, 448(DI)
	LDMXCSR mxcsr-8(SP)
	VZEROUPPER
	RET

// func mulSubAVX512(y, p, x *float64, blocks, n int)
TEXT ·mulSubAVX512(SB), NOSPLIT, $0-40
	MOVQ y+0(FP), DI
	MOVQ p+8(FP), SI
	MOVQ x+16(FP), DX
	MOVQ blocks+24(FP), CX
	MOVQ n+32(FP), R8
	CMPQ R8, $8
	JNE  narrow
	VBROADCASTSD 0(DX), Z8
	VBROADCASTSD 8(DX), Z9
	VBROADCASTSD 16(DX), Z10
	VBROADCASTSD 24(DX), Z11
	VBROADCASTSD 32(DX), Z12
	VBROADCASTSD 40(DX), Z13
	VBROADCASTSD 48(DX), Z14
	VBROADCASTSD 56(DX), Z15

eight:
	VMOVUPD (DI), Z0
	VFNMADD231PD 0(SI), Z8, Z0
	VFNMADD231PD 64(SI), Z9, Z0
	VFNMADD231PD 128(SI), Z10, Z0
	VFNMADD231PD 192(SI), Z11, Z0
	VFNMADD231PD 256(SI), Z12, Z0
	VFNMADD231PD 320(SI), Z13, Z0
	VFNMADD231PD 384(SI), Z14, Z0
	VFNMADD231PD 448(SI), Z15, Z0
	VMOVUPD Z0, (DI)
	ADDQ $64, DI
	ADDQ $512, SI
	DECQ CX
	JNZ  eight
	VZEROUPPER
	RET

narrow:
	VMOVUPD (DI), Z0
	XORQ    AX, AX

column:
	VMOVUPD (SI), Z1
	VFNMADD231PD.BCST (DX)(AX*8), Z1, Z0
	ADDQ $64, SI
	INCQ AX
	CMPQ AX, R8
	JLT  column
	VMOVUPD Z0, (DI)
	ADDQ $64, DI
	DECQ CX
	JNZ  narrow
	VZEROUPPER
	RET

// Fold the eight lanes of z and add the sum to the value at s. Uses X30, X31.
#define FOLD(z, y, x, s) \
	VEXTRACTF64X4 $1, z, Y31     \
	VADDPD        Y31, y, Y30    \
	VEXTRACTF64X2 $1, Y30, X31   \
	VADDPD        X31, X30, X30  \
	VPERMILPD     $1, X30, X31   \
	VADDSD        X31, X30, X30  \
	VADDSD        s, X30, X30    \
	VMOVSD        X30, s

// func mulTransSubAVX512(s, p, y *float64, blocks, n int)
TEXT ·mulTransSubAVX512(SB), NOSPLIT, $0-40
	MOVQ s+0(FP), DI
	MOVQ p+8(FP), SI
	MOVQ y+16(FP), DX
	MOVQ blocks+24(FP), CX
	MOVQ n+32(FP), R8
	CMPQ R8, $8
	JNE  narrow
	VPXORQ Z0, Z0, Z0
	VPXORQ Z1, Z1, Z1
	VPXORQ Z2, Z2, Z2
	VPXORQ Z3, Z3, Z3
	VPXORQ Z4, Z4, Z4
	VPXORQ Z5, Z5, Z5
	VPXORQ Z6, Z6, Z6
	VPXORQ Z7, Z7, Z7

eight:
	VMOVUPD (DX), Z8
	VFNMADD231PD 0(SI), Z8, Z0
	VFNMADD231PD 64(SI), Z8, Z1
	VFNMADD231PD 128(SI), Z8, Z2
	VFNMADD231PD 192(SI), Z8, Z3
	VFNMADD231PD 256(SI), Z8, Z4
	VFNMADD231PD 320(SI), Z8, Z5
	VFNMADD231PD 384(SI), Z8, Z6
	VFNMADD231PD 448(SI), Z8, Z7
	ADDQ $64, DX
	ADDQ $512, SI
	DECQ CX
	JNZ  eight
	FOLD(Z0, Y0, X0, 0(DI))
	FOLD(Z1, Y1, X1, 8(DI))
	FOLD(Z2, Y2, X2, 16(DI))
	FOLD(Z3, Y3, X3, 24(DI))
	FOLD(Z4, Y4, X4, 32(DI))
	FOLD(Z5, Y5, X5, 40(DI))
	FOLD(Z6, Y6, X6, 48(DI))
	FOLD(Z7, Y7, X7, 56(DI))
	VZEROUPPER
	RET

narrow:
	MOVQ R8, R9
	SHLQ $6, R9 // bytes in a block

column:
	VPXORQ Z0, Z0, Z0
	MOVQ SI, R10
	MOVQ DX, R11
	MOVQ CX, R12

block:
	VMOVUPD (R11), Z8
	VFNMADD231PD (R10), Z8, Z0
	ADDQ $64, R11
	ADDQ R9, R10
	DECQ R12
	JNZ  block
	FOLD(Z0, Y0, X0, 0(DI))
	ADDQ $64, SI
	ADDQ $8, DI
	DECQ R8
	JNZ  column
	VZEROUPPER
	RET
