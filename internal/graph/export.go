package graph

import (
	"bytes"
	"fmt"
	"io"
	"math"
	"strconv"

	"pinfill/internal/parallel"
	"pinfill/internal/sparse"
)

// WriteEdgeList writes one line an edge, "from,to,weight" with delim for the comma: each edge once, the smaller vertex
// first, ordered by both. name appends a vertex's name to dst, quoted as the format needs, and must be safe to call
// from several goroutines. There is no header line. Weights are the shortest decimals that read back to the same
// float64; a weight below the smallest float64 is written as that one, 5e-324, and counted in raised.
func WriteEdgeList(w io.Writer, a *sparse.CSR, name func(dst []byte, v int32) []byte, delim byte, workers int) (raised int, err error) {
	return writeEntries(w, a, workers, func(dst []byte, i, j int32, weight float64) []byte {
		dst = append(name(dst, i), delim)
		dst = append(name(dst, j), delim)
		dst = strconv.AppendFloat(dst, weight, 'g', -1, 64)
		return append(dst, '\n')
	})
}

// WriteMatrixMarket writes the weights as a Matrix Market "coordinate real symmetric" matrix: the lower triangle,
// 1-based, column by column. comment lines follow the banner, each after a per cent sign. The weights are written as
// by WriteEdgeList.
func WriteMatrixMarket(w io.Writer, a *sparse.CSR, comment []string, workers int) (raised int, err error) {
	var head bytes.Buffer
	head.WriteString("%%MatrixMarket matrix coordinate real symmetric\n")
	for _, c := range comment {
		fmt.Fprintf(&head, "%% %s\n", c)
	}
	fmt.Fprintf(&head, "%d %d %d\n", a.N, a.N, a.NNZ()/2)
	if _, err := w.Write(head.Bytes()); err != nil {
		return 0, err
	}
	return writeEntries(w, a, workers, func(dst []byte, i, j int32, weight float64) []byte {
		dst = append(strconv.AppendInt(dst, int64(j)+1, 10), ' ')
		dst = append(strconv.AppendInt(dst, int64(i)+1, 10), ' ')
		dst = strconv.AppendFloat(dst, weight, 'g', -1, 64)
		return append(dst, '\n')
	})
}

// writeGrain is the number of vertices formatted in one piece.
const writeGrain = 4096

// writeEntries formats the entries i < j of a in pieces, several at a time, and writes the pieces in order.
func writeEntries(w io.Writer, a *sparse.CSR, workers int, format func(dst []byte, i, j int32, weight float64) []byte) (raised int, err error) {
	workers = parallel.Workers(workers)
	piece := make([][]byte, 4*workers) // formatted together
	low := make([]int, len(piece))     // weights raised in each
	batch := writeGrain * len(piece)
	for from := 0; from < a.N; from += batch {
		to := min(from+batch, a.N)
		parallel.ForChunk(workers, to-from, writeGrain, func(_, c, lo, hi int) {
			buf := piece[c][:0]
			low[c] = 0
			for i := from + lo; i < from+hi; i++ {
				col, val := a.Row(i)
				for t, j := range col {
					if int(j) < i {
						continue
					}
					weight := math.Exp(val[t])
					if weight == 0 {
						weight = math.SmallestNonzeroFloat64
						low[c]++
					}
					buf = format(buf, int32(i), j, weight)
				}
			}
			piece[c] = buf
		})
		for c := range (to - from + writeGrain - 1) / writeGrain {
			raised += low[c]
			if _, err := w.Write(piece[c]); err != nil {
				return raised, err
			}
		}
	}
	return raised, nil
}
