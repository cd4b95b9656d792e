package table

import (
	"bytes"
	"compress/gzip"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"

	"github.com/klauspost/compress/zstd"
)

// put writes one file through an Outputs.
func put(set *Outputs, name, text string) error {
	f, err := set.Create(name)
	if err != nil {
		return err
	}
	if _, err := io.WriteString(f, text); err != nil {
		return err
	}
	return set.Commit(f)
}

func wantFault(t *testing.T, err error, code string, exit int) {
	t.Helper()
	if e := firstFault(err); e == nil || e.Code != code || e.Exit != exit {
		t.Errorf("%v, want %s with exit %d", err, code, exit)
	}
}

func TestOutputPlaces(t *testing.T) {
	dir := t.TempDir()
	at := func(name string) string { return filepath.Join(dir, name) }
	in := at("in.csv")
	for name, text := range map[string]string{"in.csv": "a\n1\n", "behind.csv": "old"} {
		if err := os.WriteFile(at(name), []byte(text), 0o640); err != nil {
			t.Fatal(err)
		}
	}
	for _, step := range []error{
		os.Link(in, at("hard.csv")), os.Symlink("in.csv", at("soft.csv")), os.Symlink("behind.csv", at("link.csv")),
		os.Symlink("new.csv", at("dangling.csv")), os.Symlink("loop.csv", at("loop.csv")), os.Mkdir(at("sub"), 0o777), syscall.Mkfifo(at("fifo"), 0o666),
	} {
		if step != nil {
			t.Fatal(step)
		}
	}
	for _, name := range []string{at("none/out.csv"), at("sub"), at("loop.csv"), at("in.csv/out.csv"), at("new") + "/", ""} {
		set := &Outputs{}
		if name != "" {
			wantFault(t, set.Check(name), "S01", 4)
		}
		_, err := set.Create(name)
		wantFault(t, err, "S01", 4)
	}
	for _, name := range []string{in, at("hard.csv"), at("soft.csv"), at("sub/../in.csv")} {
		set := &Outputs{Inputs: []string{"-", in}}
		wantFault(t, set.Check(name), "S10", 64)
		_, err := set.Create(name)
		wantFault(t, err, "S10", 64)
		set.InPlace = true
		if err := set.Check(name); err != nil {
			t.Error(err)
		}
	}
	for _, pair := range [][2]string{{at("x.csv"), at("x.csv")}, {at("x.csv"), at("sub/../x.csv")}, {at("link.csv"), at("behind.csv")}, {at("dangling.csv"), at("new.csv")}, {in, at("hard.csv")}, {"-", "-"}} {
		wantFault(t, (&Outputs{}).Check(pair[0], pair[1]), "S10", 64)
	}
	if err := (&Outputs{Inputs: []string{in, at("absent.csv")}}).Check(at("x.csv"), "", at("y.csv"), "-", "/dev/null"); err != nil {
		t.Error(err)
	}

	// S12: symlinks stay links, also one that leads nowhere yet.
	for link, file := range map[string]string{"link.csv": "behind.csv", "dangling.csv": "new.csv"} {
		if err := put(&Outputs{}, at(link), "text"); err != nil {
			t.Error(err)
		}
		if text, _ := os.ReadFile(at(file)); string(text) != "text" {
			t.Errorf("%s holds %q behind the link", file, text)
		}
		if info, err := os.Lstat(at(link)); err != nil || info.Mode()&os.ModeSymlink == 0 {
			t.Errorf("%s is no link any more", link)
		}
	}

	// S13: a FIFO is written directly and stays one.
	got := make(chan string)
	go func() {
		text, _ := os.ReadFile(at("fifo"))
		got <- string(text)
	}()
	if err := put(&Outputs{}, at("fifo"), "through"); err != nil {
		t.Error(err)
	}
	if text := <-got; text != "through" {
		t.Errorf("the FIFO gave %q", text)
	}
	if info, err := os.Lstat(at("fifo")); err != nil || info.Mode()&os.ModeNamedPipe == 0 {
		t.Error("the FIFO was replaced")
	}

	// S14: a new file has what the umask leaves, an old one keeps its mode.
	mask := syscall.Umask(0o027)
	err := errors.Join(put(&Outputs{}, at("fresh.csv"), "x"), put(&Outputs{}, at("behind.csv"), "x"))
	syscall.Umask(mask)
	if err != nil {
		t.Error(err)
	}
	for name, mode := range map[string]os.FileMode{"fresh.csv": 0o640, "behind.csv": 0o640} {
		if info, err := os.Stat(at(name)); err != nil || info.Mode().Perm() != mode {
			t.Errorf("%s has mode %v, want %v", name, info.Mode().Perm(), mode)
		}
	}
	entries, _ := filepath.Glob(at(".pinfill*"))
	if len(entries) > 0 {
		t.Errorf("left behind: %v", entries)
	}
}

func TestFullDevice(t *testing.T) {
	if _, err := os.Stat("/dev/full"); err != nil {
		t.Skip("no /dev/full")
	}
	err := put(&Outputs{}, "/dev/full", "x")
	wantFault(t, err, "S02", 4)
	if e := firstFault(err); e == nil || e.File != "/dev/full" || !errors.Is(err, syscall.ENOSPC) || !strings.Contains(e.Error(), "no space") {
		t.Errorf("%v, want the path and the system's reason", err)
	}
	f, err := os.OpenFile("/dev/full", os.O_WRONLY, 0)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	wantFault(t, put(&Outputs{Stdout: f}, "-", "x"), "S04", 4)
}

// brokenPipe is standard output whose reader has gone.
type brokenPipe struct{}

func (brokenPipe) Write([]byte) (int, error) {
	return 0, &os.PathError{Op: "write", Path: "|1", Err: syscall.EPIPE}
}

// TestStandardOutput: what fails there leaves the files alone.
func TestStandardOutput(t *testing.T) {
	path := filepath.Join(t.TempDir(), "r.json")
	set := &Outputs{Stdout: brokenPipe{}}
	table, err := set.Create("-")
	if err != nil {
		t.Fatal(err)
	}
	record, err := set.Create(path)
	if err != nil {
		t.Fatal(err)
	}
	io.WriteString(table, "a\n1\n")
	io.WriteString(record, "{}\n")
	wantFault(t, set.Commit(table), "S05", 141)
	if _, err := os.Stat(path); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("%v, want no record", err)
	}
	var b bytes.Buffer
	if err := put(&Outputs{Stdout: &b}, "-", "a\n1\n"); err != nil || b.String() != "a\n1\n" {
		t.Errorf("%v, %q", err, b.String())
	}
}

func TestCompressedOutputs(t *testing.T) {
	text := strings.Repeat("cell,1.5\n", 60_000)
	for _, suffix := range []string{".gz", ".zst"} {
		var first []byte
		for i := range 2 {
			path := filepath.Join(t.TempDir(), "t.csv"+suffix)
			set := &Outputs{}
			f, err := set.Create(path)
			if err != nil {
				t.Fatal(err)
			}
			io.WriteString(f, text)
			if err := f.Finish(); err != nil {
				t.Fatal(err)
			}
			if _, err := f.Write([]byte("x")); err == nil {
				t.Error("a finished output can be written")
			}
			if err := set.Commit(); err != nil {
				t.Fatal(err)
			}
			stored, err := os.ReadFile(path)
			if err != nil {
				t.Fatal(err)
			}
			if f.SHA256() != sum256(string(stored)) || f.Bytes() != int64(len(stored)) || f.Name() != path {
				t.Errorf("%s: hash, size or name differ from the file's", suffix)
			}
			if i == 0 {
				first = stored
			} else if !bytes.Equal(first, stored) {
				t.Errorf("%s: two runs give different bytes", suffix)
			}
		}
		var plain io.Reader
		var err error
		if suffix == ".gz" {
			plain, err = gzip.NewReader(bytes.NewReader(first)) // the standard library's, not the one that wrote
		} else {
			plain, err = zstd.NewReader(bytes.NewReader(first))
		}
		if err != nil {
			t.Fatal(err)
		}
		if got, err := io.ReadAll(plain); err != nil || string(got) != text {
			t.Errorf("%s does not unpack to what was written: %v", suffix, err)
		}
	}
}

// TestDescriptorLinks: a name like /dev/stdout is a link that only the system can follow.
func TestDescriptorLinks(t *testing.T) {
	r, w, err := os.Pipe()
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	path := fmt.Sprintf("/proc/self/fd/%d", w.Fd())
	if _, err := os.Stat(path); err != nil {
		t.Skip("no /proc")
	}
	if err := put(&Outputs{}, path, "through"); err != nil {
		t.Error(err)
	}
	w.Close()
	if text, err := io.ReadAll(r); err != nil || string(text) != "through" {
		t.Errorf("the pipe gave %q (%v)", text, err)
	}
}

// fewWrites is a writer that fails after some writes.
type fewWrites struct{ left int }

func (f *fewWrites) Write(p []byte) (int, error) {
	if f.left == 0 {
		return 0, syscall.EIO
	}
	f.left--
	return len(p), nil
}

// TestAppendFails: every write that fails is told.
func TestAppendFails(t *testing.T) {
	for _, text := range []string{"a\n" + strings.Repeat("1\n", 2*rowGrain), "a,b\n1,2\n" + strings.Repeat("\n", 400)} {
		tab, err := readText(text, Options{block: 64})
		if err != nil {
			t.Fatal(err)
		}
		failed := 0
		for {
			if err = WriteAppended(&fewWrites{failed}, tab, nil); err == nil {
				break
			}
			failed++
		}
		if failed < 3 {
			t.Errorf("%.20q: only %d writes can fail", text, failed)
		}
	}
}

// TestAbort drops a set from another goroutine while it is written.
func TestAbort(t *testing.T) {
	dir := oldFolder(t)
	set := &Outputs{}
	f, err := set.Create(filepath.Join(dir, "t.csv"))
	if err != nil {
		t.Fatal(err)
	}
	done := make(chan bool)
	go func() { done <- set.Abort() }()
	for err == nil {
		_, err = f.Write(bytes.Repeat([]byte("x"), sinkSize))
	}
	if <-done {
		t.Error("Abort says that the outputs are in place")
	}
	if err := set.Commit(); err == nil {
		t.Error("a set can be committed after Abort")
	}
	if _, err := set.Create(filepath.Join(dir, "u.csv")); err == nil {
		t.Error("an output can be created after Abort")
	}
	if states, strangers := stateOf(t, dir); states[0] != "old" || len(strangers) > 0 {
		t.Errorf("states %v, strangers %v", states, strangers)
	}
	set = &Outputs{}
	if err := put(set, filepath.Join(dir, "t.csv"), "x"); err != nil || !set.Abort() {
		t.Errorf("%v; Abort after Commit says that nothing is in place", err)
	}
}

func TestWriter(t *testing.T) {
	var b bytes.Buffer
	w := NewWriter(&b, 0)
	rows := [][]string{{"a", "b"}, {"1,5", "x\"y"}, {"two\nlines", " edge "}, {"", ""}, {"plain", "|"}}
	for _, r := range rows {
		if err := w.Row(r...); err != nil {
			t.Fatal(err)
		}
	}
	if err := w.Flush(); err != nil {
		t.Fatal(err)
	}
	tab, err := readText(b.String(), Options{})
	if err != nil {
		t.Fatal(err)
	}
	want := make([]string, len(rows))
	for i, r := range rows {
		want[i] = strings.Join(r, "|")
	}
	if got := joinCells(tab); got != strings.Join(want, "/") {
		t.Errorf("%q comes back as %q", rows, got)
	}
	b.Reset()
	w = NewWriter(&b, ';')
	w.Row("a")
	w.Row("")
	w.Row("1;2")
	w.Flush()
	if got := b.String(); got != "a\n\"\"\n\"1;2\"\n" {
		t.Errorf("one column is written %q", got)
	}
	w = NewWriter(brokenPipe{}, 0)
	w.Row("a")
	if err := w.Flush(); !errors.Is(err, syscall.EPIPE) || w.Flush() == nil {
		t.Errorf("%v, want the pipe's error, and again", err)
	}
}
