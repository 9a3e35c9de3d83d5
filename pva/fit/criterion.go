package fit

import (
	"fmt"
	"math"
)

// AICc is Akaike's criterion corrected for few observations, for a likelihood
// of k parameters (a variance counts) and n observations: -2 logLik + 2k +
// 2k(k+1)/(n-k-1) (C. M. Hurvich & C.-L. Tsai 1989, Biometrika 76:297-307).
// It is an error unless n > k + 1.
func AICc(logLik float64, k, n int) (float64, error) {
	if n <= k+1 {
		return 0, fmt.Errorf("fit: %d steps are too few to compare a model of %d parameters (more than %d are needed)", n, k, k+1)
	}
	p, m := float64(k), float64(n)
	return -2*logLik + 2*p + 2*p*(p+1)/(m-p-1), nil
}

// gaussian is the log likelihood of n residuals with the variance rss/n.
func gaussian(rss float64, n int) float64 {
	m := float64(n)
	return -0.5 * m * (math.Log(2*math.Pi*rss/m) + 1)
}

// weigh sets the weights of Akaike of the models that are not refused:
// exp(-(AICc - least)/2), summing to 1 (H. Akaike 1978; K. P. Burnham & D. R.
// Anderson 2002, Model Selection and Multimodel Inference, ch. 2).
func weigh(models []Model) {
	least := math.Inf(1)
	for _, m := range models {
		if m.Refused == "" {
			least = math.Min(least, m.AICc)
		}
	}
	sum := 0.0
	for i := range models {
		if models[i].Refused == "" {
			models[i].Weight = math.Exp(-(models[i].AICc - least) / 2)
			sum += models[i].Weight
		}
	}
	for i := range models {
		if sum > 0 {
			models[i].Weight /= sum
		}
	}
}
