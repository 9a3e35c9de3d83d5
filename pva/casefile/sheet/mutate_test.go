package sheet

import (
	"archive/zip"
	"bytes"
	"fmt"
	"io"
	"math/rand/v2"
	"testing"
	"time"

	"ebbline/pva"
)

// slowest is the longest that any input may take; alone a read takes
// milliseconds.
const slowest = 2 * time.Second

// read reads a workbook; the case's digest, "" for an error. It fails the test
// on a panic, on slowness, and on a case and errors at once.
func read(t testing.TB, what string, data []byte) string {
	t.Helper()
	defer func() {
		if r := recover(); r != nil {
			t.Fatalf("%s: panic: %v", what, r)
		}
	}()
	start := time.Now()
	c, errs := Read("w.xlsx", data)
	if took := time.Since(start); took > slowest {
		t.Errorf("%s: took %v", what, took)
	}
	if (c == nil) == (len(errs) == 0) {
		t.Fatalf("%s: a case %v and %d errors", what, c != nil, len(errs))
	}
	for _, e := range errs {
		if e.File != "w.xlsx" || e.Error() == "w.xlsx: " {
			t.Fatalf("%s: an error without a place or a reason: %v", what, e)
		}
	}
	return digest(c)
}

// digest names all that a case says, seed and replicates included.
func digest(c *pva.Case) string {
	if c == nil {
		return ""
	}
	return fmt.Sprint(c.Digest(), " ", c.Run.Seed, " ", c.Run.Replicates)
}

// unpacked is the parts of a workbook.
func unpacked(t testing.TB, data []byte) []part {
	t.Helper()
	z, err := zip.NewReader(bytes.NewReader(data), int64(len(data)))
	if err != nil {
		t.Fatal(err)
	}
	var ps []part
	for _, e := range z.File {
		r, err := e.Open()
		if err != nil {
			t.Fatal(err)
		}
		text, err := io.ReadAll(r)
		if err != nil {
			t.Fatal(err)
		}
		ps = append(ps, part{e.Name, string(text)})
	}
	return ps
}

// TestMutations: 2,000 damaged copies of three workbooks give errors or the very
// same case, never another one.
func TestMutations(t *testing.T) {
	rnd := rand.New(rand.NewPCG(1, 2))
	books := [][]byte{small(t), starterBytes(t), packed(t, unpacked(t, starterBytes(t)))}
	var wholes []string
	for _, b := range books {
		wholes = append(wholes, read(t, "the whole book", b))
		if wholes[len(wholes)-1] == "" {
			t.Fatal("a whole book is refused")
		}
	}
	same, refused := 0, 0
	for i := range 2000 {
		book, whole := books[i%len(books)], wholes[i%len(books)]
		data := append([]byte(nil), book...)
		what := ""
		switch kind := rnd.IntN(10); {
		case kind < 5:
			bits := 1 + rnd.IntN(3)
			for range bits {
				at := rnd.IntN(len(data))
				bit := rnd.IntN(8)
				data[at] ^= 1 << bit
				what += fmt.Sprintf("bit %d of byte %d; ", bit, at)
			}
		case kind == 5:
			n := rnd.IntN(len(data))
			data, what = data[:n], fmt.Sprintf("cut at %d", n)
		case kind == 6: // a stretch taken out, or put in
			from := rnd.IntN(len(data))
			n := 1 + rnd.IntN(200)
			if rnd.IntN(2) == 0 {
				data = append(data[:from:from], data[min(len(data), from+n):]...)
				what = fmt.Sprintf("%d bytes taken out at %d", n, from)
			} else {
				data = append(append(data[:from:from], make([]byte, n)...), data[from:]...)
				what = fmt.Sprintf("%d zeros put in at %d", n, from)
			}
		case kind == 7: // a part taken out
			ps := unpacked(t, book)
			at := rnd.IntN(len(ps))
			what = "without " + ps[at].name
			data = packed(t, append(ps[:at:at], ps[at+1:]...))
		case kind == 8: // two parts change their names
			ps := unpacked(t, book)
			a, b := rnd.IntN(len(ps)), rnd.IntN(len(ps))
			what = ps[a].name + " and " + ps[b].name + " swapped"
			ps[a].text, ps[b].text = ps[b].text, ps[a].text
			data = packed(t, ps)
		default: // a part cut short, with a checksum that fits
			ps := unpacked(t, book)
			at := rnd.IntN(len(ps))
			n := rnd.IntN(len(ps[at].text) + 1)
			what = fmt.Sprintf("%s cut at %d", ps[at].name, n)
			ps[at].text = ps[at].text[:n]
			data = packed(t, ps)
		}
		switch got := read(t, what, data); got {
		case "":
			refused++
		case whole:
			same++
		default:
			t.Errorf("book %d, %s: read as another case", i%len(books), what)
		}
	}
	if same < 100 || refused < 1000 {
		t.Errorf("%d the same, %d refused: the mutations are not what they should be", same, refused)
	}
}

// TestFlippedBits: any one bit of a workbook may flip and no number changes. One
// bit in three is tried, so that all of each byte's bits come up somewhere.
func TestFlippedBits(t *testing.T) {
	book := small(t)
	whole := read(t, "the whole book", book)
	for bit := 0; bit < len(book)*8; bit += 3 {
		data := append([]byte(nil), book...)
		data[bit/8] ^= 1 << (bit % 8)
		if got := read(t, fmt.Sprint("bit ", bit), data); got != "" && got != whole {
			t.Fatalf("bit %d: read as another case", bit)
		}
	}
}

// FuzzRead: no input gives a panic, takes long, or gives neither case nor error.
// Seeds are whole and damaged workbooks; what is fuzzed is the rows of a sheet,
// inside a sound archive, and the whole file.
func FuzzRead(f *testing.F) {
	f.Add(small(f), smallRows(goodRate))
	f.Add(starterBytes(f), headRow)
	f.Add(small(f)[:1000], smallRows(`<c r="B6" t="e"><f>1/0</f><v>#DIV/0!</v></c>`))
	f.Add(packed(f, parts("")), smallRows(`<c r="B6" t="s"><v>2</v></c>`))
	f.Add([]byte("PK\x05\x06"), `<row r="1"/></sheetData><mergeCells><mergeCell ref="A1:B2"/></mergeCells><sheetData>`)
	f.Fuzz(func(t *testing.T, data []byte, rows string) {
		if len(data) > 1<<20 || len(rows) > 1<<20 {
			return
		}
		read(t, "the file", data)
		read(t, "the rows", packed(t, parts(rows)))
		if w, err := Open("w.xlsx", data); err == nil {
			for _, s := range w.Sheets() {
				_, _ = w.Cells(s)
			}
			_, _ = Embedded(w)
		}
	})
}
