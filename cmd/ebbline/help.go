package main

import (
	"fmt"
	"io"
	"strings"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"
)

// The page of --help: no line is longer than helpWidth, and what a flag does
// begins in one column, at flagColumn or before.
const (
	helpWidth  = 80
	flagColumn = 28
)

func newHelp() *cobra.Command {
	return &cobra.Command{
		Use:     "help [COMMAND]",
		Short:   "Say more about a command",
		Long:    "Says what a command does and which flags it takes, as its --help does; without\na command, which commands there are.",
		Example: "  ebbline help assess",
		Args:    cobra.MaximumNArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			about, _, err := cmd.Root().Find(args)
			if err != nil {
				return err
			}
			return about.Help()
		},
		ValidArgsFunction: func(cmd *cobra.Command, args []string, begun string) ([]cobra.Completion, cobra.ShellCompDirective) {
			var out []cobra.Completion
			for _, c := range shownCommands(cmd.Root()) {
				if len(args) == 0 && strings.HasPrefix(c.Name(), begun) {
					out = append(out, cobra.CompletionWithDesc(c.Name(), c.Short))
				}
			}
			return out, cobra.ShellCompDirectiveNoFileComp
		},
	}
}

// usage prints what stands under a command's description in --help. The command
// library's own lines of flags are as wide as the longest flag asks for, and
// would be broken anywhere by a terminal.
func usage(cmd *cobra.Command) error {
	var b strings.Builder
	b.WriteString("Usage:\n")
	for _, line := range usageLines(cmd) {
		b.WriteString("  " + line + "\n")
	}
	if cmd.Example != "" {
		b.WriteString("\nExamples:\n" + cmd.Example + "\n")
	}
	if subs := shownCommands(cmd); len(subs) > 0 {
		width := 0
		for _, sub := range subs {
			width = max(width, len(sub.Name()))
		}
		b.WriteString("\nCommands:\n")
		for _, sub := range subs {
			hang(&b, fmt.Sprintf("  %-*s", width, sub.Name()), sub.Short, width+4)
		}
	}
	if own := flagsOf(cmd); len(own) > 0 {
		b.WriteString("\nFlags:\n")
		b.WriteString(flagLines(own))
	}
	if cmd.HasAvailableSubCommands() {
		fmt.Fprintf(&b, "\n`%s COMMAND --help` says more about a command.\n", cmd.CommandPath())
	}
	_, err := io.WriteString(cmd.OutOrStderr(), b.String())
	return err
}

// usageLines are the forms in which a command is called.
func usageLines(cmd *cobra.Command) []string {
	line := cmd.UseLine()
	if !cmd.HasAvailableSubCommands() {
		return []string{line}
	}
	return []string{cmd.CommandPath() + " COMMAND"}
}

// shownCommands are the commands below one that are offered to people.
func shownCommands(cmd *cobra.Command) []*cobra.Command {
	var out []*cobra.Command
	for _, sub := range cmd.Commands() {
		if sub.IsAvailableCommand() || sub.Name() == "help" {
			out = append(out, sub)
		}
	}
	return out
}

// flagsOf are the flags that a command takes, in alphabetical order.
func flagsOf(cmd *cobra.Command) []*pflag.Flag {
	cmd.InitDefaultHelpFlag()
	var out []*pflag.Flag
	cmd.Flags().VisitAll(func(f *pflag.Flag) {
		if !f.Hidden && f.Deprecated == "" {
			out = append(out, f)
		}
	})
	return out
}

// flagText is a flag as it is written on a command line with its value by name,
// and what it does.
func flagText(f *pflag.Flag) (value, does string) {
	value, does = pflag.UnquoteUsage(f)
	switch value {
	case "int", "uint", "float":
		value = "NUMBER"
	}
	switch f.DefValue {
	case "", "0", "[]", "false":
	default:
		does += " (default " + f.DefValue + ")"
	}
	return value, does
}

// flagLines is the table of the flags.
func flagLines(flags []*pflag.Flag) string {
	left := make([]string, len(flags))
	column := 0
	for i, f := range flags {
		left[i] = "      --" + f.Name
		if f.Shorthand != "" {
			left[i] = "  -" + f.Shorthand + ", --" + f.Name
		}
		if value, _ := flagText(f); value != "" {
			left[i] += " " + value
		}
		if n := len(left[i]) + 2; n <= flagColumn {
			column = max(column, n)
		}
	}
	var b strings.Builder
	for i, f := range flags {
		_, does := flagText(f)
		hang(&b, left[i], does, column)
	}
	return b.String()
}

// hang writes text beside a head, all of it from one column on; a head that
// reaches into the column has a line of its own.
func hang(b *strings.Builder, head, text string, column int) {
	if len(head)+2 > column {
		b.WriteString(head + "\n")
		head = ""
	}
	line := fmt.Sprintf("%-*s", column, head)
	empty := true
	for _, word := range strings.Fields(text) {
		if !empty && len(line)+1+len(word) > helpWidth {
			b.WriteString(line + "\n")
			line, empty = strings.Repeat(" ", column), true
		}
		if !empty {
			line += " "
		}
		line += word
		empty = false
	}
	b.WriteString(strings.TrimRight(line, " ") + "\n")
}
