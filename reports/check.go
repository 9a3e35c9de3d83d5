package reports

import (
	"strings"

	"ebbline/pva"
)

// OrderOfYear is the order of the year for this case, one sentence a step,
// without numbers.
func OrderOfYear(c *pva.Case) []string {
	var out []string
	for _, p := range (&model{c: c}).schedule().Paragraphs {
		if n, rest, ok := strings.Cut(p.Text, ". "); ok && len(n) < 3 && n[0] >= '1' && n[0] <= '9' {
			out = append(out, rest)
		}
	}
	return out
}

// ProvenanceOf counts what the inputs of a case rest on.
func ProvenanceOf(c *pva.Case) Provenance { return provenance(InputsTable(c)) }

// TitleOf is the title of a report of the case read from file: the case's own,
// or else the file's name.
func TitleOf(c *pva.Case, file string) string { return titleOf(c, file) }
