package main

import (
	"bytes"
	"compress/gzip"
	"encoding/csv"
	"encoding/hex"
	"errors"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"syscall"
	"testing"

	"github.com/rogpeppe/go-internal/testscript"
)

// TestCatalogue runs one script for each row of the catalogue of bad input in docs/status.md.
func TestCatalogue(t *testing.T) { runScripts(t, "catalogue") }

type script = *testscript.TestScript

// Commands of the scripts beside testscript's own.
var commands = map[string]func(ts script, neg bool, args []string){
	"exitcode":     exitCode,
	"notemps":      noTemps,
	"hex":          writeHex,
	"bytes":        startsWith,
	"append":       appendFile,
	"lines":        writeLines,
	"gzip":         gzipFile,
	"classes":      manyClasses,
	"samecells":    sameCells,
	"cutcolumns":   cutColumns,
	"sortlines":    sortLines,
	"near":         near,
	"certifiedor5": certifiedOr5,
	"fulldevice":   fullDevice,
	"closedstdout": closedStdout,
	"islink":       isLink,
	"mode":         mode,
	"fifo":         fifo,
	"bomb":         bomb,
}

// must stops a test or a script at an error.
func must(t interface{ Fatalf(string, ...any) }, err error) {
	if err != nil {
		t.Fatalf("%v", err)
	}
}

// exitCode runs a command and checks its exact exit code: exitcode 3 pinfill label ... Its standard output and error
// are then there for stdout and stderr.
func exitCode(ts script, _ bool, args []string) {
	want, err := strconv.Atoi(args[0])
	must(ts, err)
	if got := exitOf(ts, ts.Exec(args[1], args[2:]...)); got != want {
		ts.Fatalf("exit code %d, want %d", got, want)
	}
}

func exitOf(ts script, err error) int {
	var exit *exec.ExitError
	switch {
	case err == nil:
		return 0
	case errors.As(err, &exit):
		return exit.ExitCode()
	}
	ts.Fatalf("%v", err)
	return -1
}

// noTemps fails when a temporary file was left behind.
func noTemps(ts script, _ bool, _ []string) {
	entries, err := os.ReadDir(ts.MkAbs("."))
	must(ts, err)
	for _, e := range entries {
		if strings.HasPrefix(e.Name(), ".") && e.Name() != ".tmp" || strings.Contains(e.Name(), ".tmp-") {
			ts.Fatalf("left behind: %s", e.Name())
		}
	}
}

// writeHex writes bytes given in hexadecimal; - is none.
func writeHex(ts script, _ bool, args []string) {
	b, err := hex.DecodeString(strings.TrimPrefix(args[1], "-"))
	must(ts, err)
	must(ts, os.WriteFile(ts.MkAbs(args[0]), b, 0o666))
}

// startsWith checks a file's first bytes.
func startsWith(ts script, _ bool, args []string) {
	want, err := hex.DecodeString(args[1])
	must(ts, err)
	if got := ts.ReadFile(args[0]); !strings.HasPrefix(got, string(want)) {
		ts.Fatalf("%s begins %q, want %q", args[0], got[:min(len(got), len(want))], want)
	}
}

func appendFile(ts script, _ bool, args []string) {
	must(ts, os.WriteFile(ts.MkAbs(args[0]), []byte(ts.ReadFile(args[0])+ts.ReadFile(args[1])), 0o666))
}

// writeLines joins lines by a separator written as in Go, without one at the end.
func writeLines(ts script, _ bool, args []string) {
	sep, err := strconv.Unquote(`"` + args[1] + `"`)
	must(ts, err)
	must(ts, os.WriteFile(ts.MkAbs(args[0]), []byte(strings.Join(args[2:], sep)), 0o666))
}

func gzipFile(ts script, _ bool, args []string) {
	var b bytes.Buffer
	z := gzip.NewWriter(&b)
	_, err := z.Write([]byte(ts.ReadFile(args[0])))
	must(ts, err)
	must(ts, z.Close())
	must(ts, os.WriteFile(ts.MkAbs(args[1]), b.Bytes(), 0o666))
}

// bomb writes a small gzip file that unpacks to as many megabytes as asked.
func bomb(ts script, _ bool, args []string) {
	mb, err := strconv.Atoi(args[1])
	must(ts, err)
	var b bytes.Buffer
	z := gzip.NewWriter(&b)
	_, err = z.Write([]byte("id,x,y,kind\n"))
	must(ts, err)
	line := bytes.Repeat([]byte("a,1,2,mud\n"), 1<<20/10)
	for range mb {
		_, err = z.Write(line)
		must(ts, err)
	}
	must(ts, z.Close())
	must(ts, os.WriteFile(ts.MkAbs(args[0]), b.Bytes(), 0o666))
}

// manyClasses writes a table in which every row has a class of its own.
func manyClasses(ts script, _ bool, args []string) {
	n, err := strconv.Atoi(args[1])
	must(ts, err)
	var b strings.Builder
	b.WriteString("x,y,kind\n")
	for i := range n {
		fmt.Fprintf(&b, "%d,%d,class%d\n", i, i%7, i)
	}
	must(ts, os.WriteFile(ts.MkAbs(args[0]), []byte(b.String()), 0o666))
}

// columnOf gives a column of a table by id.
func columnOf(ts script, file, name string) (ids []string, cells map[string]string) {
	rows, err := csv.NewReader(strings.NewReader(ts.ReadFile(file))).ReadAll()
	must(ts, err)
	c := slices.Index(rows[0], name)
	if c < 0 {
		ts.Fatalf("%s has no column %s", file, name)
	}
	cells = map[string]string{}
	for _, r := range rows[1:] {
		ids = append(ids, r[0])
		cells[r[0]] = r[c]
	}
	return ids, cells
}

func sameCells(ts script, _ bool, args []string) {
	_, cells := columnOf(ts, args[0], args[1])
	for _, id := range args[2:] {
		if cells[id] != cells[args[2]] || cells[id] == "" {
			ts.Fatalf("row %s has %q, row %s has %q", id, cells[id], args[2], cells[args[2]])
		}
	}
}

func cutColumns(ts script, _ bool, args []string) {
	var b strings.Builder
	for _, name := range args[2:] {
		ids, cells := columnOf(ts, args[0], name)
		for _, id := range ids {
			fmt.Fprintf(&b, "%s %s\n", id, cells[id])
		}
	}
	must(ts, os.WriteFile(ts.MkAbs(args[1]), []byte(b.String()), 0o666))
}

func sortLines(ts script, _ bool, args []string) {
	lines := strings.SplitAfter(ts.ReadFile(args[0]), "\n")
	slices.Sort(lines)
	must(ts, os.WriteFile(ts.MkAbs(args[1]), []byte(strings.Join(lines, "")), 0o666))
}

// near compares a numeric column of two tables within a tolerance.
func near(ts script, _ bool, args []string) {
	tol, err := strconv.ParseFloat(args[3], 64)
	must(ts, err)
	ids, a := columnOf(ts, args[0], args[2])
	_, b := columnOf(ts, args[1], args[2])
	for _, id := range ids {
		x, err := strconv.ParseFloat(a[id], 64)
		must(ts, err)
		y, err := strconv.ParseFloat(b[id], 64)
		must(ts, err)
		if math.Abs(x-y) > tol {
			ts.Fatalf("row %s: %v and %v differ by more than %v", id, x, y, tol)
		}
	}
}

// certifiedOr5 runs a command that must either write its output or exit 5 without it.
func certifiedOr5(ts script, _ bool, args []string) {
	_ = os.Remove(ts.MkAbs(args[0]))
	code := exitOf(ts, ts.Exec(args[1], args[2:]...))
	_, err := os.Stat(ts.MkAbs(args[0]))
	if !(code == 0 && err == nil) && !(code == 5 && err != nil) {
		ts.Fatalf("exit code %d, output there: %v", code, err == nil)
	}
}

// fullDevice runs a command with /dev/full as standard output; it must exit 4.
func fullDevice(ts script, _ bool, args []string) {
	if code := exitOf(ts, ts.Exec("sh", "-c", shellLine(args)+" >/dev/full")); code != 4 {
		ts.Fatalf("exit code %d, want 4", code)
	}
}

// closedStdout runs a command with standard output closed.
func closedStdout(ts script, _ bool, args []string) {
	if code := exitOf(ts, ts.Exec("sh", "-c", shellLine(args)+" >&-")); code != 0 {
		ts.Fatalf("exit code %d, want 0", code)
	}
}

func shellLine(args []string) string {
	q := make([]string, len(args))
	for i, a := range args {
		q[i] = "'" + strings.ReplaceAll(a, "'", `'\''`) + "'"
	}
	return strings.Join(q, " ")
}

func isLink(ts script, _ bool, args []string) {
	info, err := os.Lstat(ts.MkAbs(args[0]))
	must(ts, err)
	if info.Mode()&os.ModeSymlink == 0 {
		ts.Fatalf("%s is no link any more", args[0])
	}
}

func mode(ts script, _ bool, args []string) {
	want, err := strconv.ParseUint(args[1], 8, 32)
	must(ts, err)
	old := syscall.Umask(0)
	syscall.Umask(old)
	info, err := os.Stat(ts.MkAbs(args[0]))
	must(ts, err)
	if got := uint64(info.Mode().Perm()); got != want&^uint64(old)|want&0o600 {
		ts.Fatalf("mode %o, want %o under umask %o", got, want, old)
	}
}

// fifo runs a command that writes to a FIFO and keeps what came through.
func fifo(ts script, _ bool, args []string) {
	must(ts, syscall.Mkfifo(ts.MkAbs(args[0]), 0o666))
	must(ts, ts.Exec("sh", "-c", "cat "+args[0]+" > "+args[1]+" & "+shellLine(args[2:])+"; r=$?; wait; exit $r"))
}

// TestCatalogueIsWhole fails for a code of docs/status.md without a script here, or a test elsewhere that is named there.
func TestCatalogueIsWhole(t *testing.T) {
	doc, err := os.ReadFile(filepath.Join("..", "..", "docs", "status.md"))
	if err != nil {
		t.Fatal(err)
	}
	rows := 0
	for line := range strings.SplitSeq(string(doc), "\n") {
		cells := strings.Split(line, "|")
		if len(cells) < 5 || !isCode(strings.TrimSpace(cells[1])) {
			continue
		}
		rows++
		code, where := strings.TrimSpace(cells[1]), strings.TrimSpace(cells[len(cells)-2])
		if where == "" {
			where = "cmd/pinfill/testdata/catalogue/" + code + ".txtar"
		}
		file, test, _ := strings.Cut(strings.Trim(where, "`"), " ")
		b, err := os.ReadFile(filepath.Join("..", "..", file))
		if err != nil || (test != "" && !bytes.Contains(b, []byte("func "+test+"("))) {
			t.Errorf("%s has no test: %s", code, where)
		}
	}
	if rows < 100 {
		t.Errorf("docs/status.md has %d rows of the catalogue, want all", rows)
	}
}

func isCode(s string) bool {
	if len(s) != 3 || !strings.Contains("CLGPNSXR", s[:1]) {
		return false
	}
	_, err := strconv.Atoi(s[1:])
	return err == nil
}
