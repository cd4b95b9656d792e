package table

import (
	"io"

	"pinfill/internal/parallel"
)

// Column is a column to append.
type Column struct {
	Name string
	// Cell appends the content of the cell in a row to dst, without quotes, and gives the result. Rows count from 0 in
	// the table or batch that is written. It is called from several goroutines.
	Cell func(row int, dst []byte) []byte
}

// WriteAppended writes the table's own bytes in order, byte-order mark, quotes and line ends included, with extra
// columns at the end of each row. Cells are quoted where the delimiter asks for it. Of a Stream's batches, the first
// writes the header.
func WriteAppended(w io.Writer, t *Table, extra []Column) error {
	if t.first {
		if _, err := w.Write(t.appendHead(nil, extra)); err != nil {
			return err
		}
	}
	const ahead = 4 // chunks a worker computes before they are written
	workers := t.head.workers
	bufs := make([][]byte, workers*ahead)
	for lo := 0; lo < t.rows; lo += len(bufs) * rowGrain {
		n := min(len(bufs)*rowGrain, t.rows-lo)
		parallel.ForChunk(workers, n, rowGrain, func(_, chunk, from, to int) {
			bufs[chunk] = t.appendRows(bufs[chunk][:0], lo+from, lo+to, extra)
		})
		for i := range (n + rowGrain - 1) / rowGrain {
			if _, err := w.Write(bufs[i]); err != nil {
				return err
			}
		}
	}
	for _, b := range t.blocks {
		if b.rows() == 0 { // blank lines at the end of the file
			if _, err := w.Write(b.data); err != nil {
				return err
			}
		}
	}
	return nil
}

// appendHead writes the byte-order mark and the header line.
func (t *Table) appendHead(dst []byte, extra []Column) []byte {
	h := t.head
	dst = append(dst, h.mark...)
	if h.noHeader {
		return dst
	}
	line := trimEnd(h.raw)
	dst = append(dst, line...)
	for _, c := range extra {
		dst = append(dst, h.delim)
		start := len(dst)
		dst = quoteFrom(append(dst, c.Name...), start, h.delim)
	}
	return append(dst, h.raw[len(line):]...)
}

// appendRows writes rows lo to hi, with the blank lines that follow the last row of a block.
func (t *Table) appendRows(dst []byte, lo, hi int, extra []Column) []byte {
	for row := lo; row < hi; {
		b, i := t.find(row)
		for ; i < b.rows() && row < hi; i, row = i+1, row+1 {
			whole := b.data[b.starts[i]:b.starts[i+1]]
			line := trimEnd(whole)
			dst = append(dst, line...)
			for _, c := range extra {
				dst = append(dst, t.head.delim)
				start := len(dst)
				dst = quoteFrom(c.Cell(row, dst), start, t.head.delim)
			}
			dst = append(dst, whole[len(line):]...)
		}
		if i == b.rows() {
			dst = append(dst, b.data[b.starts[i]:]...)
		}
	}
	return dst
}

// quoteFrom puts the cell dst[start:] in quotes where it holds the delimiter, a quote or a line end, or begins or ends
// with a space, which some readers take off.
func quoteFrom(dst []byte, start int, delim byte) []byte {
	quotes, needed := 0, false
	for _, c := range dst[start:] {
		switch c {
		case '"':
			quotes++
			needed = true
		case delim, '\n', '\r':
			needed = true
		}
	}
	if n := len(dst); n > start && (dst[start] == ' ' || dst[n-1] == ' ' || dst[start] == '\t' || dst[n-1] == '\t') {
		needed = true
	}
	if !needed {
		return dst
	}
	from := len(dst) - 1
	for range quotes + 2 {
		dst = append(dst, '"')
	}
	to := len(dst) - 2 // the last byte is the closing quote already
	for ; from >= start; from-- {
		dst[to] = dst[from]
		to--
		if dst[from] == '"' {
			dst[to] = '"'
			to--
		}
	}
	dst[start] = '"'
	return dst
}
