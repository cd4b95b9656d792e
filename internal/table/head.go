package table

import (
	"bytes"
	"fmt"
	"strconv"

	"pinfill/internal/fault"
)

// head is what all blocks of one table share.
type head struct {
	name     string // of the file, as the user typed it
	delim    byte
	given    bool // the user named the delimiter
	decimal  byte
	na       [][]byte
	maxField int
	maxRows  int64
	memory   int64
	workers  int

	mark     []byte // byte-order mark, echoed
	raw      []byte // header line with its line end; empty without a header
	noHeader bool
	cols     int
	names    []string
	index    map[string]int
}

// nameOf gives the name of a column, or "" for one beyond the header.
func (h *head) nameOf(col int) string {
	if col < len(h.names) {
		return h.names[col]
	}
	return ""
}

// readHead takes the header off the first piece of a table and checks it. What follows of the piece comes back.
func readHead(h *head, p piece, o *Options) (piece, error) {
	end, cells, err := h.headEnd(p)
	if err != nil {
		return p, err
	}
	line := trimEnd(p.data[:end])
	if cells > o.MaxColumns {
		return p, tooManyColumns(h.name, 1, o.MaxColumns)
	}
	h.cols = cells
	texts, starts := make([][]byte, 0, cells), make([]int, 0, cells)
	for start := 0; start <= len(line); {
		e := cellEnd(line, start, h.delim)
		texts, starts = append(texts, decode(line[start:e])), append(starts, start)
		start = e + 1
	}
	if err := h.wrongDelimiter(line); err != nil {
		return p, err
	}
	if h.noHeader {
		for c := range cells {
			h.names = append(h.names, strconv.Itoa(c+1))
		}
	} else {
		for _, t := range texts {
			h.names = append(h.names, string(t))
		}
	}
	h.index = make(map[string]int, cells)
	for c, name := range h.names {
		if _, ok := h.index[name]; !ok {
			h.index[name] = c
		}
	}
	if h.noHeader {
		return p, nil
	}
	rest := piece{data: p.data[end:], off: p.off + int64(end)}
	h.raw = p.data[:end:end]
	return rest, h.checkNames(line, starts, rest, o)
}

// headEnd finds the end of the first row, which must not be blank, and counts its cells.
func (h *head) headEnd(p piece) (end, cells int, err error) {
	s := &scanned{}
	w := walker{h: h, p: p, s: s, hasCR: bytes.IndexByte(p.data, '\r') >= 0}
	end, cells = w.quotedRow(0)
	if e, _ := h.notText(piece{p.data[:end], p.off}); e != nil {
		return 0, 0, e
	}
	if s.refused.Total > 0 {
		return 0, 0, s.refused.First[0]
	}
	if len(trimEnd(p.data[:end])) == 0 {
		e := h.at(p, 0, "C19", "a blank line before the header")
		e.Hint = "remove it"
		return 0, 0, e
	}
	if end > h.maxField {
		w.longCell(0, trimEnd(p.data[:end]))
	}
	return end, cells, s.fatal
}

// wrongDelimiter refuses a table of one column whose first line holds another usual delimiter, unless the delimiter
// was given.
func (h *head) wrongDelimiter(line []byte) error {
	if h.cols != 1 || h.given {
		return nil
	}
	for _, d := range []byte(";\t|,") {
		if i := bytes.IndexByte(line, d); d != h.delim && i >= 0 {
			flag := fmt.Sprintf("--delimiter='%c'", d)
			if d == '\t' {
				flag = `--delimiter='\t'`
			}
			e := h.at(piece{data: line}, i, "C22", fmt.Sprintf("one column only, but the first line holds %q", d))
			e.Hint = fmt.Sprintf("pass %s, or --delimiter='%c' if it is one column", flag, h.delim)
			return e
		}
	}
	return nil
}

// checkNames refuses a header that is none, or whose names do not tell the columns apart. starts
// says where its cells begin.
func (h *head) checkNames(line []byte, starts []int, rest piece, o *Options) error {
	place := func(col int, code, message, hint string) *fault.Error {
		e := h.at(piece{data: line}, starts[col], code, message)
		e.Hint = hint
		return e
	}
	numbers := 0
	for _, name := range h.names {
		if _, err := ParseNumber(trimSpace([]byte(name)), h.decimal); err == nil {
			numbers++
		}
	}
	if numbers == h.cols {
		e := place(0, "C16", "the first line holds only numbers and would be taken for the header", "pass --no-header if it is a row")
		e.Value = string(line)
		return e
	}
	if o.RepeatedNames {
		return nil
	}
	last := h.cols - 1
	if h.names[last] == "" && last > 0 && len(rest.data) > 0 {
		first := h.firstRow(rest)
		if n := countCells(first, h.delim); n == h.cols && first[len(first)-1] == h.delim {
			return place(last, "C13", fmt.Sprintf("column %d has no name: the lines end in a delimiter", h.cols), "remove the delimiter at the end of every line")
		} else if n == last {
			return nil // the row will be refused as ragged, and that names the cause
		}
	}
	var refused fault.List
	seen := make(map[string]int, h.cols)
	for c, name := range h.names {
		first, repeated := seen[name]
		empty := len(trimSpace([]byte(name))) == 0
		if (empty || repeated) && skip(&refused) {
			continue
		}
		if empty {
			refused.Add(place(c, "C15", fmt.Sprintf("column %d has no name", c+1), "give it one"))
			continue
		}
		if repeated {
			e := place(c, "C14", fmt.Sprintf("columns %d and %d have the same name", first+1, c+1), fmt.Sprintf("rename one, or choose by number: #%d, #%d", first+1, c+1))
			e.Name = name
			refused.Add(e)
			continue
		}
		seen[name] = c
	}
	return single(&refused)
}

// firstRow is the first row of a piece that does not begin with a blank line, without its line end.
func (h *head) firstRow(p piece) []byte {
	w := walker{h: h, p: p, s: &scanned{}}
	end, _ := w.quotedRow(0)
	return trimEnd(p.data[:end])
}

// skip counts a refusal for which a list has no place left, so that nobody need find out where it stands.
func skip(l *fault.List) bool {
	if len(l.First) < shownAll {
		return false
	}
	l.Total++
	return true
}

// single gives the one refusal of a list as itself, several as the list, none as nil.
func single(l *fault.List) error {
	if l.Total == 1 {
		return l.First[0]
	}
	return l.Err()
}
