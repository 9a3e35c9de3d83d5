package reports

import (
	"slices"
	"strings"

	"ebbline/pva"
)

// Caution is one thing to bear in mind: in short for the first page, in whole
// with its references for the report.
type Caution struct {
	Short      string // "" where it stands in the whole report only
	Heading    string
	Text       string
	References []string
}

// The publications that cautions and the model rest on.
const (
	beissinger = "Beissinger, S. R. & Westphal, M. I. 1998. On the use of demographic models of population viability in endangered species management. J. Wildl. Manage. 62:821-841."
	coulson    = "Coulson, T., Mace, G. M., Hudson, E. & Possingham, H. 2001. The use and abuse of population viability analysis. Trends Ecol. Evol. 16:219-221."
	ludwig     = "Ludwig, D. 1999. Is it meaningful to estimate a probability of extinction? Ecology 80:298-310."
	fieberg    = "Fieberg, J. & Ellner, S. P. 2000. When is it meaningful to estimate an extinction probability? Ecology 81:2040-2047."
	frankham   = "Frankham, R. 2005. Genetics and extinction. Biol. Conserv. 126:131-140."
	caswell    = "Caswell, H. 2001. Matrix population models, 2nd ed. Sinauer."
	lande      = "Lande, R. 1993. Risks of population extinction from demographic and environmental stochasticity and random catastrophes. Am. Nat. 142:911-927."
	allee      = "Stephens, P. A. & Sutherland, W. J. 1999. Consequences of the Allee effect for behaviour, ecology and conservation. Trends Ecol. Evol. 14:401-405."
	grimm2006  = "Grimm, V. et al. 2006. A standard protocol for describing individual-based and agent-based models. Ecol. Model. 198:115-126."
	grimm2020  = "Grimm, V. et al. 2020. The ODD protocol for describing agent-based and other simulation models: a second update. J. Artif. Soc. Soc. Simul. 23(2):7."
	mccarthy   = "McCarthy, M. A. & Thompson, C. 2001. Expected minimum population size as a measure of threat. Anim. Conserv. 4:379-386."
	wilson1927 = "Wilson, E. B. 1927. Probable inference, the law of succession, and statistical inference. J. Am. Stat. Assoc. 22:209-212."
	robbins    = "Robbins, H. 1970. Statistical methods related to the law of the iterated logarithm. Ann. Math. Stat. 41:1397-1409."
	howard     = "Howard, S. R., Ramdas, A., McAuliffe, J. & Sekhon, J. 2021. Time-uniform, nonparametric, nonasymptotic confidence sequences. Ann. Stat. 49:1055-1080."
	betting    = "Waudby-Smith, I. & Ramdas, A. 2024. Estimating means of bounded random variables by betting. J. R. Stat. Soc. B 86:1-27."
	newcombe   = "Newcombe, R. G. 1998. Improved confidence intervals for the difference between binomial proportions based on paired data. Stat. Med. 17:2635-2650."
)

// methodsOf are the references of the methods behind an assessment's intervals.
func methodsOf(a *pva.Assessment) []string {
	switch {
	case a.Uncertainty != nil:
		return []string{betting, wilson1927}
	case a.Sequential:
		return []string{robbins, howard}
	}
	return []string{wilson1927, newcombe}
}

// Cautions are what every answer carries, worded for this case: in short, and in whole.
func Cautions(c *pva.Case) (short, long []Caution) {
	long = []Caution{lawCaution(c), conditionalCaution(c), inputCaution(c), leftOutCaution(c)}
	if permitted, _ := c.Takes(); permitted {
		long = append(long, takeCaution(c))
	}
	if w := noiseCaution(c); w.Text != "" {
		long = append(long, w)
	}
	for _, w := range long {
		if w.Short != "" {
			short = append(short, w)
		}
	}
	return short, long
}

// ExactCautions are those of an answer without random numbers alone.
func ExactCautions(c *pva.Case) []Caution {
	short, _ := Cautions(c)
	for i := range short {
		if short[i].Heading == inputHeading {
			short[i].Short = "The error stated is that of the computation alone; it does not carry the uncertainty of the inputs."
		}
	}
	return short
}

// besideExact words the cautions for an answer that is both exact and simulated.
func besideExact(short []Caution) {
	for i := range short {
		if short[i].Heading == inputHeading && strings.HasPrefix(short[i].Short, "The interval is that of the replicates alone") {
			short[i].Short = "The interval is that of the replicates alone and the exact answer's error that of the computation; neither carries the uncertainty of the inputs."
		}
	}
}

// Unsaid leaves out the short cautions whose matter a warning already states.
func Unsaid(short []Caution, warnings []pva.Warning) []Caution {
	for _, w := range warnings {
		if w.Key != "births.year_sd" {
			continue
		}
		var left []Caution
		for _, s := range short {
			if s.Heading != noiseHeading {
				left = append(left, s)
			}
		}
		return left
	}
	return short
}

const inputHeading, noiseHeading = "Uncertain inputs", "Noise"

func lawCaution(c *pva.Case) Caution {
	return Caution{
		Heading: "Law and judgement come first",
		Short:   "Local law, agency guidance and a qualified biologist's judgement come first.",
		Text: "Local law, agency guidance and the judgement of a licensed or otherwise qualified biologist come before any figure here. " +
			"Whether a permit is given is not for this program to say; it shows what follows from the numbers that it was handed.",
	}
}

func conditionalCaution(c *pva.Case) Caution {
	w := Caution{
		Heading: "A risk under a model, not a forecast",
		Short:   "A risk under a model and its inputs, not a forecast.",
		Text: "Every risk here holds if the population lives as the model says with the numbers that stand under Inputs. It is no forecast of what will be counted. " +
			"Differences between options under the same model are usually firmer than any one figure, so compare before relying on a single risk.",
		References: []string{beissinger, coulson},
	}
	return w
}

// inputCaution says what the interval carries and what not.
func inputCaution(c *pva.Case) Caution {
	w := Caution{Heading: inputHeading, References: []string{ludwig, fieberg}}
	if len(c.Uncertain) == 0 {
		w.Short = "The interval is that of the replicates alone; it does not carry the uncertainty of the inputs."
		w.Text = "The intervals say how far the risk could move if the same case were simulated again with other random numbers. They do not say how far it could move if the inputs were wrong: no input is marked uncertain in this case. "
	} else {
		w.Short = "The interval carries the uncertainty of the inputs that are marked uncertain, and of no others."
		w.Text = "Inputs marked uncertain (" + listed(uncertainKeys(c)) + ") were drawn from their laws; all others are taken as exact. "
	}
	w.Text += "Rates from short or noisy series of counts leave a risk of falling very open, more so the longer the horizon."
	if c.CountYears.Set {
		w.Text += " The rates rest on " + counted(int64(c.CountYears.Value), "year") + " of counts and the horizon is " + counted(int64(c.Question.Horizon), c.TimeUnit) + "."
		if float64(c.Question.Horizon) > c.CountYears.Value/5 {
			w.Text += " That is more than a fifth of the series, beyond which Fieberg & Ellner found estimates of little use."
		}
	} else {
		w.Text += " The case does not say how many years of counts its rates rest on."
	}
	return w
}

func uncertainKeys(c *pva.Case) []string {
	keys := make([]string, len(c.Uncertain))
	for i, u := range c.Uncertain {
		keys[i] = u.Key
	}
	return keys
}

// leftOutCaution names what this case's model has no place for.
func leftOutCaution(c *pva.Case) Caution {
	out := []string{
		"ages and stages (all that are counted have the same chances)",
		"genetics and inbreeding",
		"movement to and from other populations" + map[bool]string{true: " beyond the additions stated"}[len(c.Stocking) > 0],
		"disease and predators as populations of their own",
	}
	if !hasCalendar(c.Births.Calendar) && !hasCalendar(c.Deaths.Calendar) {
		out = append(out, "change of the habitat or climate (the rates have no trend)")
	}
	if len(c.Catastrophe) == 0 {
		out = append(out, "catastrophes (none is stated)")
	}
	if c.Births.Scarcity.Form == "none" {
		out = append(out, "difficulty of finding mates when few are left (no Allee effect is stated)")
	}
	if c.Births.Crowding.Form == "none" && c.Deaths.Crowding.Form == "none" {
		out = append(out, "crowding (births and deaths per head do not depend on the number)")
	}
	out = append(out, "poaching and other losses that nobody reports")
	return Caution{
		Heading:    "What the model leaves out",
		Short:      "Left out: ages, genetics, movement, disease" + map[bool]string{true: ", catastrophes"}[len(c.Catastrophe) == 0] + map[bool]string{true: ", Allee effect"}[c.Births.Scarcity.Form == "none"] + "; see Cautions.",
		Text:       "The model of this case leaves out: " + strings.Join(out, "; ") + ". Most of these make a small population more likely to fall; some work the other way. None is in the figures.",
		References: []string{frankham, caswell, allee},
	}
}

func hasCalendar(c pva.Calendar) bool {
	return c.Trend != 0 || len(c.Steps) > 0 || c.Cycle.Amplitude != 0 || len(c.ByYear) > 0
}

// takeCaution is about what the take of the model assumes.
func takeCaution(c *pva.Case) Caution {
	w := Caution{Heading: "The take as modelled"}
	var exact, unsexed []string
	for i := range c.Harvest {
		h := c.Harvest[i]
		name := "the take"
		if h.Name != "" {
			name = h.Name
		}
		if h.SurveyCV == 0 && (h.Rule != "constant" && h.Rule != "by_year" || h.StopBelow > 0) {
			exact = append(exact, name)
		}
		if h.Share == 1 {
			unsexed = append(unsexed, name)
		}
	}
	w.Text = "The take follows its rule every scheduled " + c.TimeUnit + ", and is made in full while enough are there; a rule that is not kept, or kept late, is not modelled."
	if len(exact) > 0 {
		w.Text += " The rule of " + listed(exact) + " sees the true number, without the error that every survey has."
	}
	if len(unsexed) > 0 && c.Counts != "animals" {
		w.Text += " Each animal of " + listed(unsexed) + " is taken to cost one counting unit (" + c.Counts + ")."
	}
	return w
}

// noiseCaution is about variation that the case does not state.
func noiseCaution(c *pva.Case) Caution {
	var parts []string
	if c.Births.YearSD == 0 && c.Deaths.YearSD == 0 {
		parts = append(parts, "No variation between "+c.TimeUnit+"s is stated for births or deaths. Real rates vary, and leaving it out understates the risk, often by much (Lande 1993).")
	}
	if c.UnitSize > 1 {
		parts = append(parts, "One counting unit stands for "+Plain(c.UnitSize)+" animals; chance is drawn for units, which overstates the noise of single births and deaths.")
	}
	if len(parts) == 0 {
		return Caution{}
	}
	w := Caution{Heading: noiseHeading, Text: strings.Join(parts, " ")}
	if c.Births.YearSD == 0 && c.Deaths.YearSD == 0 {
		w.Short = "No variation between " + c.TimeUnit + "s is stated, which understates the risk."
		w.References = []string{lande}
	}
	return w
}

func cautionsPart(c *pva.Case, r *Report) Part {
	p := Part{Name: PartCautions, Lead: "What this result supports and what it does not."}
	seen := map[string]bool{}
	var refs []Paragraph
	for _, w := range r.Cautions {
		p.Sections = append(p.Sections, Section{Heading: w.Heading, Paragraphs: []Paragraph{{Text: w.Text}}})
		for _, ref := range w.References {
			if !seen[ref] {
				seen[ref] = true
				refs = append(refs, Paragraph{Text: ref, Kind: Reference})
			}
		}
	}
	if len(r.Warnings) > 0 {
		s := Section{Heading: "Warnings about this case"}
		for _, w := range r.Warnings {
			s.Paragraphs = append(s.Paragraphs, Paragraph{Text: strings.TrimSuffix(w, ".") + "."})
		}
		p.Sections = append(p.Sections, s)
	}
	for _, ref := range append(slices.Clone(r.methods), mccarthy) {
		refs = append(refs, Paragraph{Text: ref, Kind: Reference})
	}
	p.Sections = append(p.Sections, Section{Heading: "References", Paragraphs: refs})
	return p
}
