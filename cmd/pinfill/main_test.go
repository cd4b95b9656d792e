package main

import (
	"flag"
	"os"
	"path/filepath"
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
		Cmds:          commands,
	})
}

func TestScripts(t *testing.T) { runScripts(t, "scripts") }
