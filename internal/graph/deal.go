package graph

import (
	"math"

	"pinfill/internal/parallel"
	"pinfill/internal/sparse"
)

// deal deals edges out to blocks of consecutive vertices, both directions of each. Edges are read in chunks; the place
// of each chunk's share of each block is counted beforehand, so the order within a block is that of the edges
// whatever the number of workers.
type deal struct {
	n     int
	edges []Edge

	shift  int // vertex v belongs to block v >> shift
	blocks int
	grain  int   // edges in a chunk
	place  []int // of each chunk, for each block: first the count of its entries, then where the next one goes
	start  []int // where each block begins, and where the last ends

	from, to []int32
	val      []float64 // weights
}

const (
	blockSize = 1 << 12 // vertices in a block, whose entries then fit a core's own cache at 20 edges a vertex
	minBlocks = 1 << 6  // smaller blocks rather than fewer, to share the work
	maxBlocks = 1 << 10 // larger blocks rather than more, to write to few places at a time
	maxChunks = 1 << 7
	minGrain  = 1 << 14
)

func newDeal(n int, edges []Edge) *deal {
	d := &deal{n: n, edges: edges}
	for n>>d.shift > maxBlocks || (1<<d.shift < blockSize && n>>d.shift > minBlocks) {
		d.shift++
	}
	d.blocks = (n + 1<<d.shift - 1) >> d.shift
	d.grain = max(minGrain, (len(edges)+maxChunks-1)/maxChunks)
	return d
}

// count checks the edges, counts loops, and lays out the blocks. The error is an *EdgeError for the first bad edge.
func (d *deal) count(workers int) (loops int, err error) {
	chunks := (len(d.edges) + d.grain - 1) / d.grain
	d.place = make([]int, chunks*d.blocks)
	firstBad := make([]int, chunks)
	loop := make([]int, chunks)
	parallel.ForChunk(workers, len(d.edges), d.grain, func(_, c, lo, hi int) {
		firstBad[c] = -1
		count := d.place[c*d.blocks : (c+1)*d.blocks]
		for p := lo; p < hi; p++ {
			e := d.edges[p]
			if e.I < 0 || int(e.I) >= d.n || e.J < 0 || int(e.J) >= d.n || !(e.W > 0) || e.W > math.MaxFloat64 {
				firstBad[c] = p
				return
			}
			if e.I == e.J {
				loop[c]++
				continue
			}
			count[e.I>>d.shift]++
			count[e.J>>d.shift]++
		}
	})
	for c := range chunks {
		if p := firstBad[c]; p >= 0 {
			return 0, &EdgeError{Position: p, Edge: d.edges[p], Vertices: d.n}
		}
		loops += loop[c]
	}
	d.start = make([]int, d.blocks+1)
	at := 0
	for b := range d.blocks {
		d.start[b] = at
		for c := range chunks {
			size := d.place[c*d.blocks+b]
			d.place[c*d.blocks+b] = at
			at += size
		}
	}
	d.start[d.blocks] = at
	return loops, nil
}

// scatter puts both directions of each edge into their blocks.
func (d *deal) scatter(workers int) {
	size := d.start[d.blocks]
	d.from, d.to, d.val = make([]int32, size), make([]int32, size), make([]float64, size)
	parallel.ForChunk(workers, len(d.edges), d.grain, func(_, c, lo, hi int) {
		place := d.place[c*d.blocks : (c+1)*d.blocks]
		for _, e := range d.edges[lo:hi] {
			if e.I == e.J {
				continue
			}
			at := &place[e.I>>d.shift]
			d.from[*at], d.to[*at], d.val[*at] = e.I, e.J, e.W
			*at++
			at = &place[e.J>>d.shift]
			d.from[*at], d.to[*at], d.val[*at] = e.J, e.I, e.W
			*at++
		}
	})
}

// sortBlocks sorts each block's entries into rows and the rows by column, keeps one of equal entries, moves what is
// kept to the front of the block, and counts it by vertex. It gives false if some pair has two weights.
func (d *deal) sortBlocks(degree []int32, workers int) bool {
	clash := make([]bool, d.blocks)
	parallel.For(workers, d.blocks, 1, func(b, _ int) {
		lo, hi := d.start[b], d.start[b+1]
		v0, v1 := b<<d.shift, min((b+1)<<d.shift, d.n)
		next := make([]int, v1-v0+1)
		for _, v := range d.from[lo:hi] {
			next[int(v)-v0+1]++
		}
		for v := range v1 - v0 {
			next[v+1] += next[v]
		}
		col, val := make([]int32, hi-lo), make([]float64, hi-lo)
		for t := lo; t < hi; t++ {
			at := &next[int(d.from[t])-v0]
			col[*at], val[*at] = d.to[t], d.val[t]
			*at++ // ends as the end of the row, the start of the next
		}
		kept, from := lo, 0
		for v := v0; v < v1; v++ {
			to := next[v-v0]
			sparse.SortRow(col[from:to], val[from:to])
			first := kept
			for t := from; t < to; t++ {
				if t > from && col[t] == col[t-1] {
					clash[b] = clash[b] || val[t] != val[t-1]
					continue
				}
				d.to[kept], d.val[kept] = col[t], val[t]
				kept++
			}
			degree[v] = int32(kept - first)
			from = to
		}
	})
	for _, c := range clash {
		if c {
			return false
		}
	}
	return true
}
