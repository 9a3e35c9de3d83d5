package reports

import (
	"math"
	"strconv"
	"strings"
)

// PercentDigits is the number of decimals, in percent, that a risk near p
// deserves from so many replicates: the last one is about as large as the
// standard error. A risk of 0 or 1 is taken as one replicate away from it.
func PercentDigits(p float64, replicates int64) int {
	if replicates < 1 {
		replicates = 1
	}
	n := float64(replicates)
	p = math.Min(math.Max(p, 1/(n+1)), 1-1/(n+1))
	return max(0, min(8, int(math.Ceil(-math.Log10(100*math.Sqrt(p*(1-p)/n))-1e-9))))
}

// Percent is a risk as percent, with as many digits as the replicates support.
// With no replicates (an exact risk) it has three significant digits.
func Percent(p float64, replicates int64) string { return percentBare(p, replicates) + " %" }

func percentBare(p float64, replicates int64) string {
	switch {
	case math.IsNaN(p):
		return "unknown"
	case p == 0:
		return "0"
	case p == 1:
		return "100"
	case replicates <= 0:
		return Significant(100*p, 3)
	}
	return strconv.FormatFloat(100*p, 'f', PercentDigits(p, replicates), 64)
}

// PercentRange is an interval of risks as percent: "6.6 to 7.6 %".
func PercentRange(low, high float64, replicates int64) string {
	// Both ends with the digits of the finer one, so that they read alike.
	digits := PercentDigits((low+high)/2, replicates)
	f := func(p float64) string {
		if p == 0 || p == 1 {
			return percentBare(p, replicates)
		}
		return strconv.FormatFloat(100*p, 'f', digits, 64)
	}
	return f(low) + " to " + f(high) + " %"
}

// PointsText is a difference of two risks in percentage points: "3.1".
func PointsText(d float64, replicates int64) string {
	digits := PercentDigits(math.Abs(d), replicates)
	s := strconv.FormatFloat(100*d, 'f', digits, 64)
	if strings.Trim(s, "-0.") == "" {
		return "0"
	}
	return s
}

// Grouped is a whole number in groups of three: "10,000".
func Grouped(n int64) string {
	s := strconv.FormatInt(n, 10)
	sign := ""
	if n < 0 {
		sign, s = "-", s[1:]
	}
	for i := len(s) - 3; i > 0; i -= 3 {
		s = s[:i] + "," + s[i:]
	}
	return sign + s
}

// Plain is a number as a person writes it: all its digits, thousands grouped,
// no exponent between a millionth and a thousand million millions.
func Plain(v float64) string {
	switch {
	case math.IsNaN(v):
		return "unknown"
	case math.IsInf(v, 0):
		return "beyond all bounds"
	case v == math.Trunc(v) && math.Abs(v) < 1e15:
		return Grouped(int64(v))
	case math.Abs(v) < 1e-6 || math.Abs(v) >= 1e15:
		return strconv.FormatFloat(v, 'g', -1, 64)
	}
	s := strconv.FormatFloat(v, 'f', -1, 64)
	whole, rest, _ := strings.Cut(s, ".")
	n, err := strconv.ParseInt(whole, 10, 64)
	if err != nil || n == 0 {
		return s
	}
	return Grouped(n) + "." + rest
}

// Significant is a number with so many significant digits, trailing zeros kept
// off and no exponent above a millionth.
func Significant(v float64, digits int) string {
	if v == 0 || math.IsNaN(v) || math.IsInf(v, 0) {
		return Plain(v)
	}
	rounded, _ := strconv.ParseFloat(strconv.FormatFloat(v, 'e', digits-1, 64), 64)
	return Plain(rounded)
}

// Show writes a number in the format.
func (f Format) Show(v float64) string {
	switch f.Kind {
	case Counts:
		return Grouped(int64(math.Round(v)))
	case Dates:
		return strconv.FormatInt(int64(v), 10)
	case Decimal:
		return fixed(v, f.Digits)
	case Percents:
		return percentCell(v, f.Digits) + " %"
	case Small:
		return strconv.FormatFloat(v, 'e', f.Digits, 64)
	case Points:
		s := fixed(v, f.Digits)
		if v > 0 && strings.Trim(s, "0.") != "" {
			return "+" + s
		}
		return s
	}
	return Plain(v)
}

// percentCell keeps a small risk from being shown as none: below half of the
// last digit it is written with one more.
func percentCell(p float64, digits int) string {
	v := 100 * p
	switch {
	case v == 0:
		return "0"
	case math.Abs(v) < 0.5*math.Pow10(-digits):
		digits++
	}
	return strconv.FormatFloat(v, 'f', digits, 64)
}

func fixed(v float64, digits int) string {
	s := strconv.FormatFloat(math.Abs(v), 'f', digits, 64)
	whole, rest, point := strings.Cut(s, ".")
	if n, err := strconv.ParseInt(whole, 10, 64); err == nil {
		whole = Grouped(n)
	}
	if point {
		whole += "." + rest
	}
	if v < 0 && strings.Trim(s, "0.") != "" {
		return "-" + whole
	}
	return whole
}

// counted is a number with its noun: "1 replicate", "3 replicates".
func counted(n int64, noun string) string {
	if n == 1 {
		return "1 " + noun
	}
	return Grouped(n) + " " + noun + "s"
}

// listed joins words as a sentence does: "a, b and c".
func listed(words []string) string {
	if len(words) < 2 {
		return strings.Join(words, "")
	}
	return strings.Join(words[:len(words)-1], ", ") + " and " + words[len(words)-1]
}

// sentence makes the first letter large.
func sentence(s string) string {
	if s == "" {
		return s
	}
	return strings.ToUpper(s[:1]) + s[1:]
}
