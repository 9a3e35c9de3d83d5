package main

import (
	"context"
	"errors"
	"fmt"
	"path/filepath"
	"strconv"
	"strings"
	"sync"

	"ebbline/pva"
	"ebbline/pva/casefile"
	"ebbline/pva/sweep"
	"ebbline/pva/sweep/ledger"
	"ebbline/reports"
	"ebbline/reports/text"
	"ebbline/reports/tidy"

	"github.com/spf13/cobra"
)

type sweepOptions struct {
	caseInput
	outputs
	longRun
	slurm      slurmOptions
	shard      string
	each       string
	structures bool
}

func newSweep(a *app) *cobra.Command {
	o := &sweepOptions{}
	cmd := &cobra.Command{
		Use:   "sweep CASE",
		Short: "Run a grid of cases and find the largest take within the limit",
		Long: `Runs every cell of the grid that the [[sweep]] tables of the case make, all on
the same replicates, and searches between them for the largest take within the
permit's limit. With --each it changes every input alone instead, and says which
matter most; with --structures it tries the other defensible forms of the model
too.

What is finished is kept in a ledger, a folder beside the case (or --ledger).
After a stop, a kill or a full disk the same command with --resume goes on where
it was. A ledger that nobody named is taken away when the report is written.

With --slurm it writes a folder with a job for a Slurm cluster instead: scripts
that submit it, run its shards and merge them. --submit submits it, --status
says how far it is, and --slurm DIR --submit --resume submits what is missing.

` + statusHelp,
		Example: `  ebbline sweep --example upland-goat
  ebbline sweep goat.toml --each 10% --structures
  ebbline sweep goat.toml --shard 2/8 --ledger goat-2.ledger
  ebbline sweep goat.toml --slurm goat.job --time 1:00:00 --submit
  ebbline sweep --status goat.job`,
		Args: cobra.MaximumNArgs(1),
		RunE: func(_ *cobra.Command, args []string) error { return a.sweep(o, args) },
	}
	o.caseInput.addFlags(cmd.Flags())
	o.outputs.addFlags(cmd.Flags())
	o.longRun.addFlags(cmd.Flags())
	o.slurm.addFlags(cmd.Flags())
	cmd.Flags().StringVar(&o.shard, "shard", "", "run only part `I/N` of the sweep; ebbline merge joins the parts")
	cmd.Flags().StringVar(&o.each, "each", "", "change each input alone by so many `PERCENT`, such as 10%")
	cmd.Flags().BoolVar(&o.structures, "structures", false, "try the other defensible forms of the model (and each input by 10%)")
	return cmd
}

// study is what is asked for: a grid, each input, other forms. The arguments
// name it for the ledger.
func (o *sweepOptions) study(c *pva.Case) (s *sweep.Study, arguments string, err error) {
	if o.each == "" && !o.structures {
		s, err = sweep.NewGrid(c)
		return s, "", err
	}
	by := 0.1
	if o.each != "" {
		if by, err = percent(o.each); err != nil {
			return nil, "", err
		}
	}
	arguments = "--each " + strconv.FormatFloat(100*by, 'g', -1, 64) + "%"
	if o.structures {
		arguments += " --structures"
	}
	s, err = sweep.NewEach(c, by, o.structures)
	return s, arguments, err
}

// percent reads "10%", "10 %" or "10".
func percent(text string) (float64, error) {
	v, err := strconv.ParseFloat(strings.TrimSpace(strings.TrimSuffix(strings.TrimSpace(text), "%")), 64)
	if err != nil || !(v > 0 && v < 100) {
		return 0, fmt.Errorf("--each %s: give a percentage above 0 and below 100, such as 10%%", text)
	}
	return v / 100, nil
}

// shardOf reads "2/8".
func shardOf(text string) (i, n int, err error) {
	if text == "" {
		return 0, 0, nil
	}
	one, all, ok := strings.Cut(text, "/")
	i, errI := strconv.Atoi(one)
	n, errN := strconv.Atoi(all)
	if !ok || errI != nil || errN != nil || i < 1 || n < 1 || i > n {
		return 0, 0, fmt.Errorf("--shard %s: give I/N, such as 2/8, with I from 1 to N", text)
	}
	return i, n, nil
}

func (a *app) sweep(o *sweepOptions, args []string) error {
	if handled, err := a.slurm(o, args); handled {
		return err
	}
	c, name, err := o.read(args)
	if err != nil {
		return err
	}
	if err := o.longRun.check(); err != nil {
		return err
	}
	study, arguments, err := o.study(c)
	if err != nil {
		return badInput{fmt.Errorf("%s: %w", name, err)}
	}
	shard, shards, err := shardOf(o.shard)
	if err != nil {
		return badInput{err}
	}
	book := reportPath(o.book, name, map[bool]string{true: "-sweep", false: "-each"}[study.Kind == sweep.Grid])
	if shards > 0 {
		if o.book != "" || o.json != "" || o.csv != "" || o.figures != "" {
			return badInputf("--shard %s: a shard writes no report; give --out, --json, --csv and --figures to `ebbline merge`", o.shard)
		}
	} else if err := o.checkFiles(book, c, name, "sweep.csv", "search.csv"); err != nil {
		return err
	}
	if o.untilDecided && (study.Kind != sweep.Grid || !c.Question.Limit.Set) {
		return badInputf("--until-decided needs a grid and a limit (question.limit): there is no verdict to wait for")
	}
	kind := ""
	if study.Kind != sweep.Grid {
		kind = "-each"
	}
	opt := o.options("sweep", name, kind, c)
	if err := notForeign(opt.Ledger); err != nil {
		return err
	}
	opt.Example, opt.Arguments, opt.Shard, opt.Shards = o.example, arguments, shard, shards
	// Shards may share a folder: none of them throws away what others did.
	opt.Restart = o.force && !o.resume && shards == 0
	ctx, stop := a.interruptible()
	defer stop()
	bar := &stages{w: a.errs, quiet: o.quiet}
	defer bar.finish()
	opt.Progress = bar.progress
	live := &liveCSV{study: study}
	opt.Finished = live.add
	runner, err := sweep.Open(study, opt)
	if err != nil {
		return ledgerError(err)
	}
	defer runner.Close()
	a.tellDamage(runner)
	if runner.Before > 0 && !o.quiet {
		fmt.Fprintf(a.errs, "Going on with %s: units done so far: %d.\n", opt.Ledger, runner.Before)
	}
	folder := o.csv
	if folder == "" || shards > 0 {
		folder = opt.Ledger
	}
	if err := live.open(folder); err != nil {
		return err
	}
	result, err := runner.Run(ctx)
	bar.finish()
	if closed := live.close(); err == nil {
		err = closed
	}
	if err != nil {
		return stopped(ctx, err, opt.Ledger, result.UnitsDone, result.Units)
	}
	if shards > 0 {
		if err := runner.Close(); err != nil {
			return err
		}
		if !o.quiet {
			a.say(false, fmt.Sprintf("Shard %d of %d is done: %d units in %s.\nJoin the shards with: ebbline merge LEDGER...\n", shard, shards, result.UnitsDone, opt.Ledger))
		}
		return nil
	}
	search := sweep.SearchOptions{NoExact: o.noExact, Most: o.mostOf(c)}
	if err := a.finishSweep(ctx, o, runner, result, search, meta(c, name, "sweep", o.example), book, arguments); err != nil {
		return stoppedSearch(ctx, err, opt.Ledger)
	}
	if err := runner.Close(); err != nil {
		return err
	}
	if o.ledger == "" && shards == 0 {
		live.remove(opt.Ledger)
		return ledger.Remove(opt.Ledger)
	}
	return nil
}

// finishSweep searches, and writes and prints the whole answer.
func (a *app) finishSweep(ctx context.Context, o *sweepOptions, runner *sweep.Runner, result *sweep.Result, search sweep.SearchOptions, m reports.Meta, book, arguments string) error {
	var largest *sweep.Crossing
	if result.Study.Kind == sweep.Grid {
		var err error
		if largest, err = runner.Largest(ctx, result, search); err != nil {
			return err
		}
	}
	if arguments != "" {
		m.Command += " " + arguments
	}
	doc, err := tidy.SweepJSON(result, largest, pva.Version)
	if err != nil {
		return err
	}
	tables := map[string][]byte{}
	if o.csv != "" {
		if tables["sweep.csv"], err = tidy.SweepCSV(result); err != nil {
			return err
		}
		if largest != nil {
			if tables["search.csv"], err = tidy.TraceCSV(largest); err != nil {
				return err
			}
		}
	}
	if err := o.writeFiles(a, reports.BuildSweep(result, largest, m), book, doc, tables); err != nil {
		return err
	}
	if !o.quiet {
		a.say(o.json == "-", text.Sweep(result, largest, m.CaseFile)+"Report: "+book+"\n")
	}
	return nil
}

// tellDamage says what was found wrong in a ledger.
func (a *app) tellDamage(s *sweep.Runner) {
	for _, d := range s.Damage {
		fmt.Fprintln(a.errs, "ebbline: ledger: "+d.String())
	}
}

// ledgerError is the error of a ledger that cannot be used: the person's to mend.
func ledgerError(err error) error {
	if errors.Is(err, ledger.ErrOther) || errors.Is(err, ledger.ErrDamaged) || errors.Is(err, ledger.ErrFolder) || errors.Is(err, sweep.ErrHolds) {
		return badInput{err}
	}
	return err
}

// stopped says what is kept of a run that ended early.
func stopped(ctx context.Context, err error, dir string, done, units int) error {
	if ctx.Err() != nil {
		return fmt.Errorf("interrupted: %d of %d units are kept in %s; run the same command with --resume to go on", done, units, dir)
	}
	return err
}

// stoppedSearch is the same for a search, and for files that cannot be written.
func stoppedSearch(ctx context.Context, err error, dir string) error {
	if files := (notAllWritten{}); errors.As(err, &files) {
		return fmt.Errorf("%w; what is finished is kept in %s: make room and run the same command with --resume", err, dir)
	}
	if ctx.Err() != nil {
		return fmt.Errorf("interrupted: what is finished is kept in %s; run the same command with --resume to go on", dir)
	}
	return err
}

// stages shows one progress bar after another, each begun at its first figure.
type stages struct {
	mu    sync.Mutex
	w     interface{ Write([]byte) (int, error) }
	quiet bool
	stage string
	total int64
	show  func(int64)
	end   func()
}

func (s *stages) progress(stage string, done, total int64) {
	s.mu.Lock()
	if stage != s.stage || total != s.total {
		if s.end != nil {
			s.end()
		}
		s.stage, s.total = stage, total
		s.show, s.end = progressBar(s.w, total, s.quiet)
	}
	show := s.show
	s.mu.Unlock()
	if show != nil {
		show(done)
	}
}

func (s *stages) finish() {
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.end != nil {
		s.end()
	}
	s.show, s.end, s.stage = nil, nil, ""
}

// options are those of a long run.
func (l *longRun) options(command, name, kind string, c *pva.Case) sweep.Options {
	dir := l.ledger
	if dir == "" {
		dir = strings.TrimSuffix(filepath.Base(name), filepath.Ext(name)) + kind + ".ledger"
		dir = filepath.Join(filepath.Dir(name), dir)
	}
	return sweep.Options{Workers: workersHere(l.workers), Ledger: dir, Resume: l.resume, Command: command,
		CaseText: string(casefile.Write(c)), CaseFile: name}
}
