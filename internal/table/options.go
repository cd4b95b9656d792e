package table

import (
	"strings"

	"pinfill/internal/fault"
)

// Options say how a table is read. The zero value reads a comma-separated table with a header and the stated caps.
type Options struct {
	Delimiter byte     // between cells; 0 takes a tab for names that end in .tsv (.tsv.gz, .tsv.zst), otherwise a comma
	Decimal   byte     // '.' or ','; 0 is '.'
	NA        []string // texts that mean missing, compared with the trimmed cell; an empty cell is always missing
	NoHeader  bool     // the first line is a row; columns are then called 1, 2, ...

	// RepeatedNames lets two columns have one name, or none: such columns can only be chosen by number (#2).
	RepeatedNames bool

	MaxField   int   // longest cell in bytes; 0 is DefaultMaxField
	MaxColumns int   // most columns; 0 is DefaultMaxColumns
	MaxRows    int64 // most rows; 0 is DefaultMaxRows
	Memory     int64 // most bytes that Read may hold; 0 is DefaultMemory(). OpenStream holds a few blocks whatever the size

	Workers int // 0 is GOMAXPROCS; changes no result
	FS      FS  // nil is the operating system's

	block int // bytes read at a time; 0 is blockSize. Tests set it
}

// Caps that stand unless Options say otherwise.
const (
	DefaultMaxField   = 16 << 20  // bytes in one cell
	DefaultMaxColumns = 100_000   // columns
	DefaultMaxRows    = 1<<31 - 1 // rows; vertices are numbered by int32
	maxLine           = 64 << 20  // bytes in one row, or MaxField where that is more
	blockSize         = 1 << 20   // bytes read, scanned and handed on at a time
)

func (o Options) withDefaults(name string) Options {
	if o.Delimiter == 0 {
		o.Delimiter = delimiterByName(name)
	}
	if o.Decimal == 0 {
		o.Decimal = '.'
	}
	if o.MaxField <= 0 {
		o.MaxField = DefaultMaxField
	}
	if o.MaxColumns <= 0 {
		o.MaxColumns = DefaultMaxColumns
	}
	if o.MaxRows <= 0 {
		o.MaxRows = DefaultMaxRows
	}
	if o.Memory <= 0 {
		o.Memory = DefaultMemory()
	}
	if o.FS == nil {
		o.FS = OS{}
	}
	if o.block <= 0 {
		o.block = blockSize
	}
	return o
}

// check refuses delimiters and decimal signs that would make a table ambiguous.
func (o Options) check() error {
	if d := o.Delimiter; d >= 0x80 || strings.IndexByte("\"\r\n.+-", d) >= 0 || d-'0' <= 9 || d|0x20 >= 'a' && d|0x20 <= 'z' {
		return fault.Usagef("P09", "--delimiter %q cannot part cells: take a comma, semicolon, tab, bar or another sign that no number holds", d)
	}
	if o.Decimal != '.' && o.Decimal != ',' {
		return fault.Usagef("P09", "--decimal %q is neither a full stop nor a comma", o.Decimal)
	}
	return nil
}

// delimiterByName gives a tab for .tsv names, compressed or not, and a comma for all others.
func delimiterByName(name string) byte {
	lower := strings.ToLower(name)
	lower = strings.TrimSuffix(strings.TrimSuffix(lower, ".gz"), ".zst")
	if strings.HasSuffix(lower, ".tsv") || strings.HasSuffix(lower, ".tab") {
		return '\t'
	}
	return ','
}
