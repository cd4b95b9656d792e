package table

import (
	"bytes"
	"fmt"
	"strings"
	"sync/atomic"

	"pinfill/internal/fault"
)

// block is a run of whole rows in one buffer.
type block struct {
	data   []byte
	starts []uint32 // where each row starts in data, and where the last one ends; blank lines may follow that end
	row    int      // number of the first row
	line   int      // line of data[0], from 1
	multi  bool     // some cell holds a line end, so that rows and lines do not go in step

	counted atomic.Uint64 // where linesBefore last counted to and what it found, 32 bits each
}

func (b *block) rows() int { return len(b.starts) - 1 }

// linesBefore counts the line ends in data[:pos]. It goes on from where it was last asked, so that messages about many
// rows in order do not count all lines each time.
func (b *block) linesBefore(pos int) int {
	last := b.counted.Load()
	from, lines := int(last>>32), int(uint32(last))
	if from > pos {
		from, lines = 0, 0
	}
	lines += bytes.Count(b.data[from:pos], []byte{'\n'})
	b.counted.Store(uint64(pos)<<32 | uint64(lines))
	return lines
}

// raw is a row without its line end.
func (b *block) raw(i int) []byte {
	return trimEnd(b.data[b.starts[i]:b.starts[i+1]])
}

// scanned is a block with what was found wrong in it. Lines count from the block's own start.
type scanned struct {
	block
	lines   int // line ends in data
	refused fault.List
	fatal   error        // what ends the reading: bytes that are no text, a cap
	blank   *fault.Error // blank lines at the end of data: wrong if a row follows
}

// scan finds the rows of a piece and checks their shape. It depends on the piece alone.
func (h *head) scan(p piece, last bool) *scanned {
	s := &scanned{}
	s.data = p.data
	e, stop := h.notText(p)
	if e != nil {
		s.fatal = e
	}
	s.lines = bytes.Count(p.data, []byte{'\n'})
	s.starts = make([]uint32, 0, s.lines+2)
	w := walker{h: h, p: p, s: s, last: last, stop: stop, hasCR: bytes.IndexByte(p.data, '\r') >= 0}
	if bytes.IndexByte(p.data, '"') < 0 {
		w.plain()
	} else {
		w.quoted()
	}
	return s
}

// notText refuses bytes that are no text, NUL or invalid UTF-8, and says where in p they are. It gives nil for text.
func (h *head) notText(p piece) (*fault.Error, int) {
	pos, code, message, hint := checkText(p.data)
	if pos < 0 {
		return nil, len(p.data)
	}
	e := h.at(p, pos, code, fmt.Sprintf("%s (offset %d)", message, p.off+int64(pos)))
	e.Hint = hint
	return e, pos
}

// walker goes through the rows of one piece.
type walker struct {
	h     *head
	p     piece
	s     *scanned
	last  bool // the piece ends the file
	stop  int  // rows that reach beyond it are left alone: a byte that is no text stands there
	hasCR bool

	end   int // end of the last row that is not blank
	blank int // start of the first blank line after it, or -1
}

// plain walks a piece without any quote: every line is a row and every delimiter ends a cell.
func (w *walker) plain() {
	w.blank = -1
	data, delim := w.p.data, []byte{w.h.delim}
	for pos := 0; pos < len(data); {
		next := len(data)
		if i := bytes.IndexByte(data[pos:], '\n'); i >= 0 {
			next = pos + i + 1
		}
		if next > w.stop {
			break
		}
		row := trimEnd(data[pos:next])
		if w.row(pos, next, row) {
			if n := bytes.Count(row, delim) + 1; n != w.h.cols {
				w.ragged(pos, next, row, n)
			}
			if w.hasCR {
				w.loneCR(pos, row)
			}
		}
		pos = next
	}
	w.finish()
}

// quoted walks a piece in which some cells are quoted.
func (w *walker) quoted() {
	w.blank = -1
	data := w.p.data
	for pos := 0; pos < len(data); {
		before, blank := w.s.refused, w.blank
		if w.blank >= 0 {
			line, _, _ := bytes.Cut(data[pos:], []byte("\n"))
			if len(trimEnd(line)) > 0 {
				w.refuseBlank() // before what the row itself is refused for
			}
		}
		next, cells := w.quotedRow(pos)
		if next > w.stop {
			w.s.refused, w.blank = before, blank
			break
		}
		row := trimEnd(data[pos:next])
		if w.row(pos, next, row) && cells != w.h.cols {
			w.ragged(pos, next, row, cells)
		}
		pos = next
	}
	w.finish()
}

// quotedRow finds the end of the row at pos and counts its cells.
func (w *walker) quotedRow(pos int) (next, cells int) {
	data, delim := w.p.data, w.h.delim
	eol := -1 // next line end at or after pos, once looked for
	for cells = 1; ; cells++ {
		if pos < len(data) && data[pos] == '"' {
			end, _ := closeQuote(data, pos+1)
			if bytes.IndexByte(data[pos:end], '\n') >= 0 {
				w.s.multi = true
			}
			if end < len(data) && data[end] != delim && !atLineEnd(data, end) && !skip(&w.s.refused) {
				e := w.h.at(w.p, end, "C10", "text after the closing quote")
				e.Name = w.h.nameOf(cells - 1)
				e.Value = string(data[pos:min(cellEnd(data, pos, delim), end+40)])
				e.Hint = "double a quote that belongs to the cell, or quote the whole cell"
				if i := strings.IndexAny(e.Value[end-pos:], "\r\n"); i >= 0 {
					e.Value = e.Value[:end-pos+i]
				}
				w.s.refused.Add(e)
			}
			pos = end
		}
		if eol < pos {
			eol = len(data)
			if i := bytes.IndexByte(data[pos:], '\n'); i >= 0 {
				eol = pos + i
			}
		}
		i := bytes.IndexByte(data[pos:eol], delim)
		cell := data[pos:eol]
		if i >= 0 {
			cell = cell[:i]
		}
		if w.hasCR {
			w.cellCR(pos, cell, i < 0 && eol < len(data))
		}
		if i < 0 {
			return min(eol+1, len(data)), cells
		}
		pos += i + 1
	}
}

func atLineEnd(data []byte, pos int) bool {
	return data[pos] == '\n' || data[pos] == '\r' && pos+1 < len(data) && data[pos+1] == '\n'
}

// row notes the row data[pos:next] and tells whether it is one: a blank line in a table of several columns is none.
func (w *walker) row(pos, next int, row []byte) bool {
	if len(row) == 0 && w.h.cols > 1 {
		if w.blank < 0 {
			w.blank = pos
		}
		return false
	}
	w.refuseBlank()
	w.s.starts = append(w.s.starts, uint32(pos))
	w.end = next
	if len(row) > w.h.maxField {
		w.longCell(pos, row)
	}
	return true
}

// refuseBlank refuses the blank lines before a row, if there are any.
func (w *walker) refuseBlank() {
	if w.blank < 0 {
		return
	}
	if !skip(&w.s.refused) {
		w.s.refused.Add(w.h.blankLine(w.p, w.blank))
	}
	w.blank = -1
}

func (w *walker) finish() {
	w.s.starts = append(w.s.starts, uint32(w.end))
	if w.blank >= 0 {
		w.s.blank = w.h.blankLine(w.p, w.blank)
	}
}

func (h *head) blankLine(p piece, pos int) *fault.Error {
	e := h.at(p, pos, "C19", "a blank line among the rows")
	e.Hint = "remove the line, or fill the row"
	return e
}

// ragged refuses a row of n cells.
func (w *walker) ragged(pos, next int, row []byte, n int) {
	if skip(&w.s.refused) {
		return
	}
	at := pos + len(row)
	if n > w.h.cols {
		at = pos + cellStart(row, w.h.cols, w.h.delim)
	}
	e := w.h.at(w.p, at, "C12", fmt.Sprintf("the row has %d cells, %d are expected", n, w.h.cols))
	switch {
	case w.last && next == len(w.p.data) && next > 0 && w.p.data[next-1] != '\n' && n < w.h.cols:
		e.Hint = "the last line has no line end: the file may be truncated"
	case n == w.h.cols+1 && len(row) > 0 && row[len(row)-1] == w.h.delim:
		e.Hint = "the line ends in a delimiter that other lines do not have"
	case n == w.h.cols-1 && w.h.names[w.h.cols-1] == "":
		e.Hint = "the header ends in a delimiter, this line does not"
	default:
		e.Hint = "check the line for a missing or extra delimiter, or a cell that needs quotes"
	}
	w.s.refused.Add(e)
}

// longCell refuses a row with a cell over the cap.
func (w *walker) longCell(pos int, row []byte) {
	for start := 0; start <= len(row); {
		end := cellEnd(row, start, w.h.delim)
		if end-start > w.h.maxField && w.s.fatal == nil {
			e := w.h.at(w.p, pos+start, "C20", fmt.Sprintf("a cell of %d bytes, over the cap of %d", end-start, w.h.maxField))
			e.Exit, e.Hint = fault.Limit, "mend the file, or raise --max-field"
			w.s.fatal = e
		}
		start = end + 1
	}
}

// loneCR refuses a carriage return that stands alone in a row without quotes.
func (w *walker) loneCR(pos int, row []byte) {
	if i := bytes.IndexByte(row, '\r'); i >= 0 && !skip(&w.s.refused) {
		w.s.refused.Add(w.h.loneCR(w.p, pos+i))
	}
}

// cellCR refuses a carriage return outside quotes that no line feed follows. atEnd tells that cell ends at a line feed.
func (w *walker) cellCR(pos int, cell []byte, atEnd bool) {
	if atEnd && len(cell) > 0 && cell[len(cell)-1] == '\r' {
		cell = cell[:len(cell)-1]
	}
	w.loneCR(pos, cell)
}

func (h *head) loneCR(p piece, pos int) *fault.Error {
	e := h.at(p, pos, "C04", "a carriage return without a line feed")
	e.Hint = "convert the line ends: tr '\\r' '\\n' < FILE > NEW, or quote a cell that holds one"
	return e
}

// at is a refusal at p.data[pos].
func (h *head) at(p piece, pos int, code, message string) *fault.Error {
	line, column := place(p.data, pos)
	return &fault.Error{Exit: fault.Input, Code: code, File: h.name, Line: line, Column: column, Message: message}
}
