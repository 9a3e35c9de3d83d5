package main

import (
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"

	"ebbline/pva"
	"ebbline/pva/casefile"
	"ebbline/pva/casefile/examples"
	"ebbline/pva/casefile/sheet"

	"github.com/spf13/pflag"
)

// caseInput is where a command's case comes from: a file or a built-in example,
// with what the command line sets over it.
type caseInput struct {
	example    string
	set        []string
	replicates int64
	seed       uint64
	flags      *pflag.FlagSet
}

func (in *caseInput) addFlags(f *pflag.FlagSet) {
	in.flags = f
	f.StringVar(&in.example, "example", "", "take a built-in case by `NAME` instead of a file (ebbline example lists them)")
	f.StringArrayVar(&in.set, "set", nil, "set one value of the case, `KEY=VALUE`, recorded in the report (repeatable)")
	f.Int64Var(&in.replicates, "replicates", 0, "how often the case is simulated (default: as in the case)")
	f.Uint64Var(&in.seed, "seed", 0, "the seed of the random numbers (default: as in the case)")
}

// largestCase is more than any case needs and less than would hurt to read.
const largestCase = 4 << 20

// read reads and checks the case. The name is the file as given, or the
// example's name with .toml.
func (in *caseInput) read(args []string) (c *pva.Case, name string, err error) {
	var data []byte
	switch {
	case in.example != "" && len(args) > 0:
		return nil, "", badInputf("give either a case file or --example, not both")
	case in.example != "":
		data, err = examples.Get(in.example)
		if err != nil {
			return nil, "", badInput{err}
		}
		name = in.example + ".toml"
	case len(args) == 0:
		return nil, "", badInputf("name a case file, or use --example NAME (%s)", strings.Join(examples.Names(), ", "))
	default:
		name = args[0]
		most := int64(largestCase)
		if isWorkbook(name) {
			most = sheet.LargestFile
		}
		if data, err = readBounded(name, most); err != nil {
			return nil, "", badInput{err}
		}
	}
	readCase := casefile.Read
	if isWorkbook(name) {
		readCase = sheet.Read
	}
	c, faults := readCase(name, data)
	if len(faults) > 0 {
		return nil, "", faults
	}
	settings, err := in.settings()
	if err != nil {
		return nil, "", badInput{err}
	}
	if len(settings) > 0 {
		if c, faults = casefile.Override(c, settings); len(faults) > 0 {
			return nil, "", faults
		}
	}
	return c, name, nil
}

// isWorkbook says whether a file is taken as a workbook: by its ending.
func isWorkbook(name string) bool { return strings.EqualFold(filepath.Ext(name), ".xlsx") }

func (in *caseInput) settings() ([]pva.Setting, error) {
	var out []pva.Setting
	for _, s := range in.set {
		one, err := casefile.ParseSetting(s)
		if err != nil {
			return nil, err
		}
		out = append(out, one...)
	}
	if in.flags.Changed("replicates") {
		out = append(out, pva.Setting{Path: "run.replicates", Value: pva.Num(float64(in.replicates))})
	}
	if in.flags.Changed("seed") {
		v := pva.Num(float64(in.seed))
		v.Text = fmt.Sprint(in.seed)
		out = append(out, pva.Setting{Path: "run.seed", Value: v})
	}
	return out, nil
}

func readBounded(path string, most int64) ([]byte, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, plainPathError(err)
	}
	defer f.Close()
	if info, err := f.Stat(); err == nil && info.IsDir() {
		return nil, fmt.Errorf("%s is a folder, not a case file", path)
	}
	data, err := io.ReadAll(io.LimitReader(f, most+1))
	if err != nil {
		return nil, plainPathError(err)
	}
	if int64(len(data)) > most {
		return nil, fmt.Errorf("%s is larger than %d MB and cannot be a case file", path, most>>20)
	}
	return data, nil
}

// plainPathError says in plain words what is wrong with a path.
func plainPathError(err error) error {
	var p *os.PathError
	if !errors.As(err, &p) {
		return err
	}
	switch {
	case errors.Is(err, os.ErrNotExist):
		return fmt.Errorf("%s does not exist", p.Path)
	case errors.Is(err, os.ErrPermission):
		return fmt.Errorf("%s may not be opened (no permission)", p.Path)
	}
	return fmt.Errorf("%s: %v", p.Path, p.Err)
}

// reportPath is where the workbook goes: --out, or beside the case under its
// name; an example's report goes to the current folder. The report of a case
// that is a workbook itself has "-report" in its name, and every command but
// assess its own kind, so that none overwrites the report of another.
func reportPath(out, caseName, kind string) string {
	if out != "" {
		return out
	}
	stem := strings.TrimSuffix(caseName, filepath.Ext(caseName)) + kind
	if isWorkbook(caseName) {
		stem += "-report"
	}
	return stem + ".xlsx"
}

// sameFile says whether two names are one file.
func sameFile(a, b string) bool {
	if p, err := filepath.Abs(a); err == nil {
		if q, err := filepath.Abs(b); err == nil && p == q {
			return true // also where neither is there yet
		}
	}
	x, err := os.Stat(a)
	if err != nil {
		return false
	}
	y, err := os.Stat(b)
	return err == nil && os.SameFile(x, y)
}
