package main

import (
	"ebbline/pva"
	"ebbline/pva/assess"
	"ebbline/pva/estimate"
	"ebbline/pva/exact"
	"ebbline/pva/rates"
	"ebbline/reports"
	"ebbline/reports/text"
	"ebbline/reports/tidy"

	"github.com/spf13/cobra"
)

func newExact(a *app) *cobra.Command {
	in := &caseInput{}
	var json string
	var quiet, force bool
	cmd := &cobra.Command{
		Use:   "exact CASE",
		Short: "The answer without random numbers, where the case allows it",
		Long: `Computes the risk without replicates, by following the whole law of the
population from year to year, and states the error of the figure. Where a case
has no such answer it says why (exit status 2).`,
		Example: "  ebbline exact --example fish-pond",
		Args:    cobra.MaximumNArgs(1),
		RunE: func(_ *cobra.Command, args []string) error {
			c, name, err := in.read(args)
			if err != nil {
				return err
			}
			m, faults := rates.New(c)
			if len(faults) > 0 {
				return pva.Faults(faults)
			}
			if _, ok, reason := exact.Cost(m); !ok {
				return badInputf("%s: there is no exact answer: %s", name, reason)
			}
			ctx, stop := a.interruptible()
			defer stop()
			e, err := exact.Solve(ctx, m, exact.Options{})
			if err != nil {
				return err
			}
			if e.Reason != "" {
				return badInputf("%s: there is no exact answer: %s", name, e.Reason)
			}
			warnings := assess.Warnings(c, m)
			verdict := estimate.VerdictExact(c.Question.Limit, e.Risk, e.Error)
			if json != "" {
				doc, err := tidy.ExactJSON(c, e, verdict, warnings, pva.Version)
				if err != nil {
					return err
				}
				if json == "-" {
					if _, err := a.out.Write(doc); err != nil {
						return err
					}
				} else {
					o := outputs{force: force}
					if err := o.fresh(json, name); err != nil {
						return err
					}
					if err := reports.Save(json, doc); err != nil {
						return err
					}
				}
			}
			if !quiet {
				a.say(json == "-", text.Exact(c, name, e, verdict, warnings))
			}
			return nil
		},
	}
	in.addFlags(cmd.Flags())
	cmd.Flags().StringVar(&json, "json", "", "write the result as JSON to `FILE` (- is standard output)")
	cmd.Flags().BoolVar(&quiet, "quiet", false, "print nothing but errors")
	cmd.Flags().BoolVar(&force, "force", false, "overwrite an existing file")
	return cmd
}
