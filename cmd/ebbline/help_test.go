package main

import (
	"bytes"
	"fmt"
	"os"
	"path/filepath"
	"regexp"
	"slices"
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/spf13/cobra"
)

// everyCommand is the program's commands, itself first.
func everyCommand() []*cobra.Command {
	root := newRoot(&app{})
	root.InitDefaultHelpCmd()
	return append([]*cobra.Command{root}, root.Commands()...)
}

// TestHelpFitsATerminal wants no line of any help beyond 80 columns, no flag
// with a word of the library for its value, and no command without an example.
func TestHelpFitsATerminal(t *testing.T) {
	for _, cmd := range everyCommand() {
		page := helpOf(t, cmd)
		for _, line := range strings.Split(page, "\n") {
			if utf8.RuneCountInString(line) > 80 {
				t.Errorf("%s: %d columns: %q", cmd.CommandPath(), utf8.RuneCountInString(line), line)
			}
			if strings.Contains(line, "\t") || strings.TrimRight(line, " ") != line {
				t.Errorf("%s: a tab, or spaces at the end: %q", cmd.CommandPath(), line)
			}
		}
		for _, wrong := range []string{"true|false", " int ", " uint ", " string", " strings "} {
			if strings.Contains(page, wrong) {
				t.Errorf("%s: its help says %q", cmd.CommandPath(), wrong)
			}
		}
		if cmd.HasParent() && cmd.Example == "" {
			t.Errorf("%s has no example", cmd.CommandPath())
		}
		for _, f := range flagsOf(cmd) {
			if !strings.Contains(page, "--"+f.Name) || f.Usage == "" {
				t.Errorf("%s: its help does not explain --%s", cmd.CommandPath(), f.Name)
			}
		}
	}
}

func helpOf(t *testing.T, cmd *cobra.Command) string {
	t.Helper()
	var out, errs bytes.Buffer
	args := append(strings.Fields(cmd.CommandPath())[1:], "--help")
	if code := run(args, strings.NewReader(""), &out, &errs); code != 0 || errs.Len() > 0 {
		t.Fatalf("%v: exit status %d\n%s", args, code, errs.String())
	}
	return out.String()
}

// TestHelpColumns holds the table of flags against one set by hand.
func TestHelpColumns(t *testing.T) {
	cmd := &cobra.Command{Use: "x"}
	f := cmd.Flags()
	f.StringP("out", "o", "", "write to `FILE`")
	f.Bool("force", false, "overwrite what is there, without a question and without a word, at once")
	f.Int("n", 3, "how many")
	f.String("a-flag-with-a-long-name", "", "a `VALUE OF SOME LENGTH` to be put on a line of its own")
	f.Bool("hidden", false, "not shown")
	if err := f.MarkHidden("hidden"); err != nil {
		t.Fatal(err)
	}
	want := `      --a-flag-with-a-long-name VALUE OF SOME LENGTH
                  a VALUE OF SOME LENGTH to be put on a line of its own
      --force     overwrite what is there, without a question and without a
                  word, at once
  -h, --help      help for x
      --n NUMBER  how many (default 3)
  -o, --out FILE  write to FILE
`
	if got := flagLines(flagsOf(cmd)); got != want {
		t.Errorf("got\n%s\nwant\n%s", got, want)
	}
}

// flagWord is a flag in running text, with the word before it.
var flagWord = regexp.MustCompile(`(?:([a-z]+) )?\(?--([a-z][a-z-]*)`)

// strangers lists the flags that a text names and that the command, or the one
// named right before the flag, does not have.
func strangers(cmd *cobra.Command, text string) []string {
	var out []string
	for _, m := range flagWord.FindAllStringSubmatch(text, -1) {
		of := cmd
		for _, other := range cmd.Root().Commands() {
			if other.Name() == m[1] {
				of = other
			}
		}
		of.InitDefaultHelpFlag()
		if of.Flags().Lookup(m[2]) == nil {
			out = append(out, "--"+m[2])
		}
	}
	return out
}

// TestHelpNamesItsOwnFlags looks up every flag that a help text or an example
// speaks of.
func TestHelpNamesItsOwnFlags(t *testing.T) {
	for _, cmd := range everyCommand() {
		text := cmd.Short + "\n" + cmd.Long + "\n" + cmd.Example
		for _, f := range flagsOf(cmd) {
			text += "\n" + f.Usage
		}
		for _, flag := range strangers(cmd, text) {
			t.Errorf("%s: its help speaks of %s, which it does not have", cmd.CommandPath(), flag)
		}
	}
}

func TestHelpNamesItsOwnFlagsCatches(t *testing.T) {
	for _, cmd := range everyCommand() {
		if cmd.Name() == "check" && len(strangers(cmd, "with --out, or assess --out, or assess --nothing (--set)")) != 2 {
			t.Error("a flag that is none is not found")
		}
	}
}

// readmeCommand is a command line in a README: in backquotes, in a block, after
// a prompt or after "go run".
var readmeCommand = regexp.MustCompile("(?m)(?:`|^    |\\$ |cmd/)ebbline ([a-z]+)([^`\n|]*)")

// readmeFaults lists the commands and flags of a text that the program does not
// have.
func readmeFaults(text string) (faults []string, lines int) {
	root := everyCommand()[0]
	has := map[string]bool{}
	for _, cmd := range everyCommand() {
		for _, f := range flagsOf(cmd) {
			has[f.Name] = true
		}
	}
	for _, m := range readmeCommand.FindAllStringSubmatch(text, -1) {
		lines++
		cmd, _, err := root.Find([]string{m[1]})
		if err != nil || cmd == root {
			faults = append(faults, "ebbline "+m[1])
			continue
		}
		for _, flag := range strangers(cmd, m[2]) {
			faults = append(faults, "ebbline "+m[1]+" "+flag)
		}
	}
	for _, m := range regexp.MustCompile("`--([a-z][a-z-]*)").FindAllStringSubmatch(text, -1) {
		if !has[m[1]] {
			faults = append(faults, "--"+m[1])
		}
	}
	return faults, lines
}

// TestReadmeNamesWhatThereIs looks up every command line and flag of the README.
func TestReadmeNamesWhatThereIs(t *testing.T) {
	text, err := os.ReadFile(filepath.Join("..", "..", "README.md"))
	if err != nil {
		t.Fatal(err)
	}
	faults, lines := readmeFaults(string(text))
	for _, f := range faults {
		t.Errorf("the README names %s, which there is not", f)
	}
	if lines < 10 {
		t.Errorf("only %d command lines found: the reading is broken", lines)
	}
	planted := "`ebbline assay x` and `ebbline assess x --exactly`, `--nothing`\n    go run ./cmd/ebbline run\n$ ebbline walk\n"
	if faults, _ := readmeFaults(planted); len(faults) != 5 {
		t.Errorf("of five planted faults it finds %v", faults)
	}
}

// made is how the files come about that examples begin from.
var made = map[string][]string{
	"heron.toml":    {"example marsh-heron heron.toml"},
	"goat.toml":     {"example upland-goat goat.toml"},
	"heron.xlsx":    {"assess --example marsh-heron --out heron.xlsx --replicates 64 --quiet"},
	"goat-1.ledger": {"sweep --example upland-goat --shard 1/2 --ledger goat-1.ledger --replicates 32 --quiet"},
	"goat-2.ledger": {"sweep --example upland-goat --shard 2/2 --ledger goat-2.ledger --replicates 32 --quiet"},
	"goat.job": {
		"sweep --example upland-goat --slurm goat.job --shards 1 --program ebbline --replicates 32 --quiet",
		"sweep --slurm goat.job --shard 1",
	},
}

// readers are the commands whose arguments are files to be read.
var readers = []string{"assess", "exact", "check", "sweep", "minimum", "fit", "rerun", "merge"}

// TestExamplesRun runs every example of every help, in order, in a folder with
// the files that they begin from, and wants each to end well. A run takes few
// replicates.
func TestExamplesRun(t *testing.T) {
	var counts strings.Builder
	counts.WriteString("year,count\n")
	for i, n := range []int{74, 81, 77, 92, 88, 103, 95, 110, 98, 121, 109, 118, 130, 117, 126, 141, 133, 128, 145, 139} {
		fmt.Fprintf(&counts, "%d,%d\n", 2001+i, n)
	}
	ran := 0
	for _, cmd := range everyCommand() {
		examples := exampleLines(cmd)
		if len(examples) == 0 {
			continue
		}
		t.Run(cmd.Name(), func(t *testing.T) {
			t.Chdir(t.TempDir())
			if err := os.WriteFile("counts.csv", []byte(counts.String()), 0o666); err != nil {
				t.Fatal(err)
			}
			standInForSlurm(t)
			for _, line := range examples {
				runExample(t, line)
				ran++
			}
		})
	}
	if ran < 20 {
		t.Errorf("only %d examples were run", ran)
	}
}

// standInForSlurm puts a program first in the path that takes a job and leaves
// it: an example is not to be queued on the cluster where it is tested.
func standInForSlurm(t *testing.T) {
	t.Helper()
	dir := t.TempDir()
	if err := os.WriteFile(filepath.Join(dir, "sbatch"), []byte("#!/bin/sh\necho 4711\n"), 0o777); err != nil {
		t.Fatal(err)
	}
	t.Setenv("PATH", dir+string(os.PathListSeparator)+os.Getenv("PATH"))
}

// exampleLines are the command lines of a help's examples and of its "Begin
// with".
func exampleLines(cmd *cobra.Command) []string {
	var out []string
	for _, m := range regexp.MustCompile(`(?m)^(?:Begin with:)? +ebbline (.*)$`).FindAllStringSubmatch(cmd.Long+"\n"+cmd.Example, -1) {
		out = append(out, m[1])
	}
	return out
}

func runExample(t *testing.T, line string) {
	t.Helper()
	args, ok := splitArgs(line)
	if !ok {
		t.Fatalf("cannot be read: %s", line)
	}
	cmd, rest, err := everyCommand()[0].Find(args)
	if err != nil {
		t.Fatal(err)
	}
	if err := cmd.ParseFlags(rest); err != nil {
		t.Fatalf("ebbline %s: %v", line, err)
	}
	for _, file := range cmd.Flags().Args() {
		if _, err := os.Stat(file); err == nil || !slices.Contains(readers, cmd.Name()) {
			continue
		}
		if made[file] == nil {
			t.Fatalf("ebbline %s: it begins from %s; say in `made` how that comes about", line, file)
		}
		for _, line := range made[file] {
			quietly(t, strings.Fields(line))
		}
	}
	ofCase := cmd.Flags().NArg() > 0 || cmd.Flags().Changed("example")
	if f := cmd.Flags().Lookup("replicates"); f != nil && !f.Changed && ofCase {
		args = append(args, "--replicates", "32")
	}
	if f := cmd.Flags().Lookup("slurm"); f != nil && f.Changed {
		args = append(args, "--program", "ebbline") // not this test
	}
	if out := quietly(t, args); out == "" {
		t.Errorf("ebbline %s: prints nothing", line)
	}
}

// quietly runs a command line that must end well, and gives what it prints.
func quietly(t *testing.T, args []string) string {
	t.Helper()
	var out, errs bytes.Buffer
	if code := run(args, strings.NewReader(""), &out, &errs); code != 0 {
		t.Fatalf("ebbline %s: exit status %d\n%s%s", strings.Join(args, " "), code, out.String(), errs.String())
	}
	return out.String()
}
