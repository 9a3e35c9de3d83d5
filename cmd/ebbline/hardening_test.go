package main

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"syscall"
	"testing"
	"time"

	"ebbline/reports"
)

// said is what a process prints, read while it runs.
type said struct {
	mu sync.Mutex
	b  bytes.Buffer
}

func (s *said) Write(p []byte) (int, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.b.Write(p)
}

func (s *said) String() string {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.b.String()
}

// process starts the program in a process of its own.
func process(t *testing.T, args ...string) (*exec.Cmd, *said) {
	t.Helper()
	cmd, out := exec.Command("ebbline", args...), new(said)
	cmd.Stdout, cmd.Stderr = out, out
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { cmd.Process.Kill(); cmd.Wait() })
	return cmd, out
}

// waitFor waits until something is so, at most a minute.
func waitFor(t *testing.T, what string, so func() bool) {
	t.Helper()
	for end := time.Now().Add(time.Minute); !so(); time.Sleep(2 * time.Millisecond) {
		if time.Now().After(end) {
			t.Fatal("waited in vain for " + what)
		}
	}
}

// ended waits for a process: its exit status, or the signal that ended it.
func ended(t *testing.T, cmd *exec.Cmd) (status int, by syscall.Signal) {
	t.Helper()
	err := cmd.Wait()
	var exit *exec.ExitError
	if err == nil {
		return 0, 0
	}
	if !errors.As(err, &exit) {
		t.Fatal(err)
	}
	if s, ok := exit.Sys().(syscall.WaitStatus); ok && s.Signaled() {
		return -1, s.Signal()
	}
	return exit.ExitCode(), 0
}

// hasRecords says whether a ledger holds so many bytes of records.
func hasRecords(dir string, atLeast int64) bool {
	names, _ := filepath.Glob(filepath.Join(dir, "records-*.log"))
	sum := int64(0)
	for _, n := range names {
		if info, err := os.Stat(n); err == nil {
			sum += info.Size()
		}
	}
	return sum >= atLeast
}

// filesHere is the names in the working folder, ledgers and their contents too.
func filesHere(t *testing.T) map[string]bool {
	t.Helper()
	out := map[string]bool{}
	filepath.WalkDir(".", func(path string, d os.DirEntry, err error) error {
		if err == nil && !d.IsDir() {
			out[path] = true
		}
		return err
	})
	return out
}

// TestSignalsInAssess: what is complete is reported, with its number, and the
// report is a whole workbook that can be written again.
func TestSignalsInAssess(t *testing.T) {
	for name, s := range map[string]syscall.Signal{"SIGINT": syscall.SIGINT, "SIGTERM": syscall.SIGTERM, "SIGHUP": syscall.SIGHUP} {
		t.Run(name, func(t *testing.T) {
			inFolder(t)
			for wait := 200 * time.Millisecond; ; wait *= 2 {
				cmd, out := process(t, "assess", "pond.toml", "--replicates", "2000000000", "--json", "pond.json", "--no-exact")
				time.Sleep(wait)
				cmd.Process.Signal(s)
				status, by := ended(t, cmd)
				if by == s && wait < 10*time.Second {
					continue // it came before the run had begun
				}
				if status != 1 || !strings.Contains(out.String(), "interrupted: the report holds the ") || !strings.Contains(out.String(), "finishing what is in work; again to end at once") {
					t.Fatalf("status %d: %s", status, out)
				}
				break
			}
			got := filesHere(t)
			if len(got) != 3 || !got["pond.xlsx"] || !got["pond.json"] {
				t.Errorf("files: %v", got)
			}
			data, err := os.ReadFile("pond.json")
			if err != nil || !json.Valid(data) {
				t.Errorf("the JSON is not whole: %v", err)
			}
			mustRun(t, newAssess, "pond.toml", "--replicates", "500", "--no-exact", "--force", "--json", "pond.json")
		})
	}
}

// TestASecondSignalEndsAtOnce: and leaves the old report as it was.
func TestASecondSignalEndsAtOnce(t *testing.T) {
	inFolder(t)
	mustRun(t, newAssess, "pond.toml", "--no-exact")
	before, err := os.ReadFile("pond.xlsx")
	if err != nil {
		t.Fatal(err)
	}
	// One block of this takes many seconds.
	slow := []string{"assess", "pond.toml", "--no-exact", "--set", "question.horizon=10000", "--set", "start.abundance=9e5", "--set", "births.breeding=flow", "--set", "births.crowding.capacity=1e6", "--replicates", "1000", "--set", "run.substeps=1000"}
	for wait := 300 * time.Millisecond; ; wait *= 2 {
		cmd, out := process(t, slow...)
		time.Sleep(wait)
		cmd.Process.Signal(os.Interrupt)
		for end := time.Now().Add(20 * time.Second); !strings.Contains(out.String(), "again to end at once"); time.Sleep(time.Millisecond) {
			if cmd.Process.Signal(syscall.Signal(0)) != nil || time.Now().After(end) {
				break
			}
		}
		second := time.Now()
		cmd.Process.Signal(os.Interrupt)
		late := time.AfterFunc(10*time.Second, func() { cmd.Process.Kill() })
		_, by := ended(t, cmd)
		late.Stop()
		if !strings.Contains(out.String(), "again to end at once") && wait < 10*time.Second {
			continue
		}
		if by != syscall.SIGINT || time.Since(second) > 3*time.Second {
			t.Errorf("ended by %v, %v after the second signal: %s", by, time.Since(second), out)
		}
		break
	}
	after, err := os.ReadFile("pond.xlsx")
	if err != nil || !bytes.Equal(before, after) || len(filesHere(t)) != 2 {
		t.Errorf("the old report is another, or something is left: %v %v", err, filesHere(t))
	}
}

// interrupted runs a command until its ledger holds some records, signals it, and
// checks the message and that no result is written.
func interrupted(t *testing.T, s syscall.Signal, ledger string, atLeast int64, args ...string) {
	t.Helper()
	before := filesHere(t)
	cmd, out := process(t, args...)
	waitFor(t, "records in "+ledger, func() bool { return hasRecords(ledger, atLeast) })
	cmd.Process.Signal(s)
	status, by := ended(t, cmd)
	if status != 1 || by != 0 || !strings.Contains(out.String(), "kept in "+ledger+"; run the same command with --resume") {
		t.Fatalf("status %d, ended by %v: %s", status, by, out)
	}
	for f := range filesHere(t) {
		if !before[f] && !strings.HasPrefix(f, ledger) {
			t.Errorf("%s is there after an interruption", f)
		}
	}
}

// TestSignalsInSweep: sweep and minimum say how far they are and what to do, write
// no result, and give the same bytes when they go on.
func TestSignalsInSweep(t *testing.T) {
	inFolder(t)
	sweepArgs := func(name string, more ...string) []string {
		return append([]string{"sweep", "pond.toml", "--no-exact", "--workers", "2", "--replicates", "30000", "--quiet", "--out", name + ".xlsx", "--json", name + ".json", "--csv", name}, more...)
	}
	if status := run(sweepArgs("one"), strings.NewReader(""), io.Discard, os.Stderr); status != 0 {
		t.Fatal("status ", status)
	}
	for i, s := range []syscall.Signal{syscall.SIGINT, syscall.SIGTERM} {
		name := fmt.Sprint("two", i)
		interrupted(t, s, "pond.ledger", 1, sweepArgs(name)...)
		if status, out, errs := command(newRoot, sweepArgs(name, "--resume")...); status != 0 {
			t.Fatalf("status %d: %s%s", status, out, errs)
		}
		same(t, "one.json", name+".json")
		same(t, "one/sweep.csv", name+"/sweep.csv")
		same(t, "one/search.csv", name+"/search.csv")
		if left, _ := filepath.Glob("*.ledger"); len(left) > 0 {
			t.Errorf("left behind: %v", left)
		}
	}
	minimum := func(name string, more ...string) []string {
		return append([]string{"minimum", "pond.toml", "--no-exact", "--replicates", "60000", "--quiet", "--out", name + ".xlsx", "--json", name + ".json", "--csv", name}, more...)
	}
	if status := run(minimum("least"), strings.NewReader(""), io.Discard, os.Stderr); status != 0 {
		t.Fatal("status ", status)
	}
	interrupted(t, syscall.SIGINT, "pond-minimum.ledger", 1, minimum("again")...)
	if status, out, errs := command(newRoot, minimum("again", "--resume")...); status != 0 {
		t.Fatalf("status %d: %s%s", status, out, errs)
	}
	same(t, "least.json", "again.json")
	same(t, "least/search.csv", "again/search.csv")
}

// TestSignalsInMerge: nothing is written, the ledgers stay, and merging again
// gives what one run gives.
func TestSignalsInMerge(t *testing.T) {
	inFolder(t)
	common := []string{"pond.toml", "--no-exact", "--replicates", "40000", "--quiet"}
	mustRun(t, newSweep, append(common, "--out", "one.xlsx", "--json", "one.json")...)
	mustRun(t, newSweep, append(common, "--shard", "1/2", "--ledger", "a")...)
	mustRun(t, newSweep, append(common, "--shard", "2/2", "--ledger", "b")...)
	before := filesHere(t)
	merge := []string{"merge", "a", "b", "--no-exact", "--quiet", "--workers", "1", "--out", "two.xlsx", "--json", "two.json"}
	struck := false
	for wait := 20 * time.Millisecond; !struck && wait < 10*time.Second; wait = wait * 5 / 4 {
		cmd, out := process(t, merge...)
		time.Sleep(wait)
		cmd.Process.Signal(os.Interrupt)
		status, by := ended(t, cmd)
		switch {
		case by == syscall.SIGINT: // before it had begun
		case status == 0:
			t.Fatal("it ended before the signal came: the test shows nothing")
		case status != 1 || !strings.Contains(out.String(), "interrupted; nothing was written"):
			t.Fatalf("status %d: %s", status, out)
		default:
			struck = true
		}
		if after := filesHere(t); len(after) != len(before) {
			t.Fatalf("written by a merge that was stopped: %v", after)
		}
	}
	if !struck {
		t.Fatal("no signal came in the middle")
	}
	if status, out, errs := command(newRoot, merge...); status != 0 {
		t.Fatalf("status %d: %s%s", status, out, errs)
	}
	same(t, "one.json", "two.json")
}

// TestManyWorkersWriteTheSame: 64 workers give the bytes of one.
func TestManyWorkersWriteTheSame(t *testing.T) {
	inFolder(t)
	for name, workers := range map[string]string{"one": "1", "many": "64"} {
		mustRun(t, newAssess, "pond.toml", "--replicates", "9000", "--no-exact", "--quiet", "--workers", workers, "--out", name+".xlsx", "--json", name+".json")
		mustRun(t, newSweep, "pond.toml", "--replicates", "2000", "--no-exact", "--quiet", "--workers", workers, "--out", name+"-sweep.xlsx", "--json", name+"-sweep.json")
	}
	same(t, "one.xlsx", "many.xlsx")
	same(t, "one.json", "many.json")
	same(t, "one-sweep.xlsx", "many-sweep.xlsx")
	same(t, "one-sweep.json", "many-sweep.json")
}

// TestExtremesInEveryFile: cases whose figures are at the ends, or none, give
// every file whole: all outgrown in year 1, nobody from the start, nobody left
// after year 1, 10,000 years, a grid of 1,000 cells.
func TestExtremesInEveryFile(t *testing.T) {
	for name, sets := range map[string][]string{
		"all outgrown":    {"births.rate=1e6", "births.year_sd=0", "births.crowding.form=none", "question.threshold=0"},
		"half outgrown":   {"births.crowding.form=none", "run.stop_above=60", "question.threshold=40"},
		"nobody":          {"start.abundance=0"},
		"nobody left":     {"deaths.fraction=1", "births.crowding.form=none"},
		"10,000 years":    {"question.horizon=10000"},
		"one replicate":   {"run.replicates=1"},
		"one year":        {"question.horizon=1"},
		"a huge take":     {"harvest.control.take=1e12"},
		"a tiny unit":     {"case.unit_size=1e-30"},
		"a large unit":    {"case.unit_size=1e12", "start.abundance=1e9", "births.crowding.capacity=1e9"},
		"a distant date":  {"start.year=-1000000"},
		"a wide interval": {"question.confidence=0.9999999999999999"},
		"a narrow limit":  {"question.limit=1e-30"},
	} {
		t.Run(name, func(t *testing.T) {
			inFolder(t)
			args := []string{"pond.toml", "--replicates", "100", "--json", "x.json", "--csv", "x", "--figures", "y", "--no-exact"}
			for _, s := range sets {
				args = append(args, "--set", s)
			}
			status, out, errs := command(newAssess, args...)
			if status != 0 {
				t.Fatalf("status %d: %s", status, errs)
			}
			if strings.Contains(out, "NaN") || strings.Contains(out, "%!") {
				t.Errorf("the answer: %s", out)
			}
			data, err := os.ReadFile("x.json")
			if err != nil || !json.Valid(data) {
				t.Errorf("the JSON: %v", err)
			}
			for _, f := range []string{"x/years.csv", "x/inputs.csv", "pond.xlsx"} {
				if data, err := os.ReadFile(f); err != nil || len(data) == 0 || strings.HasSuffix(f, ".csv") && bytes.Contains(data, []byte("NaN")) {
					t.Errorf("%s: %v", f, err)
				}
			}
		})
	}
	inFolder(t)
	mustRun(t, newSweep, "pond.toml", "--replicates", "64", "--no-exact", "--json", "x.json", "--csv", "x",
		"--set", "question.horizon=2", "--set", "sweep.1.to=99", "--set", "sweep.1.step=1", "--set", "sweep.2.values=[10,20,30,40,50,60,70,80,90,100]")
	if data, err := os.ReadFile("x/sweep.csv"); err != nil || bytes.Count(data, []byte("\n")) != 1001 {
		t.Errorf("%d lines of cells: %v", bytes.Count(data, []byte("\n")), err)
	}
}

// TestOneFileThatFailsKeepsNoOtherBack: all else is written, and the message
// names both.
func TestOneFileThatFailsKeepsNoOtherBack(t *testing.T) {
	inFolder(t)
	if err := os.Mkdir("there", 0o777); err != nil {
		t.Fatal(err)
	}
	for _, failing := range []string{"gone/pond.xlsx", "gone/x.json"} {
		o := outputs{book: "there/pond.xlsx", json: "there/x.json", csv: "there/tables", quiet: true}
		if strings.HasSuffix(failing, "json") {
			o.json = failing
		} else {
			o.book = failing
		}
		err := o.writeFiles(&app{}, &reports.Report{Title: "an invented pond"}, o.book, []byte("{}"), map[string][]byte{"b.csv": []byte("b"), "a.csv": []byte("a")})
		if err == nil || !errors.Is(err, os.ErrNotExist) || !strings.HasPrefix(err.Error(), failing+": nothing was written: ") || !strings.Contains(err.Error(), "; written all the same: ") || !strings.HasSuffix(err.Error(), "there/tables/a.csv, there/tables/b.csv") {
			t.Errorf("%v", err)
		}
		for _, f := range []string{"there/tables/a.csv", "there/tables/b.csv"} {
			if _, err := os.Stat(f); err != nil {
				t.Error(err)
			}
			os.Remove(f)
		}
	}
}

// failingLive is a live table on a disk that is full after so many writes.
type failingLive struct {
	*os.File
	good *int
}

func (f failingLive) Write(p []byte) (int, error) {
	if *f.good--; *f.good >= 0 {
		return f.File.Write(p)
	}
	return 0, &os.PathError{Op: "write", Path: f.Name(), Err: syscall.ENOSPC}
}

// TestLiveTableOnAFullDisk: the ledger keeps what is finished, an old table stays
// as it was, and the run goes on afterwards.
func TestLiveTableOnAFullDisk(t *testing.T) {
	inFolder(t)
	real := createLive
	t.Cleanup(func() { createLive = real })
	good := 0
	createLive = func(dir string) (liveFile, string, error) {
		f, name, err := real(dir)
		if err != nil {
			return nil, "", err
		}
		return failingLive{f.(*os.File), &good}, name, nil
	}
	if err := os.Mkdir("x", 0o777); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile("x/sweep.csv", []byte("an old table\n"), 0o666); err != nil {
		t.Fatal(err)
	}
	args := []string{"pond.toml", "--no-exact", "--csv", "x", "--json", "x.json", "--force"}
	for _, good = range []int{0, 1} { // at the start, and in the middle
		began := good > 0
		status, _, errs := command(newSweep, args...)
		if status != 1 || !strings.Contains(errs, ".csv cannot be written: no space left on device; the ledger keeps what is finished") || !strings.Contains(errs, "--resume") {
			t.Errorf("status %d: %s", status, errs)
		}
		if data, err := os.ReadFile("x/sweep.csv"); err != nil || string(data) != "an old table\n" {
			t.Errorf("the old table holds %q: %v", data, err)
		}
		if got := filesHere(t); got["pond-sweep.xlsx"] || got["x.json"] || began && !hasRecords("pond.ledger", 1) {
			t.Errorf("files: %v", got)
		}
	}
	createLive = real
	mustRun(t, newSweep, append(args, "--resume")...)
	mustRun(t, newSweep, "pond.toml", "--no-exact", "--csv", "y", "--json", "y.json", "--out", "y.xlsx")
	same(t, "x.json", "y.json")
	same(t, "x/sweep.csv", "y/sweep.csv")
	for f := range filesHere(t) {
		if strings.Contains(f, "so-far") || strings.Contains(f, "ledger") {
			t.Errorf("left behind: %s", f)
		}
	}
}
