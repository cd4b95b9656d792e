package table

import (
	"bytes"
	"fmt"
	"unicode/utf8"

	"pinfill/internal/fault"
)

var utf8Mark = []byte{0xef, 0xbb, 0xbf}

// formats are file kinds that people hand over as if they were CSV, by their first bytes.
var formats = []struct{ magic, name, hint string }{
	{"PK\x03\x04", "a zip archive (an .xlsx or .ods workbook is one)", "unpack it, or export the sheet as CSV UTF-8"},
	{"PK\x05\x06", "an empty zip archive", "export the sheet as CSV UTF-8"},
	{"PAR1", "a Parquet file", "convert it to CSV first, for example with duckdb -c \"COPY 'FILE' TO 'FILE.csv'\""},
	{"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1", "an old Excel workbook", "export the sheet as CSV UTF-8"},
	{"BZh", "bzip2 data", "decompress it first: bunzip2 -k FILE"},
	{"\xfd7zXZ\x00", "xz data", "decompress it first: xz -dk FILE"},
	{"7z\xbc\xaf\x27\x1c", "a 7-Zip archive", "unpack it first"},
	{"%PDF-", "a PDF document", "export the table as CSV UTF-8"},
	{"SQLite format 3\x00", "an SQLite database", "export the table: sqlite3 -header -csv FILE 'select * from TABLE'"},
	{"\x1f\x8b", "compressed twice (gzip within)", "decompress it once: gunzip FILE"},
	{"\x28\xb5\x2f\xfd", "compressed twice (zstd within)", "decompress it once: zstd -d FILE"},
}

// checkStart refuses text whose first bytes show that it is not UTF-8 text at all.
func checkStart(name string, text []byte) error {
	for _, f := range formats {
		if f.magic != "BZh" && bytes.HasPrefix(text, []byte(f.magic)) || f.magic == "BZh" && isBzip2(text) {
			return &fault.Error{Exit: fault.Input, Code: "C08", File: name, Message: "not a CSV file but " + f.name, Hint: f.hint}
		}
	}
	if enc := wideEncoding(text); enc != "" {
		return &fault.Error{
			Exit: fault.Input, Code: "C05", File: name, Message: "the text is " + enc + ", not UTF-8",
			Hint: fmt.Sprintf("convert it: iconv -f %s -t UTF-8 FILE > NEW", enc),
		}
	}
	return nil
}

// isBzip2 asks for the block size digit and the block's magic too, since a header may well begin with BZh.
func isBzip2(text []byte) bool {
	return len(text) >= 10 && text[0] == 'B' && text[1] == 'Z' && text[2] == 'h' && text[3] >= '1' && text[3] <= '9' &&
		bytes.Equal(text[4:10], []byte{0x31, 0x41, 0x59, 0x26, 0x53, 0x59})
}

// wideEncoding names UTF-16 or UTF-32 by the byte-order mark, or by where the zero bytes of the first 4,096 bytes stand: text that is
// mostly ASCII has them in every other place, or in three of four.
func wideEncoding(text []byte) string {
	switch {
	case bytes.HasPrefix(text, []byte{0xff, 0xfe, 0, 0}):
		return "UTF-32LE"
	case bytes.HasPrefix(text, []byte{0, 0, 0xfe, 0xff}):
		return "UTF-32BE"
	case bytes.HasPrefix(text, []byte{0xff, 0xfe}):
		return "UTF-16LE"
	case bytes.HasPrefix(text, []byte{0xfe, 0xff}):
		return "UTF-16BE"
	}
	text = text[:min(len(text), 4096)&^3]
	var zero [4]int
	for i, c := range text {
		if c == 0 {
			zero[i%4]++
		}
	}
	most := len(text) / 4 * 7 / 10 // of the places of one residue, 70%
	if len(text) < 4 {
		return ""
	}
	var full [4]bool
	for i := range zero {
		full[i] = zero[i] > most
	}
	switch full {
	case [4]bool{false, true, true, true}:
		return "UTF-32LE"
	case [4]bool{true, true, true, false}:
		return "UTF-32BE"
	case [4]bool{false, true, false, true}:
		return "UTF-16LE"
	case [4]bool{true, false, true, false}:
		return "UTF-16BE"
	}
	return ""
}

// checkText finds the first NUL or invalid UTF-8 of a block and says what it is; pos is -1 when there is none.
func checkText(data []byte) (pos int, code, message, hint string) {
	pos = bytes.IndexByte(data, 0)
	bad := pos < 0 && !utf8.Valid(data)
	if pos >= 0 {
		bad = !utf8.Valid(data[:pos])
	}
	if !bad {
		if pos < 0 {
			return -1, "", "", ""
		}
		return pos, "C07", "a NUL byte", "the file is damaged or binary; remove the byte or export the table again"
	}
	for pos = 0; pos < len(data); {
		r, n := utf8.DecodeRune(data[pos:])
		if r == utf8.RuneError && n == 1 {
			break
		}
		pos += n
	}
	return pos, "C06", fmt.Sprintf("byte 0x%02X is not valid UTF-8", data[pos]), "if the file is Latin-1 or Windows-1252, convert it: iconv -f WINDOWS-1252 -t UTF-8 FILE > NEW"
}
