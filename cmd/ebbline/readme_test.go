package main

import (
	"bytes"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
)

var shown = regexp.MustCompile("(?s)<!-- the output of: ebbline ([^\n]*) -->\n```text\n(.*?)```")

// TestReadmeIsTrue runs each command whose output the README shows, and compares.
func TestReadmeIsTrue(t *testing.T) {
	path, err := filepath.Abs(filepath.Join("..", "..", "README.md"))
	if err != nil {
		t.Fatal(err)
	}
	text, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	t.Chdir(t.TempDir())
	found := shown.FindAllSubmatch(text, -1)
	if len(found) == 0 {
		t.Fatal("the README shows no output")
	}
	for _, f := range found {
		var out, errs bytes.Buffer
		if code := run(strings.Fields(string(f[1])), strings.NewReader(""), &out, &errs); code != 0 {
			t.Fatalf("ebbline %s: exit status %d\n%s", f[1], code, errs.String())
		}
		if out.String() == string(f[2]) {
			continue
		}
		if !*update {
			t.Errorf("the README shows another output of ebbline %s (go test ./cmd/ebbline -run Readme -update mends it); now:\n%s", f[1], out.String())
			continue
		}
		head := "ebbline " + string(f[1]) + " -->\n```text\n"
		text = bytes.Replace(text, append([]byte(head), f[2]...), []byte(head+out.String()), 1)
		if err := os.WriteFile(path, text, 0o666); err != nil {
			t.Fatal(err)
		}
	}
}
