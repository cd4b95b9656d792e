package cli

import (
	"fmt"
	"runtime/debug"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"pinfill/internal/fault"
	"pinfill/internal/job"
)

// app is one run of the command line: its streams, its root command and the flags of every command.
type app struct {
	streams
	root  *cobra.Command
	flags map[*cobra.Command]*flags

	helpFailed error // help could not be written
}

// newApp builds every command.
func newApp(s streams) *app {
	a := &app{streams: s, flags: map[*cobra.Command]*flags{}}
	a.root = &cobra.Command{
		Use:   "pinfill COMMAND",
		Short: "finish a partly labelled table",
		Long: `pinfill finishes a partly labelled table: it reads rows with feature columns and a few labels from CSV, builds a
kernel-weighted neighbour graph, solves the p-Laplacian interpolation problem on it, and writes every row's label with
how far to trust it. Settings that are not given are chosen from the table; every solve carries its proof.`,
		Example: `  pinfill demo demo
  pinfill check demo/seabed.csv --label bottom --id cell
  pinfill label demo/seabed.csv --label bottom --id cell -o seabed_done.csv`,
		Args:          cobra.NoArgs,
		SilenceErrors: true,
		SilenceUsage:  true,
		RunE: func(*cobra.Command, []string) error {
			return fault.Usagef("P09", "no command given; pinfill --help lists them")
		},
	}
	a.root.SetIn(s.in)
	a.root.SetOut(s.out)
	a.root.SetErr(s.err)
	a.root.CompletionOptions.HiddenDefaultCmd = false
	a.root.AddCommand(
		a.checkCommand(), a.labelCommand(), a.compareCommand(),
		a.auditCommand(), a.nextCommand(), a.extendCommand(), a.assessCommand(), a.graphCommand(), a.demoCommand(), a.versionCommand(),
	)
	a.root.SetHelpFunc(a.help)
	return a
}

// unknownCommand refuses a first word that is no command, before its flags are looked at.
func (a *app) unknownCommand(args []string) error {
	if len(args) == 0 || strings.HasPrefix(args[0], "-") {
		return nil
	}
	names := append(a.commandNames(), "help", "completion", cobra.ShellCompRequestCmd, cobra.ShellCompNoDescRequestCmd)
	if slices.Contains(names, args[0]) {
		return nil
	}
	return fault.Usagef("P09", "unknown command %s%s", fault.Quote(args[0]), nearest(args[0], a.commandNames()))
}

func (a *app) commandNames() []string {
	var names []string
	for _, c := range a.root.Commands() {
		names = append(names, c.Name())
	}
	return names
}

// exactArgs refuses a command line with another number of arguments than the names listed.
func exactArgs(names ...string) cobra.PositionalArgs {
	return func(cmd *cobra.Command, args []string) error {
		switch {
		case len(args) < len(names):
			return fault.Usagef("S18", "%s needs %s; see pinfill %s --help", cmd.Name(), strings.Join(names[len(args):], " and "), cmd.Name())
		case len(args) > len(names):
			return fault.Usagef("P09", "%s takes %s and no more: %s is too many", cmd.Name(), strings.Join(names, " and "), fault.Quote(args[len(names)]))
		}
		return nil
	}
}

func (a *app) versionCommand() *cobra.Command {
	return &cobra.Command{
		Use:     "version",
		Short:   "print the version and what it was built from",
		Example: "  pinfill version",
		Args:    exactArgs(),
		RunE: func(*cobra.Command, []string) error {
			var b strings.Builder
			fmt.Fprintf(&b, "pinfill %s\n", job.Version)
			if info, ok := debug.ReadBuildInfo(); ok {
				fmt.Fprintf(&b, "%s\n", info.GoVersion)
				for _, m := range info.Deps {
					fmt.Fprintf(&b, "%s %s\n", m.Path, m.Version)
				}
			}
			return a.print(b.String())
		},
	}
}

// print writes to standard output; a failed write is exit 4, never a silent loss.
func (a *app) print(text string) error {
	if _, err := fmt.Fprint(a.out, text); err != nil {
		return &fault.Error{Exit: fault.File, Code: "S04", Message: "cannot write to standard output: " + err.Error(), Err: err}
	}
	return nil
}
