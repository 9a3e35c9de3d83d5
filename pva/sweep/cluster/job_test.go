package cluster

import (
	"errors"
	"flag"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"ebbline/pva/sweep/ledger"
)

var update = flag.Bool("update", false, "rewrite testdata/golden/job")

// invented is a job with everything asked for, in words that a shell would read.
func invented(root string) *Job {
	return &Job{
		Shards:  12,
		Program: "/opt/o'neil's programs/ebbline",
		Run: ledger.Manifest{Program: "ebbline", Format: ledger.Format, Version: "1", Command: "sweep", Title: "an invented pond", Digest: "sha256:1",
			Seed: 7, Replicates: 1000, What: "a grid", Cells: 10, Group: 64, Range: 64, Units: 40, Case: "[case]\n", CaseFile: "the pond's $case.toml"},
		Slurm: Slurm{Partition: "short", Account: "marsh & pond", Time: "1:30:00", Memory: "2G", Cores: 4,
			Lines: []string{"module load ebbline/1.0", `export NOTE="a b"`}, Prefix: "apptainer exec image.sif", Workers: 3},
		Report: Report{Book: filepath.Join(root, "it's a job", "pond-sweep.xlsx"), CSV: filepath.Join(root, "tables")},
	}
}

// TestGoldenFolder: the written folder, file by file.
func TestGoldenFolder(t *testing.T) {
	root := t.TempDir()
	dir := filepath.Join(root, "it's a job")
	if err := Write(dir, invented(root)); err != nil {
		t.Fatal(err)
	}
	golden := filepath.Join("..", "..", "..", "testdata", "golden", "job")
	var names []string
	err := filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
		if err != nil || path == dir {
			return err
		}
		names = append(names, d.Name())
		if d.IsDir() {
			return nil
		}
		data, err := os.ReadFile(path)
		if err != nil {
			return err
		}
		text := strings.ReplaceAll(string(data), root, "/scratch")
		if d.Name() == manifestName { // its checksum covers the name of this test's own folder
			text = text[:strings.LastIndex(text, `"checksum": "`)] + "\"checksum\": \"...\"\n}\n"
		}
		if *update {
			return os.WriteFile(filepath.Join(golden, d.Name()), []byte(text), 0o666)
		}
		want, err := os.ReadFile(filepath.Join(golden, d.Name()))
		if err != nil {
			return err
		}
		if text != string(want) {
			t.Errorf("%s is\n%s\nwant\n%s", d.Name(), text, want)
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	if got := strings.Join(names, " "); got != "README job.json logs merge.sh shard.sh shards submit.sh" {
		t.Error("the folder holds", got)
	}
	for _, name := range []string{submitName, shardName, mergeName} {
		if info, err := os.Stat(filepath.Join(dir, name)); err != nil || info.Mode()&0o100 == 0 {
			t.Errorf("%s cannot be run (%v)", name, err)
		}
	}
	if readme := invented(root).readme(dir); strings.Count(readme, "\n") != 3 {
		t.Error("the README has not three lines:\n" + readme)
	}
}

// fake puts a program into a folder that notes its arguments, one a line, in the
// file that $NOTES names, and says a number.
func fake(t *testing.T, path string) {
	t.Helper()
	if err := os.MkdirAll(filepath.Dir(path), 0o777); err != nil {
		t.Fatal(err)
	}
	script := "#!/bin/sh\nprintf '%s\\n' \"$@\" >>\"$NOTES\"\necho END >>\"$NOTES\"\necho '41;cluster'\n"
	if err := os.WriteFile(path, []byte(script), 0o777); err != nil {
		t.Fatal(err)
	}
}

func needsShell(t *testing.T) {
	t.Helper()
	if _, err := exec.LookPath("bash"); err != nil {
		t.Skip("skipped: bash is not installed, so no script was run")
	}
}

// call runs a script with environment variables and gives what the fake was given.
func call(t *testing.T, environment []string, script string, args ...string) (noted string) {
	t.Helper()
	notes := filepath.Join(t.TempDir(), "notes")
	c := exec.Command(script, args...)
	c.Dir = t.TempDir()
	c.Env = append(append(os.Environ(), "NOTES="+notes, "SLURM_ARRAY_TASK_ID="), environment...)
	if out, err := c.CombinedOutput(); err != nil {
		t.Fatalf("%s: %v\n%s", script, err, out)
	}
	data, err := os.ReadFile(notes)
	if err != nil {
		t.Fatal(err)
	}
	return string(data)
}

// TestScriptsReachTheProgram runs the scripts: whatever stands in the names, the
// program is given the words that are meant.
func TestScriptsReachTheProgram(t *testing.T) {
	needsShell(t)
	for _, name := range []string{"plain", "$HOME", "`id`", "it's a job", `$HOME "and" back`, "a;b&c*?[d](e)<f>|#!~", "ünïcode"} {
		root := t.TempDir()
		dir := filepath.Join(root, name)
		j := invented(root)
		j.Program = filepath.Join(root, "my o'neil $PATH", "ebbline")
		j.Slurm.Prefix, j.Slurm.Lines = "env WORD=1", []string{"cd /"}
		fake(t, j.Program)
		if err := Write(dir, j); err != nil {
			t.Fatal(err)
		}
		want := "sweep\n--slurm\n" + dir + "\n--shard\n3\n--workers\n3\nEND\n"
		if got := call(t, nil, filepath.Join(dir, shardName), "3"); got != want {
			t.Errorf("by hand in %s: %q, want %q", name, got, want)
		}
		if got := call(t, []string{"SLURM_ARRAY_TASK_ID=3", "SLURM_ARRAY_TASK_COUNT=1"}, filepath.Join(dir, shardName)); got != want {
			t.Errorf("as a task in %s: %q, want %q", name, got, want)
		}
		if got, want := call(t, nil, filepath.Join(dir, mergeName)), "merge\n"+dir+"\n--workers\n3\nEND\n"; got != want {
			t.Errorf("merge in %s: %q, want %q", name, got, want)
		}
	}
}

// TestShardNeedsANumber: neither an argument nor a task's number.
func TestShardNeedsANumber(t *testing.T) {
	needsShell(t)
	dir := filepath.Join(t.TempDir(), "job")
	if err := Write(dir, invented("/")); err != nil {
		t.Fatal(err)
	}
	c := exec.Command(filepath.Join(dir, shardName))
	c.Env = []string{"PATH=" + os.Getenv("PATH")}
	out, err := c.CombinedOutput()
	if err == nil || !strings.Contains(string(out), "name a shard, 1 to 12") {
		t.Errorf("%v %s", err, out)
	}
}

// TestSubmit runs submit.sh with a stand-in for sbatch: what it is told, and that
// the merge waits for the array by the number that sbatch gave.
func TestSubmit(t *testing.T) {
	needsShell(t)
	root := t.TempDir()
	dir := filepath.Join(root, "it's a job")
	if err := Write(dir, invented(root)); err != nil {
		t.Fatal(err)
	}
	bin := filepath.Join(root, "bin")
	fake(t, filepath.Join(bin, "sbatch"))
	path := []string{"PATH=" + bin + ":" + os.Getenv("PATH")}
	common := "--chdir=" + dir + "\n--open-mode=append\n--requeue\n--signal=B:TERM@120\n--cpus-per-task=4\n--partition=short\n--account=marsh & pond\n--time=1:30:00\n--mem=2G\n"
	array := func(shards string) string {
		return "--parsable\n--array=" + shards + "\n--job-name=ebbline\n--output=logs/%a.log\n" + common + "shard.sh\nEND\n"
	}
	merge := "--job-name=ebbline-merge\n--output=logs/merge.log\n" + common + "merge.sh\nEND\n"
	held := "--parsable\n--dependency=afterok:41\n--kill-on-invalid-dep=yes\n" + merge
	for _, c := range []struct {
		args []string
		want string
	}{
		{nil, array("1-12") + held},
		{[]string{"3,7-9"}, array("3,7-9") + held},
		{[]string{"none"}, "--parsable\n" + merge},
	} {
		if got := call(t, path, Script(dir), c.args...); got != c.want {
			t.Errorf("%v: sbatch was told\n%s\nwant\n%s", c.args, got, c.want)
		}
	}
	if got, want := Submitted(dir), "array 41 of shards 1-12\nmerge 41\narray 41 of shards 3,7-9\nmerge 41\nmerge 41"; got != want {
		t.Errorf("noted: %q, want %q", got, want)
	}
}

func TestRefusals(t *testing.T) {
	root := t.TempDir()
	for want, change := range map[string]func(j *Job, dir *string){
		"--line":      func(j *Job, _ *string) { j.Slurm.Lines = []string{"a\nb"} },
		"--prefix":    func(j *Job, _ *string) { j.Slurm.Prefix = "a\nb" },
		"--time":      func(j *Job, _ *string) { j.Slurm.Time = "1\n2" },
		"reads as a":  func(_ *Job, dir *string) { *dir = filepath.Join(root, "50%") },
		"line break":  func(_ *Job, dir *string) { *dir = filepath.Join(root, "a\nb") },
		"other files": func(_ *Job, dir *string) { *dir = filepath.Join(root, "full") },
		"cannot be":   func(_ *Job, dir *string) { *dir = filepath.Join(root, "full", "file") },
	} {
		os.MkdirAll(filepath.Join(root, "full"), 0o777)
		os.WriteFile(filepath.Join(root, "full", "file"), []byte("mine"), 0o666)
		j, dir := invented(root), filepath.Join(root, "job")
		change(j, &dir)
		if err := Write(dir, j); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: %v", want, err)
		}
	}
	if data, _ := os.ReadFile(filepath.Join(root, "full", "file")); string(data) != "mine" {
		t.Error("a file of somebody's is gone")
	}
	if _, err := Read(root); !errors.Is(err, ErrNoJob) {
		t.Error(err)
	}
}

// TestManifest: what is written is read, and any change of a byte that matters
// is seen.
func TestManifest(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "job")
	want := invented("/")
	if err := Write(dir, want); err != nil {
		t.Fatal(err)
	}
	got, err := Read(dir)
	if err != nil || got.Shards != 12 || got.Run.Difference(want.Run) != "" || got.checksum() != want.checksum() {
		t.Fatal(err, got)
	}
	name := filepath.Join(dir, manifestName)
	good, _ := os.ReadFile(name)
	unseen := 0
	for at := range good {
		bad := append([]byte(nil), good...)
		bad[at] ^= 1
		os.WriteFile(name, bad, 0o666)
		if j, err := Read(dir); err == nil {
			if j.checksum() != want.checksum() {
				t.Fatalf("byte %d: a damaged manifest is read as %+v", at, j)
			}
			unseen++
		}
	}
	if unseen > len(good)/4 { // blanks between the fields
		t.Fatalf("%d of %d flips went unseen", unseen, len(good))
	}
}
