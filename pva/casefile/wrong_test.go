package casefile

import (
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

var update = flag.Bool("update", false, "write the expected messages anew")

const wrongFiles = "../../testdata/wrong"

// TestWrongCases reads every file of testdata/wrong and compares all that is
// said about it, snippets included, with NAME.want beside it. A file without
// expected messages fails.
func TestWrongCases(t *testing.T) {
	files, err := filepath.Glob(filepath.Join(wrongFiles, "*.toml"))
	if err != nil || len(files) < 70 {
		t.Fatalf("%d wrong cases in %s (%v), want 70 or more", len(files), wrongFiles, err)
	}
	for _, file := range files {
		name := strings.TrimSuffix(filepath.Base(file), ".toml")
		t.Run(name, func(t *testing.T) {
			data, err := os.ReadFile(file)
			if err != nil {
				t.Fatal(err)
			}
			c, errs := Read(name+".toml", data)
			if c != nil || len(errs) == 0 {
				t.Fatal("the case was read without a fault")
			}
			got := errs.Text(true) + "\n"
			golden := strings.TrimSuffix(file, ".toml") + ".want"
			if *update {
				if err := os.WriteFile(golden, []byte(got), 0o644); err != nil {
					t.Fatal(err)
				}
			}
			want, err := os.ReadFile(golden)
			if err != nil {
				t.Fatalf("no expected messages: %v\n%s", err, got)
			}
			if got != string(want) {
				t.Errorf("got\n%s\nwant\n%s", got, want)
			}
		})
	}
	wants, _ := filepath.Glob(filepath.Join(wrongFiles, "*.want"))
	if len(wants) != len(files) {
		t.Errorf("%d files of messages for %d wrong cases", len(wants), len(files))
	}
}
