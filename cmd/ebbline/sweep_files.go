package main

import (
	"encoding/csv"
	"fmt"
	"os"
	"path/filepath"
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

// writeFiles writes the workbook, then JSON and CSV, each whole or not at all.
func (o *outputs) writeFiles(a *app, r *reports.Report, book string, doc []byte, tables map[string][]byte) error {
	data, err := workbook.Bytes(r)
	if err != nil {
		return err
	}
	if err := reports.Save(book, data); err != nil {
		return err
	}
	if err := o.writeFigures(r); err != nil {
		return err
	}
	switch o.json {
	case "":
	case "-":
		if _, err := a.out.Write(doc); err != nil {
			return err
		}
	default:
		if err := reports.Save(o.json, doc); err != nil {
			return err
		}
	}
	for name, content := range tables {
		if err := os.MkdirAll(o.csv, 0o777); err != nil {
			return plainPathError(err)
		}
		if err := reports.Save(filepath.Join(o.csv, name), content); err != nil {
			return err
		}
	}
	return nil
}

// liveCSV writes the cells of a sweep as they come, so that a long run can be
// looked at; the whole table takes its place at the end.
type liveCSV struct {
	study *sweep.Study
	early []*sweep.Outcome // that came before the file was open
	f     *os.File
	w     *csv.Writer
	err   error
}

const liveName = "sweep.csv"

func (l *liveCSV) open(dir string) error {
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return plainPathError(err)
	}
	f, err := os.Create(filepath.Join(dir, liveName))
	if err != nil {
		return plainPathError(err)
	}
	l.f, l.w = f, csv.NewWriter(f)
	l.err = l.w.Write(tidy.SweepHead(l.study))
	l.add(l.early)
	return l.err
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
	name := l.f.Name()
	if err := l.f.Close(); l.err == nil {
		l.err = err
	}
	l.f = nil
	if l.err != nil {
		return fmt.Errorf("%s cannot be written: %w; the ledger keeps what is finished: make room and run again with --resume", name, l.err)
	}
	return nil
}

// remove takes the file away if it stands in the ledger's folder.
func (l *liveCSV) remove(dir string) { os.Remove(filepath.Join(dir, liveName)) }
