package main

import (
	_ "embed"
	"fmt"
	"runtime"
	"runtime/debug"

	"ebbline/pva"

	"github.com/spf13/cobra"
)

// notices are the licences of everything that is built into the program, as
// .ci/notices gathers them.
//
//go:embed notices.txt
var notices string

func newVersion(a *app) *cobra.Command {
	var licences bool
	cmd := &cobra.Command{
		Use:   "version",
		Short: "Print the version, what it was built from, and the licences",
		Long: `Prints the version, with the Go version and the platform it was built for, and
the revision it was built from where that is known. The same version, case and
seed give the same counts on every platform.

With --licences it prints the licence of ebbline, and those of the modules and
fonts that are built into it, with their versions.`,
		Example: "  ebbline version\n  ebbline version --licences",
		Args:    cobra.NoArgs,
		RunE: func(*cobra.Command, []string) error {
			if licences {
				a.say(false, notices)
				return nil
			}
			info, _ := debug.ReadBuildInfo()
			a.say(false, versionLine()+builtFrom(info))
			return nil
		},
	}
	cmd.Flags().BoolVar(&licences, "licences", false, "print the licences of everything that is built in")
	return cmd
}

func versionLine() string {
	return fmt.Sprintf("ebbline %s (%s, %s/%s)\n", pva.Version, runtime.Version(), runtime.GOOS, runtime.GOARCH)
}

// builtFrom says which source a program was built from, as far as the build
// recorded it. It has no clock: the time is that of the revision.
func builtFrom(info *debug.BuildInfo) string {
	if info == nil {
		return "module    ebbline\nrevision  not recorded\n"
	}
	set := map[string]string{}
	for _, s := range info.Settings {
		set[s.Key] = s.Value
	}
	module := "module    " + info.Main.Path
	if v := info.Main.Version; v != "" && v != "(devel)" {
		module += " " + v
	}
	module += "\n"
	revision := set["vcs.revision"]
	if revision == "" {
		return module + "revision  not recorded\n"
	}
	if t := set["vcs.time"]; t != "" {
		revision += " of " + t
	}
	if set["vcs.modified"] == "true" {
		revision += ", with changes"
	}
	return module + "revision  " + revision + "\n"
}
