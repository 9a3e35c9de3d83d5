package pva

// Uncertainty is what the outer draws of uncertain inputs say beside the pooled
// risk. Slices by draw are in the order of the draws that are complete: replicate
// r of the run belongs to draw r mod the number of draws asked for.
type Uncertainty struct {
	Draws    int   // complete
	Asked    int   // draws asked for; more than Draws if interrupted
	Each     int64 // replicates a draw
	Inputs   []UncertainInput
	Values   [][]float64 // by draw and input
	Redrawn  int         // draws of which a value was drawn anew: the case cannot have it
	Unsolved int         // draws whose capacity no scale reaches; the case's own scales were kept
	Case     DrawnRisk
	Baseline *DrawnRisk  // nil where there is no baseline
	Options  []DrawnRisk // in the order of the options
	// Stated is the exact answer with every input at the value that the case
	// states; its Reason says why there is none.
	Stated *ExactAnswer
}

// UncertainInput is one uncertain number, its law, and how the risk goes with it.
type UncertainInput struct {
	Key      string // by name
	Law      string // in words
	Value    float64
	Mean, SD float64 // of the law
	Outside  int     // draws of which this value was drawn anew
	Link     Correlation
}

// Correlation is the partial rank correlation coefficient of an input with the
// risk over the draws, the other inputs held: NaN, and an interval of [-1, 1],
// where it is not defined or there are too few draws.
type Correlation struct{ Estimate, Low, High float64 }

// DrawnRisk is the risk of one case over the draws.
type DrawnRisk struct {
	Name   string     // of the option; "" for the case and its baseline
	Fallen []int64    // by draw: replicates fallen by the horizon, of Each
	Pooled Proportion // over all replicates, its interval between draws
	// Exact holds the exact risk of every draw, each known to within ExactError,
	// and Mean their mean with its interval between draws; ExactReason says why
	// there are none.
	Exact       []float64
	ExactError  float64
	ExactReason string
	Mean        Chance
	// Law is the law of the risk over the draws, cleared of the noise of the
	// replicates: the exact risks, or a beta law fitted to the counts.
	Law RiskLaw
	// Within is the chance that the risk of a draw is at or below the limit, by
	// Law; nil without a limit or without a law.
	Within *Chance
	// FitTail is how likely, under a fitted law, a number of draws is whose share
	// fallen is at or below the limit as far off as the one seen (two-sided); a
	// small one says that the law does not fit there. 1 without a limit or a fit.
	FitTail float64
	// Spread says where the variance of the shares fallen between draws is from.
	Spread VarianceParts
}

// Chance is a probability, or a mean of probabilities, that does not rest on one
// count, with its interval.
type Chance struct{ Estimate, Low, High float64 }

// RiskLaw is a law of the risk over draws.
type RiskLaw struct {
	Exact  bool   // the exact risks of the draws; otherwise a fitted beta law
	Reason string // why there is none; all else is then zero
	Mean   float64
	SD     float64
	// Alpha and Beta are the shapes of the fitted law, +Inf where the counts vary
	// no more than replicates of one risk do, and 0 for exact risks.
	Alpha, Beta float64
	Percentiles Percentiles
	Bins        []RiskBin // of equal width, from the lowest up
}

// RiskBin is one bar of the histogram of the risk over draws.
type RiskBin struct {
	Low, High float64 // of the risk; High belongs to the bin, Low to the one before
	Share     float64 // of the law
	Seen      float64 // of the draws, by the share of their replicates fallen
}

// VarianceParts splits the variance between draws of the shares fallen, which is
// Total, into what the inputs make and what is replicate noise. Inputs is Total
// less Noise, or 0 if that is negative; both are NaN with one replicate a draw.
type VarianceParts struct{ Total, Inputs, Noise float64 }
