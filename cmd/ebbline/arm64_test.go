package main

import (
	"bytes"
	"encoding/csv"
	"encoding/json"
	"fmt"
	"io/fs"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"strconv"
	"strings"
	"testing"

	"ebbline/pva/casefile/examples"
)

// emulated runs a command line of the program as built for arm64 on an emulated
// processor of that family.
type emulated struct{ qemu, program string }

func (e emulated) run(t *testing.T, args []string) []byte {
	t.Helper()
	var out, errs bytes.Buffer
	cmd := exec.Command(e.qemu, append([]string{e.program}, args...)...)
	cmd.Stdout, cmd.Stderr = &out, &errs
	if err := cmd.Run(); err != nil {
		t.Fatalf("arm64: ebbline %s: %v\n%s%s", strings.Join(args, " "), err, out.String(), errs.String())
	}
	return out.Bytes()
}

// emulator finds what runs programs of arm64 here. The compiler of that family
// fuses a*b + c where the language allows it, which that of amd64 does not: what
// is not guarded comes out otherwise.
func emulator(t *testing.T) string {
	t.Helper()
	if runtime.GOARCH != "amd64" || runtime.GOOS != "linux" {
		t.Skip("compares linux on amd64 with arm64: not for " + runtime.GOOS + "/" + runtime.GOARCH)
	}
	for _, name := range []string{"qemu-aarch64-static", "qemu-aarch64"} {
		if path, err := exec.LookPath(name); err == nil {
			readEverySource(t)
			return path
		}
	}
	t.Skip("skipped: qemu-aarch64-static is not installed")
	return ""
}

func buildForArm64(t *testing.T) emulated {
	t.Helper()
	e := emulated{emulator(t), filepath.Join(t.TempDir(), "ebbline-arm64")}
	build := exec.Command("go", "build", "-trimpath", "-buildvcs=false", "-o", e.program, ".")
	build.Env = forArm64()
	if out, err := build.CombinedOutput(); err != nil {
		t.Fatalf("the build for arm64: %v\n%s", err, out)
	}
	return e
}

func forArm64() []string {
	return append(os.Environ(), "GOOS=linux", "GOARCH=arm64", "CGO_ENABLED=0")
}

// readEverySource lets the go command know on what a test depends that builds
// the program itself: without it a change that only arm64 sees would leave the
// test's result in the cache.
func readEverySource(t *testing.T) {
	t.Helper()
	files := 0
	err := filepath.WalkDir(filepath.Join("..", ".."), func(path string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		if name := d.Name(); strings.HasSuffix(name, ".go") || name == "go.mod" {
			files++
			_, err = os.ReadFile(path)
		}
		return err
	})
	if err != nil || files < 50 {
		t.Fatalf("%d source files read: %v", files, err)
	}
}

// TestArm64DrawsTheSame runs the golden draws, and the sum of the bits of exp,
// log and their kin, on the emulated processor: they see an expression that
// fuses in the last digit, which a count hardly ever does.
func TestArm64DrawsTheSame(t *testing.T) {
	cmd := exec.Command("go", "test", "-count=1", "-v", "-exec", emulator(t), "-run", "^(TestSameBitsEverywhere|TestGolden.*)$", "ebbline/rng/portable", "ebbline/rng")
	cmd.Env = forArm64()
	out, err := cmd.CombinedOutput()
	if err != nil {
		t.Fatalf("on arm64: %v\n%s", err, out)
	}
	for _, name := range []string{"TestSameBitsEverywhere", "TestGoldenCounts", "TestGoldenReals", "TestGoldenSeeds"} {
		if !bytes.Contains(out, []byte("--- PASS: "+name+" ")) {
			t.Errorf("%s did not run on arm64:\n%s", name, out)
		}
	}
}

// TestArm64GivesTheSame runs cases over the whole grammar on both families of
// processors: every count must be equal, every other figure to one part in a
// thousand million.
func TestArm64GivesTheSame(t *testing.T) {
	e := buildForArm64(t)
	cases, err := filepath.Abs(filepath.Join("..", "..", "testdata", "cases"))
	if err != nil {
		t.Fatal(err)
	}
	t.Chdir(t.TempDir())
	heron, err := examples.Get("marsh-heron")
	if err != nil {
		t.Fatal(err)
	}
	swept := append(heron, "\n[[sweep]]\nkey = \"harvest.control.take\"\nvalues = [0, 6, 12]\n\n[[sweep]]\nkey = \"start.abundance\"\nvalues = [60, 180]\n"...)
	if err := os.WriteFile("swept.toml", swept, 0o666); err != nil {
		t.Fatal(err)
	}
	for _, line := range []string{
		"assess --example marsh-heron --replicates 128 --no-exact",   // pulse, weather with memory, a catastrophe, a survey
		"assess --example river-cod --replicates 128 --no-exact",     // a ladder, takes by year, more memory
		"assess --example meadow-bee --replicates 128 --no-exact",    // scarcity
		"assess --example fish-pond --replicates 64 --no-exact",      // streams through the year, event by event
		"assess --example weed-outbreak --replicates 192 --no-exact", // flow, births that rise with numbers
		"assess --example upland-goat --replicates 8 --no-exact --set run.draws=6 --set run.stop_above=1e6",
		"assess CASES/pulse-every-key.toml --replicates 10 --no-exact",
		"assess CASES/flow-every-key.toml --replicates 192 --no-exact",
		"assess CASES/flow-large.toml --replicates 64 --no-exact --set question.horizon=20", // flow in sub-steps
		"assess CASES/events.toml --replicates 64 --no-exact --set question.horizon=20",
		"exact --example fish-pond --set question.horizon=4",
	} {
		args := strings.Fields(strings.ReplaceAll(line, "CASES", cases))
		args = append(args, "--json", "-", "--quiet")
		if args[0] == "assess" {
			args = append(args, "--out", "report.xlsx", "--force")
		}
		here := quietly(t, args)
		there := e.run(t, args)
		c := comparison{}
		c.values("", numbersOf(t, here), numbersOf(t, string(there)))
		c.report(t, line)
	}
	// A sweep, by the cells of its table.
	args := []string{"sweep", "swept.toml", "--replicates", "64", "--no-exact", "--quiet"}
	quietly(t, append(args, "--csv", "here", "--out", "here.xlsx"))
	e.run(t, append(args, "--csv", "there", "--out", "there.xlsx"))
	c := comparison{}
	c.tables(t, filepath.Join("here", "sweep.csv"), filepath.Join("there", "sweep.csv"))
	c.report(t, "sweep")
	// A report written here, run again there, cell by cell.
	quietly(t, []string{"assess", "--example", "marsh-heron", "--replicates", "64", "--out", "here.xlsx", "--force", "--quiet"})
	e.run(t, []string{"rerun", "here.xlsx", "--quiet"})
}

// comparison counts what was compared and keeps what differs.
type comparison struct {
	counts, figures int
	different       []string
}

func (c *comparison) differ(path string, a, b any) {
	c.different = append(c.different, fmt.Sprintf("%s: amd64 %v, arm64 %v", path, a, b))
}

func (c *comparison) report(t *testing.T, what string) {
	t.Helper()
	for i, d := range c.different {
		if i == 10 {
			t.Errorf("ebbline %s: and %d more", what, len(c.different)-i)
			break
		}
		t.Errorf("ebbline %s: %s", what, d)
	}
	if c.counts < 3 || c.figures < 3 {
		t.Errorf("ebbline %s: only %d counts and %d figures compared", what, c.counts, c.figures)
	}
	t.Logf("ebbline %s: %d counts, %d figures", what, c.counts, c.figures)
}

// numbersOf reads a JSON document and keeps its numbers as they are written.
func numbersOf(t *testing.T, text string) (v any) {
	t.Helper()
	d := json.NewDecoder(strings.NewReader(text))
	d.UseNumber()
	if err := d.Decode(&v); err != nil {
		t.Fatalf("%v in %.200s", err, text)
	}
	return v
}

// values compares two JSON documents.
func (c *comparison) values(path string, a, b any) {
	switch x := a.(type) {
	case map[string]any:
		y, ok := b.(map[string]any)
		if !ok || len(x) != len(y) {
			c.differ(path, a, b)
			return
		}
		for k := range x {
			c.values(path+"."+k, x[k], y[k])
		}
	case []any:
		y, ok := b.([]any)
		if !ok || len(x) != len(y) {
			c.differ(path, a, b)
			return
		}
		for i := range x {
			c.values(path+"."+strconv.Itoa(i), x[i], y[i])
		}
	case json.Number:
		y, ok := b.(json.Number)
		if !ok {
			c.differ(path, a, b)
			return
		}
		c.numbers(path, x.String(), y.String())
	default:
		if a != b {
			c.differ(path, a, b)
		}
	}
}

// numbers compares two numbers as they are written: whole ones exactly.
func (c *comparison) numbers(path, a, b string) {
	if !strings.ContainsAny(a+b, ".eE") {
		c.counts++
		if a != b {
			c.differ(path, a, b)
		}
		return
	}
	c.figures++
	x, err1 := strconv.ParseFloat(a, 64)
	y, err2 := strconv.ParseFloat(b, 64)
	if err1 != nil || err2 != nil || !(math.Abs(x-y) <= closeEnough*math.Max(math.Abs(x), math.Abs(y))) {
		c.differ(path, a, b)
	}
}

// tables compares two CSV files, cell by cell.
func (c *comparison) tables(t *testing.T, one, other string) {
	t.Helper()
	var rows [2][][]string
	for i, path := range []string{one, other} {
		data, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		if rows[i], err = csv.NewReader(bytes.NewReader(data)).ReadAll(); err != nil {
			t.Fatal(err)
		}
	}
	if len(rows[0]) != len(rows[1]) || len(rows[0]) < 4 {
		t.Fatalf("%s has %d rows, %s %d", one, len(rows[0]), other, len(rows[1]))
	}
	for i, row := range rows[0] {
		for j, cell := range row {
			at := fmt.Sprintf("row %d, %s", i+1, rows[0][0][j])
			if _, err := strconv.ParseFloat(cell, 64); err == nil {
				c.numbers(at, cell, rows[1][i][j])
			} else if cell != rows[1][i][j] {
				c.differ(at, cell, rows[1][i][j])
			}
		}
	}
}

// TestArm64ComparisonCatches plants a count that is off by one, a figure that
// is off in the ninth digit, a key and a word.
func TestArm64ComparisonCatches(t *testing.T) {
	const sound = `{"count": 100000000000, "risk": [0.25, 1.5e-3], "verdict": "undecided"}`
	for other, want := range map[string]int{
		sound: 0,
		`{"count": 100000000000, "risk": [0.2500000000001, 1.5e-3], "verdict": "undecided"}`: 0,
		`{"count": 100000000001, "risk": [0.25, 1.5e-3], "verdict": "undecided"}`:            1,
		`{"count": 100000000000, "risk": [0.250000001, 1.5e-3], "verdict": "undecided"}`:     1,
		`{"count": 100000000000, "risk": [0.25], "verdict": "undecided"}`:                    1,
		`{"count": null, "risk": [0.25, 1.5e-3], "verdict": "above the limit"}`:              2,
		`{"counts": 100000000000, "risk": [0.25, 1.5e-3], "verdict": "undecided"}`:           1,
	} {
		var c comparison
		if c.values("", numbersOf(t, sound), numbersOf(t, other)); len(c.different) != want {
			t.Errorf("%s: finds %v, want %d", other, c.different, want)
		}
	}
}
