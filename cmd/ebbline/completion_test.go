package main

import (
	"bytes"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"ebbline/pva"
	"ebbline/pva/casefile/examples"

	"github.com/spf13/cobra"
)

// complete is what a shell is offered for a command line whose last word is
// begun, and how it is told to go on.
func complete(t *testing.T, words ...string) (offers []string, directive string) {
	t.Helper()
	var out, errs bytes.Buffer
	if code := run(append([]string{cobra.ShellCompNoDescRequestCmd}, words...), strings.NewReader(""), &out, &errs); code != 0 {
		t.Fatalf("exit status %d\n%s", code, errs.String())
	}
	lines := strings.Split(strings.TrimRight(out.String(), "\n"), "\n")
	return lines[:len(lines)-1], lines[len(lines)-1]
}

// TestCompletion asks as the shells' scripts do. The directives are those of
// the command library: 0 files, 4 no files, 6 no files and no space after it,
// 8 files with these endings, 16 folders.
func TestCompletion(t *testing.T) {
	t.Chdir(t.TempDir())
	heron, err := examples.Get("marsh-heron")
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile("heron.toml", heron, 0o666); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile("broken.toml", []byte("[births\n"), 0o666); err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct{ line, want, directive string }{
		{"ass", "assess", ":4"},
		{"help ver", "version", ":4"},
		{"completion ", "bash zsh fish powershell", ":4"},
		{"assess ", "toml xlsx", ":8"},
		{"assess heron.toml ", "", ":4"},
		{"assess --example marsh-heron ", "", ":4"},
		{"sweep --example m", "marsh-heron meadow-bee", ":4"},
		{"example river", "river-cod", ":4"},
		{"example river-cod ", "toml", ":8"},
		{"fit ", "csv xlsx", ":8"},
		{"fit counts.csv --breeding ", "pulse flow", ":4"},
		{"fit counts.csv --write ", "toml", ":8"},
		{"rerun ", "xlsx", ":8"},
		{"new ", "toml xlsx", ":8"},
		{"merge ", "", ":16"},
		{"merge one two ", "", ":16"},
		{"man ", "", ":16"},
		{"man manual ", "", ":4"},
		{"assess --out ", "xlsx", ":8"},
		{"assess --json ", "", ":0"},
		{"assess --csv ", "", ":16"},
		{"assess --workers ", "", ":4"},
		{"assess --set births.br", "births.breeding=", ":6"},
		{"assess --set births.breeding=", "births.breeding=pulse births.breeding=flow", ":4"},
		{"assess --set run.baseline=f", "run.baseline=false", ":4"},
		{"assess --set births.rate=", "", ":4"},
		{"assess --set births.st", "births.steps=", ":6"}, // a list is set as a whole
		{"assess --set harvest.", "", ":6"},               // of no case
		{"assess --example marsh-heron --set harvest.control.take", "harvest.control.take= harvest.control.takes= harvest.control.take_cv= harvest.control.take_noise=", ":6"},
		{"assess --example marsh-heron --set harvest.control.n", "", ":6"}, // no name is set
		{"assess heron.toml --set harvest.control.when=", "harvest.control.when=start harvest.control.when=end harvest.control.when=through", ":4"},
		{"assess broken.toml --set weather.", "weather.correlation= weather.memory=", ":6"},
		{"assess none.toml --set harvest.", "", ":6"},
	} {
		offers, directive := complete(t, strings.Split(c.line, " ")...)
		if got := strings.Join(offers, " "); got != c.want || directive != c.directive {
			t.Errorf("%q: offers %q %s, want %q %s", c.line, got, directive, c.want, c.directive)
		}
	}
}

// TestCompletionOffersOnlyWhatIsTaken sets every key that is offered for a case
// to a value of its kind, and wants none to be unknown.
func TestCompletionOffersOnlyWhatIsTaken(t *testing.T) {
	for _, name := range examples.Names() {
		offers, _ := complete(t, "check", "--example", name, "--set", "")
		if len(offers) < 60 {
			t.Fatalf("%s: only %d keys are offered", name, len(offers))
		}
		in := caseInput{example: name, flags: newRoot(&app{}).Flags()}
		c, _, err := in.read(nil)
		if err != nil {
			t.Fatal(err)
		}
		for _, offer := range offers {
			path := strings.TrimSuffix(offer, "=")
			if at, fault := c.Lookup(path); fault != nil {
				t.Errorf("%s: %s is offered and not found: %v", name, path, fault)
			} else if !known(at) {
				t.Errorf("%s: %s is offered and no key", name, path)
			}
		}
		// What the case itself says can be set, but for names, options and elements.
		for _, e := range c.Entries() {
			table, _, _ := strings.Cut(e.Path, ".")
			key, _ := pva.Find(e.Path)
			if table == "option" || key == nil || strings.HasSuffix(e.Path, ".name") || strings.HasSuffix(key.Path, "*") || strings.Contains(key.Path, ".steps.") {
				continue
			}
			if !slices.Contains(offers, c.Display(e.Path)+"=") && !slices.Contains(offers, e.Path+"=") {
				t.Errorf("%s: %s is in the case and not offered", name, c.Display(e.Path))
			}
		}
	}
}

// known says whether a path is that of a key or of a list of keys.
func known(path string) bool {
	for _, tail := range []string{"", ".1", ".1.1", ".1.from", ".1.factor"} {
		if k, _ := pva.Find(path + tail); k != nil {
			return true
		}
	}
	return false
}

// TestCompletionScripts has bash read its own script, and finds the program's
// name in the others.
func TestCompletionScripts(t *testing.T) {
	for _, shell := range []string{"bash", "zsh", "fish", "powershell"} {
		var out, errs bytes.Buffer
		if code := run([]string{"completion", shell}, strings.NewReader(""), &out, &errs); code != 0 || !strings.Contains(out.String(), "ebbline") || out.Len() < 1000 {
			t.Errorf("completion %s: exit status %d, %d bytes\n%s", shell, code, out.Len(), errs.String())
		}
		if program, err := exec.LookPath(shell); err == nil && shell == "bash" {
			path := filepath.Join(t.TempDir(), "script")
			if err := os.WriteFile(path, out.Bytes(), 0o666); err != nil {
				t.Fatal(err)
			}
			if said, err := exec.Command(program, "-n", path).CombinedOutput(); err != nil {
				t.Errorf("bash cannot read its script: %v\n%s", err, said)
			}
		}
	}
	var out, errs bytes.Buffer
	if code := run([]string{"completion", "abacus"}, strings.NewReader(""), &out, &errs); code != statusBadInput || out.Len() > 0 {
		t.Errorf("a shell that is none: exit status %d, %d bytes written", code, out.Len())
	}
}
