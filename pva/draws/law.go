package draws

import (
	"fmt"
	"math"
	"strconv"

	"gonum.org/v1/gonum/stat/distuv"

	"ebbline/pva"
)

// law is a distribution of one number.
type law interface {
	Quantile(p float64) float64
	CDF(x float64) float64
	Mean() float64
	StdDev() float64
}

var standard = distuv.Normal{Mu: 0, Sigma: 1}

// central is the normal quantile that cuts off the ends of the central 95 %.
var central = standard.Quantile(0.975)

// newLaw reads one [[uncertain]] table around the value v of the case.
//
// With sd, the law has mean v and that standard deviation: the uniform reaches
// sqrt(3) sd to either side, the triangular (symmetric) sqrt(6) sd; the beta is
// that of the numbers from 0 to 1.
//
// With low and high, laws that have ends have them there: uniform; triangular,
// likeliest at mode, which is v if not given; beta, likeliest at v, with the
// weight that the program evaluation technique gives to it (Malcolm, Roseboom,
// Clark & Fazar 1959, Oper. Res. 7:646): shapes 1 + 4 (v - low)/(high - low) and
// 1 + 4 (high - v)/(high - low), mean (low + 4 v + high)/6. The normal and the
// log-normal have no ends: low and high are those of their central 95 %, as in
// a published interval, and v has no part in them.
func newLaw(u pva.Uncertain, v float64) (l law, words string, fault *pva.Fault) {
	low, high, sd := u.Low.Value, u.High.Value, u.SD.Value
	if u.SD.Set {
		words = fmt.Sprintf("%s, mean %.6g, standard deviation %.6g", named(u.Law), v, sd)
		switch u.Law {
		case "normal":
			return distuv.Normal{Mu: v, Sigma: sd}, words, nil
		case "lognormal":
			if v <= 0 {
				return nil, "", &pva.Fault{Key: "law", Value: `"lognormal"`, Want: "needs a value above 0", Fix: "choose another law"}
			}
			s2 := math.Log1p(sd / v * (sd / v))
			return distuv.LogNormal{Mu: math.Log(v) - s2/2, Sigma: math.Sqrt(s2)}, words, nil
		case "beta":
			n := v*(1-v)/(sd*sd) - 1
			if !(v > 0 && v < 1 && n > 0) {
				return nil, "", &pva.Fault{Key: "sd", Value: number(sd), Want: "is more than a beta law with mean " + number(v) + " can have", Fix: "give a smaller sd, or another law"}
			}
			return distuv.Beta{Alpha: v * n, Beta: (1 - v) * n}, words, nil
		case "uniform":
			half := math.Sqrt(3) * sd
			return distuv.Uniform{Min: v - half, Max: v + half}, words, nil
		case "triangular":
			half := math.Sqrt(6) * sd
			return triangle{v - half, v, v + half}, words, nil
		}
	}
	words = fmt.Sprintf("%s from %.6g to %.6g", named(u.Law), low, high)
	switch u.Law {
	case "normal":
		return distuv.Normal{Mu: (low + high) / 2, Sigma: (high - low) / (2 * central)}, "normal, 95 % " + words[len("normal "):], nil
	case "lognormal":
		if low <= 0 {
			return nil, "", &pva.Fault{Key: "low", Value: number(low), Want: "is not above 0, as all values of a log-normal law are", Fix: "give a low above 0, or another law"}
		}
		a, b := math.Log(low), math.Log(high)
		return distuv.LogNormal{Mu: (a + b) / 2, Sigma: (b - a) / (2 * central)}, "log-normal, 95 % " + words[len("log-normal "):], nil
	case "uniform":
		return distuv.Uniform{Min: low, Max: high}, words, nil
	case "triangular":
		mode := u.Mode.Or(v)
		if mode < low || mode > high {
			return nil, "", &pva.Fault{Key: "mode", Missing: true, Want: "is needed: the case's value " + number(v) + " is not between low and high", Fix: "give the likeliest value"}
		}
		return triangle{low, mode, high}, words + fmt.Sprintf(", likeliest %.6g", mode), nil
	case "beta":
		if v < low || v > high {
			return nil, "", &pva.Fault{Key: "low", Value: number(low), Want: "to high leave out the case's value " + number(v) + ", around which the beta law lies", Fix: "give a low below and a high above it, or another law"}
		}
		w := high - low
		return scaled{distuv.Beta{Alpha: 1 + 4*(v-low)/w, Beta: 1 + 4*(high-v)/w}, low, w}, words + fmt.Sprintf(", likeliest %.6g", v), nil
	}
	panic("draws: no law " + u.Law) // the key table allows no other
}

func named(law string) string {
	if law == "lognormal" {
		return "log-normal"
	}
	return law
}

func number(v float64) string { return strconv.FormatFloat(v, 'g', 6, 64) }

// scaled is a beta law on [low, low + width].
type scaled struct {
	distuv.Beta
	low, width float64
}

func (s scaled) Quantile(p float64) float64 { return s.low + s.width*s.Beta.Quantile(p) }
func (s scaled) CDF(x float64) float64      { return s.Beta.CDF((x - s.low) / s.width) }
func (s scaled) Mean() float64              { return s.low + s.width*s.Beta.Mean() }
func (s scaled) StdDev() float64            { return s.width * s.Beta.StdDev() }

// triangle is the triangular law: its ends and its likeliest value, which may be
// an end.
type triangle struct{ low, mode, high float64 }

func (t triangle) Quantile(p float64) float64 {
	w := t.high - t.low
	if f := (t.mode - t.low) / w; p < f {
		return t.low + math.Sqrt(p*w*(t.mode-t.low))
	}
	return t.high - math.Sqrt((1-p)*w*(t.high-t.mode))
}

func (t triangle) CDF(x float64) float64 {
	w := t.high - t.low
	switch {
	case x <= t.low:
		return 0
	case x >= t.high:
		return 1
	case x < t.mode:
		return (x - t.low) * (x - t.low) / (w * (t.mode - t.low))
	}
	return 1 - (t.high-x)*(t.high-x)/(w*(t.high-t.mode))
}

func (t triangle) Mean() float64 { return (t.low + t.mode + t.high) / 3 }
func (t triangle) StdDev() float64 {
	a, b, c := t.low, t.mode, t.high
	return math.Sqrt(((b-a)*(b-a) + (c-b)*(c-b) + (c-a)*(c-a)) / 36)
}

// newInput reads one [[uncertain]] table; row is its path with a dot.
func newInput(c *pva.Case, row string, u pva.Uncertain) (Input, pva.Faults) {
	fault := func(key string, f pva.Fault) (Input, pva.Faults) {
		f.Key, f.Path = row+key, row+key
		return Input{}, pva.Faults{f}
	}
	path, bad := c.Lookup(u.Key)
	if bad != nil {
		return Input{}, pva.Faults{*bad}
	}
	key, positions := pva.Find(path)
	if key == nil {
		return fault("key", pva.Fault{Value: strconv.Quote(u.Key), Want: "names nothing"})
	}
	in := Input{Path: path, Key: c.Display(path), key: key}
	switch p := key.At(c, positions...).(type) {
	case *float64:
		in.Value = *p
	case *pva.Optional:
		in.Value = p.Value
	default:
		return fault("key", pva.Fault{Value: strconv.Quote(u.Key), Want: "is not a number that can be uncertain"})
	}
	l, words, wrong := newLaw(u, in.Value)
	if wrong != nil {
		return fault(wrong.Key, *wrong)
	}
	in.law, in.Words, in.Mean, in.SD = l, words, l.Mean(), l.StdDev()
	in.from, in.to = below(l, key.Min), below(l, key.Max)
	if !(in.to-in.from >= leastInside) {
		return fault("law", pva.Fault{Value: strconv.Quote(u.Law), Want: fmt.Sprintf("lies for the most part (%.0f %%) outside what %s may be", 100*(1-in.to+in.from), in.Key), Fix: "give a narrower law, or one that ends there"})
	}
	return in, nil
}

// below is the chance of values up to x. A log-normal law has none up to 0, where
// its formula has no value.
func below(l law, x float64) float64 {
	if p := l.CDF(x); p > 0 {
		return p
	}
	return 0
}

// leastInside is the smallest part of a law that must lie inside the key's range.
const leastInside = 0.5

// at is the value at chance p of the law or, if the key cannot be that, the one
// at chance spare of the part of the law that it can be.
func (in *Input) at(p, spare float64) (v float64, outside bool) {
	if v := rounded(in.law.Quantile(p)); in.allows(v) {
		return v, false
	}
	return in.within(spare), true
}

// within is the value at chance p of the part of the law that the key allows.
func (in *Input) within(p float64) float64 {
	v := in.law.Quantile(in.from + p*(in.to-in.from))
	if r := rounded(v); in.allows(r) {
		return r
	}
	// Rounding may reach an end that is itself not allowed.
	v = math.Max(in.key.Min, math.Min(in.key.Max, v))
	if in.key.OpenMin {
		v = math.Max(v, math.Nextafter(in.key.Min, math.Inf(1)))
	}
	if in.key.OpenMax {
		v = math.Min(v, math.Nextafter(in.key.Max, math.Inf(-1)))
	}
	return v
}

func (in *Input) allows(v float64) bool {
	k := in.key
	return v >= k.Min && v <= k.Max && !(k.OpenMin && v == k.Min) && !(k.OpenMax && v == k.Max)
}

// rounded is v with ten significant digits.
func rounded(v float64) float64 {
	r, err := strconv.ParseFloat(strconv.FormatFloat(v, 'e', 9, 64), 64)
	if err != nil {
		return v // beyond all numbers, and so outside every range
	}
	return r
}
