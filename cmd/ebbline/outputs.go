package main

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"syscall"

	"ebbline/pva"
	"ebbline/reports"
	"ebbline/reports/tidy"
)

// outputs are the files a command writes.
type outputs struct {
	book, json, csv, figures string
	quiet, force             bool
}

func (o *outputs) addFlags(f flagSet) {
	f.StringVar(&o.book, "out", "", "write the report workbook to `FILE.xlsx` (default: beside the case)")
	f.StringVar(&o.json, "json", "", "write the result as JSON to `FILE` (- is standard output)")
	f.StringVar(&o.csv, "csv", "", "write CSV tables into the folder `DIR`")
	f.StringVar(&o.figures, "figures", "", "draw the report's charts as PNG and SVG into the folder `DIR`")
	f.BoolVar(&o.quiet, "quiet", false, "print nothing but errors")
	f.BoolVar(&o.force, "force", false, "overwrite files that are not this case's own report")
}

type flagSet interface {
	StringVar(p *string, name, value, usage string)
	BoolVar(p *bool, name string, value bool, usage string)
}

// check makes sure, before anything runs, that every file of an assessment can
// be written and that none is lost.
func (o *outputs) check(book string, c *pva.Case, name string) error {
	return o.checkFiles(book, c, name, csvFiles...)
}

// fresh refuses to overwrite a file without --force, and the case itself with it,
// and a file in a folder that takes none.
func (o *outputs) fresh(path, caseName string) error {
	if sameFile(path, caseName) {
		return badInputf("%s is the case itself; give another name", path)
	}
	info, err := os.Stat(path)
	switch {
	case err == nil && info.IsDir():
		return badInputf("%s is a folder; give the name of a file", path)
	case err == nil && !o.force:
		return badInputf("%s exists; use --force to replace it", path)
	}
	dir := filepath.Dir(path)
	if dir == filepath.Clean(o.csv) || dir == filepath.Clean(o.figures) {
		dir = existing(dir) // the rest is made when it is written
	}
	return takesFiles(path, dir)
}

// takesFiles makes sure that a file can be made at path, in the folder given.
func takesFiles(path, dir string) error {
	if _, err := os.Lstat(path); errors.Is(err, syscall.ENAMETOOLONG) {
		return badInputf("%s cannot be the name of a file (%v); give a shorter one", path, syscall.ENAMETOOLONG)
	}
	switch info, err := os.Stat(dir); {
	case errors.Is(err, fs.ErrNotExist):
		return badInputf("%s: the folder %s does not exist", path, dir)
	case err != nil:
		return badInput{fmt.Errorf("%s: %w", path, plainPathError(err))}
	case !info.IsDir():
		return badInputf("%s: %s is a file and no folder; give another place", path, dir)
	}
	if err := reports.CheckFolder(dir); err != nil {
		return badInput{err}
	}
	return nil
}

// existing is the nearest folder above dir, or dir itself, that is there.
func existing(dir string) string {
	for {
		if _, err := os.Lstat(dir); err == nil {
			return dir
		}
		up := filepath.Dir(dir)
		if up == dir {
			return dir
		}
		dir = up
	}
}

var csvFiles = []string{"years.csv", "inputs.csv"}

// write writes the files of an assessment.
func (o *outputs) write(a *app, r *reports.Report, result *pva.Assessment, book string) error {
	doc, err := tidy.JSON(result, pva.Version, "assess")
	if err != nil {
		return err
	}
	tables := map[string][]byte{}
	if o.csv != "" {
		if tables["years.csv"], err = tidy.Years(result); err != nil {
			return err
		}
		if tables["inputs.csv"], err = tidy.Inputs(reports.InputsTable(result.Case)); err != nil {
			return err
		}
	}
	return o.writeFiles(a, r, book, doc, tables)
}
