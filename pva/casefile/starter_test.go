package casefile

import (
	"regexp"
	"strings"
	"testing"

	"ebbline/pva"
)

// Remarks begin with "# ", keys that are not in force with "#" and the key.
var asleep = regexp.MustCompile(`^#(\[|[a-z_]+ *=)`)

// TestStarterStands: the starter is a case as it is, says that it is invented,
// and has no number without a source but the settings of the question and run.
func TestStarterStands(t *testing.T) {
	c := mustRead(t, "starter.toml", Starter())
	if !strings.Contains(c.Title, "invented") {
		t.Errorf("title %q does not say that it is invented", c.Title)
	}
	for _, e := range c.Entries() {
		top, _, _ := strings.Cut(e.Path, ".")
		if e.Value.Kind == pva.NumberKind && e.Source == "" && top != "question" && top != "run" && top != "option" {
			t.Errorf("%s has no source", e.Path)
		}
	}
}

// starterKeys walks the starter's lines: the key pattern of each, and whether
// it is asleep.
func starterKeys(t *testing.T, visit func(line int, pattern string, isAsleep bool)) {
	t.Helper()
	table := ""
	for i, line := range strings.Split(string(Starter()), "\n") {
		off := asleep.MatchString(line)
		if off {
			line = line[1:]
		}
		switch {
		case strings.HasPrefix(line, "#") || strings.TrimSpace(line) == "":
		case strings.HasPrefix(line, "[["):
			table = line[2:strings.Index(line, "]]")] + ".*"
		case strings.HasPrefix(line, "["):
			table = line[1:strings.Index(line, "]")]
		default:
			key, _, ok := strings.Cut(line, "=")
			if !ok {
				t.Fatalf("line %d is neither key nor remark: %s", i+1, line)
			}
			visit(i, table+"."+strings.TrimSpace(key), off)
		}
	}
}

// TestStarterShowsEveryKey: each key of the key table stands in the starter,
// in force or asleep, and each line of it is a key of the table, with a remark.
func TestStarterShowsEveryKey(t *testing.T) {
	shown := map[string]bool{}
	starterKeys(t, func(_ int, pattern string, _ bool) { shown[pattern] = true })
	for _, k := range pva.Keys() {
		path := k.Path
		for strings.HasSuffix(path, ".*") {
			path = strings.TrimSuffix(path, ".*")
		}
		if !shown[path] {
			t.Errorf("%s is not in the starter", k.Path)
		}
		delete(shown, path)
	}
	delete(shown, "option.*.set")
	for path := range shown {
		t.Errorf("%s is in the starter and no key", path)
	}
}

// TestStarterWakes takes the "#" from each key in turn, with its table's, and
// reads what comes out: every fault must be about keys that exclude or need one
// another, never about the key itself or its value.
func TestStarterWakes(t *testing.T) {
	lines := strings.Split(string(Starter()), "\n")
	allowed := regexp.MustCompile(`is given beside|has no use|is missing|needs breeding|needs when|is not above low|cannot be|is not marked uncertain`)
	woken := 0
	starterKeys(t, func(n int, pattern string, isAsleep bool) {
		if !isAsleep {
			return
		}
		woken++
		copied := append([]string(nil), lines...)
		copied[n] = copied[n][1:]
		// Its table, if that is asleep too.
		for up := n; up >= 0; up-- {
			if strings.HasPrefix(copied[up], "#[") {
				copied[up] = copied[up][1:]
				break
			}
			if strings.HasPrefix(copied[up], "[") {
				break
			}
		}
		_, errs := Read("starter.toml", []byte(strings.Join(copied, "\n")))
		for _, e := range errs {
			if e.Fault.Key == "" || !allowed.MatchString(e.Fault.Want) {
				t.Errorf("with %s in force: %v", pattern, e)
			}
		}
	})
	if woken < 60 {
		t.Errorf("only %d keys are asleep", woken)
	}
	// All at once the file is still TOML, and no key is unknown.
	for i, line := range lines {
		if asleep.MatchString(line) {
			lines[i] = line[1:]
		}
	}
	_, errs := Read("starter.toml", []byte(strings.Join(lines, "\n")))
	for _, e := range errs {
		if e.Fault.Key == "" || strings.Contains(e.Fault.Want, "not a key") || strings.Contains(e.Fault.Want, "not a table") {
			t.Errorf("with all keys in force: %v", e)
		}
	}
}
