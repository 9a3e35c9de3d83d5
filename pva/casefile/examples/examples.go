// Package examples holds the built-in cases. Places, people and figures in them
// are invented. The command line lists them, writes them out and runs them with
// --example; tests run them all.
package examples

import (
	"embed"
	"fmt"
	"strings"
)

//go:embed *.toml
var files embed.FS

// Names is the names of the built-in cases in alphabetical order.
func Names() []string {
	all, err := files.ReadDir(".")
	if err != nil {
		panic("examples: " + err.Error()) // they are part of the program
	}
	names := make([]string, len(all))
	for i, f := range all {
		names[i] = strings.TrimSuffix(f.Name(), ".toml")
	}
	return names
}

// Get is the text of a built-in case as a case file.
func Get(name string) ([]byte, error) {
	data, err := files.ReadFile(name + ".toml")
	if err != nil || strings.ContainsAny(name, `/\`) {
		return nil, fmt.Errorf("there is no built-in case %q; there are %s", name, strings.Join(Names(), ", "))
	}
	return data, nil
}
