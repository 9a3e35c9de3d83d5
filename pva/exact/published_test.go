package exact

import (
	"context"
	"encoding/csv"
	"math"
	"os"
	"sort"
	"strconv"

	"testing"
)

// row is one value of a table in testdata/published: of a case, a quantity at
// a year, level or state. The sources stand at the head of each file.
type row struct {
	id, quantity string
	at           int
	value        float64
}

func published(t *testing.T, name string) map[string][]row {
	t.Helper()
	f, err := os.Open("../../testdata/published/" + name)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	records, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	out := map[string][]row{}
	for _, rec := range records[1:] {
		at, _ := strconv.Atoi(rec[2])
		v, err := strconv.ParseFloat(rec[3], 64)
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		out[rec[0]] = append(out[rec[0]], row{rec[0], rec[1], at, v})
	}
	return out
}

// unstated are the cases of the tables that no case file can state, and why.
var unstated = map[string]string{
	"D09":  "offspring law neither Poisson, binomial of one, nor negative binomial",
	"D10":  "offspring law neither Poisson, binomial of one, nor negative binomial",
	"D11":  "up to five young of one parent: at-most-one is the only binomial",
	"D13":  "offspring law neither Poisson, binomial of one, nor negative binomial",
	"C07":  "births stop at a ceiling within the year: a case's ceiling acts at its end",
	"C08":  "births stop at a ceiling within the year: a case's ceiling acts at its end",
	"C20":  "catastrophes at any moment of the year: a case's strike once, at its start",
	"CE01": "rates that change within the year",
	"CE02": "rates that change within the year",
	"CE03": "rates that change within the year, and weather of two kinds with memory",
	"CE04": "years of two kinds of death rate: a case's weather is log-normal",
	"F10":  "weather of two kinds with memory",
	"F11":  "births crowded by the N before deaths while only survivors breed",
}

// The rows are checked to the ten digits of the tables: their two independent
// computations agree to 5e-10, of numbers below 1. The answer's own stated
// error is granted, and must itself stay below the goal.
const tableDigits = 1e-9

func check(t *testing.T, file string, cases map[string]set) {
	t.Helper()
	table := published(t, file)
	var ids []string
	for id := range table {
		ids = append(ids, id)
	}
	sort.Strings(ids)
	for _, id := range ids {
		keys, ok := cases[id]
		if !ok {
			if unstated[id] == "" {
				t.Errorf("%s: no case for %s, and no reason", file, id)
			}
			continue
		}
		t.Run(id, func(t *testing.T) { checkCase(t, keys, table[id]) })
	}
}

func checkCase(t *testing.T, keys set, rows []row) {
	m := model(t, keys)
	a := answer(t, keys)
	if a.Error > Goal {
		t.Errorf("stated error %.2g is above %.2g", a.Error, Goal)
	}
	// The law itself, on many states, for what the answer does not hold.
	var last batch
	law := func() batch {
		if last == nil {
			s := newPlan(m, Options{}).first
			s.top = max(s.top, wideTop(rows))
			s.order, s.bound = 2*s.order, 4
			if m.Case.Births.Breeding == "pulse" {
				s.order = 64 // the ceiling makes a kink in the mean of a year
			}
			f, err := newRun(m, s).solve(context.Background())
			if err != nil {
				t.Fatal(err)
			}
			last = f.last
		}
		return last
	}
	for i, r := range rows {
		if r.quantity == "smallest" && i%2 == 1 && !*long {
			continue // each is a run of its own
		}
		got, slack := 0.0, tableDigits
		switch r.quantity {
		case "fallen":
			got, slack = a.Fallen[r.at-1], slack+a.Error
		case "mean":
			got, _ = moments(law()[0])
			slack = 1e-8 * r.value
		case "variance":
			_, got = moments(law()[0])
			slack = 1e-7 * math.Max(1, r.value) // a sum of squares up to the last state
		case "law":
			got = law()[0][r.at]
		case "mean_alive":
			got, _ = moments(law()[1])
			slack = 1e-6 * r.value // of what lies beyond the last state, see meanLoss
		case "smallest":
			low := answer(t, keys.with(set{"question.threshold": r.at, "question.horizon": 50}))
			got, slack = low.Risk, slack+low.Error
		default:
			t.Fatalf("unknown quantity %s", r.quantity)
		}
		if !(math.Abs(got-r.value) <= slack) {
			t.Errorf("%s at %d: %.12g, published %.12g (%.1g apart, %.1g allowed)", r.quantity, r.at, got, r.value, math.Abs(got-r.value), slack)
		}
	}
}

// wideTop is a largest state beyond which moments lose less than they are checked to.
func wideTop(rows []row) int {
	top := 0
	for _, r := range rows {
		if r.quantity == "variance" {
			top = max(top, int(60*math.Sqrt(r.value)))
		}
	}
	return top
}

func moments(p []float64) (mean, variance float64) {
	mass := 0.0
	for n, v := range p {
		mass += v
		mean += float64(n) * v
	}
	mean /= mass
	for n, v := range p {
		variance += (float64(n) - mean) * (float64(n) - mean) * v / mass
	}
	return mean, variance
}

func TestLinearBirthDeath(t *testing.T) {
	check(t, "exact_linear.csv", map[string]set{
		"A01": flow(3, 0, 5, 0.3, 0.2), "A02": flow(3, 0, 20, 0.3, 0.2), "A03": flow(5, 0, 10, 0.2, 0.3),
		"A04": flow(4, 0, 10, 0.25, 0.25), "A05": flow(10, 0, 5, 0, 0.2), "A06": flow(2, 0, 5, 0.2, 0),
		"A07": flow(10, 0, 50, 0.11, 0.1), "A08": flow(20, 0, 20, 0.5, 0.45),
	})
}

func TestImmigrationAndRemoval(t *testing.T) {
	take := func(h float64) set {
		return set{"harvest.1.rule": "constant", "harvest.1.take": h, "harvest.1.when": "through"}
	}
	add := func(nu float64) set { return set{"stocking.1.add": nu, "stocking.1.when": "through"} }
	check(t, "exact_removal.csv", map[string]set{
		// Long enough for the start to be forgotten: exp(-0.1 300), exp(-0.05 600).
		"B01": flow(5, 0, 300, 0.2, 0.3).with(add(0.5)), "B02": flow(2, 0, 600, 0.45, 0.5).with(add(0.1)),
		"B03": flow(10, 0, 20, 0.3, 0.2).with(take(0.5)), "B04": flow(6, 0, 20, 0.3, 0.3).with(take(0.4)),
		"B05": flow(15, 0, 20, 0.2, 0.3).with(take(1)),
	})
}

func TestBranching(t *testing.T) {
	young := func(mean float64) set {
		return set{"start.abundance": 1, "question.threshold": 0, "question.horizon": 50, "births.breeding": "pulse",
			"births.rate": mean, "births.parents": "all", "deaths.fraction": 1}
	}
	clumped := func(mean, k float64) set {
		return young(mean).with(set{"births.offspring": "clumped", "births.clumping": k})
	}
	check(t, "exact_branching.csv", map[string]set{
		"D01": young(1.1), "D02": young(1.5), "D03": young(2), "D04": young(1), "D05": young(0.9), "D06": young(1.01),
		"D07": clumped(1.5, 1), "D08": clumped(1.1, 1), "D12": clumped(1.5, 0.5),
	})
}

// always is the linear crowding of deaths, births or both at capacity k, the
// threshold watched always.
func always(n0, q float64, b, d, k float64, sides ...string) set {
	s := flow(n0, q, 100, b, d)
	s["question.watch"] = "always"
	for _, side := range sides {
		s[side+".crowding.form"], s[side+".crowding.capacity"] = "linear", k
	}
	return s
}

func TestCrowdedBirthDeath(t *testing.T) {
	through := func(rule, key string, v float64) set {
		return set{"harvest.1.rule": rule, "harvest.1." + key: v, "harvest.1.when": "through"}
	}
	base := always(50, 0, 0.5, 0.3, 50, "deaths")
	theta := flow(15, 0, 100, 0.5, 0.3).with(set{"question.watch": "always", "deaths.crowding.form": "theta", "deaths.crowding.exponent": 2, "deaths.crowding.capacity": 30})
	// The capacity of C18 is that of the rates without scarcity: d + (b-d) n/K.
	scarce := flow(20, 0, 100, 1, 0.6).with(set{"question.watch": "always", "deaths.crowding.form": "linear", "deaths.crowding.scale": 0.6 * 40 / 0.4,
		"births.scarcity.form": "saturating", "births.scarcity.half_at": 3})
	check(t, "exact_crowding.csv", map[string]set{
		"C01": always(5, 0, 0.5, 0.3, 20, "deaths"), "C02": always(20, 0, 0.5, 0.3, 20, "deaths"), "C03": always(10, 0, 0.5, 0.3, 50, "deaths"),
		"C04": always(10, 0, 0.6, 0.4, 20, "births"), "C05": always(30, 0, 0.4, 0.3, 30, "births"), "C06": always(15, 0, 0.8, 0.5, 15, "births", "deaths"),
		"C09": base.with(through("constant", "take", 1)), "C10": base.with(through("constant", "take", 2)),
		"C11": base.with(through("constant", "take", 2.5)), "C12": base.with(through("constant", "take", 3)),
		"C13": base.with(through("fraction", "rate", 0.05)), "C14": base.with(through("constant", "take", 3)).with(set{"harvest.1.leave": 25}),
		"C15": always(30, 5, 0.5, 0.3, 40, "deaths"), "C16": always(30, 10, 0.5, 0.3, 40, "deaths").with(through("constant", "take", 1.5)),
		"C17": always(12, 2, 0.6, 0.4, 30, "deaths").with(set{"stocking.1.add": 0.5, "stocking.1.when": "through"}),
		"C18": scarce, "C19": theta,
	})
}

func TestYearlyEnvironment(t *testing.T) {
	crowded := flow(50, 0, 100, 0.5, 0.3).with(set{"question.watch": "always", "deaths.crowding.form": "linear", "deaths.crowding.scale": 0.3 / 0.004})
	lognormal := flow(20, 1, 100, 0.6, 0.4).with(set{"question.watch": "always", "deaths.crowding.form": "linear", "deaths.crowding.scale": 0.4 / 0.01,
		"births.year_sd": 0.6 * math.Sqrt(math.Expm1(0.3*0.3))})
	at := func(take, leave float64) set {
		return set{"harvest.1.rule": "constant", "harvest.1.take": take, "harvest.1.leave": leave, "harvest.1.when": "end"}
	}
	check(t, "exact_environment.csv", map[string]set{
		"CE05": lognormal, "CE06": crowded.with(at(2, 0)), "CE07": crowded.with(at(4, 25)).with(set{"question.threshold": 5}),
		"CE08": crowded.with(set{"harvest.1.rule": "constant", "harvest.1.take": 3, "harvest.1.when": "through", "harvest.1.years": "-10"}),
	})
}

// oneNormal is the years of survival expit(logit(s) + a z) and births
// f exp(c z - c^2/2) with one z: the death fraction is logit-normal with the
// same moments, and its own number is -z, so that the correlation is -1.
func oneNormal(n0, q, s, f, a, c, ceiling float64) set {
	var mean, second, weight float64
	for z := -9.0; z <= 9; z += 1.0 / 64 {
		w := math.Exp(-z * z / 2)
		m := 1 / (1 + math.Exp(math.Log(s/(1-s))+a*z))
		weight, mean, second = weight+w, mean+w*m, second+w*m*m
	}
	mean, second = mean/weight, second/weight
	return pulse(n0, q, 100, f, mean).with(set{"deaths.year_sd": math.Sqrt(second - mean*mean),
		"births.year_sd": f * math.Sqrt(math.Expm1(c*c)), "weather.correlation": -1, "ceiling.abundance": ceiling})
}

func TestAnnualChains(t *testing.T) {
	take := func(h, leave float64) set {
		return set{"harvest.1.rule": "constant", "harvest.1.take": h, "harvest.1.leave": leave, "harvest.1.when": "end"}
	}
	cut := func(k float64) set { return set{"ceiling.abundance": k} }
	env := oneNormal(40, 0, 0.75, 0.45, 0.5, 0.4, 80)
	ricker := func(n0, q, r, k, variance float64) set {
		s := set{"start.abundance": n0, "question.threshold": q, "question.horizon": 100, "births.breeding": "pulse", "births.parents": "all",
			"births.rate": math.Exp(r), "births.crowding.form": "ricker", "births.crowding.scale": k / r, "deaths.fraction": 1}
		if variance > 0 {
			s["births.year_sd"] = math.Exp(r) * math.Sqrt(math.Expm1(variance))
		}
		return s
	}
	strike := func(chance, kills, births float64) set {
		return set{"catastrophe.1.chance": chance, "catastrophe.1.kills": kills, "catastrophe.1.births_times": births}
	}
	cases := map[string]set{
		"F01": pulse(10, 0, 100, 0.4, 0.3).with(cut(50)), "F02": pulse(50, 0, 100, 0.4, 0.3).with(cut(50)),
		"F03": pulse(10, 0, 100, 0.35, 0.3).with(cut(50)).with(set{"births.parents": "all"}),
		// Years of two kinds: the second is the first with a catastrophe one year in two.
		"F04": pulse(40, 5, 100, 0.4, 0.1).with(cut(60)).with(strike(0.5, 1-0.7/0.9, 0.5)),
		"F05": env, "F06": env.with(take(1, 0)), "F08": env.with(take(3, 40)),
		"F07": env.with(set{"harvest.1.rule": "fraction", "harvest.1.fraction": 0.06, "harvest.1.take_noise": "each-animal", "harvest.1.when": "end"}),
		"F09": pulse(30, 2, 100, 0.35, 0.2).with(cut(60)).with(strike(0.05, 0.7, 0.5)),
		"F12": ricker(10, 0, 0.4, 30, 0).with(cut(120)), "F13": ricker(10, 0, 0.4, 30, 0.16).with(cut(240)),
		"F14": ricker(50, 10, 0.5, 50, 0.09).with(cut(200)).with(take(3, 0)),
		"F15": pulse(5, 0, 100, 1.1, 1).with(cut(400)).with(set{"births.parents": "all"}),
		"F16": pulse(6, 1, 100, 0.4, 0.3).with(cut(40)).with(set{"stocking.1.add": 1, "stocking.1.when": "end"}),
	}
	for h := 0; h <= 5; h++ {
		s := oneNormal(80, 10, 0.8, 0.45, 0.4, 0.3, 100).with(set{"question.horizon": 50})
		if h > 0 {
			s = s.with(take(float64(h), 0))
		}
		cases["I01-"+strconv.Itoa(h)] = s
	}
	check(t, "exact_annual.csv", cases)
}

// Ten animals of an annual survival of 0.2 all die with chance 0.8^10, fifty
// with 0.8^50 (National Research Council 2002, p. 44).
func TestAllDieWithinTheYear(t *testing.T) {
	for n, want := range map[float64]float64{10: 0.10737418, 50: 1.4272477e-05} {
		if a := answer(t, pulse(n, 0, 1, 0, 0.8)); math.Abs(a.Risk/want-1) > 1e-7 {
			t.Errorf("%v animals: %.9g, published %.9g", n, a.Risk, want)
		}
	}
}
