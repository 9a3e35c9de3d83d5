package rates

import "sync"

// matched keeps the fractions that have been matched: a sweep makes thousands of
// cases whose fractions are the same, and matching one takes milliseconds.
var matched struct {
	sync.Mutex
	laws map[[2]float64]Fraction // by mean and standard deviation
}

// mostMatched bounds what is kept; beyond it all is forgotten at once.
const mostMatched = 4096

// matchedFraction is matchFraction, remembered. An error is not.
func matchedFraction(mean, sd float64) (Fraction, error) {
	key := [2]float64{mean, sd}
	matched.Lock()
	law, known := matched.laws[key]
	matched.Unlock()
	if known {
		return law, nil
	}
	law, err := matchFraction(mean, sd)
	if err != nil {
		return law, err
	}
	matched.Lock()
	defer matched.Unlock()
	if matched.laws == nil || len(matched.laws) >= mostMatched {
		matched.laws = map[[2]float64]Fraction{}
	}
	matched.laws[key] = law
	return law, nil
}
