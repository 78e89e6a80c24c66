package compare_test

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/compare"
	"budgetcheck/budget/unit"
)

const confidence = 0.95

// contest is one kind of pull request, judged many times.
type contest struct {
	title   string
	jobs    int // all judged; only the first one's energy rises
	maxRise unit.Share
	rises   bool                     // by what is detectable; else nothing changes
	again   func(compare.State) bool // whether the author runs the head again, up to five times; nil for never
}

func whileOver(s compare.State) bool   { return s == compare.Over }
func whileClosed(s compare.State) bool { return s == compare.Over || s == compare.Unproven }

var contests = []contest{
	{"one job", 1, 0, false, nil},
	{"one job", 1, 0.05, false, nil},
	{"one job", 1, 0, true, nil},
	{"one job", 1, 0.05, true, nil},
	{"five jobs", 5, 0, false, nil},
	{"five jobs", 5, 0, true, nil},
	{"run again while over", 1, 0, false, whileOver},
	{"run again while over", 1, 0, true, whileOver},
	{"run again while closed", 1, 0, false, whileClosed},
	{"run again while closed", 1, 0.05, false, whileClosed},
	{"run again while closed", 1, 0, true, whileClosed},
	{"run again while closed", 1, 0.05, true, whileClosed},
}

func (c contest) question() compare.Question {
	return compare.Question{MaxRise: c.maxRise, Confidence: confidence, Shares: c.jobs}
}

// rise is the true one, as a ratio - 1.
func (c contest) rise(noise float64) float64 {
	if !c.rises {
		return 0
	}
	each := unit.Share(1 - (1-confidence)/float64(c.jobs))
	rise, _ := compare.Rule{MaxRise: c.maxRise, Confidence: each, BaseRuns: nights}.Detectable(unit.Share(noise))
	return rise
}

// tally counts how pull requests ended: by us, and by plain totals.
type tally struct {
	n       float64
	by      map[compare.State]float64
	plainly float64 // closed
}

func (t tally) share(s compare.State) float64 { return t.by[s] / t.n }

// held judges n pull requests on noise.
func (c contest) held(w *world, noise float64, n int) tally {
	t := tally{n: float64(n), by: map[compare.State]float64{}}
	times := 1 + c.rise(noise)
	for range n {
		jobs := []job{w.job(times, noise)}
		for range c.jobs - 1 {
			jobs = append(jobs, w.job(1, noise))
		}
		t.by[c.last(jobs, func(j job, m int) compare.State { return compare.Compare(j.base, j.head[:m], c.question()).State })]++
		if c.last(jobs, func(j job, m int) compare.State { return j.plainly(m, c.maxRise) }) == compare.Over {
			t.plainly++
		}
	}
	return t
}

// last is the state in which the author leaves it.
func (c contest) last(jobs []job, judge func(job, int) compare.State) (s compare.State) {
	for m := 1; m <= looks; m++ {
		s = worst(jobs, func(j job) compare.State { return judge(j, m) })
		if c.again == nil || !c.again(s) {
			break
		}
	}
	return s
}

func worst(jobs []job, judge func(job) compare.State) (s compare.State) {
	order := []compare.State{compare.Within, compare.Near, compare.Unproven, compare.Over}
	rank := 0
	for _, j := range jobs {
		rank = max(rank, slices.Index(order, judge(j)))
	}
	return order[rank]
}

// TestErrorRates judges thousands of made-up pull requests with ten base runs
// each, on a grid that swings threefold, and prints how they end.
func TestErrorRates(t *testing.T) {
	w, table := newWorld(1), &strings.Builder{}
	fmt.Fprintf(table, "\n%-23s %8s %6s %9s | %6s %8s %6s %6s | plain totals\n", "", "max_rise", "noise", "true rise", "over", "unproven", "near", "within")
	for _, c := range contests {
		for _, noise := range []float64{0.02, 0.05, 0.10} {
			r := c.held(w, noise, count(c))
			fmt.Fprintf(table, "%-23s %6.0f %% %4.0f %% %7.1f %% | %4.1f %% %6.1f %% %4.1f %% %4.1f %% | %4.1f %% closed\n", c.title, 100*c.maxRise, 100*noise, 100*c.rise(noise),
				100*r.share(compare.Over), 100*r.share(compare.Unproven), 100*r.share(compare.Near), 100*r.share(compare.Within), 100*r.plainly/r.n)
			c.check(t, r, fmt.Sprintf("%s, max_rise %v, noise %v, rises %v", c.title, c.maxRise, noise, c.rises))
		}
	}
	t.Log(table.String())
}

// count is how often a contest is held: those of most comparisons less often,
// where what they are checked for is far from its bound.
func count(c contest) int {
	switch {
	case testing.Short():
		return 200
	case c.rises && (c.again != nil || c.jobs > 1) || c.title == "run again while closed":
		return 2000
	}
	return 5000
}

// check: innocent changes are over at most 6 times in 100, and a rise as large
// as what is called detectable at least 93 times. Such a rise is not let
// through, however often it is run again. Plain totals do worse at both.
func (c contest) check(t *testing.T, r tally, what string) {
	slack := slack(r.n)
	over, open := r.share(compare.Over), r.share(compare.Near)+r.share(compare.Within)
	if !c.rises {
		assert.LessOrEqual(t, over, 0.06+slack, what)
		assert.Greater(t, r.plainly/r.n, over+0.1, what)
		return
	}
	assert.LessOrEqual(t, open, 0.01+slack, what)
	if c.again == nil {
		assert.GreaterOrEqual(t, over, 0.93-slack, what)
	}
	if c.jobs == 1 { // of five jobs, chance closes one or another anyway
		assert.Less(t, r.plainly/r.n, over, what)
	}
}

// slack is what chance may add to a share in a short test: three standard
// errors of one near 0.06. The whole test has none.
func slack(n float64) float64 {
	if testing.Short() {
		return 3 * math.Sqrt(0.06*0.94/n)
	}
	return 0
}

// TestDetectableIsDetected: the detectable ratio as the result tells it, of
// noise that it can only estimate, is over as often as it promises; with three
// head runs too.
func TestDetectableIsDetected(t *testing.T) {
	w, n := newWorld(2), min(2000, count(contest{}))
	q := compare.Question{Confidence: confidence, MaxRise: 0.05}
	for _, m := range []int{1, 2, 3} {
		over := 0.0
		for range n {
			j := w.job(1, 0.05)
			rise := *compare.Compare(j.base, j.head[:m], q).Detectable
			up := func(s *compare.Sample) { s.Machine *= unit.Energy(1 + rise) }
			if compare.Compare(j.base, scaled(j.head[:m], up), q).State == compare.Over {
				over++
			}
		}
		t.Logf("%d head runs: %.1f %%", m, 100*over/float64(n))
		assert.GreaterOrEqual(t, over/float64(n), 0.93-slack(float64(n)))
	}
}

// TestSwing: the grid above is what it is said to be.
func TestSwing(t *testing.T) {
	w := newWorld(1)
	var swings float64
	for day := range daysIn {
		hours := w.intensity[day*daily : (day+1)*daily]
		swings += slices.Max(hours) / slices.Min(hours) / daysIn
	}
	require.InDelta(t, 3, swings, 0.5)
}
