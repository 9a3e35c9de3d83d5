package sheet

import (
	"bytes"
	"flag"
	"math/rand/v2"
	"strings"
	"testing"
	"time"

	"ebbline/pva/casefile"
)

var long = flag.Bool("long", false, "push ten million mutated sheets through, or as many as an hour allows")

// sheets are rows that are cases, in the spellings that programs write.
func sheets() []string {
	return []string{
		smallRows(`<c r="B6"><v>0.48</v></c>`),
		smallRows(`<c r="B6" t="str"><f>1/2</f><v>0.5</v></c>`),
		smallRows(`<c r="B6" s="6"><v>4.8000000000000001E-1</v></c>`) + `<row r="9">` + inline("A9", "harvest.1.name") + inline("B9", "control & co") + `</row><row r="10">` + inline("A10", "harvest.control & co.take") + `<c r="B10"><v>4</v></c></row>`,
	}
}

// sameAgain faults a case of a sheet that is another one as a case file.
func sameAgain(t *testing.T, rows string) bool {
	t.Helper()
	data := packed(t, parts(rows))
	c, errs := Read("w.xlsx", data)
	if (c == nil) == (len(errs) == 0) {
		t.Fatalf("%q: a case %v and %d errors", rows, c != nil, len(errs))
	}
	if c == nil {
		if said := errs.Error(); strings.ContainsAny(said, "\x00\x1b\a\b") {
			t.Errorf("%q: control characters in %q", rows, said)
		}
		return false
	}
	again, errs := casefile.Read("again.toml", casefile.Write(c))
	if len(errs) > 0 || digest(again) != digest(c) {
		t.Errorf("%q: as a case file it is another: %v", rows, errs)
	}
	return true
}

// FuzzRows: the rows of a sheet are refused, or are the same case as a case file.
func FuzzRows(f *testing.F) {
	for _, s := range sheets() {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, rows string) {
		if len(rows) < 1<<18 {
			sameAgain(t, rows)
		}
	})
}

// TestMutatedSheets is the same for inputs that are the same each time.
func TestMutatedSheets(t *testing.T) {
	n := 1500
	if *long {
		n = 10_000_000
	}
	words := []string{"<", ">", "&", "&amp;", `t="s"`, `t="b"`, `t="e"`, `s="1"`, "<f>", "</c>", "</row>", `<row r="8">`, "</v>", "0", "1", "-", ".", "e", "_x0041_", "births.", "A7", "B6", "<v>", "NaN", "true", "\n", "&#0;"}
	g, began, i, cases := rand.New(rand.NewPCG(9, 10)), time.Now(), 0, 0
	for ; i < n && !t.Failed() && (i%1000 > 0 || time.Since(began) < time.Hour); i++ {
		data := []byte(sheets()[g.IntN(len(sheets()))])
		for range 1 + g.IntN(2) {
			at := len(headRow)/2 + g.IntN(len(data)-len(headRow)/2)
			end := min(len(data), at+1+g.IntN(6))
			switch g.IntN(5) {
			case 0:
				data[at] ^= byte(1 << g.IntN(8))
			case 1:
				data = append(data[:at:at], data[end:]...)
			case 2:
				data = append(data[:end:end], data[at:]...)
			case 3:
				data = append(append(data[:at:at], words[g.IntN(len(words))]...), data[at:]...)
			default:
				data = append(append(data[:at:at], words[g.IntN(len(words))]...), data[end:]...)
			}
		}
		if sameAgain(t, string(bytes.ToValidUTF8(data, nil))) {
			cases++
		}
	}
	t.Logf("%d mutated sheets in %v: %d are cases", i, time.Since(began).Round(time.Second), cases)
	if cases < i/100 || cases > i*9/10 {
		t.Errorf("%d of %d are cases: the mutations are not what they should be", cases, i)
	}
}
