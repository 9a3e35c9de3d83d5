package main

import (
	"fmt"
	"os"
	"path/filepath"
	"strconv"
	"strings"

	"ebbline/pva/sweep"
	"ebbline/pva/sweep/cluster"
	"ebbline/pva/sweep/ledger"
)

// runShard runs one shard of a job folder: a task of an array, or a person.
func (a *app) runShard(o *sweepOptions, dir string) (err error) {
	if err := o.longRun.check(); err != nil {
		return err
	}
	job, err := cluster.Read(dir)
	if err != nil {
		return badInput{err}
	}
	shard, err := shardOfJob(o.shard, job.Shards)
	if err != nil {
		return err
	}
	o.each, o.structures = "", false
	_, study, arguments, err := o.again(dir, job.Run)
	if err != nil {
		return err
	}
	opt := sweep.Options{Workers: workersHere(o.workers), Ledger: cluster.Ledger(dir, shard), Resume: true, Shard: shard, Shards: job.Shards,
		Command: "sweep", Arguments: arguments, CaseText: job.Run.Case, CaseFile: job.Run.CaseFile, Example: job.Run.Example}
	if d := study.Manifest(opt).Difference(job.Run); d != "" {
		return badInputf("the job %s cannot be run by this program: %s; write it anew into another folder", dir, d)
	}
	ctx, stop := a.interruptible()
	defer stop()
	bar := &stages{w: a.errs, quiet: o.quiet}
	defer bar.finish()
	opt.Progress = bar.progress
	cluster.BeginShard(dir, shard)
	defer func() {
		if err != nil {
			cluster.FailShard(dir, shard, err.Error()) // the log has it, too
		}
	}()
	runner, err := sweep.Open(study, opt)
	if err != nil {
		return ledgerError(err)
	}
	defer runner.Close()
	a.tellDamage(runner)
	units := sweep.ShardUnits(job.Run.Units, shard, job.Shards)
	say := func(format string, args ...any) {
		if !o.quiet {
			a.say(false, fmt.Sprintf(cluster.Mark+"%d of %d ", shard, job.Shards)+fmt.Sprintf(format, args...)+"\n")
		}
	}
	host := os.Getenv("SLURMD_NODENAME")
	if host == "" {
		host, _ = os.Hostname()
	}
	say("begins on %s with %d of its %s done.", host, runner.Before, count(units, "unit"))
	result, err := runner.Run(ctx)
	bar.finish()
	if err == nil {
		err = runner.Close()
	}
	if err != nil {
		if ctx.Err() != nil {
			return fmt.Errorf("interrupted: %d of %s of shard %d are kept", result.UnitsDone, count(units, "unit"), shard)
		}
		return err
	}
	say("is done: %s.", count(units, "unit"))
	return nil
}

// shardOfJob reads "3", or "3/20" if the job has 20.
func shardOfJob(text string, shards int) (int, error) {
	one, all, ok := strings.Cut(text, "/")
	n, err := strconv.Atoi(one)
	if err != nil || n < 1 || n > shards || ok && all != strconv.Itoa(shards) {
		return 0, badInputf("--shard %s: give the number of a shard of this job, 1 to %d", text, shards)
	}
	return n, nil
}

// jobStatus prints what the files of a job say.
func (a *app) jobStatus(dir string) error {
	job, err := cluster.Read(dir)
	if err != nil {
		return badInput{err}
	}
	st, err := job.Survey(dir)
	if err != nil {
		return badInput{err}
	}
	for _, d := range st.Damage {
		fmt.Fprintln(a.errs, "ebbline: ledger: "+d.String())
	}
	held, units := st.Held()
	var b strings.Builder
	fmt.Fprintf(&b, "%s\n%d of %s done, in %s\n\n", orNone(job.Run.Title, "The sweep of "+job.Run.CaseFile), held, count(units, "unit"), count(job.Shards, "shard"))
	for _, row := range []struct {
		name  string
		state cluster.State
		note  string
	}{
		{"done", cluster.Done, ""},
		{"failed", cluster.Failed, ""},
		{"begun", cluster.Begun, "running, or lost without a word"},
		{"missing", cluster.Missing, "never begun"},
	} {
		numbers := st.Of(row.state)
		text := cluster.List(numbers)
		if row.note != "" && len(numbers) > 0 {
			text += " (" + row.note + ")"
		}
		hang(&b, fmt.Sprintf("  %-8s %5d", row.name, len(numbers)), strings.ReplaceAll(text, ",", ", "), 18)
	}
	failed := 0
	for _, sh := range st.Shards {
		if sh.State != cluster.Failed {
			continue
		}
		if failed++; failed == 1 {
			b.WriteString("\nWhy shards failed (their logs: " + cluster.Quote(filepath.Dir(cluster.Log(dir, 1))) + ")\n")
		}
		if failed > 10 {
			continue
		}
		hang(&b, fmt.Sprintf("  %6d", sh.Number), sh.Why, 10)
	}
	if failed > 10 {
		fmt.Fprintf(&b, "  and %d more\n", failed-10)
	}
	b.WriteString("\n")
	switch open := st.Open(); {
	case len(open) > 0:
		fmt.Fprintf(&b, "Once nothing of it is queued, submit what is missing with:\n  %s\n", job.Resubmit(absolute(dir)))
	case st.Merged:
		b.WriteString("Report: " + job.Report.Book + "\n")
	default:
		b.WriteString("All shards are done, and the report is not written yet.\n")
		if st.MergeSaid != "" {
			hang(&b, "The merge said:", st.MergeSaid, 2)
		}
		fmt.Fprintf(&b, "Merge it here with: %s merge %s\n", cluster.Quote(job.Program), cluster.Quote(absolute(dir)))
	}
	a.say(false, b.String())
	return nil
}

func orNone(s, other string) string {
	if s == "" {
		return other
	}
	return s
}

// mergeFrom is what a merge reads: ledgers, or the shards of one job folder,
// which also says what is to be written unless the command line does.
func (o *sweepOptions) mergeFrom(dirs []string) (ledger.Manifest, []string, *cluster.Job, error) {
	if len(dirs) != 1 || !cluster.Holds(dirs[0]) {
		m, err := ledger.ReadManifest(dirs[0])
		return m, dirs, nil, err
	}
	dir := dirs[0]
	job, err := cluster.Read(dir)
	if err != nil {
		return ledger.Manifest{}, nil, nil, err
	}
	var shards []string
	for n := 1; n <= job.Shards; n++ {
		if ledger.Holds(cluster.Ledger(dir, n)) {
			shards = append(shards, cluster.Ledger(dir, n))
		}
	}
	was := job.Report
	if o.book == "" {
		o.book = was.Book
		// Its files were checked when the job was written. A merge that was
		// stopped or run twice finds its own.
		o.force = true
	}
	for _, one := range []struct{ now, then *string }{{&o.json, &was.JSON}, {&o.csv, &was.CSV}, {&o.figures, &was.Figures}} {
		if *one.now == "" {
			*one.now = *one.then
		}
	}
	o.noExact, o.untilDecided = o.noExact || was.NoExact, o.untilDecided || was.UntilDecided
	return job.Run, shards, job, nil
}

// missingOf names the shards of a job that a merge lacks.
func missingOf(job *cluster.Job, dir string, err error) error {
	st, failed := job.Survey(dir)
	if failed != nil || len(st.Open()) == 0 {
		return err
	}
	held, units := st.Held()
	return fmt.Errorf("%w: of %d units %d are missing, those of shards %s; run them, or submit them with: %s", sweep.ErrMissing, units, units-held, cluster.List(st.Open()), job.Resubmit(absolute(dir)))
}

// absolute is a path that holds in every folder; as given where there is none.
func absolute(path string) string {
	if abs, err := filepath.Abs(path); err == nil {
		return abs
	}
	return path
}
