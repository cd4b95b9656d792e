package main

import (
	"errors"
	"flag"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"testing"

	"github.com/rogpeppe/go-internal/testscript"

	"pinfill/internal/cli"
)

func TestMain(m *testing.M) {
	testscript.Main(m, map[string]func(){
		"pinfill": func() { os.Exit(cli.Main()) },
	})
}

// update rewrites the golden parts of the scripts: go test ./cmd/pinfill -args -update.
var update = flag.Bool("update", false, "rewrite the golden parts of the scripts")

func runScripts(t *testing.T, dir string) {
	testscript.Run(t, testscript.Params{
		Dir:           filepath.Join("testdata", dir),
		UpdateScripts: *update,
		Cmds: map[string]func(ts *testscript.TestScript, neg bool, args []string){
			"exitcode": exitCode,
		},
		RequireExplicitExec: false,
	})
}

// exitCode runs a command and checks its exact exit code: exitcode 3 pinfill label ... Its standard output and error
// are then there for stdout and stderr.
func exitCode(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 2 {
		ts.Fatalf("usage: exitcode CODE COMMAND [ARG...]")
	}
	want, err := strconv.Atoi(args[0])
	ts.Check(err)
	err = ts.Exec(args[1], args[2:]...)
	got := 0
	var exit *exec.ExitError
	if errors.As(err, &exit) {
		got = exit.ExitCode()
	} else if err != nil {
		ts.Fatalf("%v", err)
	}
	if got != want {
		ts.Fatalf("exit code %d, want %d", got, want)
	}
}

func TestScripts(t *testing.T) { runScripts(t, "scripts") }
