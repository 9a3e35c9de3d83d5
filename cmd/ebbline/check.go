package main

import (
	"ebbline/pva"
	"ebbline/pva/assess"
	"ebbline/pva/rates"
	"ebbline/reports/text"

	"github.com/spf13/cobra"
)

func newCheck(a *app) *cobra.Command {
	in := &caseInput{}
	cmd := &cobra.Command{
		Use:   "check CASE",
		Short: "Read a case and print it as understood; run nothing",
		Long: `Reads and checks a case and prints it as understood: every value in force with
its unit and source, the order of the year, the growth of the rates under both
readings of the year, every resting place of the mean path, and the doubts that
a reviewer would raise. Runs nothing and writes nothing.`,
		Example: "  ebbline check heron.toml",
		Args:    cobra.MaximumNArgs(1),
		RunE: func(_ *cobra.Command, args []string) error {
			c, _, err := in.read(args)
			if err != nil {
				return err
			}
			m, faults := rates.New(c)
			if len(faults) > 0 {
				return pva.Faults(faults)
			}
			a.say(false, text.Check(c, m, assess.Warnings(c, m)))
			return nil
		},
	}
	in.addFlags(cmd.Flags())
	return cmd
}
