package main

import (
	"errors"
	"fmt"
	"strings"

	"ebbline/pva"
	"ebbline/pva/sweep"

	"github.com/spf13/cobra"
)

func newMerge(a *app) *cobra.Command {
	o := &sweepOptions{}
	cmd := &cobra.Command{
		Use:   "merge LEDGER...",
		Short: "Join the ledgers of a sharded sweep into its report",
		Long: `Reads the ledgers of the shards of one sweep, finds the largest take within the
limit, and writes the report that one run of the whole sweep would have written.
Names what is missing, and refuses ledgers of another case, version or seed.
In place of the ledgers it takes the folder of a job written by sweep --slurm.

` + statusHelp,
		Example: "  ebbline merge goat-1.ledger goat-2.ledger --out goat.xlsx\n  ebbline merge goat.job",
		Args:    cobra.MinimumNArgs(1),
		RunE:    func(_ *cobra.Command, args []string) error { return a.merge(o, args) },
	}
	o.outputs.addFlags(cmd.Flags())
	cmd.Flags().IntVar(&o.workers, "workers", 0, "how many parts run side by side (default: all cores)")
	cmd.Flags().BoolVar(&o.untilDecided, "until-decided", false, "add replicates until no value is left undecided (at most 256 times as many)")
	cmd.Flags().BoolVar(&o.noExact, "no-exact", false, "search by simulation alone")
	return cmd
}

func (a *app) merge(o *sweepOptions, dirs []string) error {
	if err := o.longRun.check(); err != nil {
		return err
	}
	given := dirs[0]
	m, dirs, job, err := o.mergeFrom(dirs)
	if err != nil {
		return badInput{err}
	}
	if m.Command != "sweep" {
		return badInputf("%s is the ledger of `ebbline %s`, which has no shards to merge", given, m.Command)
	}
	name := m.CaseFile
	c, study, arguments, err := o.again(given, m)
	if err != nil {
		return err
	}
	book := reportPath(o.book, name, "-sweep")
	if err := o.checkFiles(book, c, name, "sweep.csv", "search.csv"); err != nil {
		return err
	}
	bar := &stages{w: a.errs, quiet: o.quiet}
	defer bar.finish()
	runner, err := sweep.Merge(study, dirs, sweep.Options{Workers: workersHere(o.workers), Command: m.Command, Arguments: arguments, CaseText: m.Case, CaseFile: name, Progress: bar.progress})
	if runner != nil {
		a.tellDamage(runner)
	}
	if err != nil {
		if errors.Is(err, sweep.ErrMissing) {
			if job != nil {
				err = missingOf(job, given, err)
			}
			return fmt.Errorf("%w; nothing was written", err)
		}
		return badInput{err}
	}
	ctx, stop := a.interruptible()
	defer stop()
	result, err := runner.Run(ctx) // nothing is left to run
	if err != nil {
		return err
	}
	search := sweep.SearchOptions{NoExact: o.noExact, Most: o.mostOf(c)}
	err = a.finishSweep(ctx, o, runner, result, search, meta(c, name, "sweep", m.Example), book, arguments)
	if err != nil && ctx.Err() != nil {
		return errors.New("interrupted; nothing was written")
	}
	return err
}

// overriddenAgain marks again what the command line had set over the case, so
// that the report of a merge says so too.
func overriddenAgain(c *pva.Case, paths []string) (*pva.Case, error) {
	marked := map[string]bool{}
	for _, p := range paths {
		marked[p] = true
	}
	var set []pva.Setting
	for _, e := range c.Entries() {
		if marked[e.Path] {
			set = append(set, pva.Setting{Path: e.Path, Value: e.Value})
		}
	}
	if len(set) == 0 {
		return c, nil
	}
	out, faults := c.With(set)
	if len(faults) > 0 {
		return nil, faults
	}
	return out, nil
}

// takeArguments takes back what a manifest says of the command line.
func (o *sweepOptions) takeArguments(text string) error {
	words := strings.Fields(text)
	for i := 0; i < len(words); i++ {
		switch {
		case words[i] == "--structures":
			o.structures = true
		case words[i] == "--each" && i+1 < len(words):
			i++
			o.each = words[i]
		default:
			return fmt.Errorf("the manifest has an argument that this version does not know (%q)", words[i])
		}
	}
	return nil
}
