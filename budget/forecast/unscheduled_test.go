package forecast

import (
	"math"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/stat/distuv"

	"budgetcheck/budget/unit"
)

// TestUnscheduled: 14 runs of 4 kg in 28 days, 21 days left: 10.5 runs, with the
// variance (4 kg)^2 x 10.5 x (1 + 21/28). They come at the time of day at which
// they came, half a run a night.
func TestUnscheduled(t *testing.T) {
	b := of(t, 10)
	j := steady(t, b.Now, 400, 0, 10, 10, 10, 10)
	j.Rate = &Rate{14, 28 * unit.Day}
	b.Jobs, b.Limit = []Job{j}, 9_999
	l := LandMass(b)
	assert.InEpsilon(t, 10.5, l.RunsLeft, 1e-12)
	assert.InEpsilon(t, 42_000, float64(*l.Expected), 1e-12)
	assert.InEpsilon(t, 4000*math.Sqrt(10.5*1.75), float64(l.Terms[0].Count), 1e-12)
	assert.InEpsilon(t, 28, l.DF, 1e-6, "2 N")
	assert.Equal(t, "2031-03-15T02:15:00Z", l.RunsOutOn.String(), "the fifth night")

	energy := LandEnergy(Budget[unit.Energy]{Period: b.Period, Now: b.Now, Limit: 50, Jobs: b.Jobs})
	assert.InEpsilon(t, 105, float64(*energy.Expected), 1e-12)
	assert.InEpsilon(t, 10*math.Sqrt(10.5*1.75), float64(energy.Terms[0].Count), 1e-12)
}

// TestUnscheduledAtTheEnd: in the last hours, none of which is one of their own.
func TestUnscheduledAtTheEnd(t *testing.T) {
	b := of(t, 31)
	b.Now = b.Now.Add(-6 * unit.Hour)
	j := steady(t, b.Now.Add(6*unit.Hour), 400, 0, 10, 10)
	j.Rate = &Rate{14, 28 * unit.Day}
	b.Jobs = []Job{j}
	assert.InEpsilon(t, 4000*0.5*0.25, float64(*LandMass(b).Expected), 1e-12)
}

// TestCountsHold: runs come at random, 6 to 40 in 28 days on average; the landing
// 14 days ahead holds their number in 93 to 98 of 100 (2,000 cases each).
func TestCountsHold(t *testing.T) {
	const cases = 2000
	r := rand.New(rand.NewPCG(28, 14))
	for _, rate := range []float64{6, 14, 40} {
		holds := 0
		for range cases {
			seen, came := distuv.Poisson{Lambda: rate, Src: r}.Rand(), distuv.Poisson{Lambda: rate / 2, Src: r}.Rand()
			if seen == 0 {
				continue // nothing is expected then
			}
			e := estimate{job: Job{Rate: &Rate{int(seen), 28 * unit.Day}}, runs: seen / 2}
			e.counted(1)
			if math.Abs(came-e.runs) <= e.count.half() {
				holds++
			}
		}
		t.Logf("%v runs in 28 days: the 95 %% interval of the next 14 holds %.1f in 100", rate, float64(holds)/cases*100)
		require.InDelta(t, 95.5, float64(holds)/cases*100, 2.5)
	}
}
