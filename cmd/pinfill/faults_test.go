package main

import (
	"bytes"
	"errors"
	"flag"
	"fmt"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"

	"golang.org/x/sys/unix"
)

// kills is the number of times that TestKills kills a run.
var kills = flag.Int("kills", 60, "runs to kill in TestKills")

var plain = []string{"label", "t.csv", "--label", "kind", "--id", "id", "--p", "2", "--quiet", "-o", "out.csv", "--record", "r.json"}

// whole is what a finished run writes.
func whole(t *testing.T, dir string) (table, record string) {
	t.Helper()
	if code, msg := runBinary(t, dir, nil, plain...); code != 0 {
		t.Fatalf("exit %d: %s", code, msg)
	}
	return read(t, dir, "out.csv"), read(t, dir, "r.json")
}

// TestNoSpace limits the size of files so that writing fails at many places: exit 4, the path named, and the old files
// whole, with nothing left behind.
func TestNoSpace(t *testing.T) {
	dir := t.TempDir()
	sheet(t, dir, 2000, 0)
	table, record := whole(t, dir)
	failed := 0
	for kb := 0; kb <= len(table)/1024+2; kb += 8 {
		// ulimit -f counts blocks of 512 bytes or 1 kB by shell; either way the limit moves through the file.
		cmd := exec.Command("sh", "-c", fmt.Sprintf(`trap '' XFSZ; ulimit -f %d; exec "$0" "$@"`, kb))
		cmd.Args = append(append(cmd.Args, binary(t)), plain...)
		cmd.Dir = dir
		out, err := cmd.CombinedOutput()
		switch cmd.ProcessState.ExitCode() {
		case 0:
		case 4:
			failed++
			if !bytes.Contains(out, []byte("[S02]")) {
				t.Errorf("limit %d: no S02 in %q", kb, out)
			}
		default:
			t.Fatalf("limit %d: %v: %s", kb, err, out)
		}
		if read(t, dir, "out.csv") != table || read(t, dir, "r.json") != record {
			t.Fatalf("limit %d: an output is torn", kb)
		}
	}
	if failed == 0 {
		t.Error("no limit made a write fail")
	}
	noStrays(t, dir)
}

func noStrays(t *testing.T, dir string) {
	t.Helper()
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range entries {
		if e.Name() != "t.csv" && e.Name() != "out.csv" && e.Name() != "r.json" {
			t.Errorf("left behind: %s", e.Name())
		}
	}
}

// TestReaderGone closes the pipe that standard output goes into: 141 and silence, as the shell expects, and the record
// that was to go beside it is not there.
func TestReaderGone(t *testing.T) {
	dir := t.TempDir()
	sheet(t, dir, 20000, 0)
	r, w, err := os.Pipe()
	if err != nil {
		t.Fatal(err)
	}
	cmd := exec.Command(binary(t), "label", "t.csv", "--label", "kind", "--id", "id", "--p", "2", "--quiet", "-o", "-", "--record", "r.json")
	cmd.Dir, cmd.Stdout = dir, w
	var msg bytes.Buffer
	cmd.Stderr = &msg
	r.Close()
	err = cmd.Run()
	w.Close()
	if err == nil || cmd.ProcessState.ExitCode() != 128+int(syscall.SIGPIPE) || msg.Len() > 0 {
		t.Errorf("exit %d, said %q", cmd.ProcessState.ExitCode(), msg.String())
	}
	if _, err := os.Stat(filepath.Join(dir, "r.json")); !errors.Is(err, os.ErrNotExist) {
		t.Error("a record without its table")
	}
}

// TestSignals stops a long run: within a second or so, with 128+n, leaving nothing.
func TestSignals(t *testing.T) {
	dir := t.TempDir()
	sheet(t, dir, 40000, 0)
	for _, sig := range []syscall.Signal{syscall.SIGINT, syscall.SIGTERM, syscall.SIGHUP} {
		cmd := exec.Command(binary(t), "label", "t.csv", "--label", "kind", "--id", "id", "--p", "1.7", "--quiet", "-o", "out.csv")
		cmd.Dir = dir
		if err := cmd.Start(); err != nil {
			t.Fatal(err)
		}
		time.Sleep(400 * time.Millisecond)
		if err := cmd.Process.Signal(sig); err != nil {
			t.Fatal(err)
		}
		sent := time.Now()
		_ = cmd.Wait()
		if code := cmd.ProcessState.ExitCode(); code != 128+int(sig) && code != 0 {
			t.Errorf("%v: exit %d", sig, code)
		}
		if took := time.Since(sent); took > 5*time.Second { // a second is the promise; a loaded machine gets five
			t.Errorf("%v: stopped after %v", sig, took)
		}
		noStrays(t, dir)
		os.Remove(filepath.Join(dir, "out.csv"))
	}
}

// TestKills kills runs that replace their outputs at random moments: each output is the old or the new one, whole.
func TestKills(t *testing.T) {
	dir := t.TempDir()
	sheet(t, dir, 300, 0)
	newTable, newRecord := whole(t, dir)
	oldTable, oldRecord := "id,old\n", "{}\n"
	rng := rand.New(rand.NewPCG(97, 13))
	hit := 0
	for range *kills {
		must(t, os.WriteFile(filepath.Join(dir, "out.csv"), []byte(oldTable), 0o666))
		must(t, os.WriteFile(filepath.Join(dir, "r.json"), []byte(oldRecord), 0o666))
		cmd := exec.Command(binary(t), plain...)
		cmd.Dir = dir
		must(t, cmd.Start())
		time.Sleep(time.Duration(rng.IntN(60)) * time.Millisecond)
		_ = cmd.Process.Kill()
		if cmd.Wait() != nil {
			hit++
		}
		table, record := read(t, dir, "out.csv"), read(t, dir, "r.json")
		if table != oldTable && table != newTable || record != oldRecord && record != newRecord {
			t.Fatalf("torn: table of %d bytes, record of %d", len(table), len(record))
		}
		if table == newTable && record != newRecord {
			t.Fatal("the table is in place before the record that speaks of it")
		}
	}
	t.Logf("%d runs killed, %d before their end, none torn", *kills, hit)
	if hit == 0 {
		t.Error("no run was killed before its end")
	}
}

// TestSyncBeforeRename looks at the order of system calls: every output is synced before the first rename, the folder
// after the last. It needs strace.
func TestSyncBeforeRename(t *testing.T) {
	strace, err := exec.LookPath("strace")
	if err != nil {
		t.Skip("strace is not installed")
	}
	dir := t.TempDir()
	sheet(t, dir, 300, 0)
	log := filepath.Join(t.TempDir(), "log")
	cmd := exec.Command(strace, append([]string{"-f", "-o", log, "-e", "trace=fsync,fdatasync,rename,renameat,renameat2", binary(t)}, plain...)...)
	cmd.Dir = dir
	if out, err := cmd.CombinedOutput(); err != nil {
		t.Skipf("strace does not run here: %v: %s", err, out)
	}
	b, err := os.ReadFile(log)
	must(t, err)
	var calls string
	for line := range strings.SplitSeq(string(b), "\n") {
		switch {
		case strings.Contains(line, "sync("):
			calls += "s"
		case strings.Contains(line, "rename"):
			calls += "r"
		}
	}
	if calls != "ssrrs" { // two files synced, two renamed, their folder synced
		t.Errorf("order of calls %q, want ssrrs", calls)
	}
}

// TestTwoRuns lets runs with one output race: the file is whole and is one of theirs.
func TestTwoRuns(t *testing.T) {
	dir := t.TempDir()
	sheet(t, dir, 300, 0)
	var want []string
	jobs := [][]string{append(plain[:len(plain):len(plain)], "--neighbors", "6"), append(plain[:len(plain):len(plain)], "--neighbors", "12")}
	for _, args := range jobs {
		if code, msg := runBinary(t, dir, nil, args...); code != 0 {
			t.Fatal(msg)
		}
		want = append(want, read(t, dir, "out.csv"))
	}
	for range 10 {
		var cmds []*exec.Cmd
		for _, args := range jobs {
			cmd := exec.Command(binary(t), args...)
			cmd.Dir = dir
			must(t, cmd.Start())
			cmds = append(cmds, cmd)
		}
		for _, cmd := range cmds {
			must(t, cmd.Wait())
		}
		if got := read(t, dir, "out.csv"); got != want[0] && got != want[1] {
			t.Fatal("the output is neither run's")
		}
	}
	noStrays(t, dir)
}

// TestTerminalInput reads from a terminal: a usage error, not a run that waits for typing.
func TestTerminalInput(t *testing.T) {
	master, err := os.OpenFile("/dev/ptmx", os.O_RDWR, 0)
	if err != nil {
		t.Skip("no pseudo-terminals here")
	}
	defer master.Close()
	var unlock int
	if err := unix.IoctlSetPointerInt(int(master.Fd()), unix.TIOCSPTLCK, unlock); err != nil {
		t.Skip(err)
	}
	n, err := unix.IoctlGetInt(int(master.Fd()), unix.TIOCGPTN)
	if err != nil {
		t.Skip(err)
	}
	terminal, err := os.OpenFile(fmt.Sprintf("/dev/pts/%d", n), os.O_RDWR|syscall.O_NOCTTY, 0)
	if err != nil {
		t.Skip(err)
	}
	defer terminal.Close()
	cmd := exec.Command(binary(t), "label", "-", "--label", "kind", "-o", "-")
	var msg bytes.Buffer
	cmd.Stdin, cmd.Stderr = terminal, &msg
	_ = cmd.Run()
	if cmd.ProcessState.ExitCode() != 64 || !strings.Contains(msg.String(), "[S18]") {
		t.Errorf("exit %d, said %q", cmd.ProcessState.ExitCode(), msg.String())
	}
}
