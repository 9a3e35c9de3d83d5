package sweep

import (
	"bufio"
	"context"
	"errors"
	"flag"
	"fmt"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync/atomic"
	"testing"
	"time"

	"ebbline/pva"
)

var kills = flag.Int("kills", 8, "how often a run is killed at a random moment")

// wide is a grid of several groups and many units.
func wide(t testing.TB, more ...any) *pva.Case {
	return marsh(t, append([]any{"sweep.1.key", "harvest.control.take", "sweep.1.from", 0, "sweep.1.to", 9, "sweep.1.step", 1,
		"sweep.2.key", "start.abundance", "sweep.2.from", 20, "sweep.2.to", 100, "sweep.2.step", 10, "question.horizon", 10, "run.replicates", 1500}, more...)...)
}

// TestTheSameBytes: workers, shards, merging and stopping change nothing, to the
// last bit of every figure, the search included.
func TestTheSameBytes(t *testing.T) {
	s := grid(t, wide(t))
	single := bytesOf(t, run(t, s, Options{Workers: 1}))
	if got := bytesOf(t, run(t, s, Options{Workers: 5})); got != single {
		t.Error("five workers give other figures than one")
	}
	// Shards in folders of their own and in one folder.
	one := filepath.Join(t.TempDir(), "one")
	var dirs []string
	for i := 1; i <= 3; i++ {
		dir := filepath.Join(t.TempDir(), fmt.Sprint("shard", i))
		dirs = append(dirs, dir)
		for _, d := range []string{dir, one} {
			sh := open(t, s, Options{Ledger: d, Shard: i, Shards: 3})
			r, err := sh.Run(context.Background())
			if err != nil || r.Whole() && d == dir || r.UnitsDone != r.Units {
				t.Fatal(err, r.UnitsDone, r.Units)
			}
			sh.Close()
		}
	}
	for _, set := range [][]string{dirs, {one}, append([]string{one}, dirs[2])} {
		m, err := Merge(s, set, Options{Command: "sweep"})
		if err != nil {
			t.Fatal(err)
		}
		if got := bytesOf(t, m.result()); got != single {
			t.Errorf("merging %d ledgers gives other figures than one run", len(set))
		}
	}
	// A shard that is missing is named.
	m, err := Merge(s, []string{dirs[0], dirs[2]}, Options{Command: "sweep"})
	if !errors.Is(err, ErrMissing) || !strings.Contains(err.Error(), "that is shard 2/3") || m == nil {
		t.Error(err)
	}
	// Another seed is not mixed in.
	other := grid(t, wide(t, "run.seed", 12))
	if _, err := Merge(other, dirs, Options{Command: "sweep"}); err == nil || !strings.Contains(err.Error(), "seed is 11, this run's 12") {
		t.Error(err)
	}
	if _, err := Open(other, Options{Ledger: one, Command: "sweep", Resume: true}); err == nil || !strings.Contains(err.Error(), "seed") {
		t.Error(err)
	}
}

// TestStopAndResume stops a run a few times in the middle: it goes on where it
// was, and ends with the figures of an undisturbed run.
func TestStopAndResume(t *testing.T) {
	s := grid(t, wide(t))
	want := bytesOf(t, run(t, s, Options{}))
	dir := filepath.Join(t.TempDir(), "l")
	before := -1
	for stop := int64(400); ; stop += 300 {
		ctx, cancel := context.WithCancel(context.Background())
		var handed atomic.Int64
		r := open(t, s, Options{Ledger: dir, Resume: before > 0, Progress: func(_ string, done, total int64) {
			if before < 1 && done > stop*64 || done > 2*stop*64 {
				cancel()
			}
		}, Finished: func(cells []*Outcome) { handed.Add(int64(len(cells))) }})
		out, err := r.Run(ctx)
		r.Close()
		cancel()
		if r.Before < before {
			t.Fatalf("%d units, %d before", r.Before, before)
		}
		before = out.UnitsDone
		if int(handed.Load()) != out.Complete {
			t.Errorf("%d cells handed out, %d complete", handed.Load(), out.Complete)
		}
		if err == nil {
			if got := bytesOf(t, out); got != want {
				t.Error("a resumed run gives other figures")
			}
			break
		}
		if !errors.Is(err, context.Canceled) {
			t.Fatal(err)
		}
		if before == 0 {
			t.Fatal("stopped before anything was finished: the test shows nothing")
		}
	}
	// Without --resume a ledger that holds something is not used.
	if _, err := Open(s, Options{Ledger: dir, Command: "sweep"}); !errors.Is(err, ErrHolds) {
		t.Error(err)
	}
	if r, err := Open(s, Options{Ledger: dir, Command: "sweep", Restart: true}); err != nil || r.Before != 0 {
		t.Error("restart: ", err)
	}
}

// TestDamagedUnits damages the ledger of a finished run in many places: nothing
// damaged is trusted, and the run ends with the same figures.
func TestDamagedUnits(t *testing.T) {
	s := grid(t, takes(t))
	want := bytesOf(t, run(t, s, Options{}))
	dir := t.TempDir()
	r := open(t, s, Options{Ledger: dir})
	if _, err := r.Run(context.Background()); err != nil {
		t.Fatal(err)
	}
	r.Close()
	names, _ := filepath.Glob(filepath.Join(dir, "records-*.log"))
	good, err := os.ReadFile(names[0])
	if err != nil {
		t.Fatal(err)
	}
	g := rand.New(rand.NewPCG(3, 4))
	for range 25 {
		bad := append([]byte(nil), good...)
		bad[g.IntN(len(bad))] ^= byte(1 << g.IntN(8))
		os.WriteFile(names[0], bad, 0o666)
		r := open(t, s, Options{Ledger: dir, Resume: true})
		if len(r.Damage) != 1 || r.Before != len(r.done)-1 {
			t.Fatalf("damage %v, %d of %d units", r.Damage, r.Before, len(r.done))
		}
		out, err := r.Run(context.Background())
		r.Close()
		if err != nil {
			t.Fatal(err)
		}
		if got := bytesOf(t, out); got != want {
			t.Fatal("figures of a damaged ledger differ")
		}
		for _, n := range names[1:] {
			os.Remove(n)
		}
		more, _ := filepath.Glob(filepath.Join(dir, "records-*.log"))
		for _, n := range more {
			if n != names[0] {
				os.Remove(n)
			}
		}
	}
}

const killDir = "EBBLINE_TEST_LEDGER"

// TestRunToKill is run in a process of its own by TestKill: a run with a ledger,
// which says on standard output how many units it has finished.
func TestRunToKill(t *testing.T) {
	dir := os.Getenv(killDir)
	if dir == "" {
		t.Skip("only runs for TestKill")
	}
	s := grid(t, wide(t))
	r := open(t, s, Options{Ledger: dir, Resume: true, Workers: 2})
	fmt.Printf("before %d\n", r.Before)
	out, err := r.Run(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	r.Close()
	fmt.Printf("finished %d\n", out.UnitsDone)
}

// TestKill kills a process at random moments: no finished unit is lost, and the
// run ends with the figures of an undisturbed one.
func TestKill(t *testing.T) {
	if os.Getenv(killDir) != "" {
		t.Skip()
	}
	s := grid(t, wide(t))
	started := time.Now()
	want := bytesOf(t, run(t, s, Options{}))
	whole := time.Since(started) + 100*time.Millisecond
	g := rand.New(rand.NewPCG(uint64(time.Now().UnixNano()), 1))
	dir := filepath.Join(t.TempDir(), "l")
	held, partial := 0, 0
	for kill := 0; kill < *kills; kill++ {
		cmd := exec.Command(os.Args[0], "-test.run=^TestRunToKill$")
		cmd.Env = append(os.Environ(), killDir+"="+dir)
		out, err := cmd.StdoutPipe()
		if err != nil {
			t.Fatal(err)
		}
		if err := cmd.Start(); err != nil {
			t.Fatal(err)
		}
		timer := time.AfterFunc(time.Duration(g.Int64N(int64(whole))), func() { cmd.Process.Kill() })
		before := -1
		for lines := bufio.NewScanner(out); lines.Scan(); {
			fmt.Sscanf(lines.Text(), "before %d", &before)
		}
		cmd.Wait()
		timer.Stop()
		r := open(t, s, Options{Ledger: dir, Resume: true})
		r.Close()
		for _, d := range r.Damage {
			if !d.Torn {
				t.Fatalf("kill %d: %v", kill, d)
			}
		}
		if before >= 0 && before < held || r.Before < held {
			t.Fatalf("kill %d: %d units, %d before", kill, r.Before, held)
		}
		held = r.Before
		if held > 0 && held < len(r.done) {
			partial++
		}
		if held == len(r.done) { // begin anew
			if got := bytesOf(t, r.result()); got != want {
				t.Fatal("a killed and resumed run gives other figures")
			}
			dir, held = filepath.Join(t.TempDir(), fmt.Sprint("l", kill)), 0
		}
	}
	if partial == 0 {
		t.Error("no kill struck in the middle: the test shows nothing")
	}
	r := open(t, s, Options{Ledger: dir, Resume: true})
	out, err := r.Run(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	if got := bytesOf(t, out); got != want {
		t.Error("a killed and resumed run gives other figures")
	}
	t.Logf("%d kills, %d in the middle of a run", *kills, partial)
}
