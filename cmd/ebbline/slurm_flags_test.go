package main

import (
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"unicode/utf8"

	"ebbline/pva/sweep/cluster"
)

// programHere is this program under a name and in a folder that a shell must
// quote: the test's own, which runs the command when it is called ebbline.
func programHere(t *testing.T) string {
	t.Helper()
	self, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(t.TempDir(), "the program's", "ebbline")
	if err := os.MkdirAll(filepath.Dir(path), 0o777); err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink(self, path); err != nil {
		t.Skip("skipped: no links here, so the program has no second name: ", err)
	}
	return path
}

// start begins the program, or a script, in the folder where the test is.
func start(t *testing.T, name string, args ...string) func() string {
	t.Helper()
	c := exec.Command(name, args...)
	var out strings.Builder
	c.Stdout, c.Stderr = &out, &out
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	return func() string {
		t.Helper()
		if err := c.Wait(); err != nil {
			t.Fatalf("%s %v: %v\n%s", name, args, err, out.String())
		}
		return out.String()
	}
}

func narrow(t *testing.T, text string) {
	t.Helper()
	for line := range strings.Lines(text) {
		// A path is as long as it is.
		if line = strings.TrimSuffix(line, "\n"); utf8.RuneCountInString(line) > 80 && !strings.Contains(line, "/") {
			t.Errorf("a line of %d columns: %s", utf8.RuneCountInString(line), line)
		}
	}
}

// TestJobByHand: shards run by hand, twice at once each, and merged give the
// bytes of one run; --status follows them; nothing that is missing is merged.
func TestJobByHand(t *testing.T) {
	inFolder(t)
	mustRun(t, newSweep, "pond.toml", "--set", "start.abundance=45", "--out", "one.xlsx", "--json", "one.json", "--csv", "one")
	program := programHere(t)
	out := mustRun(t, newSweep, "pond.toml", "--set", "start.abundance=45", "--slurm", "it's a job", "--shards", "3", "--program", program, "--json", "two.json", "--csv", "two")
	narrow(t, out)
	if !strings.Contains(out, "7 units of work in 3 shards") {
		t.Error(out)
	}
	looked := mustRun(t, newSweep, "--status", "it's a job")
	narrow(t, looked)
	if !strings.Contains(looked, "0 of 7 units done, in 3 shards") || !strings.Contains(looked, "missing      3  1-3 (never begun)") {
		t.Error(looked)
	}
	if status, _, errs := command(newMerge, "it's a job"); status != 1 || !strings.Contains(errs, "of 7 units 7 are missing, those of shards 1-3") {
		t.Errorf("status %d: %s", status, errs)
	}
	// The case may change after the job is written: the job has its own.
	if err := os.WriteFile("pond.toml", []byte("changed"), 0o666); err != nil {
		t.Fatal(err)
	}
	script := filepath.Join("it's a job", "shard.sh")
	var all []func() string
	for _, shard := range []string{"1", "1", "3", "3", "1"} {
		all = append(all, start(t, script, shard))
	}
	for _, wait := range all {
		if out := wait(); !strings.Contains(out, "of 3 is done: ") {
			t.Error(out)
		}
	}
	if files, _ := filepath.Glob("it's a job/shards/0001/records-*.log"); len(files) < 1 {
		t.Error("no records")
	}
	looked = mustRun(t, newSweep, "--status", "it's a job")
	if !strings.Contains(looked, "5 of 7 units done") || !strings.Contains(looked, "done         2  1, 3") || !strings.Contains(looked, "missing      1  2 (never begun)") {
		t.Error(looked)
	}
	if status, _, errs := command(newMerge, "it's a job"); status != 1 || !strings.Contains(errs, "of 7 units 2 are missing, those of shards 2; ") {
		t.Errorf("status %d: %s", status, errs)
	}
	for _, file := range []string{"it's a job/pond-sweep.xlsx", "two.json", "two"} {
		if _, err := os.Stat(file); err == nil {
			t.Errorf("an incomplete merge has written %s", file)
		}
	}
	// With the number of shards, and where all is done already.
	for _, text := range []string{"2", "2/3"} {
		if out := mustRun(t, newSweep, "--slurm", "it's a job", "--shard", text); !strings.Contains(out, "Shard 2 of 3 is done: 2 units.") {
			t.Error(out)
		}
	}
	for range 2 { // the second time its own files are there
		mustRun(t, newMerge, "it's a job")
		same(t, "one.xlsx", "it's a job/pond-sweep.xlsx")
		same(t, "one.json", "two.json")
		same(t, "one/sweep.csv", "two/sweep.csv")
		same(t, "one/search.csv", "two/search.csv")
	}
	looked = mustRun(t, newSweep, "--status", "it's a job")
	if !strings.Contains(looked, "7 of 7 units done") || !strings.Contains(looked, "\nReport: ") || strings.Contains(looked, "--resume") {
		t.Error(looked)
	}
}

// TestSameShardAtOnce: ten attempts at one shard, begun at the same moment in one
// process, share a ledger without a lock and lose nothing.
func TestSameShardAtOnce(t *testing.T) {
	inFolder(t)
	mustRun(t, newSweep, "pond.toml", "--out", "one.xlsx", "--no-exact")
	mustRun(t, newSweep, "pond.toml", "--slurm", "job", "--shards", "1", "--no-exact", "--program", "ebbline")
	var all sync.WaitGroup
	for range 10 {
		all.Go(func() {
			if status, _, errs := command(newSweep, "--slurm", "job", "--shard", "1"); status != 0 {
				t.Errorf("status %d: %s", status, errs)
			}
		})
	}
	all.Wait()
	if files, _ := filepath.Glob("job/shards/0001/records-*.log"); len(files) < 2 {
		t.Errorf("%d files of records: no two attempts ran at once, the test shows nothing", len(files))
	}
	mustRun(t, newMerge, "job")
	same(t, "one.xlsx", "job/pond-sweep.xlsx")
}

// TestJobFailure: a shard that cannot keep its work says so in the folder, and
// is well again when it is run again.
func TestJobFailure(t *testing.T) {
	inFolder(t)
	mustRun(t, newSweep, "pond.toml", "--slurm", "job", "--shards", "2", "--program", "ebbline")
	if err := os.WriteFile("job/shards/0002", []byte("in the way"), 0o666); err != nil {
		t.Fatal(err)
	}
	if status, _, errs := command(newSweep, "--slurm", "job", "--shard", "2"); status != 2 || !strings.Contains(errs, "takes no ledger") {
		t.Errorf("status %d: %s", status, errs)
	}
	os.Remove("job/shards/0002")
	if out := mustRun(t, newSweep, "--status", "job"); !strings.Contains(out, "failed       1  2\n") || !strings.Contains(out, "(not a directory)") {
		t.Error(out)
	}
	mustRun(t, newSweep, "--slurm", "job", "--shard", "2", "--quiet")
	if out := mustRun(t, newSweep, "--status", "job"); !strings.Contains(out, "failed       0\n") || strings.Contains(out, "not a directory") {
		t.Error(out)
	}
	if left, _ := filepath.Glob("job/shards/*.failed"); len(left) > 0 {
		t.Error("the note of a failure stays after it is mended")
	}
	// Everything is run and only the merge is left.
	mustRun(t, newSweep, "--slurm", "job", "--shard", "1")
	if out := mustRun(t, newSweep, "--slurm", "job", "--resume"); !strings.HasSuffix(out, "submit.sh none\n") {
		t.Error(out)
	}
	if out := mustRun(t, newSweep, "--status", "job"); !strings.Contains(out, "Merge it here with: ") {
		t.Error(out)
	}
	mustRun(t, newMerge, "job", "--quiet")
	if out := mustRun(t, newSweep, "--slurm", "job", "--resume"); !strings.HasSuffix(out, "there is nothing to submit.\n") {
		t.Error(out)
	}
}

// TestJobKeepsWhatWasAsked: written anew, a job keeps what is not asked anew.
func TestJobKeepsWhatWasAsked(t *testing.T) {
	inFolder(t)
	t.Setenv("PATH", t.TempDir()) // no cluster here
	mustRun(t, newSweep, "pond.toml", "--slurm", "job", "--shards", "3", "--program", "bin/ebbline", "--partition", "long", "--time", "5", "--line", "module load a", "--line", "module load b", "--cpus", "2", "--json", "x.json", "--workers", "7")
	mustRun(t, newSweep, "--slurm", "job", "--time", "20", "--memory", "3G", "--resume")
	mustRun(t, newSweep, "pond.toml", "--slurm", "job", "--account", "marsh")
	job, err := cluster.Read("job")
	if err != nil {
		t.Fatal(err)
	}
	here, _ := os.Getwd()
	want := cluster.Slurm{Partition: "long", Account: "marsh", Time: "20", Memory: "3G", Cores: 2, Lines: []string{"module load a", "module load b"}, Workers: 7}
	if got := fmt.Sprintf("%+v", job.Slurm); got != fmt.Sprintf("%+v", want) || job.Shards != 3 || job.Program != filepath.Join(here, "bin", "ebbline") || job.Report.JSON != filepath.Join(here, "x.json") {
		t.Errorf("%+v", job)
	}
}

// TestJobRefusals: bad usage and folders that must not be touched, before
// anything is written.
func TestJobRefusals(t *testing.T) {
	inFolder(t)
	os.MkdirAll("mine", 0o777)
	os.WriteFile("mine/notes", []byte("mine"), 0o666)
	os.WriteFile("there.json", []byte("mine"), 0o666)
	p := []string{"--program", "ebbline"}
	mustRun(t, newSweep, append(p, "pond.toml", "--slurm", "job", "--shards", "3")...)
	t.Setenv("PATH", t.TempDir()) // no cluster here
	for _, c := range []struct {
		want string
		args []string
	}{
		{"give --slurm DIR with it", []string{"pond.toml", "--submit"}},
		{"give --slurm DIR with it", []string{"pond.toml", "--partition", "short"}},
		{"give --slurm DIR with it", []string{"pond.toml", "--cpus", "1"}},
		{"give --slurm DIR with it", []string{"pond.toml", "--line", "x"}},
		{"stands alone", []string{"pond.toml", "--status", "job"}},
		{"stands alone", []string{"--status", "job", "--resume"}},
		{"is no job folder", []string{"--status", "mine"}},
		{"is no job folder", []string{"--slurm", "mine", "--shard", "1"}},
		{"holds no job yet", []string{"--slurm", "new"}},
		{"keeps its ledgers in its own folder", []string{"pond.toml", "--slurm", "new", "--ledger", "x"}},
		{"seed is 1, this run's 9", []string{"pond.toml", "--slurm", "job", "--seed", "9"}},
		{"its case says", []string{"pond.toml", "--slurm", "job", "--set", "births.rate=0.5"}},
		{"written for its own case", []string{"--slurm", "job", "--seed", "9"}},
		{"is cut into 3, and stays so", []string{"pond.toml", "--slurm", "job", "--shards", "4"}},
		{"the number of a shard of this job, 1 to 3", []string{"--slurm", "job", "--shard", "4"}},
		{"the number of a shard of this job, 1 to 3", []string{"--slurm", "job", "--shard", "1/8"}},
		{"the number of a shard of this job, 1 to 3", []string{"--slurm", "job", "--shard", "x"}},
		{"as it was written", []string{"--slurm", "job", "--shard", "1", "--seed", "3"}},
		{"as it was written", []string{"pond.toml", "--slurm", "job", "--shard", "1"}},
		{"holds other files and no job", append(p, "pond.toml", "--slurm", "mine")},
		{"cannot be made", append(p, "pond.toml", "--slurm", "pond.toml/job")},
		{"there.json exists", append(p, "pond.toml", "--slurm", "new", "--json", "there.json")},
		{"no standard output", append(p, "pond.toml", "--slurm", "new", "--json", "-")},
		{"--cpus 0", append(p, "pond.toml", "--slurm", "new", "--cpus", "0")},
		{"arrays of up to 1000 tasks", append(p, "pond.toml", "--slurm", "new", "--shards", "1001", "--replicates", "1000000", "--set", "sweep.1.step=0.001")},
		{"one line", append(p, "pond.toml", "--slurm", "new", "--line", "a\nb")},
		{"reads as a pattern", append(p, "pond.toml", "--slurm", "50%")},
		{"there is no sbatch on this machine", append(p, "pond.toml", "--slurm", "new", "--submit")},
		{"`go run` takes its program away", []string{"pond.toml", "--slurm", "new"}},
		{"no [[sweep]] table", append(p, "--example", "fish-pond", "--slurm", "new")},
	} {
		if status, _, errs := command(newSweep, c.args...); status != 2 || !strings.Contains(errs, c.want) {
			t.Errorf("%v: status %d: %s", c.args, status, errs)
		}
	}
	for _, name := range []string{"new", "50%"} {
		if _, err := os.Stat(name); err == nil {
			t.Errorf("a refused job has made the folder %s", name)
		}
	}
	if data, _ := os.ReadFile("there.json"); string(data) != "mine" {
		t.Error("a file of somebody's is gone")
	}
	// A job that was submitted is not submitted again unasked.
	os.WriteFile("job/submitted", []byte("array 7 of shards 1-3\nmerge 8\n"), 0o666)
	if status, _, errs := command(newSweep, "--slurm", "job"); status != 2 || !strings.Contains(errs, "is submitted already (merge 8); give --resume") {
		t.Errorf("status %d: %s", status, errs)
	}
	// A manifest that was changed by hand.
	data, _ := os.ReadFile("job/job.json")
	os.WriteFile("job/job.json", []byte(strings.Replace(string(data), `"shards": 3`, `"shards": 4`, 1)), 0o666)
	if status, _, errs := command(newSweep, "--slurm", "job", "--shard", "1"); status != 2 || !strings.Contains(errs, "is damaged or was changed by hand") {
		t.Errorf("status %d: %s", status, errs)
	}
}

// TestWorkersHere: the flag, then what Slurm gives the task, then what it gives
// on the node, then the cores.
func TestWorkersHere(t *testing.T) {
	for _, c := range []struct {
		flag         int
		task, onNode string
		want         int
	}{
		{3, "4", "5", 3}, {0, "4", "5", 4}, {0, "", "5", 5}, {0, "", "", 0}, {0, "x", "5", 5}, {0, "0", "", 0}, {0, "-1", "2", 2},
	} {
		t.Setenv("SLURM_CPUS_PER_TASK", c.task)
		t.Setenv("SLURM_CPUS_ON_NODE", c.onNode)
		if got := workersHere(c.flag); got != c.want {
			t.Errorf("%+v: %d", c, got)
		}
	}
}
