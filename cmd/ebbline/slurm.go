package main

import (
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"

	"ebbline/pva"
	"ebbline/pva/casefile"
	"ebbline/pva/sweep"
	"ebbline/pva/sweep/cluster"
	"ebbline/pva/sweep/ledger"
)

// slurmOptions are the flags of a sweep that is laid out as a job folder.
type slurmOptions struct {
	dir     string // of the job: to write, to submit, or to run one shard of
	status  string // of the job to look at
	submit  bool
	shards  int
	program string
	ask     cluster.Slurm
}

// Flags that mean something only beside --slurm.
var onlyWithSlurm = []string{"submit", "shards", "program", "partition", "account", "time", "memory", "cpus", "line", "prefix"}

type slurmFlags interface {
	longFlags
	StringArrayVar(p *[]string, name string, value []string, usage string)
}

func (s *slurmOptions) addFlags(f slurmFlags) {
	f.StringVar(&s.dir, "slurm", "", "write the sweep as a job for Slurm into the folder `DIR`; without CASE, the job that is there")
	f.StringVar(&s.status, "status", "", "say what of the job in the folder `DIR` is done, failed or missing")
	f.BoolVar(&s.submit, "submit", false, "submit the job of --slurm; with --resume only what is missing")
	f.IntVar(&s.shards, "shards", 0, "cut the job of --slurm into so many shards (default: so that each lasts about ten minutes)")
	f.StringVar(&s.program, "program", "", "the tasks of --slurm run the program `FILE` (default: this one)")
	f.StringVar(&s.ask.Partition, "partition", "", "partition for the tasks of --slurm, `NAME`")
	f.StringVar(&s.ask.Account, "account", "", "account for the tasks of --slurm, `NAME`")
	f.StringVar(&s.ask.Time, "time", "", "time limit of each task of --slurm, `LIMIT`, such as 2:00:00")
	f.StringVar(&s.ask.Memory, "memory", "", "memory of each task of --slurm, `SIZE`, such as 2G")
	f.IntVar(&s.ask.Cores, "cpus", 1, "cores of each task of --slurm")
	f.StringArrayVar(&s.ask.Lines, "line", nil, "a `LINE` of shell before the program in the scripts of --slurm, such as 'module load x' (repeatable)")
	f.StringVar(&s.ask.Prefix, "prefix", "", "`WORDS` before the program in the scripts of --slurm, such as 'apptainer exec image.sif'")
}

// slurm does what a sweep's command line asks of a job folder, if anything.
func (a *app) slurm(o *sweepOptions, args []string) (handled bool, err error) {
	s, flags := &o.slurm, o.caseInput.flags
	switch {
	case s.status != "" || flags.Changed("status"):
		if len(args) > 0 || flags.NFlag() > 1 {
			return true, badInputf("--status DIR stands alone: the folder says what its case is")
		}
		return true, a.jobStatus(s.status)
	case !flags.Changed("slurm"):
		for _, name := range onlyWithSlurm {
			if flags.Changed(name) {
				return true, badInputf("--%s says how a job is written or submitted; give --slurm DIR with it", name)
			}
		}
		return false, nil
	case s.dir == "":
		return true, badInputf("--slurm: give the name of a folder")
	case o.ledger != "":
		return true, badInputf("--ledger %s: the job of --slurm keeps its ledgers in its own folder", o.ledger)
	}
	dir, err := filepath.Abs(s.dir)
	if err != nil {
		return true, err
	}
	if o.shard != "" {
		for _, name := range append([]string{"set", "replicates", "seed", "example", "each", "structures", "out", "json", "csv", "figures", "force", "until-decided", "no-exact"}, onlyWithSlurm...) {
			if len(args) > 0 || flags.Changed(name) {
				return true, badInputf("--slurm DIR --shard I runs a shard of the job as it was written; only --workers and --quiet go with it")
			}
		}
		return true, a.runShard(o, dir)
	}
	return true, a.writeJob(o, args, dir)
}

// writeJob writes a job folder, or one that is there anew, and submits it.
func (a *app) writeJob(o *sweepOptions, args []string, dir string) error {
	s, flags := &o.slurm, o.caseInput.flags
	if err := o.longRun.check(); err != nil {
		return err
	}
	if s.submit {
		if _, err := exec.LookPath("sbatch"); err != nil {
			return badInputf("--submit: there is no sbatch on this machine; leave --submit away, and run DIR/submit.sh on a machine of the cluster")
		}
	}
	var had *cluster.Job
	if cluster.Holds(dir) {
		var err error
		if had, err = cluster.Read(dir); err != nil {
			return badInput{err}
		}
	}
	own := len(args) == 0 && o.example == "" // the job that is there
	if own {
		if had == nil {
			return badInputf("%s holds no job yet: name a case, or use --example NAME", s.dir)
		}
		for _, name := range []string{"set", "replicates", "seed", "each", "structures"} {
			if flags.Changed(name) {
				return badInputf("--%s: the job in %s is written for its own case; write another job into another folder", name, s.dir)
			}
		}
	}
	job, study, err := a.jobOf(o, args, had, own)
	if err != nil {
		return err
	}
	if had != nil {
		if d := job.Run.Difference(had.Run); d != "" {
			return badInputf("%s holds the job of another run: %s; name another folder with --slurm", s.dir, d)
		}
		if was := cluster.Submitted(dir); was != "" && !o.resume {
			return badInputf("%s is submitted already (%s); give --resume to go on with what is missing", s.dir, lastOf(was))
		}
		job.Shards = had.Shards
		if flags.Changed("shards") && s.shards != had.Shards {
			return badInputf("--shards %d: the job in %s is cut into %d, and stays so", s.shards, s.dir, had.Shards)
		}
		o.keepAsked(job, had)
	}
	if job.Program == "" {
		if job.Program, err = programFor(s.program); err != nil {
			return err
		}
	}
	seconds := 0.0
	if job.Shards, seconds, err = s.cut(job, study); err != nil {
		return err
	}
	if err := o.jobFiles(job, had, study, dir); err != nil {
		return err
	}
	if err := cluster.Write(dir, job); err != nil {
		return badInput{err}
	}
	if !o.quiet {
		a.say(false, wroteJob(job, s.dir, seconds))
	}
	return a.submitJob(o, job, dir)
}

// jobOf is the job that a command line asks for, and its study.
func (a *app) jobOf(o *sweepOptions, args []string, had *cluster.Job, own bool) (*cluster.Job, *sweep.Study, error) {
	var c *pva.Case
	var name, text, example string
	var study *sweep.Study
	var arguments string
	var err error
	if own {
		if c, study, arguments, err = o.again(o.slurm.dir, had.Run); err != nil {
			return nil, nil, err
		}
		name, text, example = had.Run.CaseFile, had.Run.Case, had.Run.Example
	} else {
		if c, name, err = o.read(args); err != nil {
			return nil, nil, err
		}
		if study, arguments, err = o.study(c); err != nil {
			return nil, nil, badInput{fmt.Errorf("%s: %w", name, err)}
		}
		text, example = string(casefile.Write(c)), o.example
	}
	if o.untilDecided && (study.Kind != sweep.Grid || !c.Question.Limit.Set) {
		return nil, nil, badInputf("--until-decided needs a grid and a limit (question.limit): there is no verdict to wait for")
	}
	run := study.Manifest(sweep.Options{Command: "sweep", Arguments: arguments, CaseText: text, CaseFile: name, Example: example})
	job := &cluster.Job{Run: run, Slurm: o.slurm.ask}
	job.Slurm.Workers = o.workers
	job.Report = cluster.Report{Book: o.book, JSON: o.json, CSV: o.csv, Figures: o.figures, NoExact: o.noExact, UntilDecided: o.untilDecided}
	return job, study, nil
}

// keepAsked keeps what was asked when the job was first written, unless it is
// asked for anew.
func (o *sweepOptions) keepAsked(job, had *cluster.Job) {
	flags := o.caseInput.flags
	keep := func(flag string, take func()) {
		if !flags.Changed(flag) {
			take()
		}
	}
	now, then := &job.Slurm, had.Slurm
	keep("partition", func() { now.Partition = then.Partition })
	keep("account", func() { now.Account = then.Account })
	keep("time", func() { now.Time = then.Time })
	keep("memory", func() { now.Memory = then.Memory })
	keep("cpus", func() { now.Cores = then.Cores })
	keep("line", func() { now.Lines = then.Lines })
	keep("prefix", func() { now.Prefix = then.Prefix })
	keep("workers", func() { now.Workers = then.Workers })
	keep("program", func() { job.Program = had.Program })
	files, was := &job.Report, had.Report
	keep("out", func() { files.Book = was.Book })
	keep("json", func() { files.JSON = was.JSON })
	keep("csv", func() { files.CSV = was.CSV })
	keep("figures", func() { files.Figures = was.Figures })
	keep("no-exact", func() { files.NoExact = was.NoExact })
	keep("until-decided", func() { files.UntilDecided = was.UntilDecided })
}

// programFor is the absolute path of the program that tasks run.
func programFor(asked string) (string, error) {
	if asked != "" {
		path, err := filepath.Abs(asked)
		if err != nil {
			return "", err
		}
		return path, nil
	}
	path, err := os.Executable()
	if err != nil {
		return "", badInputf("this program does not know where it stands (%v); say it with --program FILE", err)
	}
	if strings.Contains(filepath.ToSlash(path), "/go-build") {
		return "", badInputf("`go run` takes its program away when it ends, and tasks would not find it: build one with `go build ./cmd/ebbline` and run that, or name it with --program FILE")
	}
	return path, nil
}

// workersHere is how many workers run: as asked, or as many as Slurm gives a
// task, or (0) as there are cores.
func workersHere(asked int) int {
	if asked > 0 {
		return asked
	}
	for _, name := range []string{"SLURM_CPUS_PER_TASK", "SLURM_CPUS_ON_NODE"} {
		if n, err := strconv.Atoi(os.Getenv(name)); err == nil && n > 0 {
			return n
		}
	}
	return 0
}

// again makes the study of a manifest once more.
func (o *sweepOptions) again(dir string, m ledger.Manifest) (c *pva.Case, s *sweep.Study, arguments string, err error) {
	c, faults := casefile.Read(m.CaseFile, []byte(m.Case))
	if len(faults) > 0 {
		return nil, nil, "", badInput{fmt.Errorf("%s: the case in the manifest: %w", dir, faults)}
	}
	if c, err = overriddenAgain(c, m.Overridden); err != nil {
		return nil, nil, "", badInput{fmt.Errorf("%s: %w", dir, err)}
	}
	if err := o.takeArguments(m.Arguments); err != nil {
		return nil, nil, "", badInput{fmt.Errorf("%s: %w", dir, err)}
	}
	if s, arguments, err = o.study(c); err != nil {
		return nil, nil, "", badInput{fmt.Errorf("%s: %w", m.CaseFile, err)}
	}
	return c, s, arguments, nil
}
