package table

import (
	"context"
	"fmt"
	"math"
	"sync/atomic"

	"pinfill/internal/fault"
	"pinfill/internal/parallel"
)

// NumberOptions say how cells are read as numbers.
type NumberOptions struct {
	Decimal byte // '.' or ','; 0 is the table's own
	Workers int  // 0 is the table's own; changes no result
}

// Numbers are the cells of some columns as numbers, row by row.
type Numbers struct {
	Rows, Cols  int
	Data        []float64 // Rows x Cols, row-major; NaN where a cell is missing
	Missing     int       // missing cells
	Trimmed     int       // numbers with spaces round them, which were taken off (C30)
	BigIntegers int       // whole numbers beyond 2^53, which may have lost digits (C29)
}

const (
	rowGrain  = 2048 // rows a worker takes at a time
	shownEach = 5    // refusals listed for one column, so that it does not hide another; all are counted
	shownAll  = 20   // refusals worth their position in one run of rows, as many as a fault.List shows
)

// maxWhole is 2^53; up to it every whole number has a float64 of its own.
const maxWhole = 1 << 53

// Numbers reads the cells of cols, in that order, on all workers. A cell that is not missing and not a number is
// refused as C23 to C28, C30 or C31 with its position.
func (t *Table) Numbers(ctx context.Context, cols []int, o NumberOptions) (*Numbers, error) {
	o = o.withDefaults(t)
	n := &Numbers{Rows: t.rows, Cols: len(cols)}
	if need := EstimateNumbers(t.rows, len(cols)); need > t.head.memory {
		return nil, overMemory(t.head, "S15", fmt.Sprintf("%d rows of %d numbers need %d bytes of memory", t.rows, len(cols), need))
	}
	n.Data = make([]float64, t.rows*len(cols))
	target := make([]int, t.head.cols) // table column -> column of Data, or -1
	for c := range target {
		target[c] = -1
	}
	for k, c := range cols {
		if target[c] >= 0 {
			return nil, fmt.Errorf("table: column %d asked for twice", c)
		}
		target[c] = k
	}
	parts := make([]part, (t.rows+rowGrain-1)/rowGrain)
	var stop atomic.Bool
	parallel.ForChunk(o.Workers, t.rows, rowGrain, func(_, chunk, lo, hi int) {
		if stop.Load() {
			return
		}
		if ctx.Err() != nil {
			stop.Store(true)
			return
		}
		p := &parts[chunk]
		p.rows(t, target, lo, hi, o.Decimal, func(row int) []float64 { return n.Data[row*n.Cols : (row+1)*n.Cols] },
			func(row, col int) { p.refuse(t, row, col, o.Decimal) })
	})
	if err := ctx.Err(); err != nil {
		return nil, context.Cause(ctx)
	}
	var refused fault.List
	shown := map[string]int{}
	for i := range parts {
		p := &parts[i]
		n.Missing += p.missing
		n.Trimmed += p.trimmed
		n.BigIntegers += p.big
		for _, e := range p.refused {
			if shown[e.Name]++; shown[e.Name] > shownEach {
				refused.Total++
			} else {
				refused.Add(e)
			}
		}
		refused.Total += p.more
	}
	if err := single(&refused); err != nil {
		return nil, err
	}
	return n, nil
}

func (o NumberOptions) withDefaults(t *Table) NumberOptions {
	if o.Decimal == 0 {
		o.Decimal = t.head.decimal
	}
	if o.Workers == 0 {
		o.Workers = t.head.workers
	}
	return o
}

// part is what one run of rows has to say beside its numbers.
type part struct {
	missing, trimmed, big int
	refused               []*fault.Error // at most shownEach a column and shownAll in all
	shown                 map[int]int
	more                  int
}

// rows reads rows lo to hi into what out gives for each; target maps table columns to places there, or to -1, and bad
// is told of cells that are neither missing nor numbers. Most cells are plain numbers and end where the number ends:
// those take one pass over their bytes. Any other goes to number.
func (p *part) rows(t *Table, target []int, lo, hi int, decimal byte, out func(row int) []float64, bad func(row, col int)) {
	h := t.head
	last := -1 // table column after which a row holds nothing wanted
	for c, k := range target {
		if k >= 0 {
			last = c
		}
	}
	sign := decimal
	if sign == h.delim {
		sign = 0 // it ends an unquoted cell
	}
	quick := len(h.na) == 0 // a number may mean missing otherwise
	for row := lo; row < hi; {
		b, i := t.find(row)
		data := b.data
		for ; i < b.rows() && row < hi; i, row = i+1, row+1 {
			to := out(row)
			pos, end := int(b.starts[i]), int(b.starts[i+1])
			end = pos + len(trimEnd(data[pos:end]))
			for col := 0; col <= last; col++ {
				k := target[col]
				if k < 0 {
					pos += cellEnd(data[pos:end], 0, h.delim) + 1
					continue
				}
				if quick {
					v, next := quickNumber(data, pos, sign)
					if next > 0 && (next == end || data[next] == h.delim && next < end) && v < maxWhole && v > -maxWhole {
						to[k] = v
						pos = next + 1
						continue
					}
				}
				next := pos + cellEnd(data[pos:end], 0, h.delim)
				v, wrong := p.number(h, data[pos:next], decimal)
				if wrong {
					bad(row, col)
				}
				to[k] = v
				pos = next + 1
			}
		}
	}
}

// number reads one raw cell; bad means that it is neither missing nor a number.
func (p *part) number(h *head, raw []byte, decimal byte) (v float64, bad bool) {
	cell := decode(raw)
	trimmed := trimSpace(cell)
	if h.missing(trimmed) {
		p.missing++
		return math.NaN(), false
	}
	v, err := ParseNumber(trimmed, decimal)
	if err != nil {
		return math.NaN(), true
	}
	if len(trimmed) != len(cell) {
		p.trimmed++
	}
	if (v >= maxWhole || v <= -maxWhole) && isBigWhole(trimmed) {
		p.big++
	}
	return v, false
}

// isBigWhole tells whether a number is written with digits only and is beyond 2^53, given that it is not below.
func isBigWhole(cell []byte) bool {
	if cell[0] == '-' || cell[0] == '+' {
		cell = cell[1:]
	}
	m, end := scanDigits(cell, 0, 0)
	return end == len(cell) && (m != maxWhole || significant(cell) > exactDigits)
}

func (p *part) refuse(t *Table, row, col int, decimal byte) {
	if p.shown == nil {
		p.shown = map[int]int{}
	}
	if p.shown[col]++; p.shown[col] > shownEach || len(p.refused) == shownAll {
		p.more++
		return
	}
	p.refused = append(p.refused, t.NumberFault(row, col, decimal))
}

// NumberFault is the refusal of a cell that is not a number, or nil where it is one or is missing.
func (t *Table) NumberFault(row, col int, decimal byte) *fault.Error {
	if decimal == 0 {
		decimal = t.head.decimal
	}
	cell := trimSpace(t.Cell(row, col))
	if t.head.missing(cell) {
		return nil
	}
	_, err := ParseNumber(cell, decimal)
	if err == nil {
		return nil
	}
	code, message, hint := diagnose(cell, decimal, err.(NumberError), t.head.names[col])
	return t.Fault(row, col, code, message, hint)
}

// FirstNonNumber gives the first row where a column is neither missing nor a number, or -1. The first call looks at
// every column.
func (t *Table) FirstNonNumber(col int) int {
	t.kinds.Do(func() {
		t.nonNumber = make([]int, t.head.cols)
		for c := range t.nonNumber {
			t.nonNumber[c] = -1
		}
		found := make([]atomic.Int64, t.head.cols)
		for c := range found {
			found[c].Store(math.MaxInt64)
		}
		parallel.For(t.head.workers, t.rows, rowGrain, func(lo, hi int) {
			var p part
			target := make([]int, t.head.cols)
			for c := range target {
				if target[c] = c; found[c].Load() < int64(lo) {
					target[c] = -1 // settled by a row before these
				}
			}
			scratch := make([]float64, t.head.cols)
			p.rows(t, target, lo, hi, t.head.decimal, func(int) []float64 { return scratch }, func(row, col int) { lower(&found[col], int64(row)) })
		})
		for c := range found {
			if row := found[c].Load(); row != math.MaxInt64 {
				t.nonNumber[c] = int(row)
			}
		}
	})
	return t.nonNumber[col]
}

// lower sets a to v where v is smaller.
func lower(a *atomic.Int64, v int64) {
	for {
		old := a.Load()
		if old <= v || a.CompareAndSwap(old, v) {
			return
		}
	}
}

// IsNumeric tells whether every cell of a column is missing or a number.
func (t *Table) IsNumeric(col int) bool { return t.FirstNonNumber(col) < 0 }
