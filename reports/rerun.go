package reports

import (
	"crypto/sha256"
	"encoding/hex"
	"strconv"
	"strings"
)

// longestLine is how many characters of a line of the case stand in one cell: as
// many as a row of the greatest height shows. A cell would hold 32,767.
const longestLine = 2400

// CaseLines is the case text as it is kept in a report: its lines without their
// ends. CaseSum is the SHA-256 of the lines joined by line feeds.
func CaseLines(caseText string) []string {
	t := strings.ReplaceAll(caseText, "\r\n", "\n")
	return strings.Split(strings.TrimSuffix(t, "\n"), "\n")
}

// CaseSum is the SHA-256, in hexadecimal, of lines joined by line feeds.
func CaseSum(lines []string) string {
	sum := sha256.Sum256([]byte(strings.Join(lines, "\n")))
	return hex.EncodeToString(sum[:])
}

// rerunPart holds all that is needed to run the case again. The case text has a
// row a line; a line too long for a cell goes on in the next row under the same
// number.
func rerunPart(r *Report) Part {
	lines := CaseLines(r.CaseText)
	b := newTable("rerun", "").column("what", "What", "", Format{}).wide("value", "Value")
	row := func(id, what string, value Cell) {
		b.row(id, map[string]Cell{"what": text(what), "value": value})
	}
	row("program", "Program", text(Program))
	row("version", "Version", text(r.Version))
	row("command", "Command line", text(r.Command))
	if r.CaseFile != "" {
		row("file", "Case file", text(r.CaseFile))
	}
	row("seed", "Seed", text(strconv.FormatUint(r.Seed, 10)))
	row("replicates", "Replicates finished", num(float64(r.Replicates)).as(Counts, 0))
	if r.Asked != r.Replicates {
		row("asked", "Replicates asked for", num(float64(r.Asked)).as(Counts, 0))
	}
	row("digest", "Digest of the case", text(r.Digest))
	row("lines", "Lines of the case text", num(float64(len(lines))).as(Counts, 0))
	row("sha256", "SHA-256 of the case text", text(CaseSum(lines)))
	t := newTable("case_text", "The case as run").column("line", "Line", "", Format{}).wide("text", "Text")
	t.t.Note = "The SHA-256 is that of these lines joined by line feeds."
	t.t.Main = true
	for i, line := range lines {
		for n, part := range pieces(line) {
			t.row(strconv.Itoa(i+1)+"/"+strconv.Itoa(n+1), map[string]Cell{"line": num(float64(i + 1)), "text": text(part)})
		}
	}
	return Part{Name: PartRunAgain, Lead: "Same version, same case, same seed: the same counts on any machine, with any number of workers.",
		Tables: []*Table{b.t, t.t}}
}

// pieces splits a line into parts that fit a cell, between characters. A
// character beyond the basic plane counts twice, as spreadsheets count it.
func pieces(line string) []string {
	var out []string
	start, units := 0, 0
	for i, r := range line {
		n := 1
		if r > 0xffff {
			n = 2
		}
		if units+n > longestLine {
			out = append(out, line[start:i])
			start, units = i, 0
		}
		units += n
	}
	return append(out, line[start:])
}
