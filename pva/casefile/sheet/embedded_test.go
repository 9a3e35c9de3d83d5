package sheet

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"strings"
	"testing"
)

// runAgain is a Run again sheet with this case; change may alter its rows.
func runAgain(lines []string, change func(rows []string) []string) string {
	sum := sha256.Sum256([]byte(strings.Join(lines, "\n")))
	rows := []string{"Run again", "What|Value", "Program|ebbline", "Version|0.1.0", "Command line|ebbline assess heron.toml --seed 5", "Case file|heron.toml",
		"Seed|18446744073709551615", "Replicates finished|#1000", "Digest of the case|sha256:00", fmt.Sprintf("Lines of the case text|#%d", len(lines)),
		"SHA-256 of the case text|" + hex.EncodeToString(sum[:]), "", "Line|Text"}
	for i, l := range lines {
		rows = append(rows, fmt.Sprintf("#%d|%s", i+1, l))
	}
	var b strings.Builder
	for i, r := range change(rows) {
		a, v, _ := strings.Cut(r, "|")
		fmt.Fprintf(&b, `<row r="%d">`, i+1)
		for j, s := range []string{a, v} {
			ref := fmt.Sprintf("%c%d", 'A'+j, i+1)
			if n, ok := strings.CutPrefix(s, "#"); ok {
				fmt.Fprintf(&b, `<c r="%s"><v>%s</v></c>`, ref, n)
			} else if s != "" {
				b.WriteString(inline(ref, s))
			}
		}
		b.WriteString(`</row>`)
	}
	return b.String()
}

func embedded(t *testing.T, rows string) (*Report, error) {
	t.Helper()
	w, err := Open("r.xlsx", packed(t, changed(parts(rows), "xl/workbook.xml", strings.Replace(bookXML, "Inputs", RunAgainSheet, 1))))
	if err != nil {
		t.Fatal(err)
	}
	return Embedded(w)
}

// TestEmbedded: the case a report carries comes back byte for byte; whatever is
// changed in it is found out.
func TestEmbedded(t *testing.T) {
	lines := []string{"[case]", `title = "a & b <c>"`, "", "  indented = 1", "What = Seed"}
	keep := func(rows []string) []string { return rows }
	r, err := embedded(t, runAgain(lines, keep))
	if err != nil {
		t.Fatal(err)
	}
	want := Report{CaseText: strings.Join(lines, "\n") + "\n", Program: "ebbline", Version: "0.1.0", Command: "ebbline assess heron.toml --seed 5", CaseFile: "heron.toml",
		Seed: 18446744073709551615, Replicates: 1000, Asked: 1000, Digest: "sha256:00"}
	if *r != want {
		t.Errorf("got  %+v\nwant %+v", *r, want)
	}
	// A line in two cells, and more replicates asked for than were finished.
	r, err = embedded(t, runAgain(lines, func(rows []string) []string {
		rows[14] = "#2|title = "
		rows = append(rows[:15:15], append([]string{`#2|"a & b <c>"`}, rows[15:]...)...)
		rows[11] = "Replicates asked for|#2000"
		return rows
	}))
	if err != nil || r.CaseText != want.CaseText || r.Asked != 2000 {
		t.Errorf("%+v, %v", r, err)
	}

	change := func(from, to string) func([]string) []string {
		return func(rows []string) []string {
			out := append([]string(nil), rows...)
			found := false
			for i := range out {
				if strings.Contains(out[i], from) {
					out[i], found = strings.Replace(out[i], from, to, 1), true
				}
			}
			if !found {
				t.Fatalf("no %q", from)
			}
			return out
		}
	}
	for _, c := range []struct {
		what   string
		change func([]string) []string
		want   string
	}{
		{"a changed line", change("indented = 1", "indented = 2"), "SHA-256"},
		{"a changed checksum", change("SHA-256 of the case text|", "SHA-256 of the case text|0"), "SHA-256"},
		{"a line taken out", func(rows []string) []string { return append(rows[:15:15], rows[16:]...) }, "A16: is not the number of the next line"},
		{"the last line taken out", func(rows []string) []string { return rows[:len(rows)-1] }, "carries a case of 4 lines where it says \"5\""},
		{"a line added", func(rows []string) []string { return append(rows, "#6|x = 1") }, "carries a case of 6 lines"},
		{"a row left blank", func(rows []string) []string { return append(append(rows[:15:15], ""), rows[15:]...) }, "A17: is not the number of the next line"},
		{"lines in another order", func(rows []string) []string { rows[14], rows[15] = rows[15], rows[14]; return rows }, "is not the number"},
		{"no seed", change("Seed|", "Sead|"), `says no "Seed"`},
		{"two seeds", change("Version|0.1.0", "Seed|7"), `says "Seed" a second time`},
		{"a seed that is none", change("18446744073709551615", "-1"), `B7: is no "Seed"`},
		{"half a replicate", change("#1000", "#999.5"), `B8: is no "Replicates finished"`},
		{"fewer asked for than finished", func(rows []string) []string { rows[11] = "Replicates asked for|#10"; return rows }, `is no "Replicates asked for"`},
	} {
		if _, err := embedded(t, runAgain(lines, c.change)); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", c.what, err, c.want)
		}
	}
	if _, err := Open("r.xlsx", small(t)); err != nil {
		t.Fatal(err)
	}
	w, _ := Open("r.xlsx", small(t))
	if _, err := Embedded(w); err == nil || !strings.Contains(err.Error(), `r.xlsx: has no sheet "Run again"`) {
		t.Error(err)
	}
}
