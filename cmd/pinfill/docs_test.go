package main

import (
	"context"
	"errors"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"
	"time"
)

// The documents' examples are run, not pasted. In README.md and docs/*.md every fenced block marked console holds
// command lines, which start with "$ " and go on after a \ at their end, each followed by what it prints on standard
// output and standard error together. A line "..." stands for any lines or none; "[exit N]" follows a command that
// ends with another code than 0. The blocks of one document run in order in one empty folder, with pinfill on the path.
//
//	go test ./cmd/pinfill -run TestDocs -args -update
//
// writes what the commands print into the documents, wherever it does not match.

func TestDocs(t *testing.T) {
	if testing.Short() {
		t.Skip("replays every example of the documents")
	}
	root := filepath.Join("..", "..")
	names, err := filepath.Glob(filepath.Join(root, "docs", "*.md"))
	if err != nil {
		t.Fatal(err)
	}
	ran := 0
	for _, name := range append([]string{filepath.Join(root, "README.md")}, names...) {
		text, err := os.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		lines := strings.Split(string(text), "\n")
		if !slices.Contains(lines, consoleFence) {
			continue
		}
		ran++
		t.Run(filepath.Base(name), func(t *testing.T) { replay(t, name, lines) })
	}
	if ran < 2 {
		t.Fatalf("examples found in %d documents; README.md and docs/tutorial.md hold some", ran)
	}
}

const consoleFence = "```console"

// replay runs the examples of one document.
func replay(t *testing.T, name string, lines []string) {
	dir := t.TempDir()
	var out []string
	changed := false
	for i := 0; i < len(lines); i++ {
		out = append(out, lines[i])
		if lines[i] != consoleFence {
			continue
		}
		for i++; lines[i] != "```"; {
			command := lines[i]
			if !strings.HasPrefix(command, "$ ") {
				t.Fatalf("%s:%d: output without a command", name, i+1)
			}
			at := i
			for strings.HasSuffix(lines[i], `\`) {
				i++
				command += "\n" + lines[i]
			}
			out = append(out, strings.Split(command, "\n")...)
			from := i + 1
			for i = from; lines[i] != "```" && !strings.HasPrefix(lines[i], "$ "); i++ {
			}
			want := lines[from:i]
			got := shell(t, dir, command[2:])
			if !matches(want, got) {
				if *update {
					want, changed = got, true
				} else {
					t.Errorf("%s:%d: %s\nprints\n%s\nand the document says\n%s", name, at+1, command, strings.Join(got, "\n"), strings.Join(want, "\n"))
				}
			}
			out = append(out, want...)
		}
		out = append(out, lines[i])
	}
	if changed {
		if err := os.WriteFile(name, []byte(strings.Join(out, "\n")), 0o666); err != nil {
			t.Fatal(err)
		}
	}
}

// shell runs one command line and gives the lines it prints, spaces at their ends taken off.
func shell(t *testing.T, dir, command string) []string {
	t.Helper()
	ctx, cancel := context.WithTimeout(t.Context(), 5*time.Minute)
	defer cancel()
	cmd := exec.CommandContext(ctx, "sh", "-c", command)
	cmd.Dir = dir
	cmd.Env = append(os.Environ(), "PATH="+filepath.Dir(binary(t))+string(os.PathListSeparator)+os.Getenv("PATH"), "LC_ALL=C")
	b, err := cmd.CombinedOutput()
	text := strings.TrimRight(string(b), "\n")
	var lines []string
	if text != "" {
		lines = strings.Split(text, "\n")
	}
	for i := range lines {
		lines[i] = strings.TrimRight(lines[i], " \r")
	}
	var ended *exec.ExitError
	switch {
	case errors.As(err, &ended):
		lines = append(lines, "[exit "+strconv.Itoa(ended.ExitCode())+"]")
	case err != nil:
		t.Fatal(err)
	}
	return lines
}

// matches compares lines, where "..." in want stands for any lines or none.
func matches(want, got []string) bool {
	if len(want) == 0 {
		return len(got) == 0
	}
	if want[0] == "..." {
		for k := range len(got) + 1 {
			if matches(want[1:], got[k:]) {
				return true
			}
		}
		return false
	}
	return len(got) > 0 && want[0] == got[0] && matches(want[1:], got[1:])
}

// A comparison that cannot fail proves nothing.
func TestDocsMatch(t *testing.T) {
	text := func(s string) []string { return strings.Fields(s) }
	for _, c := range []struct {
		want, got string
		ok        bool
	}{
		{"a b", "a b", true},
		{"a b", "a c", false},
		{"a b", "a b c", false},
		{"a b c", "a b", false},
		{"a ... c", "a x y c", true},
		{"a ... c", "a c", true},
		{"a ... c", "a x d", false},
		{"...", "", true},
		{"", "a", false},
	} {
		if matches(text(c.want), text(c.got)) != c.ok {
			t.Errorf("%q against %q: not %v", c.want, c.got, c.ok)
		}
	}
}

var (
	link    = regexp.MustCompile(`\]\(([^)\s]+)\)`)
	goFile  = regexp.MustCompile("`((?:[a-z0-9]+/)+[a-z0-9_]+\\.go)`")
	heading = regexp.MustCompile(`(?m)^#+ (.*)$`)
	notSlug = regexp.MustCompile(`[^a-z0-9 _-]`)
)

// Links between the documents lead to files and headings that are there, and so do the source files they name.
func TestDocsLinks(t *testing.T) {
	root := filepath.Join("..", "..")
	names, err := filepath.Glob(filepath.Join(root, "docs", "*.md"))
	if err != nil {
		t.Fatal(err)
	}
	names = append(names, filepath.Join(root, "README.md"), filepath.Join(root, "DEVELOPERS.md"))
	for _, name := range names {
		text, err := os.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		for _, m := range link.FindAllStringSubmatch(string(text), -1) {
			file, anchor, _ := strings.Cut(m[1], "#")
			if strings.Contains(file, "://") {
				continue
			}
			to := name
			if file != "" {
				to = filepath.Join(filepath.Dir(name), file)
			}
			there, err := os.ReadFile(to)
			if info, e := os.Stat(to); e == nil && info.IsDir() {
				continue
			}
			if err != nil {
				t.Errorf("%s: link to %s: %v", name, m[1], err)
				continue
			}
			if anchor != "" && !slices.Contains(anchors(string(there)), anchor) {
				t.Errorf("%s: no heading for %s", name, m[1])
			}
		}
		for _, m := range goFile.FindAllStringSubmatch(string(text), -1) {
			if _, err := os.Stat(filepath.Join(root, m[1])); err == nil {
				continue
			}
			if _, err := os.Stat(filepath.Join(root, "internal", m[1])); err != nil {
				t.Errorf("%s names %s, which is not there", name, m[1])
			}
		}
	}
}

// anchors are the headings of a document as links name them.
func anchors(text string) []string {
	var out []string
	for _, m := range heading.FindAllStringSubmatch(text, -1) {
		out = append(out, strings.ReplaceAll(notSlug.ReplaceAllString(strings.ToLower(m[1]), ""), " ", "-"))
	}
	return out
}
