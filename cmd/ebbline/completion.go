package main

import (
	"strings"

	"ebbline/pva/casefile"
	"ebbline/pva/casefile/examples"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"
)

// newCompletion stands in place of the command library's own command of the
// same name, which is one command a shell with a page each.
func newCompletion(a *app) *cobra.Command {
	shells := map[string]func(*cobra.Command) error{
		"bash":       func(root *cobra.Command) error { return root.GenBashCompletionV2(a.out, true) },
		"zsh":        func(root *cobra.Command) error { return root.GenZshCompletion(a.out) },
		"fish":       func(root *cobra.Command) error { return root.GenFishCompletion(a.out, true) },
		"powershell": func(root *cobra.Command) error { return root.GenPowerShellCompletionWithDesc(a.out) },
	}
	return &cobra.Command{
		Use:   "completion SHELL",
		Short: "Print the script by which a shell completes command lines",
		Long: `Prints a script for one shell: bash, zsh, fish or powershell. With it the Tab
key completes commands, flags, the names of the built-in cases, the keys of a
case (assess --set), and the files that a command reads.

For the shell that is open:

  bash         source <(ebbline completion bash)
  zsh          source <(ebbline completion zsh)
  fish         ebbline completion fish | source
  powershell   ebbline completion powershell | Out-String | iex

For every shell to come, put that line at the end of ~/.bashrc, ~/.zshrc,
~/.config/fish/config.fish or the file that $PROFILE names. In bash the package
bash-completion must be installed; in zsh "autoload -U compinit; compinit" must
stand before the line.`,
		Example:   "  ebbline completion bash",
		Args:      cobra.ExactArgs(1),
		ValidArgs: []string{"bash", "zsh", "fish", "powershell"},
		RunE: func(cmd *cobra.Command, args []string) error {
			script, ok := shells[args[0]]
			if !ok {
				return badInputf("there is no completion for %q; there is for bash, zsh, fish and powershell", args[0])
			}
			return script(cmd.Root())
		},
	}
}

// completed are the arguments that a command completes, one after the other;
// the last one goes on for a command that takes any number of them.
var completed = map[string][]cobra.CompletionFunc{
	"assess":  {oneCase},
	"exact":   {oneCase},
	"check":   {oneCase},
	"sweep":   {oneCase},
	"minimum": {oneCase},
	"fit":     {files("csv", "xlsx")},
	"rerun":   {files("xlsx")},
	"new":     {files("toml", "xlsx")},
	"example": {exampleNames, files("toml")},
	"merge":   {folders},
	"man":     {folders},
}

// manyArguments are the commands whose last argument may stand several times.
var manyArguments = map[string]bool{"merge": true}

// addCompletions tells every command below root how its arguments and flags are
// completed.
func addCompletions(root *cobra.Command) {
	for _, cmd := range root.Commands() {
		if list := completed[cmd.Name()]; list != nil {
			many := manyArguments[cmd.Name()]
			cmd.ValidArgsFunction = func(cmd *cobra.Command, args []string, toComplete string) ([]cobra.Completion, cobra.ShellCompDirective) {
				at := len(args)
				if many {
					at = min(at, len(list)-1)
				}
				if at >= len(list) {
					return nil, cobra.ShellCompDirectiveNoFileComp
				}
				return list[at](cmd, args, toComplete)
			}
		}
		cmd.Flags().VisitAll(func(f *pflag.Flag) {
			if err := cmd.RegisterFlagCompletionFunc(f.Name, flagValue(f)); err != nil {
				panic("ebbline: completion of --" + f.Name + " twice: " + err.Error())
			}
		})
	}
}

// flagValue completes a flag by what its help calls its value.
func flagValue(f *pflag.Flag) cobra.CompletionFunc {
	value, _ := pflag.UnquoteUsage(f)
	switch {
	case f.Name == "example":
		return exampleNames
	case f.Name == "set":
		return settings
	case value == "FILE":
		return cobra.FixedCompletions(nil, cobra.ShellCompDirectiveDefault)
	case value == "DIR":
		return folders
	case strings.Contains(value, " or "):
		return cobra.FixedCompletions(strings.Split(value, " or "), cobra.ShellCompDirectiveNoFileComp)
	}
	if _, ending, ok := strings.Cut(value, "."); ok {
		return files(ending)
	}
	return cobra.NoFileCompletions
}

func files(endings ...string) cobra.CompletionFunc {
	return cobra.FixedCompletions(endings, cobra.ShellCompDirectiveFilterFileExt)
}

func folders(*cobra.Command, []string, string) ([]cobra.Completion, cobra.ShellCompDirective) {
	return nil, cobra.ShellCompDirectiveFilterDirs
}

// oneCase completes the case, unless a built-in one is named.
func oneCase(cmd *cobra.Command, _ []string, _ string) ([]cobra.Completion, cobra.ShellCompDirective) {
	if cmd.Flags().Changed("example") {
		return nil, cobra.ShellCompDirectiveNoFileComp
	}
	return []cobra.Completion{"toml", "xlsx"}, cobra.ShellCompDirectiveFilterFileExt
}

// exampleNames completes the name of a built-in case, with its title.
func exampleNames(_ *cobra.Command, _ []string, begun string) ([]cobra.Completion, cobra.ShellCompDirective) {
	var out []cobra.Completion
	for _, name := range examples.Names() {
		if !strings.HasPrefix(name, begun) {
			continue
		}
		title := ""
		if data, err := examples.Get(name); err == nil {
			if c, faults := casefile.Read(name+".toml", data); len(faults) == 0 {
				title = c.Title
			}
		}
		out = append(out, cobra.CompletionWithDesc(name, title))
	}
	return out, cobra.ShellCompDirectiveNoFileComp
}
