package main

import (
	"strconv"
	"strings"

	"ebbline/pva"

	"github.com/spf13/cobra"
)

// settings completes the key of --set, and after the "=" the words that the key
// takes. The rows of [[harvest]] and the like have the names of the case that
// the command line names; without one there are no rows to set.
func settings(cmd *cobra.Command, args []string, begun string) ([]cobra.Completion, cobra.ShellCompDirective) {
	quiet := cobra.ShellCompDirectiveNoFileComp | cobra.ShellCompDirectiveNoSpace
	var c *pva.Case
	named, err := cmd.Flags().GetString("example")
	if err == nil && (named != "" || len(args) == 1) {
		in := caseInput{example: named, flags: cmd.Flags()}
		if c, _, err = in.read(args); err != nil {
			c = nil
		}
	}
	var out []cobra.Completion
	for _, s := range settable(c) {
		if key, _, value := strings.Cut(begun, "="); value {
			if s.path == key {
				for _, word := range words(s.key) {
					out = append(out, key+"="+word)
				}
				return startingWith(out, begun), cobra.ShellCompDirectiveNoFileComp
			}
			continue
		}
		if strings.HasPrefix(s.path, begun) {
			out = append(out, cobra.CompletionWithDesc(s.path+"=", describe(s.key)))
		}
	}
	return out, quiet
}

func startingWith(list []cobra.Completion, begun string) []cobra.Completion {
	var out []cobra.Completion
	for _, s := range list {
		if strings.HasPrefix(s, begun) {
			out = append(out, s)
		}
	}
	return out
}

// words are the values of a key that can be listed.
func words(k *pva.Key) []string {
	if len(k.Choices) > 0 {
		return k.Choices
	}
	if _, isFlag := k.Default.(bool); isFlag {
		return []string{"true", "false"}
	}
	return nil
}

func describe(k *pva.Key) string {
	if k.Unit == "" || k.Unit == "years" && strings.Contains(k.Doc, "years") {
		return k.Doc
	}
	return k.Doc + " (" + k.Unit + ")"
}

// setting is a path that --set takes, and its key.
type setting struct {
	path string
	key  *pva.Key
}

// settable are the paths that --set takes for a case, in the order of the key
// table. A list is set as a whole. Without a case there are no rows.
func settable(c *pva.Case) []setting {
	rows := map[string]int{}
	if c != nil {
		for _, e := range c.Entries() {
			if parts := strings.SplitN(e.Path, ".", 3); len(parts) == 3 && pva.IsArrayTable(parts[0]) {
				if n, err := strconv.Atoi(parts[1]); err == nil {
					rows[parts[0]] = max(rows[parts[0]], n)
				}
			}
		}
	}
	var out []setting
	seen := map[string]bool{}
	add := func(path string, k *pva.Key) {
		if !seen[path] {
			seen[path] = true
			out = append(out, setting{path, k})
		}
	}
	for _, k := range pva.Keys() {
		table, rest, inRow := strings.Cut(k.Path, ".*.")
		if !pva.IsArrayTable(table) {
			list, _, _ := strings.Cut(k.Path, ".*")
			add(list, k)
			continue
		}
		if !inRow || rest == "name" {
			continue // what a row is called is how it is found
		}
		list, _, _ := strings.Cut(rest, ".*")
		for n := 1; n <= rows[table]; n++ {
			path := table + "." + strconv.Itoa(n) + "." + list
			if named := c.Display(path); quoteArg(named) == named {
				path = named // one that a shell takes without quotes
			}
			add(path, k)
		}
	}
	return out
}
