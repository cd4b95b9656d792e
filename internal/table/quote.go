package table

// AppendCell appends a cell to dst as it stands in a table with that delimiter: quoted where it must be.
func AppendCell(dst, cell []byte, delimiter byte) []byte {
	start := len(dst)
	return quoteFrom(append(dst, cell...), start, delimiter)
}
