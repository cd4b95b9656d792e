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
