package year

import "ebbline/rng"

// shared holds the random numbers of a year that all variants of a replicate
// have in common. They are drawn every year whether used or not, so that cases
// that differ in a take or a rate share their years.
type shared struct {
	needs                needs
	lanes                int
	weather, catastrophe [lanesMax]rng.Stream
	killing, survey      [lanesMax]rng.Stream
	u1, u2               [lanesMax]float64   // innovations of the weather
	strikes              [][lanesMax]float64 // uniform, one a catastrophe
	kills                [][lanesMax]float64 // normal, one a catastrophe
	surveys              [][lanesMax]float64 // normal, one a harvest rule
}

func newShared(n needs) *shared {
	return &shared{needs: n, strikes: make([][lanesMax]float64, n.catastrophes),
		kills: make([][lanesMax]float64, n.catastrophes), surveys: make([][lanesMax]float64, n.surveys)}
}

func (s *shared) begin(seed uint64, first, step int64, lanes int) {
	s.lanes = lanes
	for i := 0; i < lanes; i++ {
		r := uint64(first + int64(i)*step)
		s.weather[i].Seed(seed, r, rng.Weather)
		s.catastrophe[i].Seed(seed, r, rng.Catastrophes)
		s.killing[i].Seed(seed, r, rng.Kills)
		s.survey[i].Seed(seed, r, rng.Survey)
	}
}

// draw draws one year: two normals of weather, for each catastrophe a uniform
// and a normal, and a normal for each harvest rule. All but the uniforms are drawn
// only if a variant uses any of their kind: each kind has a stream of its own, so
// that not drawing it changes nothing for the others.
func (s *shared) draw() {
	if s.needs.weather {
		for i := 0; i < s.lanes; i++ {
			s.u1[i] = rng.Normal(&s.weather[i])
			s.u2[i] = rng.Normal(&s.weather[i])
		}
	}
	for c := range s.strikes {
		for i := 0; i < s.lanes; i++ {
			s.strikes[c][i] = s.catastrophe[i].Float64()
		}
		if s.needs.kills {
			for i := 0; i < s.lanes; i++ {
				s.kills[c][i] = rng.Normal(&s.killing[i])
			}
		}
	}
	for r := range s.surveys {
		for i := 0; i < s.lanes; i++ {
			s.surveys[r][i] = rng.Normal(&s.survey[i])
		}
	}
}
