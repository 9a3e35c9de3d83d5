package main

import (
	"context"
	"errors"
	"fmt"
	"strconv"
	"strings"

	"ebbline/pva"
	"ebbline/pva/assess"
	"ebbline/pva/casefile"
	"ebbline/pva/casefile/sheet"
	"ebbline/reports"
	"ebbline/reports/workbook"

	"github.com/spf13/cobra"
)

// errDisagrees carries exit status 4 past the commands; what disagrees has been
// said.
var errDisagrees = errors.New("the report is not what its case gives")

func newRerun(a *app) *cobra.Command {
	var workers int
	var quiet bool
	cmd := &cobra.Command{
		Use:   "rerun REPORT.xlsx",
		Short: "Run a report's own case again and compare every number",
		Long: `Takes the case and the seed that a report carries, makes sure that they are the
ones it was written with, runs them, and compares every cell of the report with
what comes out: counts exactly, other numbers to one part in a thousand million.
Cells that differ are named. Writes nothing.

` + statusHelp,
		Example: "  ebbline rerun heron.xlsx",
		Args:    cobra.ExactArgs(1),
		RunE: func(_ *cobra.Command, args []string) error {
			if workers < 0 {
				return badInputf("--workers %d: give 1 or more", workers)
			}
			return a.rerun(args[0], workers, quiet)
		},
	}
	cmd.Flags().IntVar(&workers, "workers", 0, "how many replicates run side by side (default: all cores)")
	cmd.Flags().BoolVar(&quiet, "quiet", false, "print nothing but what disagrees")
	return cmd
}

// rerun checks one report. What does not agree is printed on standard output
// and ends in errDisagrees.
func (a *app) rerun(name string, workers int, quiet bool) error {
	if !isWorkbook(name) {
		return badInputf("%s is not a report: reports end in .xlsx", name)
	}
	data, err := readBounded(name, sheet.LargestFile)
	if err != nil {
		return badInput{err}
	}
	book, err := sheet.Open(name, data)
	if err != nil {
		return badInput{err}
	}
	said, err := sheet.Embedded(book)
	if altered := (sheet.Altered{}); errors.As(err, &altered) {
		return a.disagree(altered.Error())
	}
	if err != nil {
		return badInput{err}
	}
	if said.Program != reports.Program {
		return badInputf("%s was written by %q, not by this program", name, said.Program)
	}
	how, err := repeated(said.Command)
	if err != nil {
		return badInputf("%s: %w", name, err)
	}
	c, err := caseOf(name, said, how)
	if err != nil {
		return a.disagree(err.Error())
	}
	if !quiet {
		a.say(false, fmt.Sprintf("%s: %s %s, seed %d, %s replicates\n", name, said.Program, said.Version, said.Seed, reports.Grouped(said.Replicates)))
		if said.Version != pva.Version {
			a.say(false, "This is version "+pva.Version+": where the model has changed since, numbers differ.\n")
		}
		a.say(false, "The case it carries has the lines, the SHA-256 and the digest stated.\n\n")
	}
	ctx, stop := a.interruptible()
	defer stop()
	again, err := a.repeat(ctx, c, said, how, workers, quiet)
	if err != nil {
		return err
	}
	fresh, err := sheet.Open(name+" run again", again)
	if err != nil {
		return err
	}
	found, err := compare(book, fresh)
	if err != nil {
		return badInput{err}
	}
	a.say(false, found.text(quiet))
	if found.differ() {
		return errDisagrees
	}
	return nil
}

// disagree says in one line why a report cannot be what its case gives.
func (a *app) disagree(why string) error {
	a.say(false, why+"\n")
	return errDisagrees
}

// options are what a report's command line says of how its case was run.
type rerunOptions struct {
	example      string
	settings     []pva.Setting
	exact        assess.ExactWish
	untilDecided bool
}

// exactFlag is the flag by which the exact answer was asked for or refused.
func exactFlag(w assess.ExactWish) string {
	return map[assess.ExactWish]string{assess.ExactAlways: " --exact", assess.ExactNever: " --no-exact"}[w]
}

// untilFlag is how the command line says that replicates are added until decided.
func untilFlag(on bool) string {
	if on {
		return " --until-decided"
	}
	return ""
}

// repeated reads the command line that a report states. Its settings are in the
// case text already; they are read to know which values were overridden.
func repeated(line string) (rerunOptions, error) {
	var o rerunOptions
	words, ok := splitArgs(line)
	if !ok || len(words) < 3 || words[0] != "ebbline" {
		return o, fmt.Errorf("its command line cannot be read: %q", line)
	}
	if words[1] != "assess" {
		return o, fmt.Errorf("is the report of `ebbline %s`, which rerun cannot repeat yet; run its own command line: %s", words[1], line)
	}
	for i := 2; i < len(words); i++ {
		value := ""
		switch words[i] {
		case "--set", "--replicates", "--seed", "--example":
			if i+1 == len(words) {
				return o, fmt.Errorf("its command line cannot be read: %q", line)
			}
			value = words[i+1]
		}
		switch words[i] {
		case "--exact":
			o.exact = assess.ExactAlways
		case "--no-exact":
			o.exact = assess.ExactNever
		case "--until-decided":
			o.untilDecided = true
		case "--example":
			o.example = value
			i++
		case "--set":
			s, err := casefile.ParseSetting(value)
			if err != nil {
				return o, fmt.Errorf("its command line cannot be read: %w", err)
			}
			o.settings = append(o.settings, s...)
			i++
		case "--replicates", "--seed":
			n, err := strconv.ParseUint(value, 10, 64)
			if err != nil {
				return o, fmt.Errorf("its command line cannot be read: %s %q", words[i], value)
			}
			v := pva.Num(float64(n))
			v.Text = value
			o.settings = append(o.settings, pva.Setting{Path: "run." + words[i][2:], Value: v})
			i++
		default:
			if i > 2 {
				return o, fmt.Errorf("its command line cannot be read: %q", words[i])
			}
		}
	}
	return o, nil
}

// splitArgs splits a command line as quoteArg put it together.
func splitArgs(line string) ([]string, bool) {
	var words []string
	var word strings.Builder
	inWord, inQuote := false, false
	for i := 0; i < len(line); i++ {
		switch c := line[i]; {
		case inQuote && c == '\'':
			inQuote = false
		case inQuote:
			word.WriteByte(c)
		case c == '\'':
			inQuote, inWord = true, true
		case c == '\\' && i+1 < len(line):
			i++
			word.WriteByte(line[i])
			inWord = true
		case c == ' ':
			if inWord {
				words, inWord = append(words, word.String()), false
				word.Reset()
			}
		default:
			word.WriteByte(c)
			inWord = true
		}
	}
	if inWord {
		words = append(words, word.String())
	}
	return words, !inQuote
}

// caseOf is the case that the report carries. An error says how it is not the
// one of which the report speaks.
func caseOf(name string, said *sheet.Report, how rerunOptions) (*pva.Case, error) {
	c, faults := casefile.Read(name+", case text", []byte(said.CaseText))
	if len(faults) > 0 {
		return nil, fmt.Errorf("%s: the case it carries cannot be read, so it was changed:\n%w", name, faults)
	}
	if len(how.settings) > 0 {
		if c, faults = casefile.Override(c, how.settings); len(faults) > 0 {
			return nil, fmt.Errorf("%s: its command line does not fit its case, so one was changed:\n%w", name, faults)
		}
	}
	if got := c.Digest(); got != said.Digest {
		return nil, fmt.Errorf("%s: the case it carries has another digest than the one stated, so it was changed:\n  stated   %s\n  carried  %s", name, said.Digest, got)
	}
	if c.Run.Seed != said.Seed {
		return nil, fmt.Errorf("%s: it states seed %d, and carries a case of seed %d", name, said.Seed, c.Run.Seed)
	}
	return c, nil
}

// repeat runs the case and builds the report anew. One that was interrupted is
// interrupted again at the same replicate, which takes a single worker.
func (a *app) repeat(ctx context.Context, c *pva.Case, said *sheet.Report, how rerunOptions, workers int, quiet bool) ([]byte, error) {
	partly := said.Replicates < said.Asked
	progress, finish := progressBar(a.errs, said.Replicates, quiet)
	opt := assess.Options{Workers: workers, Progress: progress, Exact: how.exact}
	run := ctx
	if partly {
		var stop context.CancelFunc
		run, stop = context.WithCancel(ctx)
		defer stop()
		opt.Workers = 1
		opt.Progress = func(done int64) {
			if progress != nil {
				progress(done)
			}
			if done >= said.Replicates {
				stop()
			}
		}
	}
	var result *pva.Assessment
	var err error
	if how.untilDecided {
		var s *assess.Settled
		opt.Progress = nil
		if s, err = assess.UntilDecided(run, c, opt, 0); s != nil {
			result = s.Assessment
		}
	} else {
		result, err = assess.Run(run, c, opt)
	}
	finish()
	switch {
	case ctx.Err() != nil:
		return nil, ctx.Err()
	case err != nil && !(partly && result != nil && errors.Is(err, context.Canceled)):
		return nil, err
	}
	about := meta(c, said.CaseFile, "assess", how.example)
	about.Version = said.Version
	about.Command += exactFlag(how.exact) + untilFlag(how.untilDecided)
	return workbook.Bytes(reports.Build(result, about))
}
