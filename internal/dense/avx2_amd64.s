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
