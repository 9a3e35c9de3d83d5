// Package reports states an assessment as typed tables, figures and paragraphs,
// independent of the medium: the workbook, the terminal and the tidy files only
// render what stands here, so that they cannot disagree.
//
// It computes no risk and draws no random numbers; every number comes from the
// results of package pva or is arithmetic on them, and then carries its formula.
// It also saves report files whole and recognises this program's own reports.
// It is called by the commands.
package reports

import "ebbline/pva"

// Program is the program's name as it stands in reports and their properties.
const Program = "ebbline"

// Meta is what a report says about the run and the results do not hold.
type Meta struct {
	Version  string // of the program
	Command  string // the command line that repeats the run
	CaseText string // the case as run, in TOML
	CaseFile string // where it was read from
	// BirthsScale and DeathsScale are the scales L in force where the case gives
	// a capacity and they were solved; left out of the report if not set.
	BirthsScale, DeathsScale pva.Optional
}

// Report is one assessment ready to be rendered.
type Report struct {
	Meta
	Title, Prepared, Purpose string
	Question                 string // in one sentence
	Digest                   string // of the case
	Seed                     uint64
	Replicates, Asked        int64 // finished and asked for
	Confidence               float64
	methods                  []string // references of the methods behind its intervals
	Verdict                  pva.Verdict
	VerdictText              string // the verdict and what it rests on, in a sentence; "" without a limit
	// Head is the large figure of the first page where the answer is no risk (a
	// size, a take), and HeadBeside what stands beside it; "" where the first of
	// Figures is the answer.
	Head, HeadBeside string
	Figures          []Figure
	Numbers          []Number // five numbers that matter beside the risk
	Parts            []Part   // in order; the first is the answer
	Provenance       Provenance
	Warnings         []string
	ShortCautions    []Caution
	Cautions         []Caution
}

// Part is one sheet or chapter of a report.
type Part struct {
	Name     string
	Lead     string // what it shows, in a sentence
	Tables   []*Table
	Charts   []Chart
	Sections []Section
	// Bare parts are one table alone, its heading in the first row, so that a
	// program can read them.
	Bare bool
}

// Part is the part of a name, nil if this report has none.
func (r *Report) Part(name string) *Part {
	for i := range r.Parts {
		if r.Parts[i].Name == name {
			return &r.Parts[i]
		}
	}
	return nil
}

// Table is the table of an identity, nil if this report has none.
func (r *Report) Table(id string) *Table {
	for _, p := range r.Parts {
		for _, t := range p.Tables {
			if t.ID == id {
				return t
			}
		}
	}
	return nil
}

// Section is a heading with paragraphs under it.
type Section struct {
	Heading    string
	Paragraphs []Paragraph
}

// Paragraph is running text, a formula on a line of its own, or a reference.
type Paragraph struct {
	Text string
	Kind ParagraphKind
}

// ParagraphKind says how a paragraph is set.
type ParagraphKind uint8

// The kinds of paragraph.
const (
	Prose ParagraphKind = iota
	Formula
	Reference
)

// The names of the parts, which are the names of the workbook's sheets.
const (
	PartAnswer    = "Answer"
	PartRisk      = "Risk by year"
	PartAbundance = "Abundance"
	PartLowest    = "How soon, how low"
	PartOptions   = "Options"
	PartDrivers   = "What matters most"
	PartInputs    = "Inputs"
	PartModel     = "Model"
	PartChecks    = "Checks"
	PartCautions  = "Cautions"
	PartRunAgain  = "Run again"
)

// Build states an assessment as a report. The assessment must hold a case and
// an outcome with as many years as the horizon; anything else is a bug of the
// caller and panics.
func Build(a *pva.Assessment, meta Meta) *Report {
	c := a.Case
	if len(a.Outcome.Years) != c.Question.Horizon {
		panic("reports: an outcome without a result for every year")
	}
	r := &Report{
		Meta:       meta,
		Title:      titleOf(c, meta.CaseFile),
		Prepared:   c.Prepared,
		Purpose:    c.Purpose,
		Question:   Question(c),
		Digest:     c.Digest(),
		Seed:       a.Seed,
		Replicates: a.Replicates,
		Asked:      a.Asked,
		Confidence: c.Question.Confidence,
		Verdict:    a.Verdict,
		Figures:    figures(a),
		Numbers:    numbers(a),
		Provenance: ProvenanceOf(c),
	}
	r.methods = methodsOf(a)
	r.VerdictText = verdictText(a)
	r.carryUncertainty(a)
	r.ShortCautions, r.Cautions = Cautions(c)
	r.ShortCautions = Unsaid(r.ShortCautions, a.Warnings)
	if exactAnswer(a.Exact) != nil {
		besideExact(r.ShortCautions)
	}
	for _, w := range a.Warnings {
		r.Warnings = append(r.Warnings, w.String())
	}
	z := newScores(c.Question.Confidence)
	r.Parts = append(r.Parts, answerPart(a, r, z), riskPart(a, z), abundancePart(a), lowestPart(a, z))
	if len(a.Options) > 0 {
		r.Parts = append(r.Parts, optionsPart(a, z))
	}
	r.Parts = append(r.Parts, uncertaintyParts(a)...)
	if len(a.Drivers) > 0 {
		r.Parts = append(r.Parts, driversPart(a, z))
	}
	r.Parts = append(r.Parts,
		Part{Name: PartInputs, Bare: true, Tables: []*Table{InputsTable(c)},
			Lead: "Every number and word in force, and what it rests on."},
		modelPart(c, meta))
	if p, any := checksPart(a, z); any {
		r.Parts = append(r.Parts, p)
	}
	r.Parts = append(r.Parts, cautionsPart(c, r), rerunPart(r))
	return r
}
