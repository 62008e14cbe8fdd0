#include "textflag.h"

// Solving with the columns of one front, four at a time, for four right-hand
// sides: an unknown is one register. Columns that are missing in the last group
// are read as the first column again (offset 0) and count for nothing.
//
// SI: L, at the diagonal of the group; DI: the unknown of that row; BX: all
// unknowns; R8, R9, R10: offsets of columns 1 to 3; R11: columns left or first
// column of the group; R12: unknowns from DI on that are rows; R13: rows below.

DATA one<>+0(SB)/8, $1.0
GLOBL one<>(SB), RODATA|NOPTR, $8

// Inverses of the diagonal at (AX), (AX)(CX), (AX)(2CX), (R15).
#define INVERSES \
	MOVQ SI, AX; \
	MOVQ ld+24(FP), CX; \
	LEAQ 8(CX*8), CX; \
	CMPB unit+64(FP), $0; \
	JEQ  2(PC); \
	XORL CX, CX; \
	CMPB unit+64(FP), $0; \
	JEQ  2(PC); \
	LEAQ one<>(SB), AX; \
	LEAQ (AX)(CX*2), R15; \
	ADDQ CX, R15

// How many bytes ahead of the group at hand L is fetched: a group of columns is
// one piece of memory, and fronts stand in the order in which they are needed.
#define AHEAD 8192

// One row of L against one unknown.
#define SUBTRACT(x) \
	PREFETCHT0   AHEAD(R15);       \
	ADDQ         $32, R15;         \
	VBROADCASTSD (SI), Y5;         \
	VBROADCASTSD (SI)(R8*1), Y6;   \
	VBROADCASTSD (SI)(R9*1), Y7;   \
	VBROADCASTSD (SI)(R10*1), Y8;  \
	VMOVUPD      x, Y4;            \
	VMULPD       Y7, Y2, Y7;       \
	VFNMADD231PD Y5, Y0, Y4;       \
	VFMADD231PD  Y8, Y3, Y7;       \
	VFNMADD231PD Y6, Y1, Y4;       \
	VSUBPD       Y7, Y4, Y4;       \
	VMOVUPD      Y4, x;            \
	ADDQ         $8, SI

// func forwardFront(p, y, x *float64, ld, cols, own int, rows *int32, below int, unit bool)
TEXT ·forwardFront(SB), NOSPLIT, $0-65
	MOVQ p+0(FP), SI
	MOVQ y+8(FP), DI
	MOVQ x+16(FP), BX
	MOVQ cols+32(FP), R11
	MOVQ own+40(FP), R12
	MOVQ rows+48(FP), R13

group:
	MOVQ SI, R14
	INVERSES
	VXORPD Y1, Y1, Y1
	VXORPD Y2, Y2, Y2
	VXORPD Y3, Y3, Y3
	XORL   R8, R8
	XORL   R9, R9
	XORL   R10, R10
	VMOVUPD      (DI), Y0
	VBROADCASTSD (AX), Y4
	VMULPD       Y4, Y0, Y0
	VMOVUPD      Y0, (DI)
	CMPQ R11, $2
	JLT  solved1
	MOVQ ld+24(FP), R8
	SHLQ $3, R8
	VMOVUPD      32(DI), Y1
	VBROADCASTSD 8(SI), Y4
	VFNMADD231PD Y4, Y0, Y1
	VBROADCASTSD (AX)(CX*1), Y4
	VMULPD       Y4, Y1, Y1
	VMOVUPD      Y1, 32(DI)
	CMPQ R11, $2
	JEQ  solved2
	LEAQ (R8)(R8*1), R9
	VMOVUPD      64(DI), Y2
	VBROADCASTSD 16(SI), Y4
	VFNMADD231PD Y4, Y0, Y2
	VBROADCASTSD 16(SI)(R8*1), Y4
	VFNMADD231PD Y4, Y1, Y2
	VBROADCASTSD (AX)(CX*2), Y4
	VMULPD       Y4, Y2, Y2
	VMOVUPD      Y2, 64(DI)
	CMPQ R11, $3
	JEQ  solved3
	LEAQ (R8)(R8*2), R10
	VMOVUPD      96(DI), Y3
	VBROADCASTSD 24(SI), Y4
	VFNMADD231PD Y4, Y0, Y3
	VBROADCASTSD 24(SI)(R8*1), Y4
	VFNMADD231PD Y4, Y1, Y3
	VBROADCASTSD 24(SI)(R9*1), Y4
	VFNMADD231PD Y4, Y2, Y3
	VBROADCASTSD (R15), Y4
	VMULPD       Y4, Y3, Y3
	VMOVUPD      Y3, 96(DI)
	ADDQ $32, SI
	ADDQ $128, DI
	SUBQ $4, R12
	JMP  contiguous

solved1:
	ADDQ $8, SI
	ADDQ $32, DI
	SUBQ $1, R12
	JMP  contiguous

solved2:
	ADDQ $16, SI
	ADDQ $64, DI
	SUBQ $2, R12
	JMP  contiguous

solved3:
	ADDQ $24, SI
	ADDQ $96, DI
	SUBQ $3, R12

contiguous:
	MOVQ  R14, R15
	MOVQ  DI, DX
	MOVQ  R12, CX
	TESTQ CX, CX
	JZ    indexed

ownrow:
	SUBTRACT((DX))
	ADDQ $32, DX
	DECQ CX
	JNZ  ownrow

indexed:
	MOVQ  below+56(FP), CX
	TESTQ CX, CX
	JZ    nextgroup
	XORL  DX, DX

belowrow:
	MOVL (R13)(DX*4), AX
	SHLQ $5, AX
	SUBTRACT((BX)(AX*1))
	INCQ DX
	CMPQ DX, CX
	JLT  belowrow

nextgroup:
	// Four columns and rows on.
	MOVQ ld+24(FP), SI
	LEAQ 8(SI*8), SI
	LEAQ (R14)(SI*4), SI
	SUBQ $4, R11
	JGT  group
	VZEROUPPER
	RET

// Two rows of L, each with its unknown, into two sets of four sums.
#define COLLECT(x, s0, s1, s2, s3) \
	PREFETCHT0   -AHEAD(R15);      \
	ADDQ         $32, R15;         \
	VMOVUPD      x, Y8;            \
	VBROADCASTSD (SI), Y9;         \
	VBROADCASTSD (SI)(R8*1), Y10;  \
	VBROADCASTSD (SI)(R9*1), Y11;  \
	VBROADCASTSD (SI)(R10*1), Y12; \
	ADDQ         $8, SI;           \
	VFMADD231PD  Y9, Y8, s0;       \
	VFMADD231PD  Y10, Y8, s1;      \
	VFMADD231PD  Y11, Y8, s2;      \
	VFMADD231PD  Y12, Y8, s3

// func backwardFront(p, y, x *float64, ld, cols, own int, rows *int32, below int, unit bool)
TEXT ·backwardFront(SB), NOSPLIT, $0-65
	MOVQ x+16(FP), BX
	MOVQ rows+48(FP), R13
	// The last group of columns first.
	MOVQ cols+32(FP), R11
	DECQ R11
	ANDQ $~3, R11

group:
	MOVQ p+0(FP), SI
	MOVQ ld+24(FP), AX
	LEAQ 8(AX*8), AX
	IMULQ R11, AX
	ADDQ AX, SI
	MOVQ SI, R14
	MOVQ y+8(FP), DI
	MOVQ R11, AX
	SHLQ $5, AX
	ADDQ AX, DI
	MOVQ own+40(FP), R12
	SUBQ R11, R12

	// Offsets and number of the columns.
	XORL R8, R8
	XORL R9, R9
	XORL R10, R10
	MOVQ cols+32(FP), DX
	SUBQ R11, DX
	MOVL $4, AX
	CMPQ DX, AX
	CMOVQGT AX, DX
	MOVQ ld+24(FP), CX
	SHLQ $3, CX
	CMPQ DX, $2
	JLT  sums
	MOVQ CX, R8
	JEQ  sums
	LEAQ (CX)(CX*1), R9
	CMPQ DX, $4
	JLT  sums
	LEAQ (CX)(CX*2), R10

sums:
	MOVQ   R14, R15
	VXORPD Y0, Y0, Y0
	VXORPD Y1, Y1, Y1
	VXORPD Y2, Y2, Y2
	VXORPD Y3, Y3, Y3
	VXORPD Y4, Y4, Y4
	VXORPD Y5, Y5, Y5
	VXORPD Y6, Y6, Y6
	VXORPD Y7, Y7, Y7
	LEAQ (SI)(DX*8), SI
	MOVQ DX, CX
	SHLQ $5, CX
	ADDQ DI, CX
	SUBQ DX, R12
	SUBQ $2, R12
	JLT  ownlast

owntwo:
	COLLECT((CX), Y0, Y1, Y2, Y3)
	COLLECT(32(CX), Y4, Y5, Y6, Y7)
	ADDQ $64, CX
	SUBQ $2, R12
	JGE  owntwo

ownlast:
	ADDQ $2, R12
	JZ   indexed
	COLLECT((CX), Y0, Y1, Y2, Y3)

indexed:
	XORL R12, R12
	MOVQ below+56(FP), CX
	SUBQ $2, CX
	JLT  belowlast

belowtwo:
	MOVL (R13)(R12*4), AX
	SHLQ $5, AX
	COLLECT((BX)(AX*1), Y0, Y1, Y2, Y3)
	MOVL 4(R13)(R12*4), AX
	SHLQ $5, AX
	COLLECT((BX)(AX*1), Y4, Y5, Y6, Y7)
	ADDQ $2, R12
	SUBQ $2, CX
	JGE  belowtwo

belowlast:
	ADDQ $2, CX
	JZ   triangle
	MOVL (R13)(R12*4), AX
	SHLQ $5, AX
	COLLECT((BX)(AX*1), Y0, Y1, Y2, Y3)

triangle:
	MOVQ R14, SI
	INVERSES
	VADDPD Y4, Y0, Y0
	VADDPD Y5, Y1, Y1
	VADDPD Y6, Y2, Y2
	VADDPD Y7, Y3, Y3
	CMPQ DX, $2
	JLT  one
	JEQ  two
	CMPQ DX, $4
	JLT  three
	VMOVUPD      96(DI), Y4
	VSUBPD       Y3, Y4, Y3
	VBROADCASTSD (R15), Y5
	VMULPD       Y5, Y3, Y3
	VMOVUPD      Y3, 96(DI)
	VBROADCASTSD 24(SI), Y4
	VFMADD231PD  Y4, Y3, Y0
	VBROADCASTSD 24(SI)(R8*1), Y4
	VFMADD231PD  Y4, Y3, Y1
	VBROADCASTSD 24(SI)(R9*1), Y4
	VFMADD231PD  Y4, Y3, Y2

three:
	VMOVUPD      64(DI), Y4
	VSUBPD       Y2, Y4, Y2
	VBROADCASTSD (AX)(CX*2), Y5
	VMULPD       Y5, Y2, Y2
	VMOVUPD      Y2, 64(DI)
	VBROADCASTSD 16(SI), Y4
	VFMADD231PD  Y4, Y2, Y0
	VBROADCASTSD 16(SI)(R8*1), Y4
	VFMADD231PD  Y4, Y2, Y1

two:
	VMOVUPD      32(DI), Y4
	VSUBPD       Y1, Y4, Y1
	VBROADCASTSD (AX)(CX*1), Y5
	VMULPD       Y5, Y1, Y1
	VMOVUPD      Y1, 32(DI)
	VBROADCASTSD 8(SI), Y4
	VFMADD231PD  Y4, Y1, Y0

one:
	VMOVUPD      (DI), Y4
	VSUBPD       Y0, Y4, Y0
	VBROADCASTSD (AX), Y5
	VMULPD       Y5, Y0, Y0
	VMOVUPD      Y0, (DI)
	SUBQ $4, R11
	JGE  group
	VZEROUPPER
	RET
