package main

import (
	"path/filepath"

	"ebbline/reports"
	"ebbline/reports/figure"
)

// checkFigures makes sure, before anything runs, that no figure is lost.
func (o *outputs) checkFigures() error {
	if o.figures == "" {
		return nil
	}
	for _, name := range figure.Names() {
		if err := o.fresh(filepath.Join(o.figures, name), ""); err != nil {
			return err
		}
	}
	return nil
}

// writeFigures draws the report's charts if they are wanted.
func (o *outputs) writeFigures(r *reports.Report) error {
	if o.figures == "" {
		return nil
	}
	return figure.Write(r, o.figures)
}
