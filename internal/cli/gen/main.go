// Gen writes the man pages and shell completions into the folder named, docs in make docs. A test of package cli
// fails when the files there are not what this program writes.
package main

import (
	"fmt"
	"os"
	"path/filepath"

	"pinfill/internal/cli"
)

func main() {
	if err := write(os.Args[1:]); err != nil {
		fmt.Fprintln(os.Stderr, "gen:", err)
		os.Exit(1)
	}
}

func write(args []string) error {
	if len(args) != 1 {
		return fmt.Errorf("one argument, the folder of documents; got %d", len(args))
	}
	pages, err := cli.Pages()
	if err != nil {
		return err
	}
	for _, page := range pages {
		name := filepath.Join(args[0], filepath.FromSlash(page.Name))
		if err := os.MkdirAll(filepath.Dir(name), 0o777); err != nil {
			return err
		}
		if err := os.WriteFile(name, page.Text, 0o666); err != nil {
			return err
		}
	}
	return nil
}
