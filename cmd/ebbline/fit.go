package main

import (
	"os"
	"path/filepath"
	"strings"

	"ebbline/pva"
	"ebbline/pva/casefile"
	"ebbline/pva/fit"
	"ebbline/reports"
	"ebbline/reports/text"
	"ebbline/reports/tidy"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"
)

// fitInput is what the command line of fit says.
type fitInput struct {
	opt         fit.Options
	zeros       string
	make        fit.CaseOptions
	write, json string
	quiet       bool
	force       bool
	flags       *pflag.FlagSet
}

func newFit(a *app) *cobra.Command {
	in := &fitInput{}
	cmd := &cobra.Command{
		Use:   "fit COUNTS",
		Short: "Estimate growth, its variance and crowding from a series of counts",
		Long: `Reads a series of counts (CSV, or the sheet Counts or first sheet of an .xlsx
workbook, with a header: year and count; optionally se or cv, the error of each
count, effort, and note; years may be missing) and fits growth with drift, three
curves of crowding, and the split of process from observation error, each with
its interval; states the risk that the drift model puts on a fall, unless the
counts do not carry one, and why.

With --write it makes a case from the fit, ready for assess. Counts alone cannot
tell births from deaths: the case needs --survival (or --generation). Births are
taken to come once a year unless --breeding says otherwise.`,
		Example: `  ebbline fit counts.csv --threshold 20 --horizon 30
  ebbline fit counts.csv --write mycase.toml --survival 0.8
  ebbline assess mycase.toml`,
		Args: cobra.ExactArgs(1),
		RunE: func(_ *cobra.Command, args []string) error { return in.run(a, args[0]) },
	}
	f := cmd.Flags()
	in.flags = f
	f.StringVar(&in.write, "write", "", "write a case made from the fit to `CASE.toml`")
	f.StringVar(&in.make.Breeding, "breeding", "", "births once a year or all through it: `pulse or flow` (for --write; default: pulse, told as assumed)")
	f.Float64Var(&in.make.Survival, "survival", 0, "mean `SHARE` of the counted animals that survive a year (for --write)")
	f.Float64Var(&in.make.Generation, "generation", 0, "mean age of parents in `YEARS` from when an animal is first counted, in place of --survival")
	f.Float64Var(&in.make.Split, "split", 0.5, "`SHARE` of the environmental variance that births have; deaths have the rest (for --write)")
	f.StringVar(&in.make.Model, "model", "", "`NAME` of the model of growth to write (default: the one of the lowest AICc but theta-logistic)")
	f.Float64Var(&in.opt.Threshold, "threshold", 0, "`ABUNDANCE` at or below which the population has fallen (default: a tenth of the last count)")
	f.IntVar(&in.opt.Horizon, "horizon", 50, "`YEARS` to look ahead")
	f.StringVar(&in.zeros, "zeros", "", "what a count of 0 means: `missing or half`")
	f.Uint64Var(&in.opt.Seed, "seed", 1, "the seed of the random numbers of the risk's interval")
	f.StringVar(&in.json, "json", "", "write the result as JSON to `FILE` (- is standard output)")
	f.BoolVar(&in.quiet, "quiet", false, "print nothing but errors")
	f.BoolVar(&in.force, "force", false, "overwrite existing files")
	return cmd
}

func (in *fitInput) run(a *app, path string) error {
	if err := in.check(); err != nil {
		return err
	}
	for _, out := range []string{in.write, in.json} {
		if out != "" && out != "-" && sameFile(out, path) {
			return badInputf("%s is the file of counts itself; give another name", out)
		}
	}
	if in.write != "" && sameFile(in.write, in.json) {
		return badInputf("%s cannot be both the case and the JSON file", in.write)
	}
	series, err := readCounts(path)
	if err != nil {
		return badInput{err}
	}
	in.opt.Zeros = fit.ZeroRule(in.zeros)
	result, err := fit.Fit(series, in.opt)
	if err != nil {
		return badInputf("%s: %w", path, err)
	}
	var written *fit.Written
	var file []byte
	if in.write != "" {
		if written, file, err = in.makeCase(result); err != nil {
			return badInputf("%s: %w", path, err)
		}
	}
	if in.json != "" {
		doc, err := tidy.FitJSON(result, written, pva.Version)
		if err != nil {
			return err
		}
		if in.json == "-" {
			_, err = a.out.Write(doc)
		} else {
			err = reports.Save(in.json, doc)
		}
		if err != nil {
			return err
		}
	}
	said := text.Fit(result, written)
	if in.write != "" {
		if err := reports.Save(in.write, file); err != nil {
			return err
		}
		said += "Wrote " + in.write + ". Look it over, then: ebbline assess " + in.write + "\n"
	}
	if !in.quiet {
		a.say(in.json == "-", said)
	}
	return nil
}

// check refuses, before anything is read, what cannot be written, and flags
// that say nothing without --write or that no number of is meant by 0.
func (in *fitInput) check() error {
	if in.write == "" {
		for _, name := range []string{"breeding", "survival", "generation", "split", "model"} {
			if in.flags.Changed(name) {
				return badInputf("--%s says how a case is made: give --write CASE.toml beside it", name)
			}
		}
	} else if !strings.EqualFold(filepath.Ext(in.write), ".toml") {
		return badInputf("%s: a case file ends in .toml", in.write)
	}
	for name, v := range map[string]float64{"threshold": in.opt.Threshold, "survival": in.make.Survival, "generation": in.make.Generation, "horizon": float64(in.opt.Horizon)} {
		if in.flags.Changed(name) && !(v > 0) {
			return badInputf("--%s %g is not above 0", name, v)
		}
	}
	if in.flags.Changed("seed") && in.opt.Seed == 0 {
		return badInputf("--seed 0 is no seed here: give a whole number from 1")
	}
	if in.force {
		return nil
	}
	for _, path := range []string{in.write, in.json} {
		if _, err := os.Stat(path); path != "" && path != "-" && err == nil {
			return badInputf("%s exists; use --force to replace it", path)
		}
	}
	return nil
}

// makeCase makes the case and its file.
func (in *fitInput) makeCase(r *fit.Result) (*fit.Written, []byte, error) {
	in.make.ThresholdSaid = in.flags.Changed("threshold")
	in.make.HorizonSaid = in.flags.Changed("horizon")
	if in.make.BreedingAssumed = !in.flags.Changed("breeding"); in.make.BreedingAssumed {
		in.make.Breeding = "pulse"
	}
	w, err := r.Case(in.make)
	if err != nil {
		return nil, nil, err
	}
	c, faults := pva.Build(w.Entries)
	if len(faults) > 0 {
		return nil, nil, faults
	}
	return w, casefile.Write(c), nil
}
