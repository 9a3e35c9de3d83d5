package main

import (
	"bytes"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
	"unicode/utf8"
)

// TestManPages writes the pages and reads them as text: each is there, says all
// that --help says, and carries no date.
func TestManPages(t *testing.T) {
	t.Chdir(t.TempDir())
	quietly(t, []string{"man", "manual"})
	var pages []string
	for _, cmd := range everyCommand() {
		if cmd.Name() == "help" {
			continue
		}
		name := manName(cmd) + ".1"
		pages = append(pages, name)
		data, err := os.ReadFile(filepath.Join("manual", name))
		if err != nil {
			t.Fatal(err)
		}
		page := strings.NewReplacer(`\fB`, "", `\fI`, "", `\fR`, "", `\-`, "-", `\(aq`, "'", `\(dq`, `"`, `\(ti`, "~", `\(ga`, "`").Replace(string(data))
		if !strings.HasPrefix(page, `.TH "`+strings.ToUpper(manName(cmd))+`" "1" "" "ebbline `) {
			t.Errorf("%s: its head is not one of a page without a date: %.80q", name, page)
		}
		for _, part := range []string{".SH NAME", ".SH SYNOPSIS", ".SH DESCRIPTION", ".SH OPTIONS", ".SH SEE ALSO", strings.TrimPrefix(cmd.Example, "  ")} {
			if !strings.Contains(page, part) {
				t.Errorf("%s: lacks %q", name, part)
			}
		}
		for _, f := range flagsOf(cmd) {
			_, does := flagText(f)
			if !strings.Contains(page, "--"+f.Name) || !strings.Contains(page, does) {
				t.Errorf("%s: does not explain --%s", name, f.Name)
			}
		}
	}
	files, err := os.ReadDir("manual")
	if err != nil || len(files) != len(pages) {
		t.Errorf("%d files written for %d pages: %v", len(files), len(pages), err)
	}
	// Pages are not overwritten unasked, and come out the same.
	first, _ := os.ReadFile("manual/ebbline.1")
	var out, errs bytes.Buffer
	if code := run([]string{"man", "manual"}, strings.NewReader(""), &out, &errs); code != statusBadInput || !strings.Contains(errs.String(), "--force") {
		t.Errorf("over pages that are there: exit status %d\n%s", code, errs.String())
	}
	quietly(t, []string{"man", "manual", "--force"})
	if again, _ := os.ReadFile("manual/ebbline.1"); !bytes.Equal(first, again) {
		t.Error("a page comes out otherwise the second time")
	}
}

// TestManPagesRender has groff set every page 80 columns wide and warn of
// everything.
func TestManPagesRender(t *testing.T) {
	groff, err := exec.LookPath("groff")
	if err != nil {
		t.Skip("skipped: groff is not installed")
	}
	marks := regexp.MustCompile(".\b") // how bold and underlined letters are set
	byHand := map[string][]string{}    // page -> lines that must stay lines
	for _, c := range everyCommand() {
		byHand[manName(c)+".1"] = strings.Split(c.Example, "\n")
	}
	byHand["ebbline.1"] = []string{"ebbline new mycase.toml"}
	for _, page := range manPages(everyCommand()[0]) {
		cmd := exec.Command(groff, "-man", "-ww", "-Tutf8", "-P-c", "-rLL=80n")
		cmd.Stdin = strings.NewReader(page.text)
		var out, errs bytes.Buffer
		cmd.Stdout, cmd.Stderr = &out, &errs
		if err := cmd.Run(); err != nil || errs.Len() > 0 {
			t.Errorf("%s: %v\n%s", page.name, err, errs.String())
		}
		text := marks.ReplaceAllString(out.String(), "")
		if !strings.Contains(text, "DESCRIPTION") {
			t.Fatalf("%s: is not set:\n%s", page.name, text)
		}
		has := map[string]bool{}
		for _, line := range strings.Split(text, "\n") {
			has[strings.TrimSpace(line)] = true
			if utf8.RuneCountInString(line) > 80 {
				t.Errorf("%s: %d columns: %q", page.name, utf8.RuneCountInString(line), line)
			}
		}
		for _, line := range byHand[page.name] {
			if line = strings.TrimSpace(line); !has[line] {
				t.Errorf("%s: has no line %q", page.name, line)
			}
		}
	}
}

func TestRoffMeansItself(t *testing.T) {
	for text, want := range map[string]string{
		`.not a request`:    `\&.not a request`,
		`'nor this`:         `\(aqnor this`,
		`--force \ "a" ~/b`: `\-\-force \e \(dqa\(dq \(ti/b`,
	} {
		if got := roff(text); got != want {
			t.Errorf("%q gives %q, want %q", text, got, want)
		}
	}
}
