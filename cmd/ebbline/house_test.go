package main

import (
	"go/parser"
	"go/token"
	"io/fs"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
)

// mayImport is the house: which rooms of this module each room's program code
// may import. The way of the data is one way. DEVELOPERS.md explains it.
var mayImport = map[string][]string{
	"rng":                       {"rng/portable"},
	"rng/portable":              {},
	"pva":                       {},
	"pva/rates":                 {"pva", "rng/portable"},
	"pva/casefile":              {"pva", "pva/rates"},
	"pva/casefile/examples":     {},
	"pva/casefile/sheet":        {"pva", "pva/casefile"},
	"pva/ensemble":              {"pva"},
	"pva/year":                  {"pva", "pva/rates", "pva/ensemble", "rng", "rng/portable"},
	"pva/exact":                 {"pva", "pva/rates"},
	"pva/estimate":              {"pva"},
	"pva/assess":                {"pva", "pva/draws", "pva/rates", "pva/year", "pva/ensemble", "pva/exact", "pva/estimate"},
	"pva/plain":                 {"pva"},
	"reports":                   {"pva", "pva/estimate", "pva/sweep"},
	"reports/internal/invented": {"pva", "pva/estimate"}, // an assessment for tests of the renderers
	"pva/sweep":                 {"pva", "pva/rates", "pva/year", "pva/ensemble", "pva/exact", "pva/estimate", "pva/assess", "pva/sweep/ledger"},
	"pva/sweep/ledger":          {"pva"},
	"pva/sweep/cluster":         {"pva/sweep", "pva/sweep/ledger"},
	"pva/draws":                 {"pva", "pva/rates", "rng"},
	"pva/fit":                   {"pva", "pva/estimate", "pva/rates", "rng"},
	"reports/figure":            {"reports", "pva"},
	"reports/workbook":          {"reports", "pva"},
	"reports/text":              {"reports", "pva", "pva/rates", "pva/sweep", "pva/fit"},
	"reports/tidy":              {"reports", "pva", "pva/sweep", "pva/fit"},
	"cmd/ebbline":               {"pva", "pva/assess", "pva/casefile", "pva/casefile/examples", "pva/casefile/sheet", "pva/estimate", "pva/exact", "pva/rates", "pva/sweep", "pva/sweep/ledger", "pva/sweep/cluster", "pva/fit", "reports", "reports/text", "reports/tidy", "reports/workbook", "reports/figure"},
}

// testsMayImport adds what test files may import besides.
var testsMayImport = []string{"pva", "pva/rates", "pva/year", "pva/ensemble", "pva/estimate", "pva/exact", "pva/plain", "pva/casefile", "pva/casefile/examples", "pva/assess", "pva/sweep", "rng", "rng/portable", "reports", "reports/internal/invented"}

// onlyHere are outside packages that one room alone may import.
var onlyHere = map[string]string{
	"golang.org/x/exp/rand":         "rng",
	"github.com/spf13/cobra":        "cmd/ebbline",
	"github.com/pelletier/go-toml/": "pva/casefile",
}

// TestHouse reads the imports of every file and fails on an edge that the house
// does not have.
func TestHouse(t *testing.T) {
	root := filepath.Join("..", "..")
	files := 0
	err := filepath.WalkDir(root, func(path string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		if d.IsDir() && strings.HasPrefix(d.Name(), ".") && len(d.Name()) > 2 {
			return filepath.SkipDir
		}
		if d.IsDir() || !strings.HasSuffix(path, ".go") {
			return nil
		}
		files++
		src, err := os.ReadFile(path)
		if err != nil {
			return err
		}
		rel, _ := filepath.Rel(root, path)
		for _, fault := range houseFaults(filepath.ToSlash(rel), src) {
			t.Error(fault)
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	if files < 50 {
		t.Fatalf("only %d files read: the walk is broken", files)
	}
}

// houseFaults lists what one file imports and may not.
func houseFaults(rel string, src []byte) []string {
	f, err := parser.ParseFile(token.NewFileSet(), rel, src, parser.ImportsOnly)
	if err != nil {
		return []string{err.Error()}
	}
	room := filepath.ToSlash(filepath.Dir(rel))
	allowed, known := mayImport[room]
	if !known {
		return []string{rel + ": the room " + room + " is not in the house (mayImport)"}
	}
	test := strings.HasSuffix(rel, "_test.go")
	var faults []string
	for _, spec := range f.Imports {
		path, _ := strconv.Unquote(spec.Path.Value)
		for outside, only := range onlyHere {
			if strings.HasPrefix(path, outside) && room != only {
				faults = append(faults, rel+" imports "+path+", which only "+only+" may")
			}
		}
		inside, ours := strings.CutPrefix(path, "ebbline/")
		if !ours || inside == room {
			continue
		}
		if !contains(allowed, inside) && !(test && contains(testsMayImport, inside)) {
			faults = append(faults, rel+" imports "+inside+": the house has no such edge")
		}
	}
	return faults
}

func contains(list []string, s string) bool {
	for _, x := range list {
		if x == s {
			return true
		}
	}
	return false
}

// TestHouseCatches plants forbidden imports and wants each to be found.
func TestHouseCatches(t *testing.T) {
	for _, plant := range []struct{ file, path string }{
		{"pva/case.go", "ebbline/pva/rates"},
		{"pva/year/flow.go", "ebbline/pva/plain"},
		{"pva/assess/assess.go", "ebbline/cmd/ebbline"},
		{"pva/year/flow.go", "golang.org/x/exp/rand"},
		{"pva/new/file.go", "fmt"},
	} {
		if len(houseFaults(plant.file, []byte("package x\nimport _ \""+plant.path+"\"\n"))) == 0 {
			t.Errorf("%s may import %s unseen", plant.file, plant.path)
		}
	}
}
