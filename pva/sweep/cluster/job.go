package cluster

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strconv"
	"strings"

	"ebbline/pva/sweep/ledger"
)

// Job is what a job folder says of itself, in job.json. How many shards there
// are is decided when it is written and never again: a task of a resubmitted
// part must not take its own array for the whole.
type Job struct {
	Shards int             `json:"shards"`
	Run    ledger.Manifest `json:"run"` // what is run; every shard's ledger says the same
	Slurm  Slurm           `json:"slurm"`
	Report Report          `json:"report"`
	// Program is the absolute path of the program that the tasks run.
	Program  string `json:"program"`
	Checksum string `json:"checksum"`
}

// Slurm is what a person asks of the cluster. Empty means the cluster's own.
type Slurm struct {
	Partition string   `json:"partition,omitempty"`
	Account   string   `json:"account,omitempty"`
	Time      string   `json:"time,omitempty"`    // as sbatch takes it
	Memory    string   `json:"memory,omitempty"`  // as sbatch takes it
	Cores     int      `json:"cores"`             // of each task
	Lines     []string `json:"lines,omitempty"`   // of shell, before the program
	Prefix    string   `json:"prefix,omitempty"`  // words of shell before the program, such as a container's
	Workers   int      `json:"workers,omitempty"` // 0: as many as cores
}

// Report is what the merge writes. Paths are absolute; empty ones are not wanted.
type Report struct {
	Book         string `json:"book"`
	JSON         string `json:"json,omitempty"`
	CSV          string `json:"csv,omitempty"`
	Figures      string `json:"figures,omitempty"`
	NoExact      bool   `json:"no_exact,omitempty"`
	UntilDecided bool   `json:"until_decided,omitempty"`
}

// The names in a job folder.
const (
	manifestName  = "job.json"
	submitName    = "submit.sh"
	shardName     = "shard.sh"
	mergeName     = "merge.sh"
	readmeName    = "README"
	submittedName = "submitted"
	shardsName    = "shards"
	logsName      = "logs"
	failedSuffix  = ".failed"
)

// ErrNoJob is wrapped by the error of a folder without a job.
var ErrNoJob = errors.New("is no job folder")

// ErrOtherFiles is wrapped by the error of a folder that holds something else.
var ErrOtherFiles = errors.New("holds other files and no job")

// Holds says whether a folder is a job's.
func Holds(dir string) bool {
	info, err := os.Stat(filepath.Join(dir, manifestName))
	return err == nil && info.Mode().IsRegular()
}

// Read reads and checks the manifest of a job folder.
func Read(dir string) (*Job, error) {
	data, err := os.ReadFile(filepath.Join(dir, manifestName))
	if errors.Is(err, fs.ErrNotExist) {
		return nil, fmt.Errorf("%s %w: it has no %s; write one with `ebbline sweep CASE --slurm DIR`", dir, ErrNoJob, manifestName)
	}
	if err != nil {
		return nil, fmt.Errorf("%s: the job's manifest cannot be read: %w", dir, reason(err))
	}
	j := new(Job)
	if err := json.Unmarshal(data, j); err != nil {
		return nil, damaged(dir, err.Error())
	}
	if j.Checksum != j.checksum() || j.Shards < 1 || j.Run.Units < 1 {
		return nil, damaged(dir, "its checksum does not fit")
	}
	return j, nil
}

func damaged(dir, why string) error {
	name := filepath.Join(dir, manifestName)
	return fmt.Errorf("%s is damaged or was changed by hand (%s): nothing can be run from it, but what is finished can be merged: ebbline merge %s/*", name, why, Quote(filepath.Join(dir, shardsName)))
}

func (j Job) checksum() string {
	j.Checksum = ""
	data, err := json.Marshal(j)
	if err != nil {
		panic("cluster: manifest: " + err.Error())
	}
	sum := sha256.Sum256(data)
	return hex.EncodeToString(sum[:])
}

// Check refuses what cannot stand in the scripts.
func (j *Job) Check(dir string) error {
	if !filepath.IsAbs(dir) || !filepath.IsAbs(j.Program) {
		panic("cluster: paths must be absolute: " + dir + ", " + j.Program)
	}
	if hasControl(dir) {
		return fmt.Errorf("the folder %q has a line break or another control character in its name; name another", dir)
	}
	if strings.ContainsAny(dir, `%\`) {
		return fmt.Errorf("the folder %s has a %% or \\ in its name, which Slurm reads as a pattern in the names of logs; name another", dir)
	}
	for _, one := range []struct{ name, text string }{
		{"partition", j.Slurm.Partition}, {"account", j.Slurm.Account}, {"time", j.Slurm.Time}, {"memory", j.Slurm.Memory},
		{"prefix", j.Slurm.Prefix}, {"program", j.Program},
	} {
		if hasControl(one.text) {
			return fmt.Errorf("--%s %q: give one line of plain text", one.name, one.text)
		}
	}
	for _, line := range j.Slurm.Lines {
		if strings.ContainsAny(line, "\n\r\x00") {
			return fmt.Errorf("--line %q: give one line, and --line again for the next", line)
		}
	}
	return nil
}

func hasControl(s string) bool {
	return strings.ContainsFunc(s, func(r rune) bool { return r < ' ' || r == 0x7f })
}

// Write makes the folder of a job: manifest, scripts, README, and the folders
// for ledgers and logs. The scripts of a job that is there are written anew; its
// ledgers and logs stay. A folder that holds other files and no job is refused.
func Write(dir string, j *Job) error {
	if err := j.Check(dir); err != nil {
		return err
	}
	inside, err := os.ReadDir(dir)
	if err == nil && len(inside) > 0 && !Holds(dir) {
		return fmt.Errorf("the folder %s %w; name another with --slurm", dir, ErrOtherFiles)
	}
	for _, sub := range []string{shardsName, logsName} {
		if err := os.MkdirAll(filepath.Join(dir, sub), 0o777); err != nil {
			return notWritten(dir, err)
		}
	}
	whole := *j
	whole.Checksum = j.checksum()
	manifest, err := json.MarshalIndent(whole, "", "  ")
	if err != nil {
		panic("cluster: manifest: " + err.Error())
	}
	for _, f := range []struct {
		name string
		data []byte
		mode fs.FileMode
	}{
		{shardName, []byte(j.shardScript(dir)), 0o777},
		{mergeName, []byte(j.mergeScript(dir)), 0o777},
		{submitName, []byte(j.submitScript(dir)), 0o777},
		{readmeName, []byte(j.readme(dir)), 0o666},
		{manifestName, append(manifest, '\n'), 0o666}, // last: it makes the folder a job's
	} {
		if err := put(filepath.Join(dir, f.name), f.data, f.mode); err != nil {
			return notWritten(dir, err)
		}
	}
	return nil
}

func notWritten(dir string, err error) error {
	return fmt.Errorf("the job folder %s cannot be written (%w); name another with --slurm", dir, reason(err))
}

// put writes a file whole or leaves the old one: under a name that no other
// process has, then synced and renamed.
func put(path string, data []byte, mode fs.FileMode) error {
	host, _ := os.Hostname()
	var f *os.File
	var err error
	for n := 0; ; n++ {
		name := fmt.Sprintf(".%s-%s-%d-%d", filepath.Base(path), strings.ReplaceAll(host, "/", "_"), os.Getpid(), n)
		f, err = os.OpenFile(filepath.Join(filepath.Dir(path), name), os.O_WRONLY|os.O_CREATE|os.O_EXCL, mode)
		if !errors.Is(err, fs.ErrExist) || n > 1000 {
			break
		}
	}
	if err != nil {
		return err
	}
	_, err = f.Write(data)
	if err == nil {
		err = f.Sync()
	}
	if closed := f.Close(); err == nil {
		err = closed
	}
	if err == nil {
		err = os.Rename(f.Name(), path)
	}
	if err != nil {
		os.Remove(f.Name())
	}
	return err
}

// Ledger is the folder of a shard's ledger.
func Ledger(dir string, shard int) string {
	return filepath.Join(dir, shardsName, number(shard))
}

// Log is where a task of the array writes what it prints.
func Log(dir string, shard int) string {
	return filepath.Join(dir, logsName, strconv.Itoa(shard)+".log")
}

// MergeLog is where the merge writes what it prints.
func MergeLog(dir string) string { return filepath.Join(dir, logsName, "merge.log") }

// Script is the script that submits the job.
func Script(dir string) string { return filepath.Join(dir, submitName) }

func number(shard int) string { return fmt.Sprintf("%04d", shard) }

// Submitted is what submit.sh has noted of its submissions, a line each.
func Submitted(dir string) string {
	data, _ := os.ReadFile(filepath.Join(dir, submittedName))
	return strings.TrimSpace(string(data))
}

// reason is the cause of a path error without the path.
func reason(err error) error {
	var p *fs.PathError
	if errors.As(err, &p) {
		return p.Err
	}
	return err
}
