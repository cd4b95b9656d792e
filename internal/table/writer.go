package table

import "io"

// Writer writes a new table, cell by cell: `,` or the delimiter given, LF, quotes only where needed.
type Writer struct {
	w     io.Writer
	delim byte
	buf   []byte
	cells int
	err   error
}

// NewWriter writes to w; delimiter 0 is a comma.
func NewWriter(w io.Writer, delimiter byte) *Writer {
	if delimiter == 0 {
		delimiter = ','
	}
	return &Writer{w: w, delim: delimiter}
}

// Row writes a row of texts.
func (w *Writer) Row(cells ...string) error {
	for _, c := range cells {
		w.Cell(func(dst []byte) []byte { return append(dst, c...) })
	}
	return w.End()
}

// Cell appends a cell to the current row; f appends its content to dst and gives the result.
func (w *Writer) Cell(f func(dst []byte) []byte) {
	if w.cells > 0 {
		w.buf = append(w.buf, w.delim)
	}
	start := len(w.buf)
	w.buf = quoteFrom(f(w.buf), start, w.delim)
	w.cells++
}

// End ends the current row. The error is the first that the file underneath gave, and stays.
func (w *Writer) End() error {
	if w.cells == 1 && (len(w.buf) == 0 || w.buf[len(w.buf)-1] == '\n') {
		w.buf = append(w.buf, `""`...) // a blank line would be lost on some readers
	}
	w.buf = append(w.buf, '\n')
	w.cells = 0
	if len(w.buf) >= 1<<16 {
		return w.Flush()
	}
	return w.err
}

// Flush hands on what was written so far. Call it after the last row.
func (w *Writer) Flush() error {
	if w.err == nil {
		_, w.err = w.w.Write(w.buf)
	}
	w.buf = w.buf[:0]
	return w.err
}
