// Command ebbline assesses the viability of a population under a take: how
// likely it is to fall to a stated threshold within a stated time, with and
// without the take. It reads a case file, simulates it, prints the answer and
// writes the report workbook beside the case.
//
// This package holds flags, the clock, signals and the environment, and nothing
// else: what is computed and what is written is decided in the packages below.
package main

import (
	"io"
	"os"
)

func main() { os.Exit(run(os.Args[1:], os.Stdin, os.Stdout, os.Stderr)) }

// run is the whole program, so that tests run it in-process.
func run(args []string, in io.Reader, out, errs io.Writer) int {
	app := &app{in: in, out: out, errs: errs}
	root := newRoot(app)
	root.SetArgs(args)
	root.SetIn(in)
	root.SetOut(out)
	root.SetErr(errs)
	return app.status(root.Execute())
}
