package cli

import (
	"bytes"
	"fmt"
	"io"
	"strings"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"pinfill/internal/job"
)

// Page is a file for the manual or for a shell, written from the commands and their flags.
type Page struct {
	Name string // path below the folder of documents, with slashes
	Text []byte
}

// Pages gives the man page of each command and the completions of each shell. They hold no date, so that the same
// program gives the same bytes. The pages keep the headings under which help lists the flags.
func Pages() ([]Page, error) {
	a := newApp(streams{in: strings.NewReader(""), out: io.Discard, err: io.Discard})
	pages := []Page{{"man/pinfill.1", a.manPage(a.root)}}
	for _, c := range a.root.Commands() {
		pages = append(pages, Page{"man/" + pageName(c) + ".1", a.manPage(c)})
	}
	for _, shell := range []struct {
		name  string
		write func(io.Writer) error
	}{
		{"pinfill.bash", func(w io.Writer) error { return a.root.GenBashCompletionV2(w, true) }},
		{"_pinfill", a.root.GenZshCompletion},
		{"pinfill.fish", func(w io.Writer) error { return a.root.GenFishCompletion(w, true) }},
	} {
		var b bytes.Buffer
		if err := shell.write(&b); err != nil {
			return nil, err
		}
		pages = append(pages, Page{"completions/" + shell.name, b.Bytes()})
	}
	return pages, nil
}

// pageName is the name of a command's man page: pinfill-label for pinfill label.
func pageName(c *cobra.Command) string { return strings.ReplaceAll(c.CommandPath(), " ", "-") }

// manPage writes one command as a man page (man-pages(7)).
func (a *app) manPage(c *cobra.Command) []byte {
	var b bytes.Buffer
	name := pageName(c)
	fmt.Fprintf(&b, ".TH %s 1 \"\" \"pinfill %s\" \"pinfill manual\"\n.nh\n.ad l\n", strings.ToUpper(roff(name)), job.Version)
	fmt.Fprintf(&b, ".SH NAME\n%s \\- %s\n", roff(name), roff(c.Short))
	fmt.Fprintf(&b, ".SH SYNOPSIS\n.B %s\n", roff(c.UseLine()))
	long := c.Long
	if long == "" {
		long = c.Short
	}
	fmt.Fprintf(&b, ".SH DESCRIPTION\n%s\n", roff(long))
	if c.HasAvailableSubCommands() {
		b.WriteString(".SH COMMANDS\n")
		for _, sub := range c.Commands() {
			fmt.Fprintf(&b, ".TP\n.B %s\n%s\n", roff(sub.Name()), roff(sub.Short))
		}
	}
	if f := a.flags[c]; f != nil {
		b.WriteString(".SH OPTIONS\n")
		for _, heading := range f.groups {
			fmt.Fprintf(&b, ".SS %s\n", roff(heading))
			c.Flags().VisitAll(func(p *pflag.Flag) {
				if f.byName[p.Name] == heading && !p.Hidden {
					manFlag(&b, p, f.all[p.Name])
				}
			})
		}
	}
	b.WriteString(".SH EXIT STATUS\n0 done and certified; 3 the input is wrong; 4 a file could not be read or written; 5 not certified; 6 a limit was\nreached; 64 usage; 70 a defect of the program; 128+n a signal.\n")
	if c.Example != "" {
		fmt.Fprintf(&b, ".SH EXAMPLES\n.nf\n%s\n.fi\n", roff(c.Example))
	}
	b.WriteString(".SH SEE ALSO\n")
	var also []string
	for _, other := range append([]*cobra.Command{a.root}, a.root.Commands()...) {
		if other != c {
			also = append(also, ".BR "+roff(pageName(other))+" (1)")
		}
	}
	b.WriteString(strings.Join(also, " ,\n") + "\n")
	return b.Bytes()
}

func manFlag(b *bytes.Buffer, p *pflag.Flag, v *flag) {
	b.WriteString(".TP\n\\fB")
	if p.Shorthand != "" {
		b.WriteString(roff("-" + p.Shorthand + ", "))
	}
	b.WriteString(roff("--"+p.Name) + "\\fR")
	if v.kind != "" {
		b.WriteString(" \\fI" + roff(v.kind) + "\\fR")
	}
	fmt.Fprintf(b, "\n%s", roff(p.Usage))
	if v.def != "" {
		fmt.Fprintf(b, " (default %s)", roff(v.def))
	}
	b.WriteByte('\n')
}

// roff escapes text for troff: backslashes, hyphens that must stay ASCII, and lines that start like a request.
func roff(text string) string {
	lines := strings.Split(strings.NewReplacer(`\`, `\e`, "-", `\-`).Replace(strings.TrimRight(text, "\n")), "\n")
	for i, line := range lines {
		if strings.HasPrefix(line, ".") || strings.HasPrefix(line, "'") {
			lines[i] = `\&` + line
		}
	}
	return strings.Join(lines, "\n")
}
