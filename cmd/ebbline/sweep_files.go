package main

import (
	"encoding/csv"
	"errors"
	"fmt"
	"maps"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"ebbline/pva"
	"ebbline/pva/sweep"
	"ebbline/pva/sweep/ledger"
	"ebbline/reports"
	"ebbline/reports/tidy"
	"ebbline/reports/workbook"
)

// longRun is what the commands share that may run for hours.
type longRun struct {
	workers      int
	ledger       string
	resume       bool
	untilDecided bool
	noExact      bool
}

type longFlags interface {
	flagSet
	IntVar(p *int, name string, value int, usage string)
}

func (l *longRun) addFlags(f longFlags) {
	f.IntVar(&l.workers, "workers", 0, "how many parts run side by side (default: all cores)")
	f.StringVar(&l.ledger, "ledger", "", "keep what is finished in the folder `DIR` (default: beside the case)")
	f.BoolVar(&l.resume, "resume", false, "go on with what the ledger holds")
	f.BoolVar(&l.untilDecided, "until-decided", false, "search on, with up to 256 times the replicates, until no value is undecided")
	f.BoolVar(&l.noExact, "no-exact", false, "search by simulation alone")
}

func (l *longRun) check() error {
	if l.workers < 0 {
		return badInputf("--workers %d: give 1 or more", l.workers)
	}
	return nil
}

// mostOf is the largest number of replicates of one value of a search.
func (l *longRun) mostOf(c *pva.Case) int64 {
	if l.untilDecided {
		return 256 * c.Run.Replicates
	}
	return 0
}

// checkFiles makes sure, before anything runs, that every file can be written
// and that none is lost.
func (o *outputs) checkFiles(book string, c *pva.Case, name string, tables ...string) error {
	if !strings.EqualFold(filepath.Ext(book), ".xlsx") {
		return badInputf("%s: the report is a workbook; name it with .xlsx", book)
	}
	if sameFile(book, name) {
		return badInputf("%s is the case itself; name the report with --out FILE.xlsx", book)
	}
	if err := reports.CheckTarget(book, reports.TitleOf(c, name), o.force); err != nil {
		return badInput{err}
	}
	if err := o.checkFigures(); err != nil {
		return err
	}
	if o.json != "" && o.json != "-" {
		if sameFile(o.json, book) {
			return badInputf("%s cannot be both the report and the JSON file", book)
		}
		if err := o.fresh(o.json, name); err != nil {
			return err
		}
	}
	if o.csv == "" {
		return nil
	}
	for _, f := range tables {
		if o.json != "" && sameFile(o.json, filepath.Join(o.csv, f)) {
			return badInputf("%s cannot be both the JSON file and a table of --csv", o.json)
		}
		if err := o.fresh(filepath.Join(o.csv, f), name); err != nil {
			return err
		}
	}
	return nil
}

// notForeign refuses a ledger folder that holds something else, so that nobody's
// files are taken for a sweep's.
func notForeign(dir string) error {
	inside, err := os.ReadDir(dir)
	if err != nil || len(inside) == 0 || ledger.Holds(dir) {
		return nil // made by the ledger, or told by it
	}
	return badInputf("the folder %s holds other files and no ledger; name another with --ledger", dir)
}

// writeFiles writes the workbook, the figures, JSON and CSV, each file whole or
// not at all. One that cannot be written keeps none of the others back: the error
// names all that failed, and what is written all the same.
func (o *outputs) writeFiles(a *app, r *reports.Report, book string, doc []byte, tables map[string][]byte) error {
	var kept, failed []string
	var causes []error
	did := func(what string, err error) {
		if err == nil {
			kept = append(kept, what)
			return
		}
		failed, causes = append(failed, err.Error()), append(causes, err)
	}
	data, err := workbook.Bytes(r)
	if err == nil {
		err = reports.Save(book, data)
	}
	did(book, err)
	if o.figures != "" {
		did("the figures in "+o.figures, o.writeFigures(r))
	}
	switch o.json {
	case "":
	case "-":
		_, err := a.out.Write(doc)
		did("the JSON", err)
	default:
		did(o.json, reports.Save(o.json, doc))
	}
	for _, name := range slices.Sorted(maps.Keys(tables)) {
		path := filepath.Join(o.csv, name)
		err := plainPathError(os.MkdirAll(o.csv, 0o777))
		if err == nil {
			err = reports.Save(path, tables[name])
		}
		did(path, err)
	}
	if len(failed) == 0 {
		return nil
	}
	said := strings.Join(failed, "; ")
	if len(kept) > 0 {
		said += "; written all the same: " + strings.Join(kept, ", ")
	}
	return notAllWritten{said, causes}
}

// notAllWritten is the error of files that could not be written.
type notAllWritten struct {
	said   string
	causes []error
}

func (n notAllWritten) Error() string   { return n.said }
func (n notAllWritten) Unwrap() []error { return n.causes }

// liveCSV writes the cells of a sweep as they come, so that a long run can be
// looked at: to a file of its own, which says in its name that it is not the
// whole table and goes when the run ends. A table of an earlier run is left as it
// is until the whole of the new one takes its place.
type liveCSV struct {
	study *sweep.Study
	early []*sweep.Outcome // that came before the file was open
	f     liveFile
	name  string
	w     *csv.Writer
	err   error
}

// liveFile is what liveCSV needs of an open file; tests put one in its place that
// fails.
type liveFile interface {
	Write(p []byte) (int, error)
	Close() error
}

// The shards of a sweep may share a folder: each process has a file of its own.
const livePrefix, liveSuffix = "sweep-so-far-", ".csv"

var createLive = func(dir string) (liveFile, string, error) {
	f, err := os.CreateTemp(dir, livePrefix+"*"+liveSuffix)
	if err != nil {
		return nil, "", err
	}
	f.Chmod(0o644) // others may look at it
	return f, f.Name(), nil
}

func (l *liveCSV) open(dir string) error {
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return plainPathError(err)
	}
	f, name, err := createLive(dir)
	if err != nil {
		return plainPathError(err)
	}
	l.f, l.name, l.w = f, name, csv.NewWriter(f)
	l.err = l.w.Write(tidy.SweepHead(l.study))
	l.add(l.early)
	if l.err != nil {
		return l.close()
	}
	return nil
}

// add is called by one goroutine at a time.
func (l *liveCSV) add(cells []*sweep.Outcome) {
	if l.f == nil {
		l.early = append(l.early, cells...)
		return
	}
	for _, o := range cells {
		if l.err == nil {
			l.err = l.w.Write(tidy.SweepRow(l.study, o, false))
		}
	}
	l.w.Flush()
	if l.err == nil {
		l.err = l.w.Error()
	}
}

func (l *liveCSV) close() error {
	if l.f == nil {
		return nil
	}
	if err := l.f.Close(); l.err == nil {
		l.err = err
	}
	l.f = nil
	os.Remove(l.name)
	if l.err != nil {
		return fmt.Errorf("%s cannot be written: %w; the ledger keeps what is finished: make room and run again with --resume", l.name, cause(l.err))
	}
	return nil
}

// cause is the cause of a path error without the path.
func cause(err error) error {
	var p *os.PathError
	if errors.As(err, &p) {
		return p.Err
	}
	return err
}

// remove takes away what killed runs left in the ledger's folder.
func (l *liveCSV) remove(dir string) {
	entries, _ := os.ReadDir(dir)
	for _, e := range entries {
		if name := e.Name(); strings.HasPrefix(name, livePrefix) && strings.HasSuffix(name, liveSuffix) {
			os.Remove(filepath.Join(dir, name))
		}
	}
}
