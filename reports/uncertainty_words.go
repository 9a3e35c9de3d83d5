package reports

import (
	"math"

	"ebbline/pva"
)

// readingUncertainty explains the sheet about uncertain inputs.
func readingUncertainty(a *pva.Assessment) []Paragraph {
	u := a.Uncertainty
	var out []Paragraph
	say := func(s string) { out = append(out, Paragraph{Text: s}) }
	say("Each of " + counted(int64(u.Draws), "draw") + " gives every uncertain input a value from its law (a Latin hypercube: McKay, Beckman & Conover 1979; rank correlations by Iman & Conover 1982) and is a case of its own with " +
		counted(u.Each, "replicate") + ". Replicate r of the run belongs to draw r mod " + Grouped(int64(u.Asked)) + ".")
	say("The pooled risk is the mean over the draws: the risk as far as it is known. Its interval is by betting against every mean that it could be (Waudby-Smith & Ramdas 2024) with the shares fallen of the draws: it holds for any law of the risk over independent draws, however few, and is nowhere narrower than Wilson's interval of all replicates. It says how far this mean is settled by so many draws, and not where the risk of the population lies: that is what the law of the risk over the draws shows.")
	if u.Case.Law.Exact {
		say("The law of the risk over the draws is that of the exact risks of the draws, each within " + Significant(u.Case.ExactError, 2) + "; replicates have no part in it.")
	} else if u.Case.Law.Reason == "" {
		s := "The shares fallen of single draws scatter more than the risk does, because few replicates stand behind each. The law of the risk is therefore a beta law, fitted by maximum likelihood to the counts as beta-binomial (Skellam 1948; Griffiths 1973); the interval of the share of draws within the limit is by profile likelihood."
		if math.IsInf(u.Case.Law.Alpha, 1) {
			s += " In this case the counts scatter no more than replicates of one and the same risk do: no effect of the inputs is seen."
		} else {
			s += " Its shapes are " + Significant(u.Case.Law.Alpha, 4) + " and " + Significant(u.Case.Law.Beta, 4) + "."
		}
		say(s)
		if u.Case.ExactReason != "" {
			say("There are no exact risks of the draws: " + u.Case.ExactReason + ".")
		}
	}
	if v := u.Case.Spread; v.Total > 0 && !math.IsNaN(v.Noise) {
		say("Of the variance between draws of the shares fallen, " + shareText(v.Inputs/v.Total) + " comes from the inputs and " + shareText(1-v.Inputs/v.Total) +
			" is replicate noise, which more replicates a draw would take away.")
	}
	if s := u.Stated; s != nil && s.Reason == "" {
		say("With every input at the value that the case states, the exact risk is " + Percent(s.Risk, 0) + ". The pooled risk differs from it because the risk does not change evenly with the inputs.")
	}
	say("A partial rank correlation (McKay, Conover & Whiteman 1976; Iman & Helton 1988) is drawn towards 0 by replicate noise and does not see an input that raises the risk at both ends of its range.")
	if u.Redrawn > 0 {
		say(counted(int64(u.Redrawn), "draw") + " of " + Grouped(int64(u.Asked)) + " had a value that the case cannot have and were drawn anew.")
	}
	if u.Unsolved > 0 {
		say("In " + counted(int64(u.Unsolved), "draw") + " no scale of crowding reaches the capacity; they keep the scale that the stated values have.")
	}
	if len(a.Options) > 0 {
		say("Options are run on the same draws. A number that an option sets itself stays as it sets it in every draw.")
	}
	for _, ref := range []string{
		"Waudby-Smith, I. & Ramdas, A. 2024. Estimating means of bounded random variables by betting. Journal of the Royal Statistical Society B 86:1-27.",
		"Iman, R. L. & Conover, W. J. 1982. A distribution-free approach to inducing rank correlation among input variables. Communications in Statistics B 11:311-334.",
		"McKay, M. D., Beckman, R. J. & Conover, W. J. 1979. A comparison of three methods for selecting values of input variables in the analysis of output from a computer code. Technometrics 21:239-245.",
		"Griffiths, D. A. 1973. Maximum likelihood estimation for the beta-binomial distribution. Biometrics 29:637-648.",
	} {
		out = append(out, Paragraph{Text: ref, Kind: Reference})
	}
	return out
}
