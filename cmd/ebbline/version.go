package main

import (
	"fmt"
	"runtime"

	"ebbline/pva"

	"github.com/spf13/cobra"
)

func newVersion(a *app) *cobra.Command {
	return &cobra.Command{
		Use:   "version",
		Short: "Print the version",
		Args:  cobra.NoArgs,
		RunE: func(*cobra.Command, []string) error {
			_, err := fmt.Fprintf(a.out, "ebbline %s (%s, %s/%s)\n", pva.Version, runtime.Version(), runtime.GOOS, runtime.GOARCH)
			return err
		},
	}
}
