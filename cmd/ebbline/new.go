package main

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"

	"ebbline/pva/casefile"
	"ebbline/pva/casefile/examples"
	"ebbline/pva/casefile/sheet"
	"ebbline/reports"

	"github.com/spf13/cobra"
)

func newNew(a *app) *cobra.Command {
	var force bool
	cmd := &cobra.Command{
		Use:   "new [FILE]",
		Short: "Write a commented starter case",
		Long: `Writes a case file to begin from, with every key explained: to FILE, or to
standard output without one. A name that ends in .xlsx gives a workbook, with
lists to choose from. The population in it is invented.`,
		Example: "  ebbline new mycase.toml\n  ebbline new mycase.xlsx",
		Args:    cobra.MaximumNArgs(1),
		RunE: func(_ *cobra.Command, args []string) error {
			if len(args) > 0 && isWorkbook(args[0]) {
				return a.writeStarter(args[0], force)
			}
			return a.writeText(args, 0, casefile.Starter(), force, "Fill it in, then: ebbline check ")
		},
	}
	cmd.Flags().BoolVar(&force, "force", false, "overwrite an existing file")
	return cmd
}

func newExample(a *app) *cobra.Command {
	var force bool
	cmd := &cobra.Command{
		Use:   "example [NAME [FILE]]",
		Short: "List the built-in cases, or write one out",
		Long: `Without a name, lists the built-in cases. With one, prints that case, or writes
it to FILE. All of them are invented, in places that do not exist.`,
		Example: "  ebbline example marsh-heron heron.toml",
		Args:    cobra.MaximumNArgs(2),
		RunE: func(_ *cobra.Command, args []string) error {
			if len(args) == 0 {
				return a.listExamples()
			}
			data, err := examples.Get(args[0])
			if err != nil {
				return badInput{err}
			}
			return a.writeText(args, 1, data, force, "Assess it with: ebbline assess ")
		},
	}
	cmd.Flags().BoolVar(&force, "force", false, "overwrite an existing file")
	return cmd
}

func (a *app) listExamples() error {
	for _, name := range examples.Names() {
		data, err := examples.Get(name)
		if err != nil {
			return err
		}
		c, faults := casefile.Read(name+".toml", data)
		if len(faults) > 0 {
			return faults
		}
		if _, err := fmt.Fprintf(a.out, "%-20s %s\n", name, c.Title); err != nil {
			return err
		}
	}
	return nil
}

// writeText writes a file named by args[at], or to standard output.
func (a *app) writeText(args []string, at int, data []byte, force bool, next string) error {
	if len(args) <= at {
		_, err := a.out.Write(data)
		return err
	}
	path := args[at]
	if !strings.EqualFold(filepath.Ext(path), ".toml") {
		return badInputf("%s: a case file ends in .toml", path)
	}
	return a.writeCase(path, data, force, next)
}

// writeStarter writes the starter workbook.
func (a *app) writeStarter(path string, force bool) error {
	data, err := sheet.Starter()
	if err != nil {
		return err
	}
	return a.writeCase(path, data, force, "Fill it in, then: ebbline check ")
}

// writeCase saves a case to a new file and says what may come next.
func (a *app) writeCase(path string, data []byte, force bool, next string) error {
	switch info, err := os.Stat(path); {
	case err == nil && info.IsDir():
		return badInputf("%s is a folder; give the name of a file", path)
	case err == nil && !force:
		return badInputf("%s exists; use --force to replace it", path)
	}
	if err := takesFiles(path, filepath.Dir(path)); err != nil {
		return err
	}
	if err := reports.Save(path, data); err != nil {
		return err
	}
	_, err := fmt.Fprintln(a.out, "Wrote "+path+". "+next+path)
	return err
}
