package cluster

import (
	"io"
	"os"
	"path/filepath"
	"strings"

	"ebbline/pva/sweep"
	"ebbline/pva/sweep/ledger"
)

// State is how far a shard is, as its files say.
type State int

// The states. A shard that is begun is being run, or its machine was lost
// without a word.
const (
	Missing State = iota // nothing of it was ever begun
	Begun
	Failed
	Done
)

// Shard is what the files say of one shard.
type Shard struct {
	Number      int // from 1
	State       State
	Units, Held int    // of the shard, and of them in its ledger
	Why         string // Failed: its last words
}

// Status is what the files of a job folder say.
type Status struct {
	Shards []Shard
	Damage []ledger.Damage // torn ends left out: a shard that is running has one
	Merged bool            // the report is there
	// MergeSaid are the last words of the merge, where it wrote no report.
	MergeSaid string
}

// Survey reads how far a job is from its files alone.
func (j *Job) Survey(dir string) (*Status, error) {
	s := &Status{}
	for n := 1; n <= j.Shards; n++ {
		held, damage, err := sweep.Held(Ledger(dir, n), j.Run)
		if err != nil {
			return nil, err
		}
		sh := Shard{Number: n, Units: sweep.ShardUnits(j.Run.Units, n, j.Shards)}
		for _, u := range held {
			if u%j.Shards == n-1 {
				sh.Held++
			}
		}
		sh.State, sh.Why = state(dir, n, sh.Held == sh.Units)
		s.Shards = append(s.Shards, sh)
		for _, d := range damage {
			if !d.Torn {
				d.File = filepath.Join(number(n), d.File)
				s.Damage = append(s.Damage, d)
			}
		}
	}
	if info, err := os.Stat(j.Report.Book); err == nil && info.Mode().IsRegular() {
		s.Merged = true
	} else {
		s.MergeSaid = lastLine(MergeLog(dir))
	}
	return s, nil
}

// state: a shard has failed if it left a note that says so, or if the last line
// of its log is none of the program's own: a batch system's word about its end,
// or a shell's that it could not begin.
func state(dir string, n int, done bool) (State, string) {
	if done {
		return Done, ""
	}
	if note, err := os.ReadFile(failedNote(dir, n)); err == nil {
		return Failed, strings.TrimSpace(string(note))
	}
	last := lastLine(Log(dir, n))
	if last != "" && !strings.HasPrefix(last, Mark) {
		return Failed, last
	}
	if _, err := os.Stat(Ledger(dir, n)); err == nil || last != "" {
		return Begun, ""
	}
	return Missing, ""
}

// Mark begins what a shard that is well prints about itself.
const Mark = "Shard "

// Of lists the shards in a state.
func (s *Status) Of(state State) []int {
	var out []int
	for _, sh := range s.Shards {
		if sh.State == state {
			out = append(out, sh.Number)
		}
	}
	return out
}

// Open lists the shards that are not done.
func (s *Status) Open() []int {
	var out []int
	for _, sh := range s.Shards {
		if sh.State != Done {
			out = append(out, sh.Number)
		}
	}
	return out
}

// Held is how many units are finished, of how many.
func (s *Status) Held() (held, units int) {
	for _, sh := range s.Shards {
		held, units = held+sh.Held, units+sh.Units
	}
	return held, units
}

// BeginShard takes away the note of an earlier failure.
func BeginShard(dir string, shard int) { os.Remove(failedNote(dir, shard)) }

// FailShard notes why a shard has ended early.
func FailShard(dir string, shard int, why string) error {
	return put(failedNote(dir, shard), []byte(strings.ReplaceAll(strings.TrimSpace(why), "\n", " ")+"\n"), 0o666)
}

func failedNote(dir string, shard int) string { return Ledger(dir, shard) + failedSuffix }

// lastLine is the last line of a file that is not blank; "" if it has none.
func lastLine(name string) string {
	f, err := os.Open(name)
	if err != nil {
		return ""
	}
	defer f.Close()
	const most = 4096
	if info, err := f.Stat(); err == nil && info.Size() > most {
		f.Seek(-most, io.SeekEnd)
	}
	data, _ := io.ReadAll(io.LimitReader(f, most))
	lines := strings.Split(strings.TrimSpace(string(data)), "\n")
	return strings.TrimSpace(lines[len(lines)-1])
}
