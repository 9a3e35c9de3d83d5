package ledger

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
)

// Manifest says what a ledger's run is. Two runs may share records only if
// their manifests are the same.
type Manifest struct {
	Program    string `json:"program"`
	Format     int    `json:"format"` // of the records
	Version    string `json:"version"`
	Command    string `json:"command"`
	Arguments  string `json:"arguments"` // that decide what is run, as the command takes them
	Title      string `json:"title"`
	Digest     string `json:"digest"` // of the case
	Seed       uint64 `json:"seed"`
	Replicates int64  `json:"replicates"`
	What       string `json:"what"` // what is varied, in words that change with it
	Cells      int    `json:"cells"`
	Group      int    `json:"group"` // cells a unit
	Range      int64  `json:"range"` // replicates a unit
	Units      int    `json:"units"`
	Case       string `json:"case"` // as a case file, so that a ledger can be merged without one
	// What follows is for the report of a merge alone, and makes no other run.
	CaseFile   string   `json:"case_file"`
	Example    string   `json:"example,omitempty"`
	Overridden []string `json:"overridden,omitempty"` // paths set over the case
	Checksum   string   `json:"checksum"`
}

// Format is the format of records that this version writes.
const Format = 1

// id names the run for its records.
func (m Manifest) id() [sha256.Size]byte {
	m.Checksum, m.CaseFile, m.Example, m.Overridden = "", "", "", nil
	data, err := json.Marshal(m)
	if err != nil {
		panic("ledger: manifest: " + err.Error())
	}
	return sha256.Sum256(data)
}

// Difference names the first thing in which another manifest is another run's;
// "" if the two are the same run.
func (m Manifest) Difference(o Manifest) string {
	differs := func(what string, here, there any) string {
		return fmt.Sprintf("its %s is %v, this run's %v", what, there, here)
	}
	switch {
	case m.Program != o.Program:
		return differs("program", m.Program, o.Program)
	case m.Version != o.Version:
		return differs("version", m.Version, o.Version)
	case m.Format != o.Format:
		return differs("format", m.Format, o.Format)
	case m.Command != o.Command:
		return differs("command", m.Command, o.Command)
	case m.Arguments != o.Arguments:
		return differs("command line", quoted(m.Arguments), quoted(o.Arguments))
	case m.Title != o.Title:
		return differs("case", quoted(m.Title), quoted(o.Title))
	case m.Seed != o.Seed:
		return differs("seed", m.Seed, o.Seed)
	case m.Replicates != o.Replicates:
		return differs("number of replicates", m.Replicates, o.Replicates)
	case m.Digest != o.Digest:
		if line, was := firstChange(m.Case, o.Case); line != "" || was != "" {
			return fmt.Sprintf("its case says %s where this one says %s", quoted(was), quoted(line))
		}
		return differs("case digest", m.Digest, o.Digest)
	case m.What != o.What:
		return differs("grid", quoted(m.What), quoted(o.What))
	case m.Cells != o.Cells, m.Group != o.Group, m.Range != o.Range, m.Units != o.Units:
		return fmt.Sprintf("it is cut into %d units of %d cells and %d replicates, this run into %d of %d and %d", o.Units, o.Group, o.Range, m.Units, m.Group, m.Range)
	case m.id() != o.id():
		return "its case is written another way"
	}
	return ""
}

func quoted(s string) string {
	const most = 120
	if r := []rune(s); len(r) > most {
		s = string(r[:most]) + "..."
	}
	return fmt.Sprintf("%q", s)
}

// firstChange is the first line in which two texts differ.
func firstChange(a, b string) (inA, inB string) {
	for a != "" || b != "" {
		inA, a, _ = strings.Cut(a, "\n")
		inB, b, _ = strings.Cut(b, "\n")
		if inA != inB {
			return inA, inB
		}
	}
	return "", ""
}

// ReadManifest reads and checks the manifest of a folder. The error of a folder
// without one satisfies errors.Is(err, fs.ErrNotExist).
func ReadManifest(dir string) (Manifest, error) {
	var m Manifest
	data, err := os.ReadFile(filepath.Join(dir, manifestName))
	if errors.Is(err, fs.ErrNotExist) {
		return m, fmt.Errorf("%s is no ledger: it has no %s (%w)", dir, manifestName, fs.ErrNotExist)
	}
	if err != nil {
		return m, fmt.Errorf("ledger %s: the manifest cannot be read: %w", dir, reason(err))
	}
	if err := json.Unmarshal(data, &m); err != nil {
		return m, damaged(dir, err.Error())
	}
	if m.Checksum != m.checksum() {
		return m, damaged(dir, "its checksum does not fit")
	}
	return m, nil
}

// ErrDamaged is wrapped by the error of a manifest that cannot be trusted.
var ErrDamaged = errors.New("the manifest is damaged")

// damaged says how to go on: records name their run themselves, so that those of
// this run are known again under a manifest written anew.
func damaged(dir, why string) error {
	return fmt.Errorf("ledger %s: %w (%s); delete %s and run again with --resume, which keeps what is finished, or start over with --force", dir, ErrDamaged, why, filepath.Join(dir, manifestName))
}

func (m Manifest) checksum() string {
	m.Checksum = ""
	data, err := json.Marshal(m)
	if err != nil {
		panic("ledger: manifest: " + err.Error())
	}
	sum := sha256.Sum256(data)
	return hex.EncodeToString(sum[:])
}

// write puts the manifest into a folder in one step; the first of several
// processes that do so at once wins, as a link does not replace a file.
func (m Manifest) write(dir string) error {
	m.Checksum = m.checksum()
	data, err := json.MarshalIndent(m, "", "  ")
	if err != nil {
		return err
	}
	f, temporary, err := createManifest(dir)
	if err != nil {
		return err
	}
	defer os.Remove(temporary)
	data = append(data, '\n')
	n, err := f.Write(data)
	if err == nil && n < len(data) {
		err = io.ErrShortWrite
	}
	if err == nil {
		err = f.Sync()
	}
	if closed := f.Close(); err == nil {
		err = closed
	}
	if err != nil {
		return err
	}
	name := filepath.Join(dir, manifestName)
	if err := link(temporary, name); err != nil && !errors.Is(err, fs.ErrExist) {
		if err := rename(temporary, name); err != nil { // a file system without links
			return err
		}
	}
	return syncFolder(dir)
}
