package examples

import (
	"strings"
	"testing"

	"ebbline/pva/casefile"
)

// TestExamplesStand: each built-in case reads without a fault and says that it
// is invented.
func TestExamplesStand(t *testing.T) {
	if len(Names()) < 5 {
		t.Errorf("%d examples, want 5 or more", len(Names()))
	}
	for _, name := range Names() {
		data, err := Get(name)
		if err != nil {
			t.Fatal(err)
		}
		c, errs := casefile.Read(name+".toml", data)
		if len(errs) > 0 {
			t.Errorf("%v", errs)
			continue
		}
		if !strings.Contains(c.Title, "(invented)") || !strings.Contains(c.Purpose, "places and figures are invented") {
			t.Errorf("%s does not say that it is invented: %q, %q", name, c.Title, c.Purpose)
		}
	}
}

func TestGetOfAnUnknownName(t *testing.T) {
	for _, name := range []string{"heron", "", "../examples/marsh-heron", "marsh-heron.toml"} {
		data, err := Get(name)
		if err == nil || data != nil || !strings.Contains(err.Error(), "marsh-heron") {
			t.Errorf("Get(%q) gives %d bytes and %v; want an error that names the cases there are", name, len(data), err)
		}
	}
}
