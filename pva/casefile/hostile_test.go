package casefile

import (
	"fmt"
	"strings"
	"testing"
	"time"
)

const smallCase = `[question]
threshold = 20
horizon = 50
[start]
abundance = 180
[births]
breeding = "pulse"
rate = 0.45
[deaths]
fraction = 0.27
`

// repeat writes n lines made from their number.
func repeat(n int, line func(i int) string) string {
	var b strings.Builder
	for i := range n {
		b.WriteString(line(i))
	}
	return b.String()
}

// hostile files are large or deep in every way that a reader could pay for.
var hostile = map[string]string{
	"too large":             smallCase + strings.Repeat("#", largestFile),
	"brackets":              "a = " + strings.Repeat("[", 2_000_000),
	"nested lists":          smallCase + "by_year = " + strings.Repeat("[", 9000) + strings.Repeat("]", 9000),
	"nested tables":         smallCase + "by_year = " + strings.Repeat("{a=", 5000) + "1" + strings.Repeat("}", 5000),
	"a deep key":            strings.Repeat("a.", 200_000) + "a = 1",
	"a deep table":          "[" + strings.Repeat("a.", 200_000) + "a]\n" + repeat(100_000, func(i int) string { return fmt.Sprintf("k%d=1\n", i) }),
	"many keys":             repeat(300_000, func(i int) string { return fmt.Sprintf("k%d=1\n", i) }),
	"as many keys as go":    repeat(mostLines-1, func(i int) string { return fmt.Sprintf("k%d=1\n", i) }),
	"many tables":           repeat(mostLines-1, func(i int) string { return fmt.Sprintf("[k%d]\n", i) }),
	"many inline keys":      "a = { " + repeat(50_000, func(i int) string { return fmt.Sprintf("k%d=1,", i) }) + " }",
	"many values":           smallCase + "by_year = [" + strings.Repeat("1,", 1_000_000) + "]",
	"a list too long":       smallCase + "by_year = [" + strings.Repeat("1,", longestList+1) + "]",
	"many faults on a line": smallCase + "by_year = [" + strings.Repeat("-1,", longestList) + "]",
	"many rows":             smallCase + strings.Repeat("[[harvest]]\nrule='constant'\n", 9_000),
	"as many rows as go":    smallCase + repeat(mostRows, func(i int) string { return fmt.Sprintf("[[harvest]]\nname='h%d'\nrul='x'\n", i) }),
	"many steps":            smallCase + "steps = [" + strings.Repeat("{from=1,factor=1},", 50_000) + "]",
	"empty elements":        smallCase + "steps = [" + strings.Repeat("{},", 50_000) + "]",
	"many options":          smallCase + "by_year = [" + strings.Repeat("1,", 50_000) + "]\n" + repeat(900, func(i int) string { return fmt.Sprintf("[[option]]\nname='o%d'\nset={\"births.rate\"=1}\n", i) }),
	"one long option":       smallCase + "[[option]]\nname='o'\nset={\"births.by_year\"=[" + strings.Repeat("-1,", 20_000) + "]}\n",
	"a long name":           smallCase + "[[harvest]]\nname='" + strings.Repeat("x", 1_000_000) + "'\nrule='y'\n",
	"a long word":           strings.Replace(smallCase, `"pulse"`, `"`+strings.Repeat("x", 3_000_000)+`"`, 1),
	"a long key":            smallCase + strings.Repeat("x", 3_000_000) + " = 1",
	"a long number":         strings.Replace(smallCase, "0.45", strings.Repeat("4", 3_000_000), 1),
	"a far position":        smallCase + "[[option]]\nname='o'\nset={\"births.by_year.999999\"=1}\n",
	"a fine sweep":          smallCase + "[[sweep]]\nkey='births.rate'\nfrom=0\nto=1000000\nstep=1e-9\n",
}

// TestHostileFiles reads files made to cost time or memory. Each must be
// refused, in few words, and within a time that only something worse than
// linear would need: the slowest takes about a second.
func TestHostileFiles(t *testing.T) {
	for name, text := range hostile {
		t.Run(name, func(t *testing.T) {
			start := time.Now()
			c, errs := Read("hostile.toml", []byte(text))
			took := time.Since(start)
			if c != nil || len(errs) == 0 {
				t.Fatal("read as a case")
			}
			if said := errs.Text(true); len(said) > 40_000 {
				t.Errorf("%d bytes of messages", len(said))
			}
			if took > 20*time.Second {
				t.Errorf("took %v", took)
			}
			t.Log(took, errs[0].Error())
		})
	}
}

// TestLargeCase reads a case at the limits, which is slow only if something
// grows faster than its values.
func TestLargeCase(t *testing.T) {
	text := smallCase + "crowding = { form = 'none' }\nby_year = [" + strings.Repeat("1.0,", 40_000) + "]\n"
	c, errs := Read("large.toml", []byte(text))
	if len(errs) > 0 {
		t.Fatal(errs)
	}
	if got := len(c.Deaths.ByYear); got != 40_000 {
		t.Errorf("%d factors, want 40000", got)
	}
}
