package table

import (
	"bytes"
	"fmt"
	"io"

	"pinfill/internal/fault"
)

// cutter cuts text into blocks of whole rows. It decides in one pass, from quote to quote, where rows end, so that
// blocks can then be looked at on several workers with no state carried between them.
type cutter struct {
	in    io.Reader
	o     *Options
	name  string
	carry []byte // start of a row whose end was not read yet
	off   int64  // offset of carry's first byte in the text
	eof   bool
	ahead int // bytes to read for the next piece: few at first, so that a small table costs little, at most o.block
}

// firstAhead is how much is read for the first piece.
const firstAhead = 1 << 14

// piece is text of whole rows; only the last of a file may end without a line end.
type piece struct {
	data []byte
	off  int64 // offset of data[0] in the text
}

// next gives the next piece, or io.EOF. A row too long for the caps, or a quote that never closes, is refused, with
// lines counted from the piece's own start.
func (c *cutter) next() (piece, error) {
	if c.eof && len(c.carry) == 0 {
		return piece{}, io.EOF
	}
	c.ahead = min(max(2*c.ahead, firstAhead), c.o.block)
	buf := make([]byte, len(c.carry), len(c.carry)+c.ahead)
	copy(buf, c.carry)
	scan := boundary{delim: c.o.Delimiter}
	for {
		if !c.eof {
			n, err := io.ReadFull(c.in, buf[len(buf):cap(buf)])
			buf = buf[:len(buf)+n]
			switch err {
			case nil:
			case io.EOF, io.ErrUnexpectedEOF:
				c.eof = true
			default:
				return piece{}, err
			}
		}
		scan.advance(buf)
		if c.eof {
			if scan.inside(buf) {
				if scan.rowEnd == 0 {
					return piece{}, c.unclosed(buf, scan.open)
				}
				p := c.cut(buf, scan.rowEnd) // the rows before it have their say first, as in smaller blocks
				c.carry = buf[scan.rowEnd:]
				return p, nil
			}
			c.carry = nil
			if len(buf) == 0 {
				return piece{}, io.EOF
			}
			return c.cut(buf, len(buf)), nil
		}
		if scan.rowEnd > 0 {
			p := c.cut(buf, scan.rowEnd)
			c.carry = buf[scan.rowEnd:]
			return p, nil
		}
		if err := c.tooLong(buf, &scan); err != nil {
			return piece{}, err
		}
		grown := make([]byte, len(buf), 2*cap(buf))
		copy(grown, buf)
		buf = grown
	}
}

func (c *cutter) cut(buf []byte, end int) piece {
	p := piece{data: buf[:end:end], off: c.off}
	c.off += int64(end)
	return p
}

// boundary is how far the search for row ends has come in a buffer that grows at its end.
type boundary struct {
	delim  byte
	pos    int  // looked at so far
	quoted bool // pos is inside a quoted cell
	open   int  // the quote that opened it, or the last one
	rowEnd int  // position after the last line end outside quotes
}

// advance looks at the rest of buf.
func (b *boundary) advance(buf []byte) {
	for b.pos < len(buf) {
		i := bytes.IndexByte(buf[b.pos:], '"')
		if b.quoted {
			q := b.pos + i
			switch {
			case i < 0:
				b.pos = len(buf)
			case q+1 == len(buf): // it may be the first of a doubled quote
				b.pos = q
				return
			case buf[q+1] == '"':
				b.pos = q + 2
			default:
				b.pos, b.quoted = q+1, false
			}
			continue
		}
		gap := buf[b.pos:]
		if i >= 0 {
			gap = gap[:i]
		}
		if nl := bytes.LastIndexByte(gap, '\n'); nl >= 0 {
			b.rowEnd = b.pos + nl + 1
		}
		if i < 0 {
			b.pos = len(buf)
			return
		}
		q := b.pos + i
		b.pos = q + 1
		if q == 0 || buf[q-1] == b.delim || buf[q-1] == '\n' {
			b.quoted, b.open = true, q
		}
	}
}

// inside tells whether buf, the whole rest of a file, ends inside a quoted cell.
func (b *boundary) inside(buf []byte) bool {
	return b.quoted && !(b.pos == len(buf)-1 && buf[b.pos] == '"')
}

// tooLong refuses a row that has no end in buf and passes a cap already.
func (c *cutter) tooLong(buf []byte, b *boundary) error {
	if b.quoted && len(buf)-b.open > c.o.MaxField {
		return c.capped(buf, b.open, fmt.Sprintf("the quote opened here is still open %d bytes on", len(buf)-b.open))
	}
	cells, last := 1, 0
	for pos := cellEnd(buf, 0, b.delim); pos < len(buf); pos = cellEnd(buf, pos+1, b.delim) {
		cells, last = cells+1, pos+1
	}
	if cells > c.o.MaxColumns {
		return tooManyColumns(c.name, 1, c.o.MaxColumns)
	}
	if len(buf)-last > c.o.MaxField {
		return c.capped(buf, last, fmt.Sprintf("a cell of more than %d bytes", c.o.MaxField))
	}
	if longest := max(maxLine, c.o.MaxField); len(buf) > longest {
		return c.capped(buf, 0, fmt.Sprintf("a row of more than %d bytes", longest))
	}
	return nil
}

func (c *cutter) capped(buf []byte, at int, message string) error {
	line, column := place(buf, at)
	return &fault.Error{Exit: fault.Limit, Code: "C20", File: c.name, Line: line, Column: column, Message: message, Hint: "mend the file, or raise --max-field"}
}

func (c *cutter) unclosed(buf []byte, open int) error {
	line, column := place(buf, open)
	return &fault.Error{
		Exit: fault.Input, Code: "C09", File: c.name, Line: line, Column: column, Message: "the quote opened here never closes",
		Hint: "close it, or double a quote that belongs to the cell",
	}
}

func tooManyColumns(name string, line, most int) error {
	return &fault.Error{
		Exit: fault.Limit, Code: "C21", File: name, Line: line, Message: fmt.Sprintf("more than %d columns", most),
		Hint: "check --delimiter, or raise --max-columns",
	}
}

// place gives the line and the byte column of data[at], both from 1, where data[0] begins line 1.
func place(data []byte, at int) (line, column int) {
	before := data[:at]
	return 1 + bytes.Count(before, []byte{'\n'}), at - bytes.LastIndexByte(before, '\n')
}

// moveDown adds the lines before a piece to the position of what was refused in it.
func moveDown(err error, lines int) {
	if e, ok := err.(*fault.Error); ok && e != nil && e.Line > 0 {
		e.Line += lines
	}
}
