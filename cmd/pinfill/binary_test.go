package main

import (
	"bytes"
	"fmt"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"testing"
)

// builtOnce is the real binary, for tests that kill it or starve it.
var builtOnce = sync.OnceValues(func() (string, error) {
	dir, err := os.MkdirTemp("", "pinfill-test")
	if err != nil {
		return "", err
	}
	bin := filepath.Join(dir, "pinfill")
	cmd := exec.Command("go", "build", "-o", bin, ".")
	cmd.Env = append(os.Environ(), "CGO_ENABLED=0")
	if out, err := cmd.CombinedOutput(); err != nil {
		return "", fmt.Errorf("%w: %s", err, out)
	}
	return bin, nil
})

func binary(t *testing.T) string {
	t.Helper()
	bin, err := builtOnce()
	if err != nil {
		t.Fatal(err)
	}
	return bin
}

// sheet writes a table of n rows on a wavy sheet, a few of them labelled, in a seeded order of rows.
func sheet(t *testing.T, dir string, n int, order uint64) string {
	t.Helper()
	rng := rand.New(rand.NewPCG(71, 5))
	rows := make([]string, n)
	for i := range rows {
		x, y := rng.Float64(), rng.Float64()
		label := ""
		if i%(n/12) == 0 {
			label = "mud"
			if x+y > 1 {
				label = "sand"
			}
		}
		rows[i] = fmt.Sprintf("r%d,%.6f,%.6f,%.6f,%s\n", i, x, y, x*y, label)
	}
	if order > 0 {
		rand.New(rand.NewPCG(order, 3)).Shuffle(n, func(i, j int) { rows[i], rows[j] = rows[j], rows[i] })
	}
	path := filepath.Join(dir, "t.csv")
	if err := os.WriteFile(path, []byte("id,x,y,z,kind\n"+strings.Join(rows, "")), 0o666); err != nil {
		t.Fatal(err)
	}
	return path
}

// runBinary runs the real binary and gives its exit code and standard error.
func runBinary(t *testing.T, dir string, env []string, args ...string) (code int, stderr string) {
	t.Helper()
	cmd := exec.Command(binary(t), args...)
	cmd.Dir = dir
	cmd.Env = append(os.Environ(), env...)
	var b bytes.Buffer
	cmd.Stderr = &b
	if err := cmd.Run(); err != nil && cmd.ProcessState == nil {
		t.Fatal(err)
	}
	return cmd.ProcessState.ExitCode(), b.String()
}
