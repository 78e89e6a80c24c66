package compare

import (
	"math"

	"gonum.org/v1/gonum/stat"
	"gonum.org/v1/gonum/stat/distuv"

	"budgetcheck/budget/unit"
)

// batchCount is how many batches of equal work a pilot is cut into: enough for
// a deviation, few enough that neighbours tell little of each other.
const batchCount = 8

// Quantiles of Student's t, two-sided: of a slope at 99 %, of a mean at 95 %.
var (
	batchSlopeT = distuv.StudentsT{Mu: 0, Sigma: 1, Nu: batchCount - 2}.Quantile(0.995)
	batchMeanT  = distuv.StudentsT{Mu: 0, Sigma: 1, Nu: batchCount - 1}.Quantile(0.975)
)

// batches are the energies of a pilot's batches in order, kWh.
type batches [batchCount]float64

// batchCut cuts the span from the first to the last line into batches of equal
// work. Between two lines energy is taken as linear in work. Work rises from
// the first line to the last and never falls.
func batchCut(lines []PilotLine) (b batches) {
	first, last := lines[0], lines[len(lines)-1]
	before, n := first.Energy, 1
	for k := range b {
		upTo := last.Energy
		if k < batchCount-1 {
			work := first.Done + (last.Done-first.Done)*float64(k+1)/batchCount
			for lines[n].Done < work {
				n++
			}
			upTo = lines[n-1].energyAt(work, lines[n])
		}
		b[k] = float64(upTo - before)
		before = upTo
	}
	return b
}

// energyAt is the energy at some work between l and the next line, which has more.
func (l PilotLine) energyAt(work float64, next PilotLine) unit.Energy {
	share := (work - l.Done) / (next.Done - l.Done)
	return l.Energy + unit.Energy(share)*(next.Energy-l.Energy)
}

func (b batches) meanStdDev() (mean, sd float64) { return stat.MeanStdDev(b[:], nil) }

// autocorrelation is that of each batch with the next. Where all are the same
// there is none.
func (b batches) autocorrelation() float64 {
	mean, _ := b.meanStdDev()
	var with, own float64
	for k, e := range b {
		own += (e - mean) * (e - mean)
		if k > 0 {
			with += (e - mean) * (b[k-1] - mean)
		}
	}
	if own == 0 {
		return 0
	}
	return with / own
}

// batchNoise is the deviation that cutting alone may leave, as a share of a
// batch: a load that never varies must not seem to drift by its last digits.
const batchNoise = 1e-9

// drifts tells whether the slope of the batches on their order differs from
// zero at 99 %, by Student's t, which is r sqrt(6/(1 - r^2)).
func (b batches) drifts() bool {
	if mean, sd := b.meanStdDev(); sd <= batchNoise*mean {
		return false
	}
	var order [batchCount]float64
	for k := range order {
		order[k] = float64(k)
	}
	r := stat.Correlation(order[:], b[:], nil)
	return math.Abs(r)*math.Sqrt(batchCount-2) > batchSlopeT*math.Sqrt(1-min(r*r, 1))
}
