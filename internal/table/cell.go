package table

import "bytes"

// cellEnd gives the end of the cell that starts at pos of row, a row without its line end: the position of the
// delimiter after it, or len(row). A cell is quoted when its first byte is a quote; quotes further in are literal.
func cellEnd(row []byte, pos int, delim byte) int {
	if pos < len(row) && row[pos] == '"' {
		pos, _ = closeQuote(row, pos+1)
		if pos < len(row) && row[pos] == delim {
			return pos
		}
	}
	if i := bytes.IndexByte(row[pos:], delim); i >= 0 {
		return pos + i
	}
	return len(row)
}

// cellStart gives the start of a cell of row, or len(row) where the row has no such cell.
func cellStart(row []byte, col int, delim byte) int {
	pos := 0
	for range col {
		if pos = cellEnd(row, pos, delim) + 1; pos > len(row) {
			return len(row)
		}
	}
	return pos
}

// closeQuote finds the quote that closes a cell whose content starts at pos and gives the position after it. Without
// one it gives len(data) and false.
func closeQuote(data []byte, pos int) (int, bool) {
	for pos < len(data) {
		i := bytes.IndexByte(data[pos:], '"')
		if i < 0 {
			return len(data), false
		}
		pos += i + 1
		if pos >= len(data) || data[pos] != '"' {
			return pos, true
		}
		pos++
	}
	return len(data), false
}

// decode gives the content of a raw cell: what stands between the quotes of a quoted cell, with doubled quotes made
// single; any other cell as it is. It copies only where a quote was doubled.
func decode(raw []byte) []byte {
	if len(raw) < 2 || raw[0] != '"' {
		return raw
	}
	in := raw[1 : len(raw)-1]
	if bytes.IndexByte(in, '"') < 0 {
		return in
	}
	return bytes.ReplaceAll(in, []byte(`""`), []byte(`"`))
}

// trimEnd takes the line end off a row.
func trimEnd(row []byte) []byte {
	if n := len(row); n > 0 && row[n-1] == '\n' {
		row = row[:n-1]
		if n > 1 && row[n-2] == '\r' {
			row = row[:n-2]
		}
	}
	return row
}

// trimSpace takes spaces and tabs off both ends of a cell.
func trimSpace(cell []byte) []byte {
	for len(cell) > 0 && (cell[0] == ' ' || cell[0] == '\t') {
		cell = cell[1:]
	}
	for len(cell) > 0 && (cell[len(cell)-1] == ' ' || cell[len(cell)-1] == '\t') {
		cell = cell[:len(cell)-1]
	}
	return cell
}

// countCells gives the number of cells of a row without its line end.
func countCells(row []byte, delim byte) int {
	if bytes.IndexByte(row, '"') < 0 {
		return bytes.Count(row, []byte{delim}) + 1
	}
	n := 1
	for pos := cellEnd(row, 0, delim); pos < len(row); pos = cellEnd(row, pos+1, delim) {
		n++
	}
	return n
}
