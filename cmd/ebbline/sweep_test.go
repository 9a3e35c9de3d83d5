package main

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/spf13/cobra"
)

const sweepCase = `# an invented pond
[case]
title = "an invented pond"
counts = "adult females"
[question]
threshold = 10
horizon = 12
limit = 0.15
[start]
abundance = 50
year = 2031
[births]
breeding = "pulse"
rate = 0.45
year_sd = 0.15
crowding = { form = "linear", capacity = 110 }
[deaths]
fraction = 0.27
[[harvest]]
name = "control"
rule = "constant"
take = 3
when = "end"
[run]
replicates = 400
[[sweep]]
key = "harvest.control.take"
from = 0
to = 8
step = 2
[[sweep]]
key = "start.abundance"
values = [30, 60]
[minimum]
from = 12
to = 300
`

// command runs one of the commands as the program does and gives its exit status.
func command(make func(*app) *cobra.Command, args ...string) (status int, out, errs string) {
	var o, e bytes.Buffer
	a := &app{in: strings.NewReader(""), out: &o, errs: &e}
	c := make(a)
	c.SetArgs(args)
	c.SetOut(&o)
	c.SetErr(&e)
	c.SilenceErrors, c.SilenceUsage = true, true
	status = a.status(c.Execute())
	return status, o.String(), e.String()
}

// inFolder writes the case into a new folder and goes there.
func inFolder(t *testing.T) {
	t.Helper()
	t.Chdir(t.TempDir())
	if err := os.WriteFile("pond.toml", []byte(sweepCase), 0o666); err != nil {
		t.Fatal(err)
	}
}

func mustRun(t *testing.T, make func(*app) *cobra.Command, args ...string) string {
	t.Helper()
	status, out, errs := command(make, args...)
	if status != 0 {
		t.Fatalf("%v: status %d\n%s", args, status, errs)
	}
	return out
}

func same(t *testing.T, a, b string) {
	t.Helper()
	x, err := os.ReadFile(a)
	if err != nil {
		t.Fatal(err)
	}
	y, err := os.ReadFile(b)
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(x, y) {
		t.Errorf("%s and %s differ", a, b)
	}
}

// TestSweepFiles: one run, shards that are merged, and a resumed run write the
// same workbook, JSON and CSV, byte for byte; a ledger nobody named is gone at
// the end.
func TestSweepFiles(t *testing.T) {
	inFolder(t)
	common := []string{"pond.toml", "--seed", "7", "--no-exact"}
	out := mustRun(t, newSweep, append(common, "--out", "one.xlsx", "--json", "one.json", "--csv", "one")...)
	for _, line := range strings.Split(out, "\n") {
		if utf8.RuneCountInString(line) > 80 {
			t.Errorf("a line of %d columns: %s", utf8.RuneCountInString(line), line)
		}
	}
	if !strings.Contains(out, "The largest harvest.control.take within the limit of 15 % is") {
		t.Error(out)
	}
	if left, _ := filepath.Glob("*.ledger"); len(left) > 0 {
		t.Errorf("left behind: %v", left)
	}
	mustRun(t, newSweep, append(common, "--shard", "1/2", "--ledger", "a")...)
	if status, _, errs := command(newMerge, "a", "--out", "two.xlsx"); status != 1 || !strings.Contains(errs, "that is shard 2/2") {
		t.Errorf("status %d: %s", status, errs)
	}
	mustRun(t, newSweep, append(common, "--shard", "2/2", "--ledger", "b")...)
	mustRun(t, newMerge, "a", "b", "--no-exact", "--out", "two.xlsx", "--json", "two.json", "--csv", "two")
	mustRun(t, newSweep, append(common, "--ledger", "a", "--resume", "--out", "three.xlsx", "--json", "three.json", "--csv", "three")...)
	for _, n := range []string{"two", "three"} {
		same(t, "one.xlsx", n+".xlsx")
		same(t, "one.json", n+".json")
		same(t, "one/sweep.csv", n+"/sweep.csv")
		same(t, "one/search.csv", n+"/search.csv")
	}
	// A ledger of another seed, and one that is there already.
	if status, _, errs := command(newSweep, "pond.toml", "--seed", "8", "--ledger", "a", "--resume", "--out", "x.xlsx"); status != 2 || !strings.Contains(errs, "seed is 7") {
		t.Errorf("status %d: %s", status, errs)
	}
	if status, _, errs := command(newSweep, append(common, "--ledger", "a", "--out", "x.xlsx")...); status != 2 || !strings.Contains(errs, "--resume") {
		t.Errorf("status %d: %s", status, errs)
	}
	// Files of somebody else are not overwritten, and nothing runs.
	if status, _, errs := command(newSweep, append(common, "--out", "x.xlsx", "--json", "one.json")...); status != 2 || !strings.Contains(errs, "one.json exists") {
		t.Errorf("status %d: %s", status, errs)
	}
}

// TestSweepOtherKinds: inputs and structures, the minimum, and bad usage.
func TestSweepOtherKinds(t *testing.T) {
	inFolder(t)
	for _, out := range []string{
		mustRun(t, newSweep, "pond.toml", "--structures", "--out", "each.xlsx", "--json", "each.json"),
		mustRun(t, newMinimum, "pond.toml", "--out", "size.xlsx", "--json", "size.json"),
	} {
		for _, line := range strings.Split(out, "\n") {
			if utf8.RuneCountInString(line) > 80 {
				t.Errorf("a line of %d columns: %s", utf8.RuneCountInString(line), line)
			}
		}
	}
	for _, want := range []struct{ file, key string }{{"each.json", `"influences"`}, {"each.json", `"structures"`}, {"size.json", `"minimum": {`}, {"size.json", `"trace"`}} {
		data, err := os.ReadFile(want.file)
		if err != nil || !bytes.Contains(data, []byte(want.key)) {
			t.Errorf("%s lacks %s (%v)", want.file, want.key, err)
		}
	}
	for want, args := range map[string][]string{
		"--each 0%":    {"pond.toml", "--each", "0%"},
		"--each x":     {"pond.toml", "--each", "x"},
		"--shard 3/2":  {"pond.toml", "--shard", "3/2"},
		"--workers -1": {"pond.toml", "--workers", "-1"},
		"[[sweep]]":    {"--example", "fish-pond"},
	} {
		if status, _, errs := command(newSweep, args...); status != 2 || !strings.Contains(errs, want) {
			t.Errorf("%v: status %d: %s", args, status, errs)
		}
	}
}
