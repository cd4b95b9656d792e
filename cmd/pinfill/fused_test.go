package main

import (
	"bufio"
	"bytes"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"runtime"
	"slices"
	"strings"
	"sync"
	"testing"
)

// newer is the binary for processors with fused multiply-add instructions, and what the compiler listed for it.
type newer struct {
	bin   string
	fused []string // file:line of each fused product in this module
	seen  int      // fused products in package math, which has some
}

// The compiler's own listing (-S) needs no disassembler; the build cache keeps it.
var builtNewer = sync.OnceValues(func() (newer, error) {
	dir, err := os.MkdirTemp("", "pinfill-test")
	if err != nil {
		return newer{}, err
	}
	n := newer{bin: filepath.Join(dir, "pinfill")}
	root, err := filepath.Abs("../..")
	if err != nil {
		return n, err
	}
	build := exec.Command("go", "build", "-gcflags=pinfill/...=-S", "-gcflags=math=-S", "-o", n.bin, ".")
	build.Env = append(os.Environ(), "CGO_ENABLED=0", "GOARCH=amd64", "GOAMD64=v3")
	listing, err := build.CombinedOutput()
	if err != nil {
		return n, fmt.Errorf("%w: %s", err, listing[max(0, len(listing)-2000):])
	}
	fused := regexp.MustCompile(`\((/[^()]*:[0-9]+)\)\s+VFN?M(ADD|SUB)`)
	lines := bufio.NewScanner(bytes.NewReader(listing))
	lines.Buffer(nil, 1<<24)
	for lines.Scan() {
		switch m := fused.FindSubmatch(lines.Bytes()); {
		case m == nil:
		case bytes.HasPrefix(m[1], []byte(root)):
			n.fused = append(n.fused, strings.TrimPrefix(string(m[1]), root+"/"))
		default:
			n.seen++
		}
	}
	slices.Sort(n.fused)
	n.fused = slices.Compact(n.fused)
	return n, lines.Err()
})

func forNewer(t *testing.T) newer {
	t.Helper()
	if testing.Short() || runtime.GOARCH != "amd64" {
		t.Skip("builds a second binary, for GOAMD64=v3")
	}
	n, err := builtNewer()
	if err != nil {
		t.Fatal(err)
	}
	return n
}

// TestNoFusedProducts: a product that meets a sum unrounded would give other bytes on another processor. float64(x*y)
// rounds it.
func TestNoFusedProducts(t *testing.T) {
	n := forNewer(t)
	for _, at := range n.fused {
		t.Errorf("%s: a product is fused with a sum; write float64(x*y)", at)
	}
	if n.seen == 0 {
		t.Error("no fused product seen in package math, where there are some: the search is blind")
	}
}

// TestInstructionSets: code for a newer processor gives the same bytes on the same machine.
func TestInstructionSets(t *testing.T) {
	cpu, err := os.ReadFile("/proc/cpuinfo")
	if err != nil || !strings.Contains(string(cpu), "avx2") || !strings.Contains(string(cpu), " fma ") {
		t.Skip("this machine does not run GOAMD64=v3")
	}
	n := forNewer(t)
	dir := t.TempDir()
	sheet(t, dir, 240, 0)
	if code, msg := runBinary(t, dir, nil, scored...); code != 0 {
		t.Fatal(msg)
	}
	want := read(t, dir, "out.csv")
	run := exec.Command(n.bin, scored...)
	run.Dir = dir
	if out, err := run.CombinedOutput(); err != nil {
		t.Fatalf("%v: %s", err, out)
	}
	if read(t, dir, "out.csv") != want {
		t.Error("GOAMD64=v3 gives other bytes")
	}
}
