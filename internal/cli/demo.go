package cli

import (
	"github.com/spf13/cobra"

	"pinfill/internal/job"
)

func (a *app) demoCommand() *cobra.Command {
	return &cobra.Command{
		Use:   "demo DIR",
		Short: "write the demo tables",
		Long: `Writes the demo tables into DIR, the same bytes everywhere. All of them are invented: seabed.csv (a tidal-flat survey,
48 of its cells sampled into five bottom types), grain.csv (the same cells, median grain size at 60), clips.csv (sound
clips of pumps, 40 of them labelled), each with a table of the truth beside it.`,
		Example: "  pinfill demo demo",
		Args:    exactArgs("DIR"),
		RunE: func(cmd *cobra.Command, args []string) error {
			return job.Demo(cmd.Context(), args[0])
		},
	}
}
