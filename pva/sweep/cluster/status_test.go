package cluster

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"ebbline/pva/sweep/ledger"
)

// finish writes units into a shard's ledger.
func finish(t *testing.T, dir string, j *Job, shard int, units ...int) {
	t.Helper()
	l, err := ledger.Open(Ledger(dir, shard), j.Run, "")
	if err != nil {
		t.Fatal(err)
	}
	for _, u := range units {
		if err := l.Append(fmt.Sprint("u", u), []byte("figures")); err != nil {
			t.Fatal(err)
		}
	}
	if err := l.Close(); err != nil {
		t.Fatal(err)
	}
}

func writeFile(t *testing.T, name, text string) {
	t.Helper()
	if err := os.WriteFile(name, []byte(text), 0o666); err != nil {
		t.Fatal(err)
	}
}

// TestSurvey: each state as its files make it. 40 units in 12 shards: shard 1 has
// units 0, 12, 24 and 36; shard 5 has 4, 16 and 28.
func TestSurvey(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "job")
	j := invented(filepath.Dir(dir))
	if err := Write(dir, j); err != nil {
		t.Fatal(err)
	}
	finish(t, dir, j, 1, 0, 12, 24, 36)
	finish(t, dir, j, 1, 0, 12) // a second attempt that ran beside the first
	FailShard(dir, 1, "interrupted")
	finish(t, dir, j, 2, 1, 13, 25) // one is missing, and nothing says why
	finish(t, dir, j, 3, 2, 14)
	FailShard(dir, 3, "the disk\nis full")
	writeFile(t, Log(dir, 4), "Shard 4 of 12 begins on n1.\nslurmstepd: error: *** JOB 7 ON n1 CANCELLED AT 2027-01-01T00:00:00 DUE TO TIME LIMIT ***\n\n")
	finish(t, dir, j, 5, 4, 16, 28)
	writeFile(t, Log(dir, 6), "slurmstepd: error: *** JOB 7 ON n1 CANCELLED DUE TO NODE FAILURE ***\nShard 6 of 12 begins on n2.\n")
	finish(t, dir, j, 7) // opened, nothing finished
	FailShard(dir, 8, "interrupted")
	BeginShard(dir, 8) // and taken up again, on its way
	writeFile(t, Log(dir, 9), strings.Repeat("x", 10000)+"\nno such program\n")
	finish(t, dir, j, 10, 0, 12, 24, 9, 21) // those of another shard count for nothing here

	st, err := j.Survey(dir)
	if err != nil {
		t.Fatal(err)
	}
	for state, want := range map[State]string{Done: "1,5", Failed: "3-4,9", Begun: "2,6-7,10", Missing: "8,11-12"} {
		if got := List(st.Of(state)); got != want {
			t.Errorf("state %d: shards %s, want %s", state, got, want)
		}
	}
	if got := List(st.Open()); got != "2-4,6-12" {
		t.Error("open:", got)
	}
	if held, units := st.Held(); held != 4+3+2+3+2 || units != 40 {
		t.Error(held, units)
	}
	for n, want := range map[int]string{3: "the disk is full", 4: "TIME LIMIT", 9: "no such program"} {
		if why := st.Shards[n-1].Why; !strings.Contains(why, want) {
			t.Errorf("shard %d failed as %q", n, why)
		}
	}
	if st.Merged || st.MergeSaid != "" {
		t.Error("nothing was merged")
	}
	writeFile(t, MergeLog(dir), "one\nebbline: the disk is full\n")
	if st, _ = j.Survey(dir); st.Merged || st.MergeSaid != "ebbline: the disk is full" {
		t.Errorf("%+v", st)
	}
	j.Report.Book = filepath.Join(dir, "pond-sweep.xlsx")
	writeFile(t, j.Report.Book, "report")
	if st, _ = j.Survey(dir); !st.Merged {
		t.Error("the report is there")
	}
	// Looking changes nothing.
	if _, err := os.Stat(Ledger(dir, 12)); err == nil {
		t.Error("looking has made a ledger")
	}
}

// TestSurveyOfDamage: a torn end is a shard in work, and a damaged record is told
// and its unit missing. A ledger of another run is refused.
func TestSurveyOfDamage(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "job")
	j := invented(filepath.Dir(dir))
	if err := Write(dir, j); err != nil {
		t.Fatal(err)
	}
	finish(t, dir, j, 2, 1, 13, 25, 37)
	names, _ := filepath.Glob(filepath.Join(Ledger(dir, 2), "records-*.log"))
	good, err := os.ReadFile(names[0])
	if err != nil {
		t.Fatal(err)
	}
	writeFile(t, names[0], string(good[:len(good)-3]))
	st, err := j.Survey(dir)
	if err != nil || len(st.Damage) != 0 || st.Shards[1].Held != 3 || st.Shards[1].State != Begun {
		t.Errorf("%v %+v", err, st.Shards[1])
	}
	bad := append([]byte(nil), good...)
	bad[len(bad)/2] ^= 4
	writeFile(t, names[0], string(bad))
	st, err = j.Survey(dir)
	if err != nil || len(st.Damage) != 1 || st.Shards[1].Held != 3 || !strings.HasPrefix(st.Damage[0].String(), filepath.Join("0002", "records-")) {
		t.Errorf("%v %+v %v", err, st.Shards[1], st.Damage)
	}
	other := *j
	other.Run.Seed++
	finish(t, dir, &other, 3, 2)
	if _, err = j.Survey(dir); err == nil || !strings.Contains(err.Error(), "seed") || strings.Contains(err.Error(), "--ledger") {
		t.Error(err)
	}
}
