package cli

import (
	"fmt"
	"io"
	"os"
	"path/filepath"
	"regexp"
	"slices"
	"strings"
	"testing"

	"github.com/spf13/pflag"
)

// docs/options.md has one heading for each flag, with its value, default and commands as the program has them, and
// no other.
func TestOptionsDocument(t *testing.T) {
	type entry struct{ heading, facts string }
	want := map[string]*entry{}
	commands := map[string][]string{}
	a := newApp(streams{in: strings.NewReader(""), out: io.Discard, err: io.Discard})
	for _, c := range a.root.Commands() {
		f := a.flags[c]
		if f == nil {
			continue
		}
		c.Flags().VisitAll(func(p *pflag.Flag) {
			v := f.all[p.Name]
			if v == nil || p.Hidden {
				return
			}
			heading := "--" + p.Name
			if p.Shorthand != "" {
				heading = "-" + p.Shorthand + ", " + heading
			}
			heading = strings.TrimSpace(heading + " " + v.kind)
			def := v.def
			switch {
			case v.isBool:
				def = "off"
			case def == "":
				def = "none"
			}
			commands[p.Name] = append(commands[p.Name], c.Name())
			e := &entry{heading, def}
			if old := want[p.Name]; old != nil && old.heading != e.heading {
				t.Errorf("--%s is written %q and %q", p.Name, old.heading, e.heading)
			}
			want[p.Name] = e
		})
	}
	for name, e := range want {
		slices.Sort(commands[name])
		e.facts = fmt.Sprintf("*Default %s. Commands: %s.*", e.facts, strings.Join(commands[name], ", "))
	}

	text, err := os.ReadFile(filepath.Join("..", "..", "docs", "options.md"))
	if err != nil {
		t.Fatal(err)
	}
	lines := strings.Split(string(text), "\n")
	head := regexp.MustCompile("^### `((?:-[a-z], )?--([a-z-]+).*)`$")
	seen := map[string]bool{}
	for i, line := range lines {
		m := head.FindStringSubmatch(line)
		if m == nil {
			if strings.HasPrefix(line, "### ") {
				t.Errorf("options.md:%d: heading %q is no flag", i+1, line)
			}
			continue
		}
		name := m[2]
		e := want[name]
		switch {
		case e == nil:
			t.Errorf("options.md:%d: no command has --%s", i+1, name)
			continue
		case seen[name]:
			t.Errorf("options.md:%d: --%s stands twice", i+1, name)
		case m[1] != e.heading:
			t.Errorf("options.md:%d: heading %q, want %q", i+1, m[1], e.heading)
		}
		seen[name] = true
		if i+2 >= len(lines) || lines[i+2] != e.facts {
			t.Errorf("options.md:%d: under --%s want the line\n%s", i+3, name, e.facts)
		}
	}
	for name, e := range want {
		if !seen[name] {
			t.Errorf("options.md: no heading for --%s:\n### `%s`\n\n%s\n", name, e.heading, e.facts)
		}
	}
}
