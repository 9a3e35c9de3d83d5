package pva

// Proportion is a probability estimated from replicates, with its interval
// (Wilson 1927) at the case's confidence.
type Proportion struct {
	Count, Of           int64
	Estimate, Low, High float64
}

// Difference is a paired difference of two risks on the same replicates
// (Newcombe 1998, Stat. Med. 17:2635): this minus the other, with both
// discordant counts.
type Difference struct {
	Estimate, Low, High float64
	OnlyThis, OnlyOther int64
	Of                  int64
}

// Percentiles are the 5, 25, 50, 75 and 95 % points over all replicates;
// +Inf where the point lies among the outgrown.
type Percentiles struct{ P05, P25, P50, P75, P95 float64 }

// YearResult is one year of an outcome. Means are over replicates not
// outgrown and are NaN if all are.
type YearResult struct {
	Year, Label   int
	Fallen        Proportion // fallen by this year
	Extinct       Proportion // N = 0 at this census
	Outgrown      int64      // by this year
	Mean          float64
	Abundance     Percentiles
	TakeMean      float64
	Take          Percentiles
	ShortfallMean float64
	ExtraMean     float64
	StockedMean   float64
	Closed        Proportion // a scheduled take was closed
}

// Level is the chance of having been at or below a level at some census.
type Level struct {
	Level int64
	Risk  Proportion
}

// Outcome is everything computed from the replicates of one case.
type Outcome struct {
	Replicates int64
	Risk       Proportion // fallen by the horizon
	Extinction Proportion // N = 0 at the last census
	Years      []YearResult
	// FallP25, FallP50 and FallP75 are the years by which that share of all
	// replicates has fallen; 0 if not within the horizon.
	FallP25, FallP50, FallP75 int
	SmallestMean              float64 // expected minimum abundance (McCarthy & Thompson 2001)
	Smallest                  []Level
	MeanLogGrowth             float64 // per year, NaN without pairs
	LogPairs                  int64
	Outgrown                  int64
	Capped                    int64
	TakeMean                  float64 // a year, over the horizon
	TakeTotalMean             float64 // over the horizon
	ShortfallMean             float64 // a year
	ClosedYears               float64 // mean number of years with a closed take
	Batches                   []Proportion
}

// Verdict is the answer against the permit's limit.
type Verdict string

// The three verdicts, and none where the case states no limit.
const (
	NoVerdict  Verdict = ""
	Within     Verdict = "within the limit"
	AboveLimit Verdict = "above the limit"
	Undecided  Verdict = "undecided"
)

// Alternative is a case assessed beside the main one on the same replicates.
type Alternative struct {
	Name       string
	Case       *Case
	Set        []Setting
	Outcome    *Outcome
	Difference Difference // its risk minus the case's
	Verdict    Verdict
	// Added is its risk minus the baseline's where there is a baseline.
	Added *Difference
	Exact *ExactAnswer
}

// Driver is a paired run with one thing taken out, to show what drives the risk.
type Driver struct {
	Without    string // "bad weather", "catastrophes", "the take"
	Risk       Proportion
	Difference Difference // its risk minus the case's
}

// ExactAnswer is the answer without random numbers; Reason says why there is
// none (then all else is zero).
type ExactAnswer struct {
	Risk, Extinction float64
	Error            float64   // stated bound on the error of Risk
	Fallen, Extinct  []float64 // by year
	Mean             []float64 // E[N] by year
	Method           string
	States, Nodes    int
	Reason           string
}

// SubstepBound is how far sub-steps can shift the answer of a flow case.
type SubstepBound struct {
	Substeps    int     // a year; 0 where every event was simulated
	LogGrowth   float64 // largest shift of yearly mean log growth
	Variance    float64 // largest relative shift of its variance
	RiskBound   float64 // bound on the shift of any probability
	EventsBelow float64 // event by event while N is below this
}

// Assessment is one whole answer: the case, its outcome and all that stands beside it.
type Assessment struct {
	Case       *Case
	Seed       uint64
	Replicates int64 // finished
	Asked      int64 // replicates asked for; more than Replicates if interrupted
	Outcome    *Outcome
	Baseline   *Outcome    // nil where nothing is taken or no baseline is wanted
	Added      *Difference // the case's risk minus the baseline's
	Options    []Alternative
	Drivers    []Driver
	Exact      *ExactAnswer
	// ExactTail is the two-sided probability of a count as far from the exact
	// risk as the one simulated; Unreliable is set when it is below 1e-9.
	ExactTail     float64
	BaselineExact *ExactAnswer
	Unreliable    bool
	Verdict       Verdict
	ToDecide      int64 // about how many replicates would settle an undecided verdict
	Substeps      *SubstepBound
	Closed        []ClosedForm // published formulas beside the answer
	// Sequential says that replicates were added until the verdict was settled:
	// the intervals of the risks are then of a confidence sequence.
	Sequential bool
	// Uncertainty is what the draws of uncertain inputs say, nil where none is
	// uncertain. Where it is there, the intervals of probabilities and of
	// differences of risks are intervals between draws.
	Uncertainty *Uncertainty
	Warnings    []Warning
}

// ClosedForm is a published formula that applies to the case or to a part of
// it, beside the figure of this assessment that it can be held against.
type ClosedForm struct {
	Name   string // what it gives
	Value  float64
	Unit   string // "probability", or the unit of a quantity
	Note   string // under which conditions, and what the difference means
	Source string
	// Beside is the same quantity in this assessment, named by BesideName; none
	// where BesideName is empty.
	Beside     float64
	BesideName string
}
