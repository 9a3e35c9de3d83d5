package main

import (
	"fmt"

	"ebbline/pva"
	"ebbline/pva/sweep"
	"ebbline/pva/sweep/ledger"
	"ebbline/reports"
	"ebbline/reports/text"
	"ebbline/reports/tidy"

	"github.com/spf13/cobra"
)

type minimumOptions struct {
	caseInput
	outputs
	longRun
}

func newMinimum(a *app) *cobra.Command {
	o := &minimumOptions{}
	cmd := &cobra.Command{
		Use:   "minimum CASE",
		Short: "Find the minimum viable size",
		Long: `Searches for the smallest start (or capacity, or both: minimum.vary) whose risk
of falling is at most minimum.risk within minimum.horizon. "None up to N" and
"already viable at the smallest size" are answers, not errors.

What is finished is kept in a ledger, as in ebbline sweep.

` + statusHelp,
		Example: `  ebbline minimum --example upland-goat
  ebbline minimum goat.toml --set minimum.vary=start --set minimum.to=500`,
		Args: cobra.MaximumNArgs(1),
		RunE: func(_ *cobra.Command, args []string) error { return a.minimum(o, args) },
	}
	o.caseInput.addFlags(cmd.Flags())
	o.outputs.addFlags(cmd.Flags())
	o.longRun.addFlags(cmd.Flags())
	return cmd
}

func (a *app) minimum(o *minimumOptions, args []string) error {
	c, name, err := o.read(args)
	if err != nil {
		return err
	}
	if err := o.longRun.check(); err != nil {
		return err
	}
	study, sizes, err := sweep.NewMinimum(c)
	if err != nil {
		return badInput{fmt.Errorf("%s: %w", name, err)}
	}
	book := reportPath(o.book, name, "-minimum")
	if err := o.checkFiles(book, c, name, "search.csv"); err != nil {
		return err
	}
	opt := o.options("minimum", name, "-minimum", c)
	opt.Restart = o.force && !o.resume
	if err := notForeign(opt.Ledger); err != nil {
		return err
	}
	ctx, stop := a.interruptible()
	defer stop()
	bar := &stages{w: a.errs, quiet: o.quiet}
	defer bar.finish()
	opt.Progress = bar.progress
	runner, err := sweep.Open(study, opt)
	if err != nil {
		return ledgerError(err)
	}
	defer runner.Close()
	a.tellDamage(runner)
	found, err := runner.Smallest(ctx, sizes, sweep.SearchOptions{NoExact: o.noExact, Most: o.mostOf(c)})
	bar.finish()
	if err != nil {
		return stoppedSearch(ctx, err, opt.Ledger)
	}
	doc, err := tidy.MinimumJSON(study, sizes, found, pva.Version)
	if err != nil {
		return err
	}
	tables := map[string][]byte{}
	if o.csv != "" {
		if tables["search.csv"], err = tidy.TraceCSV(found); err != nil {
			return err
		}
	}
	report := reports.BuildMinimum(study, sizes, found, meta(c, name, "minimum", o.example))
	if err := o.writeFiles(a, report, book, doc, tables); err != nil {
		return stoppedSearch(ctx, err, opt.Ledger)
	}
	if !o.quiet {
		a.say(o.json == "-", text.Minimum(study, sizes, found, name)+"Report: "+book+"\n")
	}
	if err := runner.Close(); err != nil {
		return err
	}
	if o.ledger == "" {
		return ledger.Remove(opt.Ledger)
	}
	return nil
}
