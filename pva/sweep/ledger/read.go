package ledger

import (
	"bytes"
	"crypto/sha256"
	"encoding/binary"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
)

// Damage is what was found wrong in a record file. It is reported, and what it
// held is computed again.
type Damage struct {
	File  string // without the folder
	At    int64  // the first byte that is not part of a good record
	Bytes int64
	// Torn marks the end of a file that stops in the middle of a record, as
	// happens when a writer is killed: nothing finished is lost by it.
	Torn bool
}

func (d Damage) String() string {
	if d.Torn {
		return fmt.Sprintf("%s ends in the middle of a record (%d bytes cut): its writer was stopped", d.File, d.Bytes)
	}
	return fmt.Sprintf("%s is damaged at byte %d (%d bytes passed over): what it held there is computed again", d.File, d.At, d.Bytes)
}

// Read hands every good record to f, file by file in the order of their names.
// Of records with the same key only the first is handed out; one that differs
// from it is an error, as the same part of the same run must give the same
// figures. The data is the reader's to keep.
func (l *Ledger) Read(f func(key string, data []byte) error) ([]Damage, error) {
	names, err := list(l.dir, isRecords)
	if err != nil {
		return nil, fmt.Errorf("ledger %s: cannot be read: %w", l.dir, reason(err))
	}
	var damages []Damage
	type first struct {
		sum  [sha256.Size]byte
		file string
	}
	seen := map[string]first{}
	for _, name := range names {
		content, err := os.ReadFile(name)
		if err != nil {
			return damages, fmt.Errorf("ledger %s: %s cannot be read: %w", l.dir, filepath.Base(name), reason(err))
		}
		base := filepath.Base(name)
		found, err := l.scan(content, func(key string, data []byte) error {
			sum := sha256.Sum256(data)
			if was, twice := seen[key]; twice {
				if was.sum != sum {
					return fmt.Errorf("ledger %s: %s and %s hold different figures for the same part of the run (%s): one of them was made by another program or on a machine that errs; take one of the two files away and run again with --resume", l.dir, was.file, base, key)
				}
				return nil
			}
			seen[key] = first{sum, base}
			return f(key, data)
		})
		for i := range found {
			found[i].File = base
		}
		damages = append(damages, found...)
		if err != nil {
			return damages, err
		}
	}
	return damages, nil
}

// scan hands out the good records of one file. After bytes that are none it goes
// on at the next good record.
func (l *Ledger) scan(content []byte, f func(key string, data []byte) error) (damages []Damage, err error) {
	at, bad := 0, -1
	closeBad := func(end int, torn bool) {
		if bad >= 0 {
			damages = append(damages, Damage{At: int64(bad), Bytes: int64(end - bad), Torn: torn})
			bad = -1
		}
	}
	for at < len(content) {
		key, data, size, ok := l.parse(content[at:])
		if ok {
			closeBad(at, false)
			if err := f(key, data); err != nil {
				return damages, err
			}
			at += size
			continue
		}
		if bad < 0 {
			bad = at
		}
		next := bytes.Index(content[at+1:], []byte(mark))
		if next < 0 {
			break
		}
		at += 1 + next
	}
	if bad >= 0 {
		closeBad(len(content), unfinished(content[bad:]))
	}
	return damages, nil
}

// parse reads the record that begins the bytes.
func (l *Ledger) parse(b []byte) (key string, data []byte, size int, ok bool) {
	if len(b) < headBytes || string(b[:len(mark)]) != mark {
		return
	}
	n := int(binary.LittleEndian.Uint32(b[len(mark):headBytes]))
	if n > mostRecord || len(b) < headBytes+n+sha256.Size {
		return
	}
	end := headBytes + n
	sum := l.sum(b[:end])
	if !bytes.Equal(sum[:], b[end:end+sha256.Size]) {
		return
	}
	body := b[headBytes:end]
	k, w := binary.Uvarint(body)
	if w <= 0 || k > uint64(len(body)-w) {
		return
	}
	return string(body[w : w+int(k)]), bytes.Clone(body[w+int(k):]), end + sha256.Size, true
}

// unfinished says whether bytes look like the beginning of one record.
func unfinished(b []byte) bool {
	if len(b) < headBytes {
		return strings.HasPrefix(mark, string(b[:min(len(b), len(mark))]))
	}
	n := int64(binary.LittleEndian.Uint32(b[len(mark):headBytes]))
	return string(b[:len(mark)]) == mark && n <= mostRecord && int64(len(b)) < int64(headBytes)+n+sha256.Size
}

// list is the files of a folder whose names are wanted, in the order of their names.
func list(dir string, wanted func(name string) bool) ([]string, error) {
	entries, err := os.ReadDir(dir)
	if err != nil {
		return nil, err
	}
	var out []string
	for _, e := range entries {
		if wanted(e.Name()) {
			out = append(out, filepath.Join(dir, e.Name()))
		}
	}
	return out, nil
}

func isRecords(name string) bool {
	return strings.HasPrefix(name, recordsPrefix) && strings.HasSuffix(name, recordsSuffix)
}

// Holds says whether a folder holds a ledger: a manifest, or records alone, as
// when a damaged manifest was taken away.
func Holds(dir string) bool {
	if _, err := os.Lstat(filepath.Join(dir, manifestName)); err == nil {
		return true
	}
	names, err := list(dir, isRecords)
	if err != nil {
		return false
	}
	for _, name := range names {
		f, err := os.Open(name)
		if err != nil {
			continue
		}
		start := make([]byte, len(mark))
		_, err = io.ReadFull(f, start)
		f.Close()
		if err == nil && string(start) == mark {
			return true
		}
	}
	return false
}

// isOurs is every file that a ledger may leave in its folder.
func isOurs(name string) bool {
	return isRecords(name) || name == manifestName || strings.HasPrefix(name, temporaryPrefix)
}
