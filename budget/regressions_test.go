package budget_test

import (
	"math"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/stat/distuv"

	"budgetcheck/budget"
	"budgetcheck/budget/inputs"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// creeping is plain with room for each run, and a regression with more keys.
func creeping(keys string) string {
	return strings.Replace(plain, `"150 g"`, `"1 t"`, 1) + "\n[[regression]]\nname = \"no creep\"\nbranch = \"main\"\nmax_rise = \"5%\"\n" + keys
}

// inPull is a head run of a pull request against nights on main.
func inPull(policy string, nights int, head ...sketch) *scene {
	s := sceneOf(head...).onCommit("b")
	for n := range s.head {
		s.head[n].open.Commit = s.about.HeadCommit
	}
	s.about.Pull, s.policy, s.series = 7, policy, allYear
	s.books = bookedNights(nights, 1, ranOn("a"))
	return s
}

// tree is a commit with one file, told by its content.
func tree(content string) inputs.Tree {
	return inputs.Tree{{Mode: "100644", Path: "tide/train.py", Blob: content}}
}

// K of shared inputs: operational and embodied 8 and 2 kg of the base, 9 and
// 2 kg of the head at one site, with the sample policy's uncertainties: the
// logarithm of the ratio has 0.5755 %. It joins the least noise, 0.005, of ten
// base runs and one head run in quadrature (JCGM 100:2008, F.1.2).
func TestSharedInputsOfRatio(t *testing.T) {
	s := inPull(creeping(""), 10, night(scaled(1.125)))
	s.series = edit(t, allYear, "100,average", "8000,average")
	s.policy = edit(t, s.policy, "meters = 4\n", "meters = 4\nembodied = \"70080 kg\"\nlifetime = \"4y\"\n", // 2 kg an hour
		"decision = \"simple\"\n", "uncertainty = { meter = \"2%\", share = \"5%\", pue = \"3%\", intensity = \"8%\", embodied = \"30%\" }\n")
	st := s.judge(t)
	require.Len(t, st.Changes, 1)
	c := st.Changes[0]
	assert.InDelta(t, 10000, grams(t, c.Base), 1e-6)
	assert.InDelta(t, 11000, grams(t, c.Head), 1e-6)
	assert.InDelta(t, 0.1, *c.HeldRatio, 1e-9)
	se := math.Sqrt(0.005*0.005*(1+1/10.) + 0.005755*0.005755)
	half := distuv.StudentsT{Mu: 0, Sigma: 1, Nu: 9}.Quantile(0.95) * se
	assert.InDelta(t, 1.1*math.Exp(-half)-1, *c.LowRatio, 1e-6)
	assert.InDelta(t, 1.1*math.Exp(half)-1, *c.HighRatio, 1e-6)
	assert.Equal(t, budget.Over, ruling(t, st, "no creep").State)
}

// Each measure, and where its limit lies: 6 % more energy for 10 % more work in
// a grid that is twice as dirty.
func TestMeasures(t *testing.T) {
	for _, c := range []struct {
		keys string
		want budget.State
		rise float64
	}{
		{`measure = "total"`, budget.Unproven, 0.06},
		{`measure = "energy"`, budget.Unproven, 0.06},
		{`measure = "rate"`, budget.Within, 1.06/1.1 - 1},
		{"measure = \"rate\"\ngrid = \"actual\"", budget.Over, 2*1.06/1.1 - 1},
		{`grid = "actual"`, budget.Over, 2*1.06 - 1},
		{`grid = "hold"`, budget.Unproven, 0.06},
	} {
		s := inPull(creeping(c.keys), 10, night(scaled(1.06), func(s *sketch) {
			s.open.Site, s.work = "quay-south", []record.Work{{Unit: "step", Done: 1100}}
		}))
		r := ruling(t, s.judge(t), "no creep")
		assert.Equal(t, c.want, r.State, "%+v: %s", c, r.Reason)
		assert.InDelta(t, c.rise, *r.Observed, 1e-9, c.keys)
	}
}

// Priced by other sources than the base, actual emissions have no ratio; held
// ones do.
func TestPricedByOtherSources(t *testing.T) {
	for grid, want := range map[string]budget.State{"actual": budget.Unproven, "hold": budget.Over} {
		s := inPull(creeping("grid = \""+grid+"\""), 10, night(scaled(1.5)))
		s.series = header + row(-60*24*60, -60, "100") // the head run is priced with what is expected
		assert.Equal(t, want, ruling(t, s.judge(t), "no creep").State, grid)
	}
}

// climbing are five nights before release v1 and ten after it, each taking 4 %
// more than the one before.
func climbing(against string) *scene {
	s := inPull(creeping("against = \""+against+"\""), 15, night(scaled(math.Pow(1.04, 10))))
	for n := range s.books {
		s.books[n].sketch = scaledOf(s.books[n].sketch, math.Pow(1.04, float64(max(n-5, 0))))
	}
	s.marks = []*ledger.Mark{{Kind: ledger.KindRelease, Tag: "v1", Branch: "main", At: two.Add(-10*unit.Day - unit.Hour)}}
	return s
}

// Rises that are small one by one add up against the last release.
func TestTenRisesOfFourPercent(t *testing.T) {
	assert.NotEqual(t, budget.Over, ruling(t, climbing("branch").judge(t), "no creep").State)
	r := ruling(t, climbing("release").judge(t), "no creep")
	assert.Equal(t, budget.Over, r.State, r.Reason)
	assert.InDelta(t, math.Pow(1.04, 10)-1, *r.Observed, 1e-9)
	unmarked := climbing("release")
	unmarked.marks = nil
	assert.Equal(t, budget.Unproven, ruling(t, unmarked.judge(t), "no creep").State, "no release, nothing to compare with")
	unmarked.books = nil
	assert.Equal(t, budget.Unproven, ruling(t, unmarked.judge(t), "no creep").State)
}

// A release that was marked after the head run: no run is its own base.
func TestReleaseAfterHeadRun(t *testing.T) {
	s := inPull(creeping(`against = "release"`), 5)
	s.about.Pull = 0
	s.books = append(s.books, bookedAs("main", night(ranOn("b"), scaled(1.5))))
	s.marks = []*ledger.Mark{{Kind: ledger.KindRelease, Tag: "v1", Branch: "main", At: two.Add(2 * unit.Hour)}}
	r := ruling(t, s.judge(t), "no creep")
	assert.InDelta(t, 0.5, *r.Observed, 1e-9)
	assert.Contains(t, r.Reason, "from 5 base and 1 head runs")
	assert.Equal(t, budget.Over, r.State)
}

// A job that runs rarely has its runs before the release, however often others ran.
func TestRareJobAgainstRelease(t *testing.T) {
	s := climbing("release")
	s.policy += "\n[[job]]\nname = \"sound-harbour\"\n"
	for n := range 170 {
		s.books = append(s.books, bookedAs("main", night(lasting(unit.Minute), startedAt(two.Add(-11*unit.Day+unit.Duration(n)*5*unit.Minute)), func(o *sketch) {
			counted(o)
			o.every = unit.Minute
			o.open.Run, o.open.Job, o.open.Host, o.watts = "sound"+startOf(o), "sound-harbour", "mole-9", []float64{100, 100, 100, 100 + float64(n)}
		})))
	}
	r := ruling(t, s.judge(t), "no creep")
	assert.Equal(t, budget.Over, r.State, r.Reason)
}

func startOf(s *sketch) string { return s.open.At.String() }

// Comparisons of one rule share its error, and so do repeated head runs
// (Bonferroni): two jobs, of which one ran twice.
func TestConfidenceIsShared(t *testing.T) {
	again := night(called("again.ndjson", "n2"), later(2*unit.Hour), scaled(1.001))
	s := inPull(creeping(""), 5, night(), again)
	r := ruling(t, s.judge(t), "no creep")
	assert.InDelta(t, 1-0.05/2, *r.Confidence, 1e-12)
	s = inPull(creeping("confidence = 0.99"), 5, night(), again, night(scored, func(s *sketch) { s.watts = []float64{100, 100, 100, 101} }))
	s.policy += "\n[[job]]\nname = \"score-tide\"\n"
	for _, b := range bookedNights(5, 1, ranOn("a"), scored, scaled(0.4)) {
		b.open.Run += "s"
		s.books = append(s.books, b)
	}
	st := s.judge(t)
	for _, c := range st.Changes {
		assert.InDelta(t, 1-0.01/2/float64(c.HeadRuns), *c.Confidence, 1e-12, c.Job)
	}
	assert.Contains(t, ruling(t, st, "no creep").Reason, "worst of 2 jobs")
}

// Whoever runs again until it passes gains nothing: all head runs are pooled,
// given ones with booked ones.
func TestHeadRunsArePooled(t *testing.T) {
	s := inPull(creeping(""), 6, night(called("fine.ndjson", "n2"), later(2*unit.Hour)))
	s.books = append(s.books, bookedAs("pull/7", night(ranOn("b"), scaled(4))))
	r := ruling(t, s.judge(t), "no creep")
	assert.InDelta(t, 1, *r.Observed, 1e-9, "the geometric mean of 1 and 4, less 1")
	assert.Contains(t, r.Reason, "from 6 base and 2 head runs")
}

// What is asked of a job that did not change, did not run, or is in doubt.
func TestRegressionWithoutComparison(t *testing.T) {
	s := inPull(creeping(""), 6)
	r := ruling(t, s.judge(t), "no creep")
	assert.Equal(t, budget.Unproven, r.State)
	assert.Contains(t, r.Reason, "there is no head run of it")
	s.trees("same", "same", map[string]string{"a": "same"})
	r = ruling(t, s.judge(t), "no creep")
	assert.Equal(t, []any{budget.Within, "inputs unchanged"}, []any{r.State, r.Reason})
	thin := night(func(s *sketch) { s.hole = [2]unit.Duration{10 * unit.Minute, 50 * unit.Minute} })
	r = ruling(t, inPull(creeping(""), 6, thin).judge(t), "no creep")
	assert.Equal(t, budget.Unproven, r.State)
	assert.Contains(t, r.Reason, "coverage")
	for n, want := range map[int]budget.State{2: budget.Unproven, 3: budget.Within} {
		assert.Equal(t, want, ruling(t, inPull(creeping(""), n, night()).judge(t), "no creep").State, "%d base runs", n)
	}
	failed := night(func(s *sketch) { s.outcome = record.Failed })
	assert.Equal(t, budget.Unproven, ruling(t, inPull(creeping(""), 6, failed).judge(t), "no creep").State)
}
