package main

import (
	"os"
	"path/filepath"
	"strings"

	"ebbline/pva"
	"ebbline/reports"
	"ebbline/reports/tidy"
	"ebbline/reports/workbook"
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

// check makes sure, before anything runs, that every file can be written and
// that none is lost.
func (o *outputs) check(book string, c *pva.Case, name string) error {
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
		if err := o.fresh(o.json); err != nil {
			return err
		}
	}
	if o.csv != "" {
		for _, f := range csvFiles {
			if err := o.fresh(filepath.Join(o.csv, f)); err != nil {
				return err
			}
		}
	}
	return nil
}

// fresh refuses to overwrite a file without --force.
func (o *outputs) fresh(path string) error {
	if o.force {
		return nil
	}
	if _, err := os.Stat(path); err == nil {
		return badInputf("%s exists; use --force to replace it", path)
	}
	return nil
}

var csvFiles = []string{"years.csv", "inputs.csv"}

// write writes the workbook, then JSON and CSV, each whole or not at all.
func (o *outputs) write(a *app, r *reports.Report, result *pva.Assessment, book string) error {
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
	if o.json != "" {
		doc, err := tidy.JSON(result, pva.Version, "assess")
		if err != nil {
			return err
		}
		if o.json == "-" {
			if _, err := a.out.Write(doc); err != nil {
				return err
			}
		} else if err := reports.Save(o.json, doc); err != nil {
			return err
		}
	}
	if o.csv == "" {
		return nil
	}
	if err := os.MkdirAll(o.csv, 0o777); err != nil {
		return plainPathError(err)
	}
	years, err := tidy.Years(result)
	if err != nil {
		return err
	}
	inputs, err := tidy.Inputs(reports.InputsTable(result.Case))
	if err != nil {
		return err
	}
	if err := reports.Save(filepath.Join(o.csv, "years.csv"), years); err != nil {
		return err
	}
	return reports.Save(filepath.Join(o.csv, "inputs.csv"), inputs)
}
