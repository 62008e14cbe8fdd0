#include "textflag.h"

// The one loop that everything large goes through: a strip of C of at most
// four columns, eight rows at a time, C −= A·Bᵀ. Eight accumulators of four
// rows each (Y0 to Y7: column j in Y2j, Y2j+1) take two loads of A and four
// broadcasts of B per step of k.

// func mulSubStrip(c, a, b *float64, ldc, lda, ldb, m, n, k, step, fresh int)
// Reads up to seven entries beyond column ends of A and three beyond those of B.
TEXT ·mulSubStrip(SB), NOSPLIT, $0-88
	CMPB ·haveWide(SB), $0
	JNE  wide
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

block:
	VXORPD Y0, Y0, Y0
	VXORPD Y1, Y1, Y1
	VXORPD Y2, Y2, Y2
	VXORPD Y3, Y3, Y3
	VXORPD Y4, Y4, Y4
	VXORPD Y5, Y5, Y5
	VXORPD Y6, Y6, Y6
	VXORPD Y7, Y7, Y7
	MOVQ SI, AX
	MOVQ DX, BX
	MOVQ k+64(FP), CX
	SHRQ $1, CX
	JZ   odd

pair:
	VMOVUPD      (AX), Y8
	VMOVUPD      32(AX), Y9
	VBROADCASTSD (BX), Y10
	VBROADCASTSD 8(BX), Y11
	VFNMADD231PD Y8, Y10, Y0
	VFNMADD231PD Y9, Y10, Y1
	VFNMADD231PD Y8, Y11, Y2
	VFNMADD231PD Y9, Y11, Y3
	VBROADCASTSD 16(BX), Y10
	VBROADCASTSD 24(BX), Y11
	ADDQ         R9, AX
	ADDQ         R10, BX
	VFNMADD231PD Y8, Y10, Y4
	VFNMADD231PD Y9, Y10, Y5
	VFNMADD231PD Y8, Y11, Y6
	VFNMADD231PD Y9, Y11, Y7
	VMOVUPD      (AX), Y12
	VMOVUPD      32(AX), Y13
	VBROADCASTSD (BX), Y14
	VBROADCASTSD 8(BX), Y15
	VFNMADD231PD Y12, Y14, Y0
	VFNMADD231PD Y13, Y14, Y1
	VFNMADD231PD Y12, Y15, Y2
	VFNMADD231PD Y13, Y15, Y3
	VBROADCASTSD 16(BX), Y14
	VBROADCASTSD 24(BX), Y15
	ADDQ         R9, AX
	ADDQ         R10, BX
	VFNMADD231PD Y12, Y14, Y4
	VFNMADD231PD Y13, Y14, Y5
	VFNMADD231PD Y12, Y15, Y6
	VFNMADD231PD Y13, Y15, Y7
	DECQ         CX
	JNZ          pair

odd:
	TESTQ $1, k+64(FP)
	JZ    finish
	VMOVUPD      (AX), Y8
	VMOVUPD      32(AX), Y9
	VBROADCASTSD (BX), Y10
	VBROADCASTSD 8(BX), Y11
	VFNMADD231PD Y8, Y10, Y0
	VFNMADD231PD Y9, Y10, Y1
	VFNMADD231PD Y8, Y11, Y2
	VFNMADD231PD Y9, Y11, Y3
	VBROADCASTSD 16(BX), Y10
	VBROADCASTSD 24(BX), Y11
	VFNMADD231PD Y8, Y10, Y4
	VFNMADD231PD Y9, Y10, Y5
	VFNMADD231PD Y8, Y11, Y6
	VFNMADD231PD Y9, Y11, Y7

finish:
	// The sums are −A·Bᵀ. CX and BX: columns 2 and 3.
	LEAQ (DI)(R8*2), CX
	LEAQ (CX)(R8*1), BX
	CMPQ R11, $8
	JLT  tail
	CMPQ fresh+80(FP), $0
	JNE  put
	VADDPD (DI), Y0, Y0
	VADDPD 32(DI), Y1, Y1
	CMPQ   R13, $2
	JLT    put
	VADDPD (DI)(R8*1), Y2, Y2
	VADDPD 32(DI)(R8*1), Y3, Y3
	JEQ    put
	VADDPD (CX), Y4, Y4
	VADDPD 32(CX), Y5, Y5
	CMPQ   R13, $4
	JLT    put
	VADDPD (BX), Y6, Y6
	VADDPD 32(BX), Y7, Y7

put:
	VMOVUPD Y0, (DI)
	VMOVUPD Y1, 32(DI)
	CMPQ    R13, $2
	JLT     next
	VMOVUPD Y2, (DI)(R8*1)
	VMOVUPD Y3, 32(DI)(R8*1)
	JEQ     next
	VMOVUPD Y4, (CX)
	VMOVUPD Y5, 32(CX)
	CMPQ    R13, $4
	JLT     next
	VMOVUPD Y6, (BX)
	VMOVUPD Y7, 32(BX)

next:
	ADDQ R12, SI
	ADDQ $64, DI
	SUBQ $8, R11
	JNZ  block
	VZEROUPPER
	RET

	// Fewer than eight rows: four, two and one.
tail:
	TESTQ $4, R11
	JZ    two
	CMPQ  fresh+80(FP), $0
	JNE   put4
	VADDPD (DI), Y0, Y0
	CMPQ   R13, $2
	JLT    put4
	VADDPD (DI)(R8*1), Y2, Y2
	JEQ    put4
	VADDPD (CX), Y4, Y4
	CMPQ   R13, $4
	JLT    put4
	VADDPD (BX), Y6, Y6

put4:
	VMOVUPD Y0, (DI)
	CMPQ    R13, $2
	JLT     shift4
	VMOVUPD Y2, (DI)(R8*1)
	JEQ     shift4
	VMOVUPD Y4, (CX)
	CMPQ    R13, $4
	JLT     shift4
	VMOVUPD Y6, (BX)

shift4:
	VMOVAPD Y1, Y0
	VMOVAPD Y3, Y2
	VMOVAPD Y5, Y4
	VMOVAPD Y7, Y6
	ADDQ    $32, DI
	ADDQ    $32, CX
	ADDQ    $32, BX

two:
	TESTQ $2, R11
	JZ    one
	CMPQ  fresh+80(FP), $0
	JNE   put2
	VADDPD (DI), X0, X8
	CMPQ   R13, $2
	JLT    part2
	VADDPD (DI)(R8*1), X2, X9
	JEQ    part2
	VADDPD (CX), X4, X10
	CMPQ   R13, $4
	JLT    part2
	VADDPD (BX), X6, X11
	JMP    part2

put2:
	VMOVAPD X0, X8
	VMOVAPD X2, X9
	VMOVAPD X4, X10
	VMOVAPD X6, X11

part2:
	VMOVUPD X8, (DI)
	CMPQ    R13, $2
	JLT     shift2
	VMOVUPD X9, (DI)(R8*1)
	JEQ     shift2
	VMOVUPD X10, (CX)
	CMPQ    R13, $4
	JLT     shift2
	VMOVUPD X11, (BX)

shift2:
	VEXTRACTF128 $1, Y0, X0
	VEXTRACTF128 $1, Y2, X2
	VEXTRACTF128 $1, Y4, X4
	VEXTRACTF128 $1, Y6, X6
	ADDQ         $16, DI
	ADDQ         $16, CX
	ADDQ         $16, BX

one:
	TESTQ $1, R11
	JZ    done
	CMPQ  fresh+80(FP), $0
	JNE   put1
	VADDSD (DI), X0, X0
	CMPQ   R13, $2
	JLT    put1
	VADDSD (DI)(R8*1), X2, X2
	JEQ    put1
	VADDSD (CX), X4, X4
	CMPQ   R13, $4
	JLT    put1
	VADDSD (BX), X6, X6

put1:
	VMOVSD X0, (DI)
	CMPQ   R13, $2
	JLT    done
	VMOVSD X2, (DI)(R8*1)
	JEQ    done
	VMOVSD X4, (CX)
	CMPQ   R13, $4
	JLT    done
	VMOVSD X6, (BX)

done:
	VZEROUPPER
	RET

wide:
	JMP ·mulSubStrip512(SB)

// One to three rows of a column at p, which moves.
#define STOREFEW(x, y, p) \
	TESTQ        $2, CX;    \
	JZ           4(PC);     \
	VMOVUPD      x, (p);    \
	VEXTRACTF128 $1, y, x;  \
	ADDQ         $16, p;    \
	TESTQ        $1, CX;    \
	JZ           2(PC);     \
	VMOVSD       x, (p)

// func scaleStrip(c, t *float64, ldc, ldt, m, n int)
// Solves X·Tᵀ = C in place for m ≥ 1 rows of 1 ≤ n ≤ 4 columns, four rows at a
// time; T is n×n, lower triangular, its diagonal inverted. Reads up to three
// entries beyond column ends of C.
TEXT ·scaleStrip(SB), NOSPLIT, $0-48
	CMPB ·haveWide(SB), $0
	JNE  wide
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
	VBROADCASTSD (SI), Y4
	CMPQ R13, $2
	JLT  rows
	VBROADCASTSD 8(SI), Y5
	VBROADCASTSD 8(SI)(R9*1), Y6
	JEQ  rows
	VBROADCASTSD 16(SI), Y7
	VBROADCASTSD 16(SI)(R9*1), Y8
	VBROADCASTSD 16(SI)(R9*2), Y9
	CMPQ R13, $4
	JLT  rows
	VBROADCASTSD 24(SI), Y10
	VBROADCASTSD 24(SI)(R9*1), Y11
	VBROADCASTSD 24(SI)(R9*2), Y12
	VBROADCASTSD 24(SI)(R11*1), Y13

rows:
	VMULPD       (DI), Y4, Y0
	CMPQ R13, $2
	JLT  store
	VMOVUPD      (DI)(R8*1), Y1
	VFNMADD231PD Y0, Y5, Y1
	VMULPD       Y1, Y6, Y1
	JEQ  store
	VMOVUPD      (DI)(R8*2), Y2
	VFNMADD231PD Y0, Y7, Y2
	VFNMADD231PD Y1, Y8, Y2
	VMULPD       Y2, Y9, Y2
	CMPQ R13, $4
	JLT  store
	VMOVUPD      (DI)(R10*1), Y3
	VFNMADD231PD Y0, Y10, Y3
	VFNMADD231PD Y1, Y11, Y3
	VFNMADD231PD Y2, Y12, Y3
	VMULPD       Y3, Y13, Y3

store:
	CMPQ CX, $4
	JLT  few
	VMOVUPD Y0, (DI)
	CMPQ R13, $2
	JLT  next
	VMOVUPD Y1, (DI)(R8*1)
	JEQ  next
	VMOVUPD Y2, (DI)(R8*2)
	CMPQ R13, $4
	JLT  next
	VMOVUPD Y3, (DI)(R10*1)

next:
	ADDQ $32, DI
	SUBQ $4, CX
	JNZ  rows

done:
	VZEROUPPER
	RET

few:
	MOVQ DI, AX
	STOREFEW(X0, Y0, AX)
	CMPQ R13, $2
	JLT  done
	LEAQ (DI)(R8*1), AX
	STOREFEW(X1, Y1, AX)
	CMPQ R13, $3
	JLT  done
	LEAQ (DI)(R8*2), AX
	STOREFEW(X2, Y2, AX)
	CMPQ R13, $4
	JLT  done
	LEAQ (DI)(R10*1), AX
	STOREFEW(X3, Y3, AX)
	JMP  done

wide:
	JMP ·scaleStrip512(SB)

// func addRuns(dst, src *float64, ld, n, cols, skip, shift int, runs *run, count int)
// Adds columns of a lower triangle to those of a larger one: cols columns from
// column skip of the first of the runs on. src points at the diagonal entry of
// the first of them, in a matrix with n rows; position p of the larger matrix is
// row and column p−shift of dst.
TEXT ·addRuns(SB), NOSPLIT, $0-72
	MOVQ src+8(FP), SI
	MOVQ ld+16(FP), R8
	SHLQ $3, R8
	MOVQ n+24(FP), R9
	SHLQ $3, R9
	ADDQ $8, R9             // one column right, one row down
	MOVQ cols+32(FP), R10
	MOVQ skip+40(FP), R11
	MOVQ runs+56(FP), R12
	MOVQ count+64(FP), R13
	MOVQ $-1, R15

columns:
	// DI: position 0 of the column that takes the first column of the run.
	MOVLQSX (R12), DI
	ADDQ    R11, DI
	MOVQ    shift+48(FP), AX
	SUBQ    AX, DI
	IMULQ   R8, DI
	SHLQ    $3, AX
	SUBQ    AX, DI
	ADDQ    dst+0(FP), DI

column:
	MOVQ    SI, BX
	MOVQ    R12, DX
	MOVQ    R13, CX
	MOVLQSX (DX), AX        // position
	MOVLQSX 4(DX), R14      // length
	ADDQ    R11, AX
	SUBQ    R11, R14

part:
	LEAQ (DI)(AX*8), AX
	CMPB ·haveWide(SB), $0
	JNE  wide
	SUBQ $4, R14
	JLT  few

fours:
	VMOVUPD (BX), Y0
	VADDPD  (AX), Y0, Y0
	VMOVUPD Y0, (AX)
	ADDQ    $32, BX
	ADDQ    $32, AX
	SUBQ    $4, R14
	JGE     fours

few:
	TESTQ $2, R14
	JZ    single
	VMOVUPD (BX), X0
	VADDPD  (AX), X0, X0
	VMOVUPD X0, (AX)
	ADDQ    $16, BX
	ADDQ    $16, AX

single:
	TESTQ $1, R14
	JZ    nextpart
	VMOVSD (BX), X0
	VADDSD (AX), X0, X0
	VMOVSD X0, (AX)
	ADDQ   $8, BX

nextpart:
	DECQ CX
	JZ   nextcolumn
	ADDQ $8, DX
	MOVLQSX (DX), AX
	MOVLQSX 4(DX), R14
	JMP  part

	// The last eight entries or fewer of a part at once, under a mask; four or
	// fewer in half a register, which lies in one line of the cache more often.
wide:
	CMPQ R14, $8
	JLE  masked
	VMOVUPD (BX), Z0
	VADDPD  (AX), Z0, Z0
	VMOVUPD Z0, (AX)
	ADDQ    $64, BX
	ADDQ    $64, AX
	SUBQ    $8, R14
	JMP     wide

masked:
	BZHIQ R14, R15, DX
	KMOVW DX, K1
	CMPQ  R14, $4
	JLE   half
	VMOVUPD.Z (BX), K1, Z0
	VADDPD.Z  (AX), Z0, K1, Z0
	VMOVUPD   Z0, K1, (AX)

added:
	LEAQ  (BX)(R14*8), BX
	// DX was needed: where the runs are follows from how many are left.
	DECQ CX
	JZ   nextcolumn
	MOVQ R13, DX
	SUBQ CX, DX
	LEAQ (R12)(DX*8), DX
	MOVLQSX (DX), AX
	MOVLQSX 4(DX), R14
	LEAQ (DI)(AX*8), AX
	JMP  wide

half:
	VMOVUPD.Z (BX), K1, Y0
	VADDPD.Z  (AX), Y0, K1, Y0
	VMOVUPD   Y0, K1, (AX)
	JMP       added

nextcolumn:
	DECQ R10
	JZ   done
	ADDQ R9, SI
	ADDQ R8, DI
	INCQ R11
	MOVLQSX 4(R12), AX
	CMPQ R11, AX
	JLT  column
	XORL R11, R11
	ADDQ $8, R12
	DECQ R13
	JMP  columns

done:
	VZEROUPPER
	RET
