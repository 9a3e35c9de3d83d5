package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"path/filepath"
	"strings"
	"syscall"

	"ebbline/pva"
	"ebbline/pva/assess"
	"ebbline/pva/casefile"
	"ebbline/pva/rates"
	"ebbline/reports"
	"ebbline/reports/text"

	"github.com/spf13/cobra"
)

type assessOptions struct {
	caseInput
	outputs
	workers        int
	failAboveLimit bool
	exact, noExact bool
	untilDecided   bool
}

func newAssess(a *app) *cobra.Command {
	o := &assessOptions{}
	cmd := &cobra.Command{
		Use:   "assess CASE",
		Short: "Assess a case: the risk, the verdict and the report workbook",
		Long: `Simulates the case with and without the take, prints the answer, and writes the
report workbook beside the case (or to --out).

` + statusHelp,
		Example: `  ebbline assess --example marsh-heron
  ebbline assess heron.toml --set harvest.control.take=4 --json -`,
		Args: cobra.MaximumNArgs(1),
		RunE: func(_ *cobra.Command, args []string) error { return a.assess(o, args) },
	}
	o.caseInput.addFlags(cmd.Flags())
	o.outputs.addFlags(cmd.Flags())
	cmd.Flags().IntVar(&o.workers, "workers", 0, "how many replicates run side by side (default: all cores)")
	cmd.Flags().BoolVar(&o.untilDecided, "until-decided", false, "add up to 256 times the replicates until the verdict is settled, with intervals that hold at every look")
	cmd.Flags().BoolVar(&o.exact, "exact", false, "add the exact answer even where it is dear")
	cmd.Flags().BoolVar(&o.noExact, "no-exact", false, "leave the exact answer out")
	cmd.Flags().BoolVar(&o.failAboveLimit, "fail-above-limit", false, "end with exit status 3 if the verdict is above the limit")
	return cmd
}

func (a *app) assess(o *assessOptions, args []string) error {
	c, name, err := o.read(args)
	if err != nil {
		return err
	}
	if o.workers < 0 {
		return badInputf("--workers %d: give 1 or more", o.workers)
	}
	if o.failAboveLimit && !c.Question.Limit.Set {
		return badInputf("--fail-above-limit: the case states no limit; give question.limit")
	}
	wish := assess.ExactIfCheap
	switch {
	case o.exact && o.noExact:
		return badInputf("give either --exact or --no-exact")
	case o.exact:
		wish = assess.ExactAlways
	case o.noExact:
		wish = assess.ExactNever
	}
	book := reportPath(o.book, name, "")
	if err := o.outputs.check(book, c, name); err != nil {
		return err
	}
	ctx, stop := a.interruptible()
	defer stop()
	result, runErr := o.run(ctx, a, c, wish)
	if result == nil {
		if runErr != nil && ctx.Err() != nil {
			return errors.New("interrupted before any replicate was complete; nothing was written")
		}
		if faults := (pva.Faults)(nil); errors.As(runErr, &faults) {
			return badInput{fmt.Errorf("%s: %w", name, runErr)} // laws of uncertain inputs that cannot be
		}
		return runErr
	}
	about := meta(c, name, "assess", o.example)
	about.Command += exactFlag(wish) + untilFlag(o.untilDecided)
	report := reports.Build(result, about)
	if err := o.write(a, report, result, book); err != nil {
		if !o.quiet { // what hours may have gone into is not lost with the file
			a.say(o.json == "-", text.Answer(report, result, isTerminal(a.out)))
		}
		return err
	}
	if !o.quiet {
		a.say(o.json == "-", text.Answer(report, result, isTerminal(a.out))+"Report: "+book+"\n")
	}
	switch {
	case runErr != nil && ctx.Err() != nil:
		if result.Replicates == result.Asked {
			return errors.New("interrupted while the exact answer was computed: the report holds all replicates; --no-exact leaves the exact answer out")
		}
		return fmt.Errorf("interrupted: the report holds the %s replicates that were complete; run again for all of them", reports.Grouped(result.Replicates))
	case runErr != nil:
		return runErr
	case result.Unreliable:
		return errors.New("simulation and exact answer disagree beyond chance: do not rely on this report")
	case o.failAboveLimit && result.Verdict == pva.AboveLimit:
		return errAboveLimit
	}
	return nil
}

// run assesses the case once, or until its verdict is settled.
func (o *assessOptions) run(ctx context.Context, a *app, c *pva.Case, wish assess.ExactWish) (*pva.Assessment, error) {
	opt := assess.Options{Workers: workersHere(o.workers), Exact: wish}
	if o.untilDecided {
		s, err := assess.UntilDecided(ctx, c, opt, 0)
		if s == nil {
			if errors.Is(err, assess.ErrNoLimit) || errors.Is(err, assess.ErrUncertain) {
				err = badInput{err}
			}
			return nil, err
		}
		return s.Assessment, err
	}
	progress, finish := progressBar(a.errs, c.Run.Replicates, o.quiet)
	opt.Progress = progress
	defer finish()
	return assess.Run(ctx, c, opt)
}

// say prints text for people: on standard output, or on standard error where
// standard output carries JSON.
func (a *app) say(jsonOut bool, s string) {
	w := a.out
	if jsonOut {
		w = a.errs
	}
	if _, err := io.WriteString(w, s); err != nil && !errors.Is(err, syscall.EPIPE) {
		a.unsaid = err // a reader that went away (head) is no failure
	}
}

// meta is what the report says about this run: a command line that repeats it
// from the case text that the report carries.
func meta(c *pva.Case, name, command, example string) reports.Meta {
	line := "ebbline " + command + " "
	if example != "" {
		line += "--example " + example
	} else {
		line += quoteArg(filepath.Base(name))
	}
	for _, e := range c.Entries() {
		if e.Origin == pva.FromOverride {
			switch e.Path {
			case "run.replicates":
				line += " --replicates " + e.Value.String()
			case "run.seed":
				line += " --seed " + e.Value.String()
			default:
				line += " --set " + quoteArg(c.Display(e.Path)+"="+e.Value.String())
			}
		}
	}
	meta := reports.Meta{Version: pva.Version, Command: line, CaseText: string(casefile.Write(c)), CaseFile: name}
	if m, faults := rates.New(c); len(faults) == 0 {
		if m.BirthCrowding.Form != rates.None {
			meta.BirthsScale = pva.Optional{Value: m.BirthCrowding.L, Set: true}
		}
		if m.DeathCrowding.Form != rates.None {
			meta.DeathsScale = pva.Optional{Value: m.DeathCrowding.L, Set: true}
		}
	}
	return meta
}

func quoteArg(s string) string {
	if strings.ContainsAny(s, " \t'\"$`\\&|;<>()*?[]{}!#~") {
		return "'" + strings.ReplaceAll(s, "'", `'\''`) + "'"
	}
	return s
}
