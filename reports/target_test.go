package reports

import (
	"os"
	"path/filepath"
	"testing"
	"time"
)

// TestLeftoversAreCleared: what a killed run left an hour ago goes, what a run
// may be writing now stays, and so does everything else.
func TestLeftoversAreCleared(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "heron.xlsx")
	old, fresh, other := temporaryName(path, "1"), temporaryName(path, "2"), filepath.Join(dir, ".notes.part1")
	for _, f := range []string{old, fresh, other} {
		if err := os.WriteFile(f, []byte("half"), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	long := time.Now().Add(-2 * time.Hour)
	for _, f := range []string{old, other} {
		if err := os.Chtimes(f, long, long); err != nil {
			t.Fatal(err)
		}
	}
	if err := CheckTarget(path, "Heron", false); err != nil {
		t.Fatal(err)
	}
	for f, kept := range map[string]bool{old: false, fresh: true, other: true} {
		if _, err := os.Stat(f); (err == nil) != kept {
			t.Errorf("%s: kept %v, want %v", filepath.Base(f), err == nil, kept)
		}
	}
}
