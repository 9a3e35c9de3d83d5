// Package ledger keeps the finished parts of a long run on disk, so that a
// sleep, a full disk or a kill costs only the parts in work: a folder with one
// manifest, which says what is being run, and append-only files of records.
//
// Every writer has a file of its own and nobody ever changes another's, so that
// no locks are needed and several machines may share a folder. A record is a
// mark, its length, a key with its data, and a SHA-256 over all of it and over
// the manifest: a record that was cut short, damaged, or belongs to another run
// is never handed out. What a record means is its caller's business; package
// sweep calls it.
package ledger

import (
	"crypto/sha256"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"strconv"
	"sync"
	"syscall"
	"time"
)

const (
	manifestName    = "manifest.json"
	recordsPrefix   = "records-"
	recordsSuffix   = ".log"
	temporaryPrefix = ".manifest-"
	mark            = "ebbR"
	headBytes       = len(mark) + 4
	// mostRecord bounds what a length may claim.
	mostRecord = 256 << 20
	// syncEvery is how long a record may wait for its way to the disk. A killed
	// process loses nothing that was written; a machine that loses power loses
	// what was written in this time.
	syncEvery = time.Second
)

// file is what a ledger needs of an open file; tests put one in its place that fails.
type file interface {
	Write(p []byte) (int, error)
	Sync() error
	Close() error
}

// The steps that tests make fail.
var (
	createFile = func(name string) (file, error) {
		return os.OpenFile(name, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o666)
	}
	createManifest = func(dir string) (file, string, error) {
		f, err := os.CreateTemp(dir, temporaryPrefix+"*")
		if err != nil {
			return nil, "", err
		}
		f.Chmod(0o644) // others may merge what one has run
		return f, f.Name(), nil
	}
	link, rename = os.Link, os.Rename
)

// Ledger is an open folder. Append may be called from many goroutines.
type Ledger struct {
	dir string
	id  [sha256.Size]byte // of the manifest

	mu     sync.Mutex
	label  string
	f      file // made at the first record
	failed error
	synced time.Time
	timer  *time.Timer
}

// ErrFolder is wrapped by the error of a folder that takes no ledger.
var ErrFolder = errors.New("takes no ledger")

// ErrOther is wrapped by the error of a folder that holds another run.
var ErrOther = errors.New("is the ledger of another run")

// Open opens the ledger of a run in a folder, which is made if it is not there.
// A folder that holds another run is refused with the difference named. The
// label tells writers apart to people ("shard-2"); it may be empty.
func Open(dir string, m Manifest, label string) (*Ledger, error) {
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return nil, noFolder(dir, err)
	}
	had, err := ReadManifest(dir)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		if err := m.write(dir); err != nil {
			return nil, noFolder(dir, err)
		}
		// Another process may have put its own there at the same moment.
		if had, err = ReadManifest(dir); err != nil {
			return nil, err
		}
	case err != nil:
		return nil, err
	}
	if d := m.Difference(had); d != "" {
		return nil, fmt.Errorf("ledger %s %w: %s; name another folder with --ledger", dir, ErrOther, d)
	}
	return &Ledger{dir: dir, id: m.id(), label: label}, nil
}

func noFolder(dir string, err error) error {
	return fmt.Errorf("the folder %s %w (%w); name another with --ledger", dir, ErrFolder, reason(err))
}

// Dir is the folder.
func (l *Ledger) Dir() string { return l.dir }

// Append adds one record. After an error nothing more is written, and every
// later call returns the same error: what was written before stays good.
func (l *Ledger) Append(key string, data []byte) error {
	rec := l.record(key, data)
	l.mu.Lock()
	defer l.mu.Unlock()
	if l.failed != nil {
		return l.failed
	}
	if l.f == nil {
		if err := l.begin(); err != nil {
			return l.fail(err)
		}
	}
	n, err := l.f.Write(rec)
	if err == nil && n < len(rec) {
		err = io.ErrShortWrite
	}
	if err != nil {
		return l.fail(err)
	}
	if time.Since(l.synced) >= syncEvery {
		return l.sync()
	}
	if l.timer == nil {
		l.timer = time.AfterFunc(syncEvery, func() {
			l.mu.Lock()
			defer l.mu.Unlock()
			if l.f != nil && l.failed == nil {
				l.sync()
			}
		})
	}
	return nil
}

func (l *Ledger) sync() error {
	if l.timer != nil {
		l.timer.Stop()
		l.timer = nil
	}
	if err := l.f.Sync(); err != nil {
		return l.fail(err)
	}
	l.synced = time.Now()
	return nil
}

func (l *Ledger) fail(err error) error {
	l.failed = fmt.Errorf("ledger %s: cannot be written: %w; what is finished is kept: make room and run again with --resume", l.dir, reason(err))
	return l.failed
}

// begin makes this writer's file under a name that no other writer has.
func (l *Ledger) begin() error {
	host, _ := os.Hostname()
	name := l.label
	if name != "" {
		name += "-"
	}
	for n := 0; ; n++ {
		path := filepath.Join(l.dir, recordsPrefix+name+safe(host)+"-"+strconv.Itoa(os.Getpid())+"-"+strconv.Itoa(n)+recordsSuffix)
		f, err := createFile(path)
		if errors.Is(err, fs.ErrExist) && n < 100000 {
			continue
		}
		if err != nil {
			return err
		}
		l.f, l.synced = f, time.Now()
		return syncFolder(l.dir)
	}
}

// syncFolder brings a new name to the disk, without which what is written to the
// file may be there and not be found. Systems that cannot sync a folder say so.
func syncFolder(dir string) error {
	if runtime.GOOS == "windows" {
		return nil
	}
	d, err := os.Open(dir)
	if err != nil {
		return err
	}
	defer d.Close()
	if err := d.Sync(); err != nil && !errors.Is(err, syscall.EINVAL) && !errors.Is(err, errors.ErrUnsupported) {
		return err
	}
	return nil
}

// Close brings what was written to the disk.
func (l *Ledger) Close() error {
	l.mu.Lock()
	defer l.mu.Unlock()
	if l.f == nil {
		return nil
	}
	err := l.failed
	if err == nil {
		err = l.sync()
	}
	if l.timer != nil {
		l.timer.Stop()
		l.timer = nil
	}
	if closed := l.f.Close(); err == nil && closed != nil {
		err = l.fail(closed)
	}
	l.f = nil
	return err
}

// Remove takes a ledger's own files away, and its folder if nothing else is in it.
func Remove(dir string) error {
	names, err := list(dir, isOurs)
	if errors.Is(err, fs.ErrNotExist) {
		return nil
	}
	if err != nil {
		return fmt.Errorf("ledger %s: cannot be removed: %w", dir, reason(err))
	}
	for _, name := range names {
		if err := os.Remove(name); err != nil && !errors.Is(err, fs.ErrNotExist) {
			return fmt.Errorf("ledger %s: cannot be removed: %w", dir, reason(err))
		}
	}
	os.Remove(dir) // stays if something else is in it
	return nil
}

// record is one record as it stands on the disk.
func (l *Ledger) record(key string, data []byte) []byte {
	body := binary.AppendUvarint(nil, uint64(len(key)))
	body = append(append(body, key...), data...)
	rec := make([]byte, headBytes, headBytes+len(body)+sha256.Size)
	copy(rec, mark)
	binary.LittleEndian.PutUint32(rec[len(mark):], uint32(len(body)))
	rec = append(rec, body...)
	sum := l.sum(rec)
	return append(rec, sum[:]...)
}

// sum covers the manifest, the length and the body.
func (l *Ledger) sum(head []byte) [sha256.Size]byte {
	h := sha256.New()
	h.Write(l.id[:])
	h.Write(head)
	var out [sha256.Size]byte
	h.Sum(out[:0])
	return out
}

func safe(s string) string {
	out := []byte(s)
	for i, b := range out {
		if !(b >= 'a' && b <= 'z' || b >= 'A' && b <= 'Z' || b >= '0' && b <= '9') {
			out[i] = '_'
		}
	}
	return string(out)
}

// reason is the cause of a path error without the path.
func reason(err error) error {
	var p *fs.PathError
	var l *os.LinkError
	switch {
	case errors.As(err, &p):
		return p.Err
	case errors.As(err, &l):
		return l.Err
	}
	return err
}
