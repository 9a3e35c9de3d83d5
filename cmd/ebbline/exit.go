package main

import (
	"context"
	"errors"
	"fmt"
	"strings"

	"ebbline/pva"
	"ebbline/pva/casefile"
)

// The exit statuses, the same for every command.
const (
	statusDone       = 0
	statusFailed     = 1 // the run failed: disk full, interrupted, a bug
	statusBadInput   = 2 // a case or a command line that cannot be run; nothing was written
	statusAboveLimit = 3 // done, and the answer is "above the limit", with --fail-above-limit
	statusDisagrees  = 4 // rerun disagrees with the report
)

const statusHelp = `Exit status: 0 done; 1 the run failed (disk full, interrupted); 2 bad input or
usage, nothing written; 3 done and above the limit (assess --fail-above-limit);
4 rerun disagrees.`

// badInput is an error of the person's input: exit status 2.
type badInput struct{ err error }

func (b badInput) Error() string { return b.err.Error() }
func (b badInput) Unwrap() error { return b.err }

func badInputf(format string, args ...any) error { return badInput{fmt.Errorf(format, args...)} }

// errAboveLimit is no failure: it carries exit status 3 past the commands.
var errAboveLimit = errors.New("above the limit")

// status prints an error once and turns it into an exit status.
func (a *app) status(err error) int {
	if err == nil && a.unsaid != nil {
		err = fmt.Errorf("the answer could not be printed: %w", a.unsaid)
	}
	if err == nil {
		return statusDone
	}
	var faults casefile.Errors
	var bad badInput
	var raw pva.Faults
	switch {
	case errors.Is(err, errAboveLimit):
		return statusAboveLimit
	case errors.Is(err, errDisagrees):
		return statusDisagrees
	case errors.As(err, &faults):
		fmt.Fprintln(a.errs, strings.TrimRight(faults.Error(), "\n"))
		return statusBadInput
	case errors.As(err, &bad), errors.As(err, &raw):
		fmt.Fprintln(a.errs, "ebbline: "+err.Error())
		return statusBadInput
	case errors.Is(err, context.Canceled):
		fmt.Fprintln(a.errs, "ebbline: interrupted")
		return statusFailed
	case isUsage(err):
		fmt.Fprintln(a.errs, "ebbline: "+err.Error()+"\nSee `ebbline help`.")
		return statusBadInput
	}
	fmt.Fprintln(a.errs, "ebbline: "+err.Error())
	return statusFailed
}

// isUsage tells the command library's own errors, which come as plain text and
// only before a command has begun.
func isUsage(err error) bool {
	for _, start := range []string{"unknown command", "unknown flag", "unknown shorthand flag", "flag needs an argument", "invalid argument", "accepts ", "requires ", "bad flag syntax"} {
		if strings.HasPrefix(err.Error(), start) {
			return true
		}
	}
	return false
}
