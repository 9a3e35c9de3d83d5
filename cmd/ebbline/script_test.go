package main

import (
	"flag"
	"os"
	"path/filepath"
	"testing"

	"github.com/rogpeppe/go-internal/testscript"
)

var update = flag.Bool("update", false, "rewrite the expected output in testdata/scripts")

func TestMain(m *testing.M) {
	testscript.Main(m, map[string]func(){
		"ebbline": func() { os.Exit(run(os.Args[1:], os.Stdin, os.Stdout, os.Stderr)) },
	})
}

// TestScripts runs the commands as a person does: each file of testdata/scripts
// holds command lines, what they must print, their exit status and their files.
func TestScripts(t *testing.T) {
	testscript.Run(t, testscript.Params{
		Dir:                 filepath.Join("..", "..", "testdata", "scripts"),
		UpdateScripts:       *update,
		RequireExplicitExec: true,
		Cmds: map[string]func(ts *testscript.TestScript, neg bool, args []string){
			"status": status,
		},
	})
}

// status runs "status N ebbline ...", and fails unless the exit status is N.
func status(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 2 {
		ts.Fatalf("usage: status N command [args]")
	}
	err := ts.Exec(args[1], args[2:]...)
	got := "0"
	if err != nil {
		got = exitStatus(err)
	}
	if got != args[0] {
		ts.Fatalf("exit status %s, want %s", got, args[0])
	}
}

func exitStatus(err error) string {
	type exiter interface{ ExitCode() int }
	if e, ok := err.(exiter); ok {
		return string(rune('0' + e.ExitCode()))
	}
	return err.Error()
}
