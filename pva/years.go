package pva

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// ParseYears reads a span of years: "2027-2056", "2030-", "-2040", "2031" or "-".
func ParseYears(text string) (Years, error) {
	s := strings.ReplaceAll(strings.TrimSpace(text), " ", "")
	y := Years{Text: text}
	from, to, dash := strings.Cut(s, "-")
	if s == "" {
		return y, fmt.Errorf("empty")
	}
	if !dash {
		to = from
	}
	var err error
	if from == "" {
		y.OpenFrom = true
	} else if y.From, err = year(from); err != nil {
		return y, err
	}
	if to == "" {
		y.OpenTo = true
	} else if y.To, err = year(to); err != nil {
		return y, err
	}
	if !y.OpenFrom && !y.OpenTo && y.To < y.From {
		return y, fmt.Errorf("ends before it starts")
	}
	return y, nil
}

func year(s string) (int, error) {
	n, err := strconv.Atoi(s)
	if err != nil || n < 0 || n > latest {
		return 0, fmt.Errorf("%q is not a year", s)
	}
	return n, nil
}

// First is the first model year of the schedule in case c, at least 1; Scheduled
// counts the years from it.
func (s Schedule) First(c *Case) int {
	if s.Years.OpenFrom {
		return 1
	}
	return max(1, s.Years.From-c.Label(1)+1)
}

// Scheduled says whether the schedule acts in model year y: the first year of
// its span, then every OneYearIn-th. Where the span starts before year 1 the
// count still runs from the span's own first year.
func (s Schedule) Scheduled(c *Case, y int) bool {
	label := c.Label(y)
	from := c.Label(1)
	if !s.Years.OpenFrom {
		from = s.Years.From
	}
	to := math.MaxInt
	if !s.Years.OpenTo {
		to = s.Years.To
	}
	return label >= from && label <= to && (label-from)%max(1, s.OneYearIn) == 0
}

// FirstScheduled is the first model year, at least 1, in which the schedule acts,
// and false if it never does within the horizon.
func (s Schedule) FirstScheduled(c *Case) (int, bool) {
	for y := 1; y <= c.Question.Horizon; y++ {
		if s.Scheduled(c, y) {
			return y, true
		}
	}
	return 0, false
}
