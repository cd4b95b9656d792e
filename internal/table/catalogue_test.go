package table

import (
	"bytes"
	"compress/gzip"
	"context"
	"errors"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"unicode/utf16"

	"pinfill/internal/fault"

	"github.com/klauspost/compress/zstd"
)

// readText reads text as standard input.
func readText(text string, o Options) (*Table, error) {
	return Read(context.Background(), "-", strings.NewReader(text), o)
}

// firstFault gives the first refusal of err, or nil.
func firstFault(err error) *fault.Error {
	var l *fault.List
	if errors.As(err, &l) {
		return l.First[0]
	}
	var e *fault.Error
	errors.As(err, &e)
	return e
}

// wide encodes ASCII text in units of size bytes.
func wide(text string, size int, big, mark bool) string {
	units := utf16.Encode([]rune(text))
	if mark {
		units = append([]uint16{0xfeff}, units...)
	}
	var b []byte
	for _, u := range units {
		unit := make([]byte, size)
		if big {
			unit[size-2], unit[size-1] = byte(u>>8), byte(u)
		} else {
			unit[0], unit[1] = byte(u), byte(u>>8)
		}
		b = append(b, unit...)
	}
	return string(b)
}

func gzipped(text string) string {
	var b bytes.Buffer
	z := gzip.NewWriter(&b)
	z.Write([]byte(text))
	z.Close()
	return b.String()
}

func zstandard(text string) string {
	z, _ := zstd.NewWriter(nil)
	return string(z.EncodeAll([]byte(text), nil))
}

// refusals are the inputs that Read refuses, by row of the catalogue of bad input.
var refusals = []struct {
	name, text string
	o          Options
	code       string
	exit       int
	line, col  int
	value      string
	says       string // part of the whole message
}{
	{"CR only", "a,b\r1,2\r3,4\r", Options{}, "C04", 3, 1, 4, "", "tr '\\r' '\\n'"},
	{"one lone CR", "a,b\n1,2\n3\r,4\n", Options{}, "C04", 3, 3, 2, "", "carriage return"},
	{"lone CR beside quotes", "a,b\n\"1\",2\r3\n", Options{}, "C04", 3, 2, 6, "", ""},
	{"CR CR LF", "a,b\r\n1,2\r\r\n", Options{}, "C04", 3, 2, 4, "", ""},
	{"UTF-16LE with mark", wide("a,b\n1,2\n", 2, false, true), Options{}, "C05", 3, 0, 0, "", "iconv -f UTF-16LE"},
	{"UTF-16BE with mark", wide("a,b\n1,2\n", 2, true, true), Options{}, "C05", 3, 0, 0, "", "iconv -f UTF-16BE"},
	{"UTF-16LE", wide("a,b\n1,2\n", 2, false, false), Options{}, "C05", 3, 0, 0, "", "iconv -f UTF-16LE"},
	{"UTF-16BE", wide("a,b\n1,2\n", 2, true, false), Options{}, "C05", 3, 0, 0, "", "iconv -f UTF-16BE"},
	{"UTF-32LE with mark", wide("a,b\n1,2\n", 4, false, true), Options{}, "C05", 3, 0, 0, "", "iconv -f UTF-32LE"},
	{"UTF-32BE", wide("a,b\n1,2\n", 4, true, false), Options{}, "C05", 3, 0, 0, "", "iconv -f UTF-32BE"},
	{"Latin-1", "site,depth\nmudflat,1\ncr\xeache,2\n", Options{}, "C06", 3, 3, 3, "", "byte 0xEA is not valid UTF-8 (offset 23); "},
	{"Latin-1 header behind a mark", "\xef\xbb\xbfs\xe9,b\n1,2\n", Options{}, "C06", 3, 1, 2, "", "offset 4"},
	{"NUL", "a,b\n1,2\n3,\x004\n", Options{}, "C07", 3, 3, 3, "", "offset 10"},
	{"xlsx", "PK\x03\x04\x14\x00\x06\x00", Options{}, "C08", 3, 0, 0, "", "workbook"},
	{"parquet", "PAR1\x15\x04", Options{}, "C08", 3, 0, 0, "", "Parquet"},
	{"gzip cut short", gzipped("a,b\n1,2\n")[:20], Options{}, "C08", 3, 0, 0, "", "ends too early"},
	{"gzip damaged", strings.Replace(gzipped("a,b\n1,2\n"), "\x00\x00\x00\xff\xff", "\x00\x00\x01\xff\xff", 1)[:22] + "xxxxxxxx", Options{}, "C08", 3, 0, 0, "", "damaged"},
	{"zstd cut short", zstandard("a,b\n1,2\n" + strings.Repeat("3,4\n", 99))[:15], Options{}, "C08", 3, 0, 0, "", "damaged"},
	{"gzip twice", gzipped(gzipped("a,b\n1,2\n")), Options{}, "C08", 3, 0, 0, "", "compressed twice"},
	{"unclosed quote", "a,b\n1,2\n3,\"four\n5,6\n", Options{}, "C09", 3, 3, 3, "", "never closes"},
	{"unclosed quote in header", "a,\"b\n1,2\n", Options{}, "C09", 3, 1, 3, "", ""},
	{"unclosed doubled quote", "a,b\n1,\"x\"\"", Options{}, "C09", 3, 2, 3, "", ""},
	{"text after a quote", "a,b\n1,\"x\"y\n", Options{}, "C10", 3, 2, 6, `"x"y`, `column "b"`},
	{"space after a quote", "a,b\n\"x\" ,2\n", Options{}, "C10", 3, 2, 4, `"x" `, `column "a"`},
	{"too few cells", "a,b,c\n1,2,3\n4,5\n6,7,8\n", Options{}, "C12", 3, 3, 4, "", "2 cells, 3 are expected"},
	{"too many cells", "a,b\n1,2\n3,4,5\n6,7\n", Options{}, "C12", 3, 3, 5, "", "3 cells, 2 are expected"},
	{"too few cells beside quotes", "a,b,c\n\"1\",2,3\n\"4\n\",5\n", Options{}, "C12", 3, 4, 4, "", "2 cells, 3 are expected"},
	{"too many cells in quotes", "a,b\n\"1\",\"2\"\n\"3\",\"x\n,\",5\n", Options{}, "C12", 3, 4, 4, "", "3 cells, 2 are expected"},
	{"cut last row", "a,b,c\n1,2,3\n4,5", Options{}, "C12", 3, 3, 4, "", "may be truncated"},
	{"some trailing delimiters", "a,b\n1,2\n3,4,\n", Options{}, "C12", 3, 3, 5, "", "ends in a delimiter"},
	{"trailing delimiter in header alone", "a,b,\n1,2\n", Options{}, "C12", 3, 2, 4, "", "the header ends in a delimiter"},
	{"all trailing delimiters", "a,b,\n1,2,\n3,4,\n", Options{}, "C13", 3, 1, 5, "", "column 3 has no name"},
	{"all trailing delimiters, quoted", "a,b,\n\"1,\",2,\n", Options{}, "C13", 3, 1, 5, "", "column 3 has no name"},
	{"duplicate header", "x,y,x\n1,2,3\n", Options{}, "C14", 3, 1, 5, "", "columns 1 and 3"},
	{"empty header", "x,,y\n1,2,3\n", Options{}, "C15", 3, 1, 3, "", "column 2 has no name"},
	{"empty last header over values", "x,y,\n1,2,3\n", Options{}, "C15", 3, 1, 5, "", "column 3 has no name"},
	{"first line all numbers", "1,2.5\n3,4\n", Options{}, "C16", 3, 1, 1, "1,2.5", "--no-header"},
	{"header only", "a,b\n", Options{}, "C17", 3, 1, 0, "", "0 data rows"},
	{"header only, no line end", "a,b", Options{}, "C17", 3, 1, 0, "", "0 data rows"},
	{"empty", "", Options{}, "C18", 3, 0, 0, "", "0 bytes"},
	{"blank", "\n\r\n\n", Options{}, "C18", 3, 0, 0, "", "4 bytes"},
	{"ragged, then unclosed", "a,b\n1\n" + strings.Repeat("1,2\n", 99) + "\"", Options{block: 64}, "C12", 3, 2, 2, "", "1 cells"},
	{"ragged, then Latin-1", "a,b\n1\n\"2\",3\n\"4\",\"\xe9\n", Options{}, "C12", 3, 2, 2, "", ""},
	{"byte-order mark alone", "\xef\xbb\xbf", Options{}, "C18", 3, 0, 0, "", ""},
	{"blank line", "a,b\n1,2\n\n3,4\n", Options{}, "C19", 3, 3, 1, "", "blank line"},
	{"blank line beside quotes", "a,b\n\"1\",2\n\n\n3,4\n", Options{}, "C19", 3, 3, 1, "", "blank line"},
	{"blank first line", "\na,b\n1,2\n", Options{}, "C19", 3, 1, 1, "", "before the header"},
	{"blank line below the header", "a,b\n\n1,2\n", Options{}, "C19", 3, 2, 1, "", ""},
	{"huge cell", "a,b\n1,2\n3," + strings.Repeat("x", 200) + "\n", Options{MaxField: 100}, "C20", 6, 3, 3, "", "--max-field"},
	{"huge quoted cell", "a,b\n1,2\n\"" + strings.Repeat("x\n", 200) + "\",3\n", Options{MaxField: 100}, "C20", 6, 3, 1, "", "--max-field"},
	{"huge unclosed quote", "a,b\n1,2\n\"" + strings.Repeat("x,y\n", 1<<17), Options{MaxField: 100, block: 1 << 10}, "C20", 6, 3, 1, "", "still open"},
	{"huge header cell", "a," + strings.Repeat("x", 200) + "\n1,2\n", Options{MaxField: 100}, "C20", 6, 1, 3, "", "--max-field"},
	{"huge cell without an end", "a,b\n1," + strings.Repeat("x", 3000), Options{MaxField: 100, block: 64}, "C20", 6, 2, 3, "", "--max-field"},
	{"many columns", strings.Repeat("a,", 50) + "b\n", Options{MaxColumns: 50}, "C21", 6, 1, 0, "", "--max-columns"},
	{"a file of commas", strings.Repeat(",", 1<<20), Options{MaxColumns: 1000, block: 1 << 10}, "C21", 6, 1, 0, "", "--max-columns"},
	{"many rows", "a\n1\n2\n3\n", Options{MaxRows: 2}, "C21", 6, 0, 0, "", "more than 2 rows"},
	{"semicolons", "a;b\n1;2\n", Options{}, "C22", 3, 1, 2, "", "--delimiter=';'"},
	{"tabs", "a\tb\n1\t2\n", Options{}, "C22", 3, 1, 2, "", `--delimiter='\t'`},
	{"bars", "a|b\n1|2\n", Options{}, "C22", 3, 1, 2, "", "--delimiter='|'"},
	{"over the memory limit", "a,b\n" + strings.Repeat("1,2\n", 1<<12), Options{Memory: 1 << 13}, "S15", 6, 0, 0, "", "--memory-limit"},
	{"decompression bomb", gzipped("a,b\n" + strings.Repeat("1,2\n", 1<<20)), Options{Memory: 1 << 20, block: 1 << 16}, "X04", 6, 0, 0, "", "--memory-limit"},
	{"decompression bomb, zstd", zstandard("a,b\n" + strings.Repeat("1,2\n", 1<<20)), Options{Memory: 1 << 20, block: 1 << 16}, "X04", 6, 0, 0, "", "--memory-limit"},
}

func TestRefusals(t *testing.T) {
	for _, c := range refusals {
		t.Run(c.name, func(t *testing.T) {
			tab, err := readText(c.text, c.o)
			if err == nil {
				t.Fatalf("read %d rows, want %s", tab.Rows(), c.code)
			}
			e := firstFault(err)
			if e == nil {
				t.Fatalf("%v is no fault", err)
			}
			if e.Code != c.code || e.Exit != c.exit || e.Line != c.line || e.Column != c.col || e.Value != c.value || e.File != "-" {
				t.Errorf("%s exit %d at %d:%d value %q\nwant %s exit %d at %d:%d value %q\n%v", e.Code, e.Exit, e.Line, e.Column, e.Value, c.code, c.exit, c.line, c.col, c.value, e)
			}
			if !strings.Contains(e.Error(), c.says) {
				t.Errorf("message %q does not say %q", e.Error(), c.says)
			}
		})
	}
}

// acceptances are inputs that look odd and are read all the same: cells are joined by | and rows by /.
var acceptances = []struct {
	name, text string
	o          Options
	want       string
}{
	{"C02 byte-order mark", "\xef\xbb\xbfa,b\n1,2\n", Options{}, "a|b/1|2"},
	{"C02 byte-order mark and quote", "\xef\xbb\xbf\"a\",b\n1,2\n", Options{}, "a|b/1|2"},
	{"C03 mixed line ends, none at the end", "a,b\r\n1,2\n3,4\r\n5,6", Options{}, "a|b/1|2/3|4/5|6"},
	{"C03 blank lines at the end", "a,b\n1,2\n\r\n\n", Options{}, "a|b/1|2"},
	{"C08 gzip", gzipped("a,b\n1,2\n"), Options{}, "a|b/1|2"},
	{"C08 gzip in two members", gzipped("a,b\n1,2\n") + gzipped("3,4\n"), Options{}, "a|b/1|2/3|4"},
	{"C08 zstd", zstandard("a,b\n1,2\n"), Options{}, "a|b/1|2"},
	{"C11 bare quotes", "a,b\n5\" pipe,x\"y\"\n1,2\n", Options{}, "a|b/5\" pipe|x\"y\"/1|2"},
	{"C11 bare quote before a line end", "a,b\nx\",y\n\"1\",2\"\n3,4\n", Options{}, "a|b/x\"|y/1|2\"/3|4"},
	{"C14 repeated names by number", "x,y,x\n1,2,3\n", Options{RepeatedNames: true}, "x|y|x/1|2|3"},
	{"C16 no header", "1,2\n3,4\n", Options{NoHeader: true}, "1|2/1|2/3|4"},
	{"C19 blank line in one column", "a\n1\n\n3\n", Options{}, "a/1//3"},
	{"C22 one column after all", "a;b\n1;2\n", Options{Delimiter: ','}, "a;b/1;2"},
	{"quoted delimiter, quote and line ends", "a,b\n\"1,\"\"2\"\"\",\"x\r\ny\n\"\n3,4\n", Options{}, "a|b/1,\"2\"|x\r\ny\n/3|4"},
	{"quote at the very end", "a,b\n1,\"2\"", Options{}, "a|b/1|2"},
	{"empty quoted cells", "a,b\n\"\",\"\"\n", Options{}, "a|b/|"},
	{"a quote doubled alone", "a,b\n\"\"\"\",1\n", Options{}, "a|b/\"|1"},
	{"space before a quote is content", "a,b\n \"x\",1\n", Options{}, "a|b/ \"x\"|1"},
	{"semicolons", "a;b\n1,5;2\n", Options{Delimiter: ';'}, "a|b/1,5|2"},
	{"formula cells", "a,b\n=1+1,@x\n", Options{}, "a|b/=1+1|@x"},
	{"emoji and right-to-left", "a,b\n🦀,\u202eabc\n", Options{}, "a|b/🦀|\u202eabc"},
}

func joinCells(t *Table) string {
	rows := []string{strings.Join(t.Headers(), "|")}
	for r := range t.Rows() {
		cells := make([]string, t.Columns())
		for c := range cells {
			cells[c] = t.Text(r, c)
		}
		rows = append(rows, strings.Join(cells, "|"))
	}
	return strings.Join(rows, "/")
}

func TestAcceptances(t *testing.T) {
	for _, c := range acceptances {
		t.Run(c.name, func(t *testing.T) {
			tab, err := readText(c.text, c.o)
			if err != nil {
				t.Fatal(err)
			}
			if got := joinCells(tab); got != c.want {
				t.Errorf("%q\nwant %q", got, c.want)
			}
		})
	}
}

// TestBlockSizes reads every input of this file with blocks of 1 to 40 bytes, whole and as a stream, on one worker and
// on three: cells, positions, echo and refusals are those of one large block.
func TestBlockSizes(t *testing.T) {
	type input struct {
		text string
		o    Options
	}
	var inputs []input
	for _, c := range refusals {
		if len(c.text) < 1000 && c.o.Memory == 0 {
			inputs = append(inputs, input{c.text, c.o})
		}
	}
	for _, c := range acceptances {
		inputs = append(inputs, input{c.text, c.o})
	}
	for _, in := range inputs {
		whole, wantErr := readText(in.text, in.o)
		want := ""
		if wantErr == nil {
			want = dump(whole)
		}
		for block := 1; block <= 40; block++ {
			o := in.o
			o.block, o.Workers = block, 1+2*(block%2)
			tab, err := readText(in.text, o)
			compareRuns(t, in.text, block, "Read", tab, err, want, wantErr)
			tab, err = readStream(in.text, o)
			compareRuns(t, in.text, block, "Stream", tab, err, want, wantErr)
		}
	}
}

func compareRuns(t *testing.T, text string, block int, how string, tab *Table, err error, want string, wantErr error) {
	t.Helper()
	if e, w := firstFault(err), firstFault(wantErr); e != nil || w != nil {
		if e == nil || w == nil || e.Code != w.Code || e.Line != w.Line || e.Column != w.Column || e.Value != w.Value {
			t.Errorf("%.60q in blocks of %d: %s says\n%v\nwant\n%v", text, block, how, err, wantErr)
		}
		return
	}
	if got := dump(tab); got != want {
		t.Errorf("%.60q in blocks of %d: %s gives\n%q\nwant\n%q", text, block, how, got, want)
	}
}

// dump shows everything a table holds: cells, positions, the echo with a column appended.
func dump(t *Table) string {
	var b strings.Builder
	for r := range t.Rows() {
		for c := range t.Columns() {
			e := t.Fault(r, c, "", "", "")
			e.File = ""
			b.WriteString(e.Error() + "\n")
		}
	}
	if err := WriteAppended(&b, t, []Column{{Name: "n", Cell: func(_ int, dst []byte) []byte { return append(dst, 'x') }}}); err != nil {
		b.WriteString(err.Error())
	}
	return b.String()
}

// readStream reads all batches of a stream and joins them into one table; batches are written one by one as well.
func readStream(text string, o Options) (*Table, error) {
	s, err := OpenStream(context.Background(), "-", strings.NewReader(text), o)
	if err != nil {
		return nil, err
	}
	defer s.Close()
	all := &Table{head: s.head, first: true}
	var apart, together strings.Builder
	for {
		batch, err := s.Next()
		if err == io.EOF {
			break
		}
		if err != nil {
			return nil, err
		}
		if err := WriteAppended(&apart, batch, nil); err != nil {
			return nil, err
		}
		b := batch.blocks[0]
		b = &block{data: b.data, starts: b.starts, row: all.rows, line: b.line, multi: b.multi}
		all.rows += b.rows()
		all.blocks = append(all.blocks, b)
	}
	if err := WriteAppended(&together, all, nil); err != nil {
		return nil, err
	}
	if apart.String() != together.String() {
		return nil, errors.New("batches written one by one differ from the whole")
	}
	return all, nil
}

func TestInputFiles(t *testing.T) {
	dir := t.TempDir()
	folder := filepath.Join(dir, "folder.csv")
	if err := os.Mkdir(folder, 0o777); err != nil {
		t.Fatal(err)
	}
	for name, path := range map[string]string{"missing": filepath.Join(dir, "none.csv"), "a folder": folder} {
		_, err := Read(context.Background(), path, nil, Options{})
		if e := firstFault(err); e == nil || e.Code != "S16" || e.Exit != 4 || e.File != path {
			t.Errorf("%s: %v, want S16 with exit 4", name, err)
		}
	}
	path := filepath.Join(dir, "t.TSV")
	if err := os.WriteFile(path, []byte("a\tb\n1\t2\n"), 0o666); err != nil {
		t.Fatal(err)
	}
	tab, err := Read(context.Background(), path, nil, Options{})
	if err != nil || tab.Columns() != 2 {
		t.Errorf("%v, want 2 columns in a .tsv", err)
	}
	if _, err := Read(context.Background(), path, nil, Options{Memory: 8}); firstFault(err) == nil || firstFault(err).Code != "S15" {
		t.Errorf("%v, want S15 before reading", err)
	}
	ctx, cancel := context.WithCancelCause(context.Background())
	cause := errors.New("enough")
	cancel(cause)
	if _, err := Read(ctx, path, nil, Options{}); err != cause {
		t.Errorf("%v, want the context's cause", err)
	}
}

// TestSilentPipe: a reader that waits for its writer ends with its context, before the header and after it.
func TestSilentPipe(t *testing.T) {
	for _, text := range []string{"", "a,b\n" + strings.Repeat("1,2\n", 3000)} {
		r, w := io.Pipe()
		ctx, cancel := context.WithCancelCause(context.Background())
		cause := errors.New("enough")
		go func() {
			io.WriteString(w, text)
			cancel(cause)
		}()
		if _, err := Read(ctx, "-", r, Options{block: 64}); err != cause {
			t.Errorf("%v, want the context's cause", err)
		}
		r.Close()
	}
}

// TestStreamKnowsColumns: the columns are known before the first batch, and the end is told as often as asked.
func TestStreamKnowsColumns(t *testing.T) {
	s, err := OpenStream(context.Background(), "-", strings.NewReader("a;b\n1;2\n"), Options{Delimiter: ';'})
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	h := s.Head()
	if h.Rows() != 0 || h.Columns() != 2 || h.Header(1) != "b" || h.Delimiter() != ';' || h.Name() != "-" {
		t.Errorf("the head has %d rows and the columns %q", h.Rows(), h.Headers())
	}
	if batch, err := s.Next(); err != nil || batch.Rows() != 1 || batch.Text(0, 1) != "2" {
		t.Errorf("first batch: %v", err)
	}
	for range 2 {
		if _, err := s.Next(); err != io.EOF {
			t.Errorf("%v, want EOF", err)
		}
	}
}

func TestOptionsRefused(t *testing.T) {
	for _, o := range []Options{{Delimiter: '"'}, {Delimiter: '\n'}, {Delimiter: '.'}, {Delimiter: '5'}, {Delimiter: 'E'}, {Delimiter: 0xc3}, {Decimal: ';'}} {
		_, err := readText("a\n1\n", o)
		if e := firstFault(err); e == nil || e.Exit != 64 {
			t.Errorf("%+v: %v, want exit 64", o, err)
		}
	}
}

// TestChangedInput lets a file grow between two reads.
func TestChangedInput(t *testing.T) {
	path := filepath.Join(t.TempDir(), "t.csv")
	if err := os.WriteFile(path, []byte("a,b\n"+strings.Repeat("1,2\n", 4000)), 0o666); err != nil {
		t.Fatal(err)
	}
	s, err := OpenStream(context.Background(), path, nil, Options{block: 64, Workers: 1})
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	f, err := os.OpenFile(path, os.O_APPEND|os.O_WRONLY, 0)
	if err != nil {
		t.Fatal(err)
	}
	f.WriteString("3,4\n")
	f.Close()
	for err == nil {
		_, err = s.Next()
	}
	if e := firstFault(err); e == nil || e.Code != "S17" || e.Exit != 3 {
		t.Errorf("%v, want S17 with exit 3", err)
	}
}

func TestColumnsAndSums(t *testing.T) {
	tab, err := readText("a,#1,#3\n1,2,3\n", Options{})
	if err != nil {
		t.Fatal(err)
	}
	for name, want := range map[string]int{"a": 0, "#1": 1, "#3": 2, "#2": 1, "#0": -1, "#4": -1, "#+1": -1, "b": -1, "": -1} {
		if c, ok := tab.ColumnIndex(name); c != want || ok != (want >= 0) {
			t.Errorf("column %q: %d %v, want %d", name, c, ok, want)
		}
	}
	for _, text := range []string{"\xef\xbb\xbfa,b\r\n1,2\n\n", gzipped("a,b\n1,2\n")} {
		tab, err := readText(text, Options{block: 5})
		if err != nil {
			t.Fatal(err)
		}
		s, err := OpenStream(context.Background(), "-", strings.NewReader(text), Options{})
		if err != nil {
			t.Fatal(err)
		}
		for err == nil {
			_, err = s.Next()
		}
		if want := sum256(text); tab.SHA256() != want || s.SHA256() != want || tab.Bytes() != int64(len(text)) || s.Bytes() != int64(len(text)) {
			t.Errorf("%q: the hash or size differs from that of the bytes as stored", text)
		}
		s.Close()
	}
}
