package year

import (
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
)

// A product fused with a following sum rounds once and not twice, on the
// processors that can: counts would differ between machines. The machine code
// of the simulator and of its formulas for such a processor has no fused
// instruction, but for the two files that no draw depends on: the mean path and
// the estimate of what sub-steps shift.
func TestNothingIsFusedOnThePathOfADraw(t *testing.T) {
	for _, room := range []string{"ebbline/pva/rates", "ebbline/pva/year"} {
		// Where this machine fuses nothing its own code is the same either way, and
		// a kept result would stand for changed sources: reading them prevents it.
		sources, err := filepath.Glob(filepath.Join("..", filepath.Base(room), "*.go"))
		if err != nil || len(sources) == 0 {
			t.Fatalf("%s: no sources found (%v)", room, err)
		}
		for _, source := range sources {
			if _, err := os.ReadFile(source); err != nil {
				t.Fatal(err)
			}
		}
		cmd := exec.Command("go", "build", "-gcflags="+room+"=-S", room)
		cmd.Env = append(cmd.Environ(), "GOARCH=arm64", "CGO_ENABLED=0")
		out, err := cmd.CombinedOutput()
		if err != nil {
			t.Fatalf("%s: %v\n%s", room, err, out)
		}
		if !strings.Contains(string(out), "STEXT") {
			t.Fatalf("%s: no machine code in the output", room)
		}
		for line := range strings.Lines(string(out)) {
			if fused.MatchString(line) && !strings.Contains(line, "/rates/path.go:") && !strings.Contains(line, "/rates/substeps.go:") {
				t.Errorf("%s: %s", room, strings.TrimSpace(line))
			}
		}
	}
}

var fused = regexp.MustCompile(`\tFN?M(ADD|SUB)[DS]\t`)
