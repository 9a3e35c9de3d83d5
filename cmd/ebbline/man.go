package main

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"

	"ebbline/pva"
	"ebbline/reports"

	"github.com/spf13/cobra"
)

func newMan(a *app) *cobra.Command {
	var force bool
	cmd := &cobra.Command{
		Use:   "man DIR",
		Short: "Write the manual pages into a folder",
		Long: `Writes the manual pages, ebbline.1 and one for each command (ebbline-assess.1),
into the folder DIR, which is made if it is not there. They say what --help
says, and are the same bytes for the same version.

To look at one of them:  man -l DIR/ebbline-assess.1

In a folder man1 of the manual's path they are found by name, as is
~/.local/share/man/man1 on most systems.`,
		Example: "  ebbline man manual",
		Args:    cobra.ExactArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			pages := manPages(cmd.Root())
			if !force {
				for _, p := range pages {
					path := filepath.Join(args[0], p.name)
					if _, err := os.Stat(path); err == nil {
						return badInputf("%s exists; use --force to replace it", path)
					}
				}
			}
			if err := os.MkdirAll(args[0], 0o777); err != nil {
				return plainPathError(err)
			}
			for _, p := range pages {
				if err := reports.Save(filepath.Join(args[0], p.name), []byte(p.text)); err != nil {
					return err
				}
			}
			a.say(false, fmt.Sprintf("Wrote %d pages into %s. Look at one with: man -l %s\n", len(pages), args[0], quoteArg(filepath.Join(args[0], pages[0].name))))
			return nil
		},
	}
	cmd.Flags().BoolVar(&force, "force", false, "overwrite existing pages")
	return cmd
}

// manPage is one page, in the man macros of roff.
type manPage struct{ name, text string }

// manPages are the pages of the whole program, its own first. They are written
// here and not by the command library, whose pages come by way of Markdown and
// two more modules, call every value of a flag by its default, and carry a date.
func manPages(root *cobra.Command) []manPage {
	pages := []manPage{{"ebbline.1", manText(root)}}
	for _, cmd := range root.Commands() {
		if cmd.IsAvailableCommand() {
			pages = append(pages, manPage{manName(cmd) + ".1", manText(cmd)})
		}
	}
	return pages
}

func manName(cmd *cobra.Command) string { return strings.ReplaceAll(cmd.CommandPath(), " ", "-") }

// manText is the page of one command. Its date is left empty: the version says
// which program it describes.
func manText(cmd *cobra.Command) string {
	var b strings.Builder
	line := func(format string, args ...any) { fmt.Fprintf(&b, format+"\n", args...) }
	name := manName(cmd)
	line(`.TH "%s" "1" "" "ebbline %s" "ebbline"`, roff(strings.ToUpper(name)), pva.Version)
	line(".ad l\n.nh") // words of a command line are not to be stretched or split
	line(".SH NAME\n%s \\- %s", roff(name), roff(lowered(strings.TrimSuffix(cmd.Short, "."))))
	line(".SH SYNOPSIS")
	for _, use := range usageLines(cmd) {
		path := cmd.CommandPath()
		line("\\fB%s\\fR%s", roff(path), roffValues(strings.TrimPrefix(use, path)))
	}
	line(".SH DESCRIPTION")
	status := ""
	for i, part := range strings.Split(cmd.Long, "\n\n") {
		if rest, ok := strings.CutPrefix(part, "Exit status: "); ok {
			status = rest
			continue
		}
		if i > 0 {
			line(".PP")
		}
		b.WriteString(roffPart(part))
	}
	if subs := shownCommands(cmd); len(subs) > 0 {
		line(".SH COMMANDS")
		for _, sub := range subs {
			line(".TP\n\\fB%s\\fR\n%s", roff(sub.Name()), roff(sub.Short))
		}
	}
	line(".SH OPTIONS")
	for _, f := range flagsOf(cmd) {
		value, does := flagText(f)
		head := `\fB` + roff("--"+f.Name) + `\fR`
		if f.Shorthand != "" {
			head = `\fB` + roff("-"+f.Shorthand) + `\fR, ` + head
		}
		if value != "" {
			head += ` \fI` + roff(value) + `\fR`
		}
		line(".TP\n%s\n%s", head, roff(does))
	}
	if status != "" {
		line(".SH EXIT STATUS")
		b.WriteString(roffPart(status))
	}
	if cmd.Example != "" {
		line(".SH EXAMPLES")
		b.WriteString(roffPart(cmd.Example))
	}
	line(".SH SEE ALSO")
	line("%s", seeAlso(cmd))
	return b.String()
}

// seeAlso names the other pages.
func seeAlso(cmd *cobra.Command) string {
	var out []string
	for _, p := range append([]*cobra.Command{cmd.Root()}, cmd.Root().Commands()...) {
		if p != cmd && (p == cmd.Root() || p.IsAvailableCommand()) {
			out = append(out, `\fB`+roff(manName(p))+`\fR(1)`)
		}
	}
	return strings.Join(out, ",\n")
}

// roffPart is a paragraph; one with lines set by hand keeps them.
func roffPart(part string) string {
	lines := strings.Split(strings.Trim(part, "\n"), "\n")
	byHand := false
	for _, l := range lines {
		byHand = byHand || strings.Contains(l, "  ")
	}
	var b strings.Builder
	if byHand {
		b.WriteString(".nf\n")
	}
	for _, l := range lines {
		b.WriteString(roff(l) + "\n")
	}
	if byHand {
		b.WriteString(".fi\n")
	}
	return b.String()
}

// roffValues sets the names of values, which are in capitals, in italics.
func roffValues(s string) string {
	words := strings.Split(s, " ")
	for i, w := range words {
		if w != "" && w == strings.ToUpper(w) {
			words[i] = `\fI` + roff(w) + `\fR`
		} else {
			words[i] = roff(w)
		}
	}
	return strings.Join(words, " ")
}

// roff is text that means itself: no escapes, no requests, hyphens that can be
// copied into a command line.
func roff(s string) string {
	s = strings.NewReplacer(`\`, `\e`, "-", `\-`, "'", `\(aq`, "`", `\(ga`, "^", `\(ha`, "~", `\(ti`, `"`, `\(dq`).Replace(s)
	if strings.HasPrefix(s, ".") {
		s = `\&` + s
	}
	return s
}

func lowered(s string) string { return strings.ToLower(s[:1]) + s[1:] }
