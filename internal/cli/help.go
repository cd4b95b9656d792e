package cli

import (
	"errors"
	"fmt"
	"strings"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"
)

// help prints a command's purpose, examples and flags under their headings. Help that cannot be written is an error,
// which cobra's own help would hide; it is raised through the panic-free path of helpFailed.
func (a *app) help(cmd *cobra.Command, _ []string) {
	if err := a.print(a.helpText(cmd)); err != nil {
		a.helpFailed = errors.Join(a.helpFailed, err)
	}
}

// helpText is the whole help of a command.
func (a *app) helpText(cmd *cobra.Command) string {
	var b strings.Builder
	text := cmd.Long
	if text == "" {
		text = cmd.Short
	}
	fmt.Fprintf(&b, "%s\n\nUsage:\n  %s\n", strings.TrimSpace(text), cmd.UseLine())
	if cmd.Example != "" {
		fmt.Fprintf(&b, "\nExamples:\n%s\n", strings.TrimRight(cmd.Example, "\n"))
	}
	if cmd.HasAvailableSubCommands() {
		b.WriteString("\nCommands:\n")
		for _, c := range cmd.Commands() {
			if c.IsAvailableCommand() {
				fmt.Fprintf(&b, "  %-11s %s\n", c.Name(), c.Short)
			}
		}
		b.WriteString("\npinfill COMMAND --help tells more of each.\n")
	}
	f := a.flags[cmd]
	if f == nil {
		return b.String()
	}
	for _, heading := range f.groups {
		fmt.Fprintf(&b, "\n%s:\n", heading)
		cmd.Flags().VisitAll(func(p *pflag.Flag) {
			if f.byName[p.Name] == heading && !p.Hidden {
				b.WriteString(flagHelp(p, f.all[p.Name]))
			}
		})
	}
	return b.String()
}

// flagHelp is one flag: its name and value, its meaning, its default.
func flagHelp(p *pflag.Flag, v *flag) string {
	name := "    --" + p.Name
	if p.Shorthand != "" {
		name = "-" + p.Shorthand + ", --" + p.Name
	}
	if v.kind != "" {
		name += " " + v.kind
	}
	usage := p.Usage
	if v.def != "" {
		usage += " (default " + v.def + ")"
	}
	const at = 30 // column where the meaning starts
	indent := strings.Repeat(" ", at)
	head := "  " + name
	if len(head) < at-1 {
		head += strings.Repeat(" ", at-len(head))
	} else {
		head += "\n" + indent
	}
	return head + strings.Join(wrap(usage, 110-at), "\n"+indent) + "\n"
}

// wrap breaks text into lines of at most width bytes at spaces.
func wrap(text string, width int) []string {
	var lines []string
	line := ""
	for word := range strings.FieldsSeq(text) {
		if line != "" && len(line)+1+len(word) > width {
			lines = append(lines, line)
			line = ""
		}
		if line != "" {
			line += " "
		}
		line += word
	}
	return append(lines, line)
}
