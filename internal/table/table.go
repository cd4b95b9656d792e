// Package table reads and writes CSV and TSV tables so that nothing is misread and nothing is lost. Begin with Read,
// which gives a *Table, or with OpenStream for tables larger than memory; WriteAppended writes a table back with more
// columns, and Outputs writes a set of files of which all appear or none.
//
// The dialect is RFC 4180 with what people really send: any one-byte delimiter, line ends LF, CRLF or mixed, a
// byte-order mark, quotes inside unquoted cells taken literally, no line end after the last row, blank lines after it.
// What could be meant in two ways is refused with a *fault.Error (or a *fault.List) that names the row of the
// catalogue of bad input, the file, line, byte column and value.
//
// A table keeps the file's own bytes in blocks of about 1 MiB, each with four bytes a row to say where rows start, and
// no more: cells are found by walking their row.
package table

import (
	"bytes"
	"context"
	"crypto/sha256"
	"errors"
	"fmt"
	"io"
	"sort"
	"strconv"
	"strings"
	"sync"

	"pinfill/internal/fault"
)

// Table is a read table, or one batch of a Stream. Rows and columns count from 0. Its methods may be called from
// several goroutines.
type Table struct {
	head   *head
	blocks []*block
	rows   int
	first  bool // it begins with the file's first row, so that the header stands before it

	bytes  int64 // as stored
	packed bool
	sum    [sha256.Size]byte
	hashed sync.Once

	kinds     sync.Once
	nonNumber []int // per column: first row that is neither missing nor a number, or -1
}

// Read reads a whole table; name "-" is stdin. gzip and zstd are seen by content. It returns refusals of the catalogue
// C01 to C22, S15 to S17 and X04, or the context's cause.
func Read(ctx context.Context, name string, stdin io.Reader, o Options) (*Table, error) {
	s, err := openStream(ctx, name, stdin, o, false)
	if err != nil {
		return nil, err
	}
	defer s.Close()
	h := s.head
	if s.src.size >= 0 {
		if need := EstimateRead(s.src.size, s.rowBytes); need > h.memory {
			return nil, overMemory(h, "S15", fmt.Sprintf("reading %d bytes needs about %d bytes of memory", s.src.size, need))
		}
	}
	t := &Table{head: h, first: true, packed: s.src.packed != ""}
	var refused fault.List
	held := int64(0)
	for {
		b, bad, err := s.nextBlock()
		if err == io.EOF {
			break
		}
		if bad != nil {
			merge(&refused, bad)
		}
		if err != nil {
			return nil, joined(&refused, err)
		}
		held += int64(cap(b.data)) + 4*int64(cap(b.starts))
		if held > h.memory {
			code := "S15"
			if t.packed {
				code = "X04"
			}
			return nil, overMemory(h, code, fmt.Sprintf("%d bytes of input have grown to %d in memory", s.src.bytes.Load(), held))
		}
		if refused.Total == 0 {
			t.blocks = append(t.blocks, b)
		}
	}
	if err := single(&refused); err != nil {
		return nil, err
	}
	t.rows, t.bytes = int(s.rows), s.src.bytes.Load()
	if t.packed {
		t.sum = s.src.sum()
	}
	return t, nil
}

// joined puts what ended the reading behind what was refused before it.
func joined(refused *fault.List, err error) error {
	var e *fault.Error
	if refused.Total == 0 || !errors.As(err, &e) {
		return err
	}
	refused.Add(e)
	return refused
}

func overMemory(h *head, code, what string) error {
	return &fault.Error{Exit: fault.Limit, Code: code, File: h.name, Message: fmt.Sprintf("%s, over the limit of %d", what, h.memory), Hint: "raise --memory-limit, or split the table"}
}

// Name is the file's name as the user typed it.
func (t *Table) Name() string { return t.head.name }

// Rows is the number of rows below the header.
func (t *Table) Rows() int { return t.rows }

// Columns is the number of columns.
func (t *Table) Columns() int { return t.head.cols }

// Delimiter is the byte between cells.
func (t *Table) Delimiter() byte { return t.head.delim }

// Header is a column's name, without quotes and byte-order mark; its number, from 1, where there is no header.
func (t *Table) Header(col int) string { return t.head.names[col] }

// Headers gives all names, in order. The caller must not change them.
func (t *Table) Headers() []string { return t.head.names }

// ColumnIndex finds a column by its name, or as #N, the N-th column, where no column has that name.
func (t *Table) ColumnIndex(name string) (int, bool) {
	if c, ok := t.head.index[name]; ok {
		return c, true
	}
	if number, ok := strings.CutPrefix(name, "#"); ok {
		if n, err := strconv.Atoi(number); err == nil && n >= 1 && n <= t.head.cols && number[0] != '+' {
			return n - 1, true
		}
	}
	return -1, false
}

// Bytes is the file's size as stored, compressed if it was.
func (t *Table) Bytes() int64 { return t.bytes }

// SHA256 is the hash of the file's bytes as stored, of a table that Read gave.
func (t *Table) SHA256() [32]byte {
	t.hashed.Do(func() {
		if t.packed {
			return
		}
		hash := sha256.New()
		hash.Write(t.head.mark)
		hash.Write(t.head.raw)
		for _, b := range t.blocks {
			hash.Write(b.data)
		}
		hash.Sum(t.sum[:0])
	})
	return t.sum
}

// find gives the block of a row and the row's number in it.
func (t *Table) find(row int) (*block, int) {
	if len(t.blocks) == 1 {
		return t.blocks[0], row
	}
	i := sort.Search(len(t.blocks), func(i int) bool { return t.blocks[i].row > row }) - 1
	for t.blocks[i].rows() == 0 { // blocks of blank lines share their number with the next
		i--
	}
	return t.blocks[i], row - t.blocks[i].row
}

// raw gives a cell as it stands in the file, with its quotes.
func (t *Table) raw(row, col int) []byte {
	b, i := t.find(row)
	line := b.raw(i)
	start := cellStart(line, col, t.head.delim)
	return line[start:cellEnd(line, start, t.head.delim)]
}

// Cell gives a cell's content: without its quotes, doubled quotes made single. The bytes are the table's own, not to
// be changed, unless quotes were doubled.
func (t *Table) Cell(row, col int) []byte { return decode(t.raw(row, col)) }

// Text is Cell as a string.
func (t *Table) Text(row, col int) string { return string(t.Cell(row, col)) }

// Missing tells whether a cell holds nothing but spaces, or one of the texts that mean missing.
func (t *Table) Missing(row, col int) bool { return t.head.missing(trimSpace(t.Cell(row, col))) }

// missing looks at a cell without its quotes and surrounding spaces.
func (h *head) missing(cell []byte) bool {
	if len(cell) == 0 {
		return true
	}
	for _, text := range h.na {
		if bytes.Equal(cell, text) {
			return true
		}
	}
	return false
}

// At gives the line and the byte column where a cell starts, both from 1; the byte-order mark does not count.
func (t *Table) At(row, col int) (line, column int) {
	b, i := t.find(row)
	start := int(b.starts[i])
	cell := cellStart(b.raw(i), col, t.head.delim)
	if !b.multi {
		return b.line + i, cell + 1
	}
	return b.line + b.linesBefore(start+cell), start + cell - bytes.LastIndexByte(b.data[:start+cell], '\n')
}

// Fault is a refusal of a cell, with exit code 3: the caller gives the code, what is wrong and what mends it.
func (t *Table) Fault(row, col int, code, message, hint string) *fault.Error {
	line, column := t.At(row, col)
	return &fault.Error{
		Exit: fault.Input, Code: code, File: t.head.name, Line: line, Column: column,
		Name: t.head.names[col], Value: t.Text(row, col), Message: message, Hint: hint,
	}
}
