package main

import (
	"context"
	"flag"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"

	"ebbline/pva/sweep"
	"ebbline/pva/sweep/cluster"
)

var long = flag.Bool("long", false, "run the slow checks on a cluster too")

// ask runs a program of Slurm's, for a limited time.
func ask(name string, args ...string) (string, error) {
	ctx, stop := context.WithTimeout(context.Background(), 20*time.Second)
	defer stop()
	out, err := exec.CommandContext(ctx, name, args...).CombinedOutput()
	return strings.TrimSpace(string(out)), err
}

// withSlurm skips a test where no Slurm with a node answers.
func withSlurm(t *testing.T) {
	t.Helper()
	for _, name := range []string{"sbatch", "scontrol", "scancel", "squeue"} {
		if _, err := exec.LookPath(name); err != nil {
			t.Skip("skipped: Slurm is not installed or not running")
		}
	}
	if out, err := ask("sinfo", "-h", "-o", "%t"); err != nil || !strings.Contains(out, "idle") && !strings.Contains(out, "mix") {
		t.Skip("skipped: Slurm is not installed or not running")
	}
}

// within waits until something is so, and fails after the time given.
func within(t *testing.T, limit time.Duration, what string, so func() bool) {
	t.Helper()
	for end := time.Now().Add(limit); !so(); time.Sleep(100 * time.Millisecond) {
		if time.Now().After(end) {
			queue, _ := ask("squeue")
			logs := ""
			names, _ := filepath.Glob("*/logs/*.log")
			for _, name := range names {
				data, _ := os.ReadFile(name)
				logs += name + ":\n" + string(data)
			}
			t.Fatalf("after %s not yet: %s\n%s\n%s", limit, what, queue, logs)
		}
	}
}

// clusterJob goes to a new folder with a case of so many replicates, of which
// one run has written one.xlsx, one.json and one/, and a job in the folder "it's
// a job" that writes two.json and two/. Its tasks are taken away when the test ends.
func clusterJob(t *testing.T, replicates int, more ...string) {
	t.Helper()
	withSlurm(t)
	inFolder(t)
	n := strconv.Itoa(replicates)
	mustRun(t, newSweep, "pond.toml", "--replicates", n, "--out", "one.xlsx", "--json", "one.json", "--csv", "one")
	mustRun(t, newSweep, append([]string{"pond.toml", "--replicates", n, "--slurm", theJob, "--program", programHere(t), "--json", "two.json", "--csv", "two", "--time", "10", "--memory", "100M"}, more...)...)
	endJob(t)
}

// endJob takes what is left of the job from the cluster when the test ends.
func endJob(t *testing.T) {
	t.Cleanup(func() {
		for _, id := range append(submissions(t, "array"), submissions(t, "merge")...) {
			ask("scancel", id)
		}
	})
}

const theJob = "it's a job"

// submissions are the numbers that submit.sh has noted.
func submissions(t *testing.T, kind string) (ids []string) {
	t.Helper()
	for line := range strings.Lines(cluster.Submitted(theJob)) {
		if words := strings.Fields(line); words[0] == kind {
			ids = append(ids, words[1])
		}
	}
	return ids
}

// queued says whether anything of the job waits or runs.
func queued(t *testing.T) bool {
	t.Helper()
	out, err := ask("squeue", "-h", "-o", "%F")
	if err != nil {
		return true // not known
	}
	ours := append(submissions(t, "array"), submissions(t, "merge")...)
	for _, id := range strings.Fields(out) {
		if contains(ours, id) {
			return true
		}
	}
	return false
}

func last(list []string) string { return list[len(list)-1] }

// mergedSame waits for the report, and holds it against the one run's.
func mergedSame(t *testing.T, limit time.Duration) {
	t.Helper()
	within(t, limit, "the report is written and the queue is empty", func() bool {
		_, err := os.Stat("two/search.csv")
		return err == nil && !queued(t)
	})
	same(t, "one.xlsx", theJob+"/pond-sweep.xlsx")
	same(t, "one.json", "two.json")
	same(t, "one/sweep.csv", "two/sweep.csv")
	same(t, "one/search.csv", "two/search.csv")
}

func survey(t *testing.T) *cluster.Status {
	t.Helper()
	job, err := cluster.Read(theJob)
	if err != nil {
		t.Fatal(err)
	}
	st, err := job.Survey(theJob)
	if err != nil {
		t.Fatal(err)
	}
	return st
}

func logOf(t *testing.T, shard int) string {
	t.Helper()
	data, err := os.ReadFile(cluster.Log(theJob, shard))
	if err != nil {
		t.Fatal(err)
	}
	return string(data)
}

// together is a line of shell that holds a task until four have come, so that
// what follows it is begun by all of them at once.
const together = `: >"logs/here-$SLURM_JOB_ID"; until [ "$(ls logs/here-* | wc -l)" -ge 4 ]; do sleep 0.1; done`

// TestSlurmArray: an array and its merge give the bytes of one run. It is
// submitted twice, and each shard is run by two tasks at once, which the logs
// must show: both begin before either ends. (One may find a unit that the other
// has just finished.)
func TestSlurmArray(t *testing.T) {
	clusterJob(t, 200_000, "--shards", "2", "--line", together)
	out := mustRun(t, newSweep, "--slurm", theJob, "--submit")
	if !strings.Contains(out, "of shards 1-2\nmerge ") {
		t.Error(out)
	}
	if status, _, errs := command(newSweep, "--slurm", theJob, "--submit"); status != 2 || !strings.Contains(errs, "is submitted already") {
		t.Errorf("status %d: %s", status, errs)
	}
	start(t, cluster.Script(theJob))()
	mergedSame(t, 60*time.Second)
	if arrays := submissions(t, "array"); len(arrays) != 2 {
		t.Error("submitted:", arrays)
	}
	for shard := 1; shard <= 2; shard++ {
		var order []string
		for line := range strings.Lines(logOf(t, shard)) {
			switch {
			case strings.Contains(line, " begins on n"):
				order = append(order, "begins")
			case strings.Contains(line, " is done: "):
				order = append(order, "ends")
			}
		}
		if got := strings.Join(order, " "); got != "begins begins ends ends" {
			t.Errorf("shard %d was not run twice at once (%s):\n%s", shard, got, logOf(t, shard))
		}
		if files, _ := filepath.Glob(cluster.Ledger(theJob, shard) + "/records-*.log"); len(files) != 2 {
			t.Errorf("shard %d: %d files of records, want one a task", shard, len(files))
		}
	}
	if status := mustRun(t, newSweep, "--status", theJob); !strings.Contains(status, "done         2  1-2\n") {
		t.Error(status)
	}
}

// TestSlurmScancel takes one task away: the merge does not run, the status says
// which shard failed, and that one alone is submitted again.
func TestSlurmScancel(t *testing.T) {
	clusterJob(t, 400, "--shards", "4", "--line", `[ "$shard" != 2 ] || sleep 300`)
	mustRun(t, newSweep, "--slurm", theJob, "--submit", "--quiet")
	array := last(submissions(t, "array"))
	within(t, 60*time.Second, "all shards but the second are done", func() bool { return cluster.List(survey(t).Open()) == "2" })
	within(t, 30*time.Second, "the second has begun", func() bool { out, _ := ask("squeue", "-h", "-t", "running", "-j", array); return out != "" })
	if out, err := ask("scancel", array+"_2"); err != nil {
		t.Fatal(out, err)
	}
	within(t, 60*time.Second, "the merge is taken away", func() bool { return !queued(t) })
	status := mustRun(t, newSweep, "--status", theJob)
	narrow(t, status)
	if !strings.Contains(status, "failed       1  2\n") || !strings.Contains(status, "CANCELLED") {
		t.Error(status)
	}
	if _, err := os.Stat(theJob + "/pond-sweep.xlsx"); err == nil {
		t.Error("an incomplete sweep was merged")
	}
	out := mustRun(t, newSweep, "--slurm", theJob, "--submit", "--resume", "--line", "true")
	if !strings.Contains(out, "of shards 2\n") {
		t.Error(out)
	}
	mergedSame(t, 60*time.Second)
	for shard, want := range map[int]int{1: 1, 2: 1, 3: 1, 4: 1} {
		if log := logOf(t, shard); strings.Count(log, "begins on n") != want {
			t.Errorf("shard %d:\n%s", shard, log)
		}
	}
}

// TestSlurmMergeAlone: the shards are done and the merge is not, as when it was
// taken away: it alone is submitted.
func TestSlurmMergeAlone(t *testing.T) {
	clusterJob(t, 400, "--shards", "1")
	mustRun(t, newSweep, "--slurm", theJob, "--shard", "1")
	out := mustRun(t, newSweep, "--slurm", theJob, "--submit", "--resume")
	if strings.Contains(out, "array") || !strings.Contains(out, "merge ") {
		t.Error(out)
	}
	mergedSame(t, 60*time.Second)
	// A merge that is told to wait for nothing, with a shard missing, refuses.
	if err := os.RemoveAll(cluster.Ledger(theJob, 1)); err != nil {
		t.Fatal(err)
	}
	os.Remove(theJob + "/pond-sweep.xlsx")
	start(t, cluster.Script(theJob), "none")()
	within(t, 60*time.Second, "the merge has ended", func() bool { return strings.Contains(survey(t).MergeSaid, "nothing was written") })
}

// inTheMiddle waits until a shard of the last array runs and has finished some of
// its work and not all, and gives its node.
func inTheMiddle(t *testing.T, shard int) (node string) {
	t.Helper()
	within(t, 60*time.Second, fmt.Sprintf("shard %d is in the middle of its work", shard), func() bool {
		sh := survey(t).Shards[shard-1]
		if sh.State == cluster.Done {
			t.Fatalf("shard %d is done already: the test shows nothing", shard)
		}
		return sh.Held > 0
	})
	node, err := ask("squeue", "-h", "-o", "%N", "-j", last(submissions(t, "array"))+"_"+strconv.Itoa(shard))
	if err != nil || node == "" {
		t.Fatal("no node", node, err)
	}
	return node
}

// wentOn makes sure that a shard was begun twice, and kept work of the first time.
func wentOn(t *testing.T, shard int) {
	t.Helper()
	log := logOf(t, shard)
	if strings.Count(log, "begins on n") != 2 || strings.Count(log, " with 0 of its ") != 1 {
		t.Errorf("shard %d did not go on where it was:\n%s", shard, log)
	}
	if units := survey(t).Shards[shard-1]; units.State != cluster.Done || units.Units != sweep.ShardUnits(33, shard, 2) {
		t.Errorf("%+v", units)
	}
}

// longReplicates make two shards of about a quarter of a minute each.
const longReplicates = 2_000_000

// TestSlurmRequeue stops a task in the middle and puts it back into the queue: it
// is told to stop, keeps what is finished, and goes on with the rest.
func TestSlurmRequeue(t *testing.T) {
	if !*long {
		t.Skip("only with -long")
	}
	clusterJob(t, longReplicates, "--shards", "2")
	mustRun(t, newSweep, "--slurm", theJob, "--submit", "--quiet")
	inTheMiddle(t, 1)
	if out, err := ask("scontrol", "requeue", last(submissions(t, "array"))+"_1"); err != nil {
		t.Fatal(out, err)
	}
	mergedSame(t, 4*time.Minute)
	wentOn(t, 1)
	if log := logOf(t, 1); !strings.Contains(log, "interrupted: ") {
		t.Errorf("the program was not told to stop:\n%s", log)
	}
}

// TestSlurmTimeLimit: a task whose time is nearly up is told so, and stops by
// itself with what it has.
func TestSlurmTimeLimit(t *testing.T) {
	if !*long {
		t.Skip("only with -long")
	}
	withSlurm(t)
	inFolder(t)
	endJob(t)
	// With three minutes' time the warning comes in the first or the second.
	mustRun(t, newSweep, "pond.toml", "--replicates", strconv.Itoa(20*longReplicates), "--slurm", theJob, "--program", programHere(t), "--shards", "1", "--time", "3")
	mustRun(t, newSweep, "--slurm", theJob, "--submit", "--quiet")
	within(t, 3*time.Minute, "the shard has stopped", func() bool { return len(survey(t).Of(cluster.Failed)) == 1 })
	// Slurm's own line about the warning comes before the program has finished
	// what is in work.
	within(t, time.Minute, "the shard says that it was interrupted", func() bool { return strings.Contains(logOf(t, 1), "interrupted: ") })
	if log := logOf(t, 1); strings.Contains(log, "DUE TO TIME LIMIT") {
		t.Error(log)
	}
	within(t, 30*time.Second, "the merge is taken away", func() bool { return !queued(t) })
}

// TestSlurmNodeDies kills a node with everything on it, as a power cut does: the
// controller misses it after half a minute and runs its tasks elsewhere.
func TestSlurmNodeDies(t *testing.T) {
	if !*long {
		t.Skip("only with -long")
	}
	withSlurm(t)
	folder := filepath.Dir(os.Getenv("SLURM_CONF"))
	script, err := filepath.Abs(filepath.Join("..", "..", ".ci", "slurm"))
	if err != nil {
		t.Fatal(err)
	}
	if _, err := os.Stat(filepath.Join(folder, "n1.pid")); err != nil {
		t.Skip("skipped: this Slurm was not started by .ci/slurm, and none of its nodes is killed")
	}
	clusterJob(t, longReplicates, "--shards", "2")
	mustRun(t, newSweep, "--slurm", theJob, "--submit", "--quiet")
	node := inTheMiddle(t, 1)
	inTheMiddle(t, 2) // which may be on the same node, and must have work to keep
	t.Cleanup(func() {
		if out, err := exec.Command(script, "start", folder).CombinedOutput(); err != nil {
			t.Errorf("the node does not come back: %v\n%s", err, out)
		}
	})
	powerCut(t, filepath.Join(folder, node+".pid"), last(submissions(t, "array")))
	mergedSame(t, 4*time.Minute)
	for shard := 1; shard <= 2; shard++ {
		if strings.Contains(logOf(t, shard), "begins on "+node+" ") {
			wentOn(t, shard)
		}
	}
	if log := logOf(t, 1); strings.Contains(log, "interrupted: ") {
		t.Errorf("the program had time for a word, so this was no power cut:\n%s", log)
	}
}

// powerCut kills a node's daemon, the processes that watch over its tasks, and
// the tasks. The daemon's number is in a file; a task's process knows its array
// and its node, and its watcher is its parent.
func powerCut(t *testing.T, pidFile, array string) {
	t.Helper()
	data, err := os.ReadFile(pidFile)
	if err != nil {
		t.Fatal(err)
	}
	daemon := strings.TrimSpace(string(data))
	node := strings.TrimSuffix(filepath.Base(pidFile), ".pid")
	victims := []string{daemon}
	environments, _ := filepath.Glob("/proc/[0-9]*/environ")
	for _, name := range environments {
		data, err := os.ReadFile(name)
		variables := "\x00" + string(data)
		if err != nil || !strings.Contains(variables, "\x00SLURM_ARRAY_JOB_ID="+array+"\x00") || !strings.Contains(variables, "\x00SLURMD_NODENAME="+node+"\x00") {
			continue
		}
		pid := filepath.Base(filepath.Dir(name))
		if stat, err := os.ReadFile(filepath.Join("/proc", pid, "stat")); err == nil {
			// After the name in brackets: the state, then the parent.
			_, rest, _ := strings.Cut(string(stat), ") ")
			parent := strings.Fields(rest)[1]
			if name, _ := os.ReadFile(filepath.Join("/proc", parent, "comm")); strings.HasPrefix(string(name), "slurmstepd") {
				victims = append(victims, parent)
			}
		}
		victims = append(victims, pid)
	}
	if len(victims) < 3 {
		t.Fatal("no task to kill on", node)
	}
	for _, text := range victims {
		pid, err := strconv.Atoi(text)
		if err != nil {
			t.Fatal(err)
		}
		if p, err := os.FindProcess(pid); err == nil {
			p.Kill()
		}
	}
}
