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

// leastPercent is the smallest risk that is written in figures, in percent;
// below it a risk is said to be below it.
const leastPercent = 1e-6

// For is the format with the decimals that one value needs: a percentage below
// 1 keeps two significant digits, zeros at its end left off, and one just short of
// 100 is not written as 100. Every medium writes its percentages by this rule.
func (f Format) For(v float64) Format {
	if f.Kind != Percents {
		return f
	}
	p := math.Abs(100 * v)
	if p == 0 || p == 100 || p < leastPercent || math.IsNaN(p) || math.IsInf(p, 0) {
		return f
	}
	least := f.Digits
	if p < 100 {
		for f.Digits < 12 && strings.HasPrefix(strconv.FormatFloat(p, 'f', f.Digits, 64), "100") {
			f.Digits++
		}
	}
	if two := 1 - int(math.Floor(math.Log10(p))); p < 1 && two > f.Digits {
		f.Digits = two
		s := strconv.FormatFloat(p, 'f', two, 64)
		for f.Digits > least && strings.HasSuffix(s, "0") {
			s = s[:len(s)-1]
			f.Digits--
		}
	}
	return f
}

// TooSmall is the text for a percentage too small to be written in figures, ""
// for every other value and format.
func (f Format) TooSmall(v float64) string {
	if f.Kind == Percents && v > 0 && 100*v < leastPercent {
		return "<0.000001 %"
	}
	return ""
}

// Percent is a risk as percent, with as many digits as the replicates support
// and two significant ones below 1 %. With no replicates (an exact risk) it has
// three significant digits.
func Percent(p float64, replicates int64) string { return percentBare(p, replicates) + " %" }

func percentBare(p float64, replicates int64) string {
	switch {
	case math.IsNaN(p):
		return "unknown"
	case p == 0:
		return "0"
	case p == 1:
		return "100"
	case p > 0 && 100*p < leastPercent:
		return "<0.000001"
	case replicates <= 0:
		return Significant(100*p, 3)
	}
	return percentCell(p, PercentDigits(p, replicates))
}

// PercentRange is an interval of risks as percent: "6.6 to 7.6 %".
func PercentRange(low, high float64, replicates int64) string {
	// Both ends with the digits of their middle, so that they read alike.
	digits := PercentDigits((low+high)/2, replicates)
	return percentCell(low, digits) + " to " + percentCell(high, digits) + " %"
}

// PointsText is a difference of two risks in percentage points: "3.1".
func PointsText(d float64, replicates int64) string {
	return pointsWith(d, PercentDigits(math.Abs(d), replicates))
}

func pointsWith(d float64, digits int) string {
	return zeroless(strconv.FormatFloat(100*d, 'f', digits, 64))
}

// zeroless writes a number that its decimals leave nothing of as plain 0.
func zeroless(s string) string {
	if strings.Trim(s, "-+0.") == "" {
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
		s := zeroless(fixed(v, f.Digits))
		if v > 0 && s != "0" {
			return "+" + s
		}
		return s
	}
	return Plain(v)
}

// percentCell is a fraction in percent with so many decimals, or as many more
// as it needs.
func percentCell(p float64, digits int) string {
	f := Format{Percents, digits}
	switch {
	case p == 0:
		return "0"
	case p == 1:
		return "100"
	case f.TooSmall(p) != "":
		return strings.TrimSuffix(f.TooSmall(p), " %")
	}
	return zeroless(strconv.FormatFloat(100*p, 'f', f.For(p).Digits, 64))
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
