#include "textflag.h"

// mulSubStrip once more for processors with AVX-512: up to 24 rows of four
// columns in twelve registers (Z0 to Z11: column j in Z3j, Z3j+1, Z3j+2), three
// loads of A and four broadcasts of B per step of k. Sums run as in the other
// kernel, so that the bits are the same.

// Four columns of B, one row.
#define BROADCAST4 \
	VBROADCASTSD (BX), Z15;   \
	VBROADCASTSD 8(BX), Z16;  \
	VBROADCASTSD 16(BX), Z17; \
	VBROADCASTSD 24(BX), Z18; \
	ADDQ         R10, BX

#define TIMES(a, c0, c1, c2, c3) \
	VFNMADD231PD a, Z15, c0; \
	VFNMADD231PD a, Z16, c1; \
	VFNMADD231PD a, Z17, c2; \
	VFNMADD231PD a, Z18, c3

// One column of C at p: rows of a, b full, those of last under mask K1; added to
// what is there under K2 (full) and K3 (last).
#define STORE1(p, last) \
	VADDPD  (p), last, K3, last; \
	VMOVUPD last, K1, (p)

#define STORE2(p, a, last) \
	VADDPD  (p), a, K2, a;          \
	VMOVUPD a, (p);                 \
	VADDPD  64(p), last, K3, last;  \
	VMOVUPD last, K1, 64(p)

#define STORE3(p, a, b, last) \
	VADDPD  (p), a, K2, a;          \
	VMOVUPD a, (p);                 \
	VADDPD  64(p), b, K2, b;        \
	VMOVUPD b, 64(p);               \
	VADDPD  128(p), last, K3, last; \
	VMOVUPD last, K1, 128(p)

// Sums of a block of 8, 16 or 24 rows: −A·Bᵀ from A at SI and B at DX, CX ≥ 1
// steps of k.
TEXT products1<>(SB), NOSPLIT|NOFRAME, $0-0
	MOVQ SI, AX
	MOVQ DX, BX
	VPXORQ Z0, Z0, Z0
	VPXORQ Z3, Z3, Z3
	VPXORQ Z6, Z6, Z6
	VPXORQ Z9, Z9, Z9

loop1:
	VMOVUPD (AX), Z12
	BROADCAST4
	ADDQ R9, AX
	TIMES(Z12, Z0, Z3, Z6, Z9)
	DECQ CX
	JNZ  loop1
	RET

TEXT products2<>(SB), NOSPLIT|NOFRAME, $0-0
	MOVQ SI, AX
	MOVQ DX, BX
	VPXORQ Z0, Z0, Z0
	VPXORQ Z1, Z1, Z1
	VPXORQ Z3, Z3, Z3
	VPXORQ Z4, Z4, Z4
	VPXORQ Z6, Z6, Z6
	VPXORQ Z7, Z7, Z7
	VPXORQ Z9, Z9, Z9
	VPXORQ Z10, Z10, Z10

loop2:
	VMOVUPD (AX), Z12
	VMOVUPD (AX)(R12*1), Z13
	BROADCAST4
	ADDQ R9, AX
	TIMES(Z12, Z0, Z3, Z6, Z9)
	TIMES(Z13, Z1, Z4, Z7, Z10)
	DECQ CX
	JNZ  loop2
	RET

TEXT products3<>(SB), NOSPLIT|NOFRAME, $0-0
	MOVQ SI, AX
	MOVQ DX, BX
	VPXORQ Z0, Z0, Z0
	VPXORQ Z1, Z1, Z1
	VPXORQ Z2, Z2, Z2
	VPXORQ Z3, Z3, Z3
	VPXORQ Z4, Z4, Z4
	VPXORQ Z5, Z5, Z5
	VPXORQ Z6, Z6, Z6
	VPXORQ Z7, Z7, Z7
	VPXORQ Z8, Z8, Z8
	VPXORQ Z9, Z9, Z9
	VPXORQ Z10, Z10, Z10
	VPXORQ Z11, Z11, Z11

loop3:
	VMOVUPD (AX), Z12
	VMOVUPD (AX)(R12*1), Z13
	VMOVUPD (AX)(R12*2), Z14
	BROADCAST4
	ADDQ R9, AX
	TIMES(Z12, Z0, Z3, Z6, Z9)
	TIMES(Z13, Z1, Z4, Z7, Z10)
	TIMES(Z14, Z2, Z5, Z8, Z11)
	DECQ CX
	JNZ  loop3
	RET

// func mulSubStrip512(c, a, b *float64, ldc, lda, ldb, m, n, k, step, fresh int)
// Reads up to seven entries beyond column ends of A and three beyond those of B.
TEXT ·mulSubStrip512(SB), NOSPLIT, $0-88
	MOVQ c+0(FP), DI
	MOVQ a+8(FP), SI
	MOVQ b+16(FP), DX
	MOVQ ldc+24(FP), R8
	SHLQ $3, R8
	MOVQ lda+32(FP), R9
	SHLQ $3, R9
	MOVQ ldb+40(FP), R10
	SHLQ $3, R10
	MOVQ m+48(FP), R11
	MOVQ n+56(FP), R13
	MOVQ step+72(FP), R12
	SHLQ $3, R12

	// All of K2 if C is there already, nothing if fresh.
	MOVQ  fresh+80(FP), AX
	TESTQ AX, AX
	SETEQ AX
	MOVBQZX AX, AX
	NEGQ  AX
	KMOVW AX, K2
	CMPQ  R11, $24
	JLT   last

	// 24 rows.
	MOVL  $0xff, CX
	KMOVW CX, K1
	KMOVW K2, K3

block:
	MOVQ k+64(FP), CX
	CALL products3<>(SB)
	STORE3(DI, Z0, Z1, Z2)
	CMPQ R13, $2
	JLT  next
	LEAQ (DI)(R8*1), AX
	STORE3(AX, Z3, Z4, Z5)
	JEQ  next
	ADDQ R8, AX
	STORE3(AX, Z6, Z7, Z8)
	CMPQ R13, $4
	JLT  next
	ADDQ R8, AX
	STORE3(AX, Z9, Z10, Z11)

next:
	LEAQ (SI)(R12*2), SI
	ADDQ R12, SI
	ADDQ $192, DI
	SUBQ $24, R11
	CMPQ R11, $24
	JGE  block

last:
	TESTQ R11, R11
	JZ    done

	// One to 23 rows: (R11+7)/8 registers a column, the last of them masked.
	MOVQ  R11, CX
	NEGQ  CX
	ANDQ  $7, CX
	MOVL  $0xff, AX
	SHRL  CX, AX
	KMOVW AX, K1
	KANDW K1, K2, K3
	CMPQ  R11, $16
	JGT   three
	CMPQ  R11, $8
	JGT   two

	MOVQ k+64(FP), CX
	CALL products1<>(SB)
	STORE1(DI, Z0)
	CMPQ R13, $2
	JLT  done
	LEAQ (DI)(R8*1), AX
	STORE1(AX, Z3)
	JEQ  done
	ADDQ R8, AX
	STORE1(AX, Z6)
	CMPQ R13, $4
	JLT  done
	ADDQ R8, AX
	STORE1(AX, Z9)

done:
	VZEROUPPER
	RET

two:
	MOVQ k+64(FP), CX
	CALL products2<>(SB)
	STORE2(DI, Z0, Z1)
	CMPQ R13, $2
	JLT  done
	LEAQ (DI)(R8*1), AX
	STORE2(AX, Z3, Z4)
	JEQ  done
	ADDQ R8, AX
	STORE2(AX, Z6, Z7)
	CMPQ R13, $4
	JLT  done
	ADDQ R8, AX
	STORE2(AX, Z9, Z10)
	JMP  done

three:
	MOVQ k+64(FP), CX
	CALL products3<>(SB)
	STORE3(DI, Z0, Z1, Z2)
	CMPQ R13, $2
	JLT  done
	LEAQ (DI)(R8*1), AX
	STORE3(AX, Z3, Z4, Z5)
	JEQ  done
	ADDQ R8, AX
	STORE3(AX, Z6, Z7, Z8)
	CMPQ R13, $4
	JLT  done
	ADDQ R8, AX
	STORE3(AX, Z9, Z10, Z11)
	JMP  done

// func scaleStrip512(c, t *float64, ldc, ldt, m, n int)
// Solves X·Tᵀ = C in place for m ≥ 1 rows of 1 ≤ n ≤ 4 columns, eight rows at a
// time; T is n×n, lower triangular, its diagonal inverted.
TEXT ·scaleStrip512(SB), NOSPLIT, $0-48
	MOVQ c+0(FP), DI
	MOVQ t+8(FP), SI
	MOVQ ldc+16(FP), R8
	SHLQ $3, R8
	MOVQ ldt+24(FP), R9
	SHLQ $3, R9
	MOVQ m+32(FP), CX
	MOVQ n+40(FP), R13
	LEAQ (R8)(R8*2), R10
	LEAQ (R9)(R9*2), R11
	MOVL  $0xff, AX
	KMOVW AX, K1
	VBROADCASTSD (SI), Z4
	CMPQ R13, $2
	JLT  scale
	VBROADCASTSD 8(SI), Z5
	VBROADCASTSD 8(SI)(R9*1), Z6
	JEQ  scale
	VBROADCASTSD 16(SI), Z7
	VBROADCASTSD 16(SI)(R9*1), Z8
	VBROADCASTSD 16(SI)(R9*2), Z9
	CMPQ R13, $4
	JLT  scale
	VBROADCASTSD 24(SI), Z10
	VBROADCASTSD 24(SI)(R9*1), Z11
	VBROADCASTSD 24(SI)(R9*2), Z12
	VBROADCASTSD 24(SI)(R11*1), Z13

scale:
	CMPQ CX, $8
	JGE  rows
	MOVL $8, DX
	SUBL CX, DX
	MOVL $0xff, AX
	XCHGQ CX, DX
	SHRL CX, AX
	XCHGQ CX, DX
	KMOVW AX, K1

rows:
	VMULPD.Z (DI), Z4, K1, Z0
	VMOVUPD  Z0, K1, (DI)
	CMPQ R13, $2
	JLT  next
	VMOVUPD.Z    (DI)(R8*1), K1, Z1
	VFNMADD231PD Z0, Z5, Z1
	VMULPD       Z1, Z6, Z1
	VMOVUPD      Z1, K1, (DI)(R8*1)
	JEQ  next
	VMOVUPD.Z    (DI)(R8*2), K1, Z2
	VFNMADD231PD Z0, Z7, Z2
	VFNMADD231PD Z1, Z8, Z2
	VMULPD       Z2, Z9, Z2
	VMOVUPD      Z2, K1, (DI)(R8*2)
	CMPQ R13, $4
	JLT  next
	VMOVUPD.Z    (DI)(R10*1), K1, Z3
	VFNMADD231PD Z0, Z10, Z3
	VFNMADD231PD Z1, Z11, Z3
	VFNMADD231PD Z2, Z12, Z3
	VMULPD       Z3, Z13, Z3
	VMOVUPD      Z3, K1, (DI)(R10*1)

next:
	ADDQ $64, DI
	SUBQ $8, CX
	JGT  scale
	VZEROUPPER
	RET
