package fit

import (
	"bytes"
	"encoding/csv"
	"flag"
	"fmt"
	"math"
	"math/rand/v2"
	"strconv"
	"strings"
	"testing"
	"time"
)

var long = flag.Bool("long", false, "push ten million mutated series through, or as many as an hour allows")

var countFiles = []string{
	"year,count\n1990,12\n1991,14\n1992,9\n1993,11\n",
	"year;count;cv\n1;2,5;0,1\n2;3;0,2\n4;7;0\n5;1.200;0,1\n",
	"year\tcount\tse\teffort\n2001\t12\t1.5\t3\n2002\t\t\t\n2003\t9\t2\t1\n2004\tNA\t\t\n2006\t1e3\t2\t1\n2007\t4\t1\t1\n",
	"# counts\nseason,count,note\n3,1,\"a, b\"\n1,2,\n2,0,x\n",
	"year,count,se\n1,1e-30,1e12\n2,1e12,1\n3,5,1\n4,6,1\n",
}

// sound faults a series that is read and is none, and one that is another when it
// is written plainly and read again, as text or as the cells of a sheet.
func sound(t *testing.T, data []byte) *Series {
	t.Helper()
	s, err := Read("x.csv", data)
	if (s == nil) != (err != nil) {
		t.Fatalf("%q: a series %v and error %v", data, s != nil, err)
	}
	if err != nil {
		if said := err.Error(); said == "" || strings.ContainsAny(said, "\x00\x1b\a\b") {
			t.Errorf("%q is refused with %q", data, said)
		}
		return nil
	}
	if len(s.Counts) > mostCounts {
		t.Errorf("%d counts", len(s.Counts))
	}
	if len(s.Counts) == 0 {
		return s // dates alone, on which nobody counted
	}
	var text bytes.Buffer
	w := csv.NewWriter(&text)
	head := []string{s.TimeUnit, "count", "cv", "effort"}
	if !s.Effort {
		head = head[:3]
	}
	number := func(v float64) string { return strconv.FormatFloat(v, 'g', -1, 64) }
	w.Write(head)
	rows := [][]Cell{{}}
	for _, h := range head {
		rows[0] = append(rows[0], Cell{Text: h})
	}
	for i, c := range s.Counts {
		for _, v := range []float64{c.Year, c.Count, c.CV, c.Effort} {
			if math.IsNaN(v) || math.IsInf(v, 0) || v < 0 && v != c.Year {
				t.Errorf("%q: %+v", data, c)
			}
		}
		if i > 0 && !(c.Year > s.Counts[i-1].Year) {
			t.Errorf("%q: dates out of order: %v after %v", data, c.Year, s.Counts[i-1].Year)
		}
		row := []string{number(c.Year), number(c.Count), number(c.CV), number(c.Effort)}[:len(head)]
		if c.CV > 10 {
			return s // a se that is many times the count has no cv that could be written
		}
		w.Write(row)
		var cells []Cell
		for _, v := range row {
			cells = append(cells, Cell{Text: v})
		}
		rows = append(rows, cells)
	}
	w.Flush()
	again, err := Read("x.csv", text.Bytes())
	if err != nil {
		t.Errorf("%q: written and read: %v", data, err)
		return s
	}
	cells, err := ReadRows("x.xlsx", rows, func(r, c int) string { return fmt.Sprint(r, c) })
	if err != nil {
		t.Errorf("%q: as cells: %v", data, err)
		return s
	}
	for _, o := range []*Series{again, cells} {
		if fmt.Sprintf("%v", o.Counts) != fmt.Sprintf("%v", s.Counts) || o.TimeUnit != s.TimeUnit && s.TimeUnit != "time" {
			t.Errorf("%q: read as %v %s, written and read as %v %s", data, s.Counts, s.TimeUnit, o.Counts, o.TimeUnit)
		}
	}
	return s
}

// fitsOrNot faults a fit whose growth is no number: a series is fitted or refused.
func fitsOrNot(t *testing.T, data []byte, s *Series) bool {
	t.Helper()
	r, err := Fit(s, Options{Zeros: ZerosMissing, Resamples: 100, Horizon: 3})
	if err != nil {
		if err.Error() == "" {
			t.Errorf("%q: an error without words", data)
		}
		return false
	}
	for what, v := range map[string]float64{"growth": r.Drift.Mu.Value, "its low end": r.Drift.Mu.Low, "its high end": r.Drift.Mu.High, "the variance": r.Drift.Variance.Value} {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			t.Errorf("%q: %s is %v", data, what, v)
		}
	}
	return true
}

// FuzzCounts: no file of counts is read as anything else when it is written
// again, and what is read is fitted or refused.
func FuzzCounts(f *testing.F) {
	for _, s := range countFiles {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		if s := sound(t, data); s != nil {
			fitsOrNot(t, data, s)
		}
	})
}

// TestMutatedCounts is the same for inputs that are the same each time. A fit
// costs a thousand times what reading does: one series in fifty is fitted.
func TestMutatedCounts(t *testing.T) {
	n := 30_000
	if *long {
		n = 10_000_000
	}
	words := []string{",", ";", "\t", "\n", "\r", "\"", "#", "-", ".", "e", "year", "count", "cv", "se", "effort", "note", "NA", "0", "1e12", "-1e6", "1e-9", "\x00", "\ufeff", "1.000"}
	g, began, i := rand.New(rand.NewPCG(7, 8)), time.Now(), 0
	read, fitted := 0, 0
	for ; i < n && !t.Failed() && (i%1000 > 0 || time.Since(began) < time.Hour); i++ {
		data := []byte(countFiles[g.IntN(len(countFiles))])
		for range 1 + g.IntN(3) {
			at := g.IntN(len(data) + 1)
			end := min(len(data), at+1+g.IntN(8))
			switch g.IntN(5) {
			case 0:
				if at < len(data) {
					data[at] ^= byte(1 << g.IntN(8))
				}
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
		s := sound(t, data)
		if s == nil {
			continue
		}
		if read++; read%50 == 0 && fitsOrNot(t, data, s) {
			fitted++
		}
	}
	t.Logf("%d mutated inputs in %v: %d series, %d of them fitted", i, time.Since(began).Round(time.Second), read, fitted)
	if read < i/20 || read > i*9/10 || fitted == 0 {
		t.Errorf("%d series and %d fits of %d inputs: the mutations are not what they should be", read, fitted, i)
	}
}
