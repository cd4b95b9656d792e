package cli

import (
	"io"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

// The man pages and completions under docs are those of this program; make docs writes them.
func TestPagesAreFresh(t *testing.T) {
	pages, err := Pages()
	if err != nil {
		t.Fatal(err)
	}
	docs := filepath.Join("..", "..", "docs")
	var names []string
	for _, page := range pages {
		names = append(names, page.Name)
		on, err := os.ReadFile(filepath.Join(docs, filepath.FromSlash(page.Name)))
		if err != nil {
			t.Errorf("%v; run make docs", err)
		} else if string(on) != string(page.Text) {
			t.Errorf("docs/%s is not what the program gives; run make docs", page.Name)
		}
	}
	for _, folder := range []string{"man", "completions"} {
		files, err := os.ReadDir(filepath.Join(docs, folder))
		if err != nil {
			t.Fatal(err)
		}
		for _, f := range files {
			if name := folder + "/" + f.Name(); !slices.Contains(names, name) {
				t.Errorf("docs/%s is of no command; remove it", name)
			}
		}
	}
}

// Every command's help opens with its purpose, shows examples that call the command itself, and lists every flag under
// a heading.
func TestHelpIsWhole(t *testing.T) {
	a := newApp(streams{in: strings.NewReader(""), out: io.Discard, err: io.Discard})
	for _, c := range a.root.Commands() {
		const want = 3
		if n := strings.Count(c.Example, "pinfill "+c.Name()+" "); n < want && c.Name() != "demo" && c.Name() != "version" {
			t.Errorf("%s: %d examples, want %d", c.Name(), n, want)
		}
		if c.Long == "" && c.Name() != "version" {
			t.Errorf("%s: no purpose", c.Name())
		}
		text := a.helpText(c)
		if f := a.flags[c]; f != nil {
			for name := range f.all {
				if !strings.Contains(text, "--"+name+" ") && !strings.Contains(text, "--"+name+"\n") {
					t.Errorf("%s: help does not list --%s", c.Name(), name)
				}
			}
		}
		for _, line := range strings.Split(text, "\n") {
			if len(line) > 120 {
				t.Errorf("%s: help line of %d characters: %s", c.Name(), len(line), line)
			}
		}
	}
}
