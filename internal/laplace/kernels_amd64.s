#include "textflag.h"

// A quad is four int32 columns, then four float32 weights: 32 bytes.
//
//	SI quad   DX start   R8 tie   DI x   R9 own   R10 y   CX rows left   AX first quad of the row   BX quads left

// func rows1(quads *quad, start *int32, tie, x, own, y *float32, rows int)
TEXT ·rows1(SB), NOSPLIT, $0-56
	MOVQ quads+0(FP), SI
	MOVQ start+8(FP), DX
	MOVQ tie+16(FP), R8
	MOVQ x+24(FP), DI
	MOVQ own+32(FP), R9
	MOVQ y+40(FP), R10
	MOVQ rows+48(FP), CX
	MOVL (DX), AX

row:
	TESTQ CX, CX
	JZ    done
	MOVSS (R9), X1
	SHUFPS $0, X1, X1 // x_i in each lane
	XORPS X0, X0      // the four sums
	MOVL  4(DX), BX
	ADDQ  $4, DX
	MOVL  BX, R11
	SUBL  AX, BX
	MOVL  R11, AX
	TESTL BX, BX
	JZ    store

quad:
	MOVL     (SI), R11
	MOVL     4(SI), R12
	MOVL     8(SI), R13
	MOVL     12(SI), R15
	MOVSS    (DI)(R11*4), X2
	MOVSS    (DI)(R12*4), X3
	MOVSS    (DI)(R13*4), X4
	MOVSS    (DI)(R15*4), X5
	UNPCKLPS X3, X2
	UNPCKLPS X5, X4
	MOVLHPS  X4, X2           // x_j of the four columns
	MOVAPS   X1, X6
	SUBPS    X2, X6
	MOVUPS   16(SI), X7
	MULPS    X7, X6
	ADDPS    X6, X0
	ADDQ     $32, SI
	DECL     BX
	JNZ      quad

store:
	// (0+1)+(2+3)
	MOVAPS X0, X2
	SHUFPS $0xB1, X2, X2 // 1 0 3 2
	ADDPS  X2, X0        // 0+1 in lane 0, 2+3 in lane 2
	MOVHLPS X0, X3       // lane 2 to lane 0
	ADDSS  X3, X0
	MULSS  (R8), X1
	ADDSS  X1, X0
	MOVSS  X0, (R10)
	ADDQ   $4, R8
	ADDQ   $4, R9
	ADDQ   $4, R10
	DECQ   CX
	JMP    row

done:
	RET

#define ENTRY(OFFSET, LANE, SUM) \
	MOVL   OFFSET(SI), R11 \
	SHLQ   $4, R11         \
	MOVUPS (DI)(R11*1), X2 \
	MOVAPS X1, X3          \
	SUBPS  X2, X3          \
	PSHUFD $LANE, X6, X4   \
	MULPS  X4, X3          \
	ADDPS  X3, SUM

// func rows4(quads *quad, start *int32, tie, x, own, y *float32, rows int)
TEXT ·rows4(SB), NOSPLIT, $0-56
	MOVQ quads+0(FP), SI
	MOVQ start+8(FP), DX
	MOVQ tie+16(FP), R8
	MOVQ x+24(FP), DI
	MOVQ own+32(FP), R9
	MOVQ y+40(FP), R10
	MOVQ rows+48(FP), CX
	MOVL (DX), AX

row4:
	TESTQ  CX, CX
	JZ     done4
	MOVUPS (R9), X1 // the four vectors at i
	XORPS  X8, X8
	XORPS  X9, X9
	XORPS  X10, X10
	XORPS  X11, X11
	MOVL   4(DX), BX
	ADDQ   $4, DX
	MOVL   BX, R11
	SUBL   AX, BX
	MOVL   R11, AX
	TESTL  BX, BX
	JZ     store4

quad4:
	MOVUPS 16(SI), X6
	ENTRY(0, 0x00, X8)
	ENTRY(4, 0x55, X9)
	ENTRY(8, 0xAA, X10)
	ENTRY(12, 0xFF, X11)
	ADDQ $32, SI
	DECL BX
	JNZ  quad4

store4:
	ADDPS  X9, X8
	ADDPS  X11, X10
	ADDPS  X10, X8
	MOVSS  (R8), X2
	SHUFPS $0, X2, X2
	MULPS  X2, X1
	ADDPS  X8, X1
	MOVUPS X1, (R10)
	ADDQ   $4, R8
	ADDQ   $16, R9
	ADDQ   $16, R10
	DECQ   CX
	JMP    row4

done4:
	RET

//	SI col   BX w   DX ptr   R8 excess   DI x   R9 own   R10 y   CX rows left   AX first entry of the row   R12 entries left

// func csr1(col *int32, w *float64, ptr *int, excess, x, own, y *float64, rows int)
TEXT ·csr1(SB), NOSPLIT, $0-64
	MOVQ col+0(FP), SI
	MOVQ w+8(FP), BX
	MOVQ ptr+16(FP), DX
	MOVQ excess+24(FP), R8
	MOVQ x+32(FP), DI
	MOVQ own+40(FP), R9
	MOVQ y+48(FP), R10
	MOVQ rows+56(FP), CX
	MOVQ (DX), AX

crow:
	TESTQ    CX, CX
	JZ       cdone
	MOVSD    (R9), X8
	MOVAPD   X8, X1
	UNPCKLPD X1, X1 // x_i in each lane
	XORPS    X0, X0 // even and odd sum
	MOVQ     8(DX), R13
	ADDQ     $8, DX
	MOVQ     R13, R12
	SUBQ     AX, R12
	MOVQ     R13, AX
	SUBQ     $2, R12
	JLT      ctail

cpair:
	MOVL   (SI), R11
	MOVL   4(SI), R13
	MOVSD  (DI)(R11*8), X2
	MOVHPD (DI)(R13*8), X2
	MOVAPD X1, X3
	SUBPD  X2, X3
	MOVUPD (BX), X4
	MULPD  X4, X3
	ADDPD  X3, X0
	ADDQ   $8, SI
	ADDQ   $16, BX
	SUBQ   $2, R12
	JGE    cpair

ctail:
	ADDQ   $2, R12
	JZ     cstore
	MOVL   (SI), R11
	MOVSD  (DI)(R11*8), X2
	MOVAPD X8, X3
	SUBSD  X2, X3
	MULSD  (BX), X3
	ADDSD  X3, X0
	ADDQ   $4, SI
	ADDQ   $8, BX

cstore:
	MOVAPD   X0, X2
	UNPCKHPD X2, X2
	ADDSD    X2, X0
	MULSD    (R8), X8
	ADDSD    X8, X0
	MOVSD    X0, (R10)
	ADDQ     $8, R8
	ADDQ     $8, R9
	ADDQ     $8, R10
	DECQ     CX
	JMP      crow

cdone:
	RET

#define ENTRY64(COL, W, SUM, TUM) \
	MOVL     COL(SI), R11        \
	SHLQ     $5, R11             \
	MOVUPD   (DI)(R11*1), X3     \
	MOVUPD   16(DI)(R11*1), X4   \
	MOVSD    W(BX), X7           \
	UNPCKLPD X7, X7              \
	MOVAPD   X1, X5              \
	SUBPD    X3, X5              \
	MOVAPD   X2, X6              \
	SUBPD    X4, X6              \
	MULPD    X7, X5              \
	MULPD    X7, X6              \
	ADDPD    X5, SUM             \
	ADDPD    X6, TUM

// func csr4(col *int32, w *float64, ptr *int, excess, x, own, y *float64, rows int)
TEXT ·csr4(SB), NOSPLIT, $0-64
	MOVQ col+0(FP), SI
	MOVQ w+8(FP), BX
	MOVQ ptr+16(FP), DX
	MOVQ excess+24(FP), R8
	MOVQ x+32(FP), DI
	MOVQ own+40(FP), R9
	MOVQ y+48(FP), R10
	MOVQ rows+56(FP), CX
	MOVQ (DX), AX

crow4:
	TESTQ  CX, CX
	JZ     cdone4
	MOVUPD (R9), X1 // the four vectors at i
	MOVUPD 16(R9), X2
	XORPS  X8, X8   // even sums
	XORPS  X9, X9
	XORPS  X10, X10 // odd sums
	XORPS  X11, X11
	MOVQ   8(DX), R13
	ADDQ   $8, DX
	MOVQ   R13, R12
	SUBQ   AX, R12
	MOVQ   R13, AX
	SUBQ   $2, R12
	JLT    ctail4

cpair4:
	ENTRY64(0, 0, X8, X9)
	ENTRY64(4, 8, X10, X11)
	ADDQ $8, SI
	ADDQ $16, BX
	SUBQ $2, R12
	JGE  cpair4

ctail4:
	ADDQ $2, R12
	JZ   cstore4
	ENTRY64(0, 0, X8, X9)
	ADDQ $4, SI
	ADDQ $8, BX

cstore4:
	ADDPD    X10, X8
	ADDPD    X11, X9
	MOVSD    (R8), X7
	UNPCKLPD X7, X7
	MULPD    X7, X1
	MULPD    X7, X2
	ADDPD    X8, X1
	ADDPD    X9, X2
	MOVUPD   X1, (R10)
	MOVUPD   X2, 16(R10)
	ADDQ     $8, R8
	ADDQ     $32, R9
	ADDQ     $32, R10
	DECQ     CX
	JMP      crow4

cdone4:
	RET
