package table

import (
	"context"
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"

	"pinfill/internal/fault"
)

const (
	oldTable  = "old table\n"
	oldRecord = "old record\n"
)

// writeSet is a run that writes a table over an old one, a record over an old one, and a report where none was.
func writeSet(set *Outputs, dir string) error {
	defer set.Abort()
	names := []string{filepath.Join(dir, "t.csv"), filepath.Join(dir, "r.json"), filepath.Join(dir, "r.html")}
	if err := set.Check(names...); err != nil {
		return err
	}
	var outs []*Output
	for _, name := range names {
		f, err := set.Create(name)
		if err != nil {
			return err
		}
		outs = append(outs, f)
	}
	for i, f := range outs {
		for range 3 {
			if _, err := f.Write([]byte(newText(i) + "\n")); err != nil {
				return err
			}
		}
		if err := f.Finish(); err != nil {
			return err
		}
	}
	return set.Commit(outs[0])
}

// newText is a third of what writeSet writes into its i-th file: more than a sink gathers, so that writes happen
// before the end.
func newText(i int) string { return strings.Repeat(string(rune('a'+i)), sinkSize/2) }

// stateOf tells for each file of writeSet whether it is "old" (or absent where none was), "new" or "torn", and counts
// the strangers in the folder.
func stateOf(t *testing.T, dir string) (states [3]string, strangers []string) {
	t.Helper()
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	for i := range states {
		states[i] = "torn"
	}
	states[2] = "old"
	for _, e := range entries {
		i := map[string]int{"t.csv": 1, "r.json": 2, "r.html": 3}[e.Name()] - 1
		if i < 0 {
			strangers = append(strangers, e.Name())
			continue
		}
		text, err := os.ReadFile(filepath.Join(dir, e.Name()))
		if err != nil {
			t.Fatal(err)
		}
		switch string(text) {
		case []string{oldTable, oldRecord, ""}[i]:
			states[i] = "old"
		case strings.Repeat(newText(i)+"\n", 3):
			states[i] = "new"
		default:
			states[i] = "torn"
		}
	}
	return states, strangers
}

func oldFolder(t *testing.T) string {
	t.Helper()
	dir := t.TempDir()
	for name, text := range map[string]string{"t.csv": oldTable, "r.json": oldRecord} {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return dir
}

// TestFaultLoop fails the k-th call on files for every k until a run ends untouched, once and from then on, with three
// errors, after the manner of SQLite's tests. After a run that says it succeeded all files are new; after one fault
// all are new or all are old, and no temporary file is left; after faults that do not end every file is whole.
func TestFaultLoop(t *testing.T) {
	for _, errno := range []syscall.Errno{syscall.ENOSPC, syscall.EFBIG, syscall.EIO} {
		for _, forever := range []bool{false, true} {
			for k := int64(1); ; k++ {
				dir := oldFolder(t)
				fsys := &faultyFS{k: k, forever: forever, errno: errno, short: k%2 == 0}
				err := writeSet(&Outputs{FS: fsys}, dir)
				states, strangers := stateOf(t, dir)
				where := fmt.Sprintf("%v, call %d, forever %v: states %v, strangers %v, error %v", errno, k, forever, states, strangers, err)
				if k > fsys.calls.Load() {
					if err != nil || states != [3]string{"new", "new", "new"} || len(strangers) > 0 {
						t.Fatalf("a run without a fault: %s", where)
					}
					if k < 20 {
						t.Fatalf("only %d calls were made", k)
					}
					break
				}
				checkAfterFault(t, where, states, strangers, forever, err)
			}
		}
	}
}

func checkAfterFault(t *testing.T, where string, states [3]string, strangers []string, forever bool, err error) {
	t.Helper()
	e := firstFault(err)
	allNew := states == [3]string{"new", "new", "new"}
	switch {
	case err == nil && !allNew:
		t.Errorf("success without the outputs: %s", where)
	case err != nil && (e == nil || e.Exit != 4 || e.Code != "S01" && e.Code != "S02" && e.Code != "S03" || e.File == ""):
		t.Errorf("not a refusal with exit 4, S01 to S03 and a file: %s", where)
	case e != nil && e.Code == "S03" && !allNew:
		t.Errorf("S03 without the outputs: %s", where)
	case strings.Contains(fmt.Sprint(states), "torn"):
		t.Errorf("torn: %s", where)
	}
	if forever {
		return
	}
	if err != nil && e.Code != "S03" && states != [3]string{"old", "old", "old"} {
		t.Errorf("some outputs changed in a run that failed: %s", where)
	}
	// The fault may have hit the very removal of a temporary file: one can be left then.
	if len(strangers) > 1 {
		t.Errorf("temporary files left: %s", where)
	}
}

// TestCompressedFaultLoop is TestFaultLoop for one compressed file, whose bytes are written late and by another hand.
func TestCompressedFaultLoop(t *testing.T) {
	for _, suffix := range []string{".gz", ".zst"} {
		want := []byte(nil)
		for k := int64(0); ; k++ {
			path := filepath.Join(t.TempDir(), "t.csv"+suffix)
			fsys := &faultyFS{k: k, errno: syscall.ENOSPC, short: true}
			set := &Outputs{FS: fsys}
			err := put(set, path, noise)
			set.Abort()
			text, _ := os.ReadFile(path)
			if k == 0 {
				want = text
			}
			e := firstFault(err)
			switch {
			case err == nil && string(text) != string(want):
				t.Errorf("%s, call %d: success with %d bytes, want %d", suffix, k, len(text), len(want))
			case err != nil && (e == nil || e.Exit != 4 || e.File != path):
				t.Errorf("%s, call %d: %v is not a refusal with exit 4", suffix, k, err)
			case e != nil && e.Code != "S03" && text != nil:
				t.Errorf("%s, call %d: %d bytes in place after %v", suffix, k, len(text), err)
			}
			if k > fsys.calls.Load() {
				break
			}
		}
		if len(want) < sinkSize {
			t.Errorf("%s: %d bytes are too few to be written in several calls", suffix, len(want))
		}
	}
}

// noise is text that compression cannot make small.
var noise = func() string {
	r := rand.New(rand.NewPCG(5, 9))
	b := make([]byte, 4*sinkSize)
	for i := range b {
		b[i] = byte('0' + r.IntN(64))
	}
	return string(b)
}()

// TestManyRefusals: a file that is wrong throughout is refused in a time that grows with its size alone.
func TestManyRefusals(t *testing.T) {
	for name, text := range map[string]string{
		"ragged":         "a,b\n" + strings.Repeat("1\n", 400_000),
		"ragged, quoted": "a,b\n" + strings.Repeat("\"1\"\n", 400_000),
		"CR":             "a,b\n" + strings.Repeat("1\r,2\n", 400_000),
		"blank":          "a,b\n" + strings.Repeat("1,2\n\n", 400_000) + "1,2\n",
		"after quotes":   "a,b\n" + strings.Repeat("\"1\"x,2\n", 400_000),
		"no names":       strings.Repeat(",", 90_000) + "\n" + strings.Repeat("1,", 90_000) + "1\n",
	} {
		_, err := readText(text, Options{})
		l, ok := err.(*fault.List)
		if !ok || len(l.First) != shownAll || l.Total < 90_000 {
			t.Errorf("%s: %v, want %d refusals and more counted", name, err, shownAll)
		}
	}
	tab, err := readText("y"+strings.Repeat(",x", 90_000)+"\n"+"1"+strings.Repeat(",reef", 90_000)+"\n", Options{RepeatedNames: true})
	if err != nil {
		t.Fatal(err)
	}
	cols := make([]int, 90_001)
	for c := range cols {
		cols[c] = c
	}
	_, err = tab.Numbers(context.Background(), cols, NumberOptions{})
	if l, ok := err.(*fault.List); !ok || l.Total != 90_000 {
		t.Errorf("%v, want 90,000 refusals", err)
	}
}

// TestReadFaultLoop fails the k-th call while reading: the refusal is S16 (or S17 where the size could not be asked
// for) and nothing hangs.
func TestReadFaultLoop(t *testing.T) {
	path := filepath.Join(t.TempDir(), "t.csv")
	if err := os.WriteFile(path, []byte("a,b\n"+strings.Repeat("1,2\n", 3000)), 0o666); err != nil {
		t.Fatal(err)
	}
	for _, forever := range []bool{false, true} {
		for k := int64(1); ; k++ {
			fsys := &faultyFS{k: k, forever: forever, errno: syscall.EIO}
			tab, err := Read(context.Background(), path, nil, Options{FS: fsys, block: 1 << 9})
			if err == nil {
				if tab.Rows() != 3000 {
					t.Fatalf("call %d: %d rows", k, tab.Rows())
				}
				if k > fsys.calls.Load() {
					break
				}
				continue // closing a file that was only read may fail
			}
			if e := firstFault(err); e == nil || e.Code != "S16" || e.Exit != 4 || e.File != path {
				t.Errorf("call %d: %v, want S16", k, err)
			}
		}
	}
}
