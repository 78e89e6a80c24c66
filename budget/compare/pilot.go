package compare

import (
	"fmt"
	"math"

	"budgetcheck/budget/unit"
)

// PilotLine is a run's progress at one of its work lines.
type PilotLine struct {
	Done   float64     // functional units, from 0, never falling
	Energy unit.Energy // from the run's start up to this line
}

// Pilot is a run that did a part of its work, to tell what all of it takes.
// Its energies are of one kind: all at the meters, or all of the machine.
type Pilot struct {
	Lines    []PilotLine // in order
	Planned  float64     // functional units, more than the last line's
	Measured unit.Energy // over the whole pilot
}

// Projection is what the whole run is expected to take.
type Projection struct {
	Energy    unit.Energy
	HalfWidth unit.Energy // of its two-sided 95 % interval
	StdErr    unit.Energy // its standard uncertainty, 7 degrees of freedom
	PerUnit   unit.Energy // energy of one functional unit, without the start-up
}

// What a pilot must show, or nothing is projected from it.
const (
	pilotLeastLines = 16
	pilotLeastShare = unit.Share(0.05) // of the planned work
)

// Project adds to what was measured the work that is left, at the energy that
// a unit of it took between the first and the last work line: the start-up has
// been spent and is not spent again. doubt tells why nothing can be projected;
// it is empty where it can.
//
// The interval comes from batches of equal work (batch means: Schmeiser 1982,
// Oper. Res. 30:556, from memory), widened for the correlation between them.
// It holds where noise has mostly died out within a batch; eight batches cannot
// tell of noise that lasts for several. A straight line through the cumulative
// energy would look far more certain than it is, for each of its points carries
// the errors of all before it (Mandel 1957, JASA 52:552, from memory).
func (p Pilot) Project() (out Projection, doubt string) {
	if doubt := p.doubt(); doubt != "" {
		return Projection{}, doubt
	}
	b := batchCut(p.Lines)
	if b.drifts() {
		return Projection{}, "not settled: the energy that a unit of work takes still changes over the pilot (99 %); let it run longer"
	}
	first, last := p.Lines[0], p.Lines[len(p.Lines)-1]
	left, span := p.Planned-last.Done, last.Done-first.Done
	out.PerUnit = (last.Energy - first.Energy) / unit.Energy(span)
	out.Energy = p.Measured + out.PerUnit*unit.Energy(left)
	out.StdErr = unit.Energy(b.stdErr(left / span * batchCount))
	out.HalfWidth = unit.Energy(batchMeanT) * out.StdErr
	return out, ""
}

// stdErr is the standard uncertainty of the energy of so many more batches:
// their own variation, and that of the mean which stands for each of them.
func (b batches) stdErr(more float64) float64 {
	_, sd := b.meanStdDev()
	r1 := b.autocorrelation()
	r := min(max(r1+(1+4*max(r1, 0))/batchCount, 0), 0.8) // few values look less correlated than they are
	return sd * math.Sqrt(more+more*more/batchCount) * math.Sqrt((1+r)/(1-r))
}

func (p Pilot) doubt() string {
	advances, widest := p.advances()
	if advances < pilotLeastLines {
		return fmt.Sprintf("a pilot needs %d work lines with progress, it has %d", pilotLeastLines, advances)
	}
	first, last := p.Lines[0].Done, p.Lines[len(p.Lines)-1].Done
	done := unit.Share(last / p.Planned)
	switch {
	case last >= p.Planned:
		return "nothing is left to be projected: all planned work is done"
	case done < pilotLeastShare:
		least, did := unit.Apart(pilotLeastShare, done)
		return fmt.Sprintf("a pilot must do %s of the planned work, it did %s", least, did)
	case widest > (last-first)/batchCount:
		return "its work lines lie too far apart: between two of them lies more than an eighth of the pilot's work"
	}
	return ""
}

// advances counts the lines that tell of new progress, the first included, and
// finds the widest step between two. Lines that repeat a count, and stretches
// without any, would make batches look more alike than they are.
func (p Pilot) advances() (count int, widest float64) {
	for n, l := range p.Lines {
		if n == 0 || l.Done > p.Lines[n-1].Done {
			count++
		}
		if n > 0 {
			widest = max(widest, l.Done-p.Lines[n-1].Done)
		}
	}
	return count, widest
}
