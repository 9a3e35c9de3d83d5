package main

import (
	"io"

	"ebbline/pva"

	"github.com/spf13/cobra"
)

// app is what every command shares: where it reads and writes.
type app struct {
	in        io.Reader
	out, errs io.Writer
	unsaid    error // why text for people could not be written
}

func newRoot(a *app) *cobra.Command {
	root := &cobra.Command{
		Use:   "ebbline",
		Short: "How likely is a population to fall to a threshold, with and without a take?",
		Long: `ebbline prepares the viability assessment behind a permit to take animals, or
behind the stocking of a declining population. From a case file with counts,
vital rates and doubts it computes how likely the population is to fall to a
stated threshold within a stated time, with and without the take, and writes a
workbook that a reviewer can audit and run again.

Begin with:  ebbline assess --example marsh-heron
             ebbline new mycase.toml

A risk is conditional on the model and the inputs; it is not a forecast. Local
law, agency guidance and a qualified biologist's judgement come first.

` + statusHelp,
		SilenceErrors: true,
		SilenceUsage:  true,
	}
	root.Flags().Bool("version", false, "print the version")
	root.Version = pva.Version // without it the flag does nothing
	root.SetVersionTemplate(versionLine())
	root.SetUsageFunc(usage)
	root.SetHelpCommand(newHelp())
	root.AddCommand(newAssess(a), newExact(a), newCheck(a), newNew(a), newExample(a), newFit(a), newSweep(a), newMinimum(a), newMerge(a), newRerun(a), newCompletion(a), newMan(a), newVersion(a))
	addCompletions(root)
	return root
}
