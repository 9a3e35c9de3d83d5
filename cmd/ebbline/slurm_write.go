package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"time"

	"ebbline/pva/sweep"
	"ebbline/pva/sweep/cluster"
)

// cut decides the number of shards; seconds is what each takes of its cores, on
// slow ones.
func (s *slurmOptions) cut(job *cluster.Job, study *sweep.Study) (shards int, seconds float64, err error) {
	units, all := study.Work()
	most := cluster.DefaultMaxArraySize
	switch {
	case job.Slurm.Cores < 1:
		return 0, 0, badInputf("--cpus %d: give 1 or more", job.Slurm.Cores)
	case s.shards < 0:
		return 0, 0, badInputf("--shards %d: give 1 or more", s.shards)
	case job.Shards > 0:
		shards = job.Shards // as it was written
	default:
		most = maxArraySize()
		if shards = cluster.Shards(units, all, job.Slurm.Cores, most); s.shards > 0 {
			shards = min(s.shards, units)
		}
		if shards >= most {
			return 0, 0, badInputf("--shards %d: this cluster takes arrays of up to %d tasks (its MaxArraySize is %d)", s.shards, most-1, most)
		}
	}
	return shards, all / float64(shards*job.Slurm.Cores), nil
}

// maxArraySize asks the cluster, if there is one here.
func maxArraySize() int {
	if _, err := exec.LookPath("scontrol"); err != nil {
		return cluster.DefaultMaxArraySize
	}
	ctx, stop := context.WithTimeout(context.Background(), 10*time.Second)
	defer stop()
	out, err := exec.CommandContext(ctx, "scontrol", "show", "config").Output()
	if err != nil {
		return cluster.DefaultMaxArraySize
	}
	return cluster.MaxArraySize(string(out))
}

// jobFiles makes the paths of what the merge writes absolute, and makes sure now
// that it can be written and that nobody's file is lost: the merge itself asks
// no more.
func (o *sweepOptions) jobFiles(job, had *cluster.Job, study *sweep.Study, dir string) error {
	r := &job.Report
	if r.JSON == "-" {
		return badInputf("--json -: a job has no standard output to read; give the name of a file")
	}
	name := job.Run.CaseFile
	if r.Book == "" {
		kind := map[bool]string{true: "-sweep", false: "-each"}[study.Kind == sweep.Grid]
		r.Book = filepath.Join(dir, filepath.Base(reportPath("", name, kind)))
	}
	for _, path := range []*string{&r.Book, &r.JSON, &r.CSV, &r.Figures} {
		if *path == "" {
			continue
		}
		abs, err := filepath.Abs(*path)
		if err != nil {
			return err
		}
		*path = abs
	}
	if err := job.Check(dir); err != nil {
		return badInput{err}
	}
	inside, err := os.ReadDir(dir)
	if err == nil && len(inside) > 0 && had == nil {
		return badInputf("the folder %s holds other files and no job; name another with --slurm", o.slurm.dir)
	}
	_, err = os.Lstat(dir)
	made := errors.Is(err, os.ErrNotExist)
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return badInputf("the job folder %s cannot be made: %v; name another with --slurm", o.slurm.dir, plainPathError(err))
	}
	target := outputs{book: r.Book, json: r.JSON, csv: r.CSV, figures: r.Figures, force: o.force || had != nil && had.Report == *r}
	err = takesFiles(filepath.Join(dir, "job.json"), dir)
	if err == nil {
		err = target.checkFiles(r.Book, study.Base, name, "sweep.csv", "search.csv")
	}
	if err != nil && made {
		os.Remove(dir) // it is empty
	}
	return err
}

// wroteJob says what was written, for people.
func wroteJob(job *cluster.Job, dir string, seconds float64) string {
	text := fmt.Sprintf("Wrote the job %s: %s of work in %s, each of\nabout %s on %s.\n", dir, count(job.Run.Units, "unit"), count(job.Shards, "shard"), roughly(seconds), count(job.Slurm.Cores, "slow core"))
	return text + "Report, once it is merged: " + job.Report.Book + "\n"
}

func count(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return strconv.Itoa(n) + " " + what + "s"
}

// roughly is a time in a unit that fits it.
func roughly(seconds float64) string {
	switch {
	case seconds < 90:
		return count(max(1, int(seconds+0.5)), "second")
	case seconds < 90*60:
		return count(int(seconds/60+0.5), "minute")
	}
	return count(int(seconds/3600+0.5), "hour")
}

func lastOf(lines string) string { return lines[strings.LastIndex(lines, "\n")+1:] }

// submitJob runs submit.sh for what is missing, or says how it is run.
func (a *app) submitJob(o *sweepOptions, job *cluster.Job, dir string) error {
	script := cluster.Script(dir)
	arguments := []string{script}
	if o.resume {
		st, err := job.Survey(dir)
		if err != nil {
			return err
		}
		switch missing := st.Open(); {
		case len(missing) == 0 && st.Merged:
			if !o.quiet {
				a.say(false, "Everything is done; there is nothing to submit.\n")
			}
			return nil
		case len(missing) == 0:
			arguments = append(arguments, "none")
		case len(missing) < job.Shards:
			arguments = append(arguments, cluster.List(missing))
		}
	}
	if !o.slurm.submit {
		if !o.quiet {
			for i := range arguments {
				arguments[i] = cluster.Quote(arguments[i])
			}
			a.say(false, "Submit it with: "+strings.Join(arguments, " ")+"\n")
		}
		return nil
	}
	ctx, stop := context.WithTimeout(context.Background(), 5*time.Minute)
	defer stop()
	c := exec.CommandContext(ctx, "sh", arguments...)
	c.Stderr = a.errs
	out, err := c.Output()
	if !o.quiet {
		a.say(false, string(out))
	}
	if err != nil {
		return fmt.Errorf("the job is written, and was not submitted or not wholly (%w): mend what Slurm says, and give --resume if shards were submitted", err)
	}
	return nil
}
