package budget

import (
	"budgetcheck/budget/compare"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// bridge splits the change of one job and stage by cause.
func (j *judgement) bridge(p pair) *compare.Bridge {
	job := compare.BridgeJob{Head: bridgeSide(p.head)}
	if len(p.base) > 0 {
		job.Base = bridgeSide(p.base)
		job.Base.Days, job.Head.Days = compare.NewBridgeDays(bridgeRuns(p.base), bridgeRuns(p.head), j.policy.location())
	}
	b := compare.NewBridge(job)
	return &b
}

// bridgeSide is the mean over the runs of one side.
func bridgeSide(runs []*footprint.Run) *compare.BridgeSide {
	var machine, facility unit.Sum[unit.Energy]
	var operational, embodied unit.Sum[unit.Mass]
	var work unit.Sum[float64]
	word, told, declared := "", true, false
	for _, r := range runs {
		w := r.Whole()
		machine.Add(w.Machine)
		facility.Add(w.Facility)
		operational.Add(w.Operational)
		embodied.Add(w.Embodied)
		work.Add(w.Work)
		declared = declared || r.Embodied != nil
		if r.Work == nil || w.Work == 0 || word != "" && r.Work.Unit != word {
			told = false
			continue
		}
		word = r.Work.Unit
	}
	n := float64(len(runs))
	s := &compare.BridgeSide{Machine: machine.Value() / unit.Energy(n), Facility: facility.Value() / unit.Energy(n), Operational: operational.Value() / unit.Mass(n)}
	if told {
		s.Work = &unit.Work{Amount: work.Value() / n, Unit: word}
	}
	if declared {
		m := embodied.Value() / unit.Mass(n)
		s.Embodied = &m
	}
	return s
}

// bridgeRuns are where and when the parts of the runs took their energy.
func bridgeRuns(runs []*footprint.Run) (all []compare.BridgeRun) {
	for _, r := range runs {
		for _, p := range r.Pieces {
			if s := p.Facts.Site; s != nil {
				all = append(all, compare.BridgeRun{Series: s.Series, From: p.Open.At, To: p.End, Facility: p.FacilityOf(p.MachineEnergy())})
			}
		}
	}
	return all
}
