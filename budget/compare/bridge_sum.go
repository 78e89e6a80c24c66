package compare

import "budgetcheck/budget/unit"

// bridgeCause is a cause of change.
type bridgeCause int

// The causes. The last three are parts of the grid's.
const (
	bridgeWork bridgeCause = iota
	bridgeEfficiency
	bridgeEnergy
	bridgeSite
	bridgeGrid
	bridgeEmbodied
	bridgeZone
	bridgeDay
	bridgeHour
	bridgeCauses
)

// bridgeSum sums causes over jobs.
type bridgeSum struct {
	terms    [bridgeCauses]unit.Sum[unit.Mass]
	told     [bridgeCauses]bool
	partless bool // the grid's change of some job is known as a whole only
}

func (s *bridgeSum) add(cause bridgeCause, m unit.Mass) {
	s.terms[cause].Add(m)
	s.told[cause] = true
	if cause >= bridgeZone {
		s.add(bridgeGrid, m)
	}
}

// of is what a cause amounts to, nil if no job knows it.
func (s *bridgeSum) of(cause bridgeCause) *unit.Mass {
	if !s.told[cause] {
		return nil
	}
	m := s.terms[cause].Value()
	return &m
}

func (s *bridgeSum) job(j BridgeJob) {
	switch {
	case j.Base != nil && j.Head != nil:
		s.both(j.Base, j.Head)
	case j.Base != nil:
		s.alone(-j.Base.Operational)
	case j.Head != nil:
		s.alone(j.Head.Operational)
	}
	s.embodied(j.Head, 1)
	s.embodied(j.Base, -1)
}

// both splits the operational change of a job that is on both sides.
func (s *bridgeSum) both(base, head *BridgeSide) {
	c := newBridgeChain(base, head)
	for n, term := range lmdiRow(c.base, c.head) {
		s.add(c.causes[n], unit.Mass(term))
	}
	s.partless = s.partless || c.causes[len(c.causes)-1] == bridgeGrid
}

// alone is a job on one side only. All of it is work, none of it anything else.
func (s *bridgeSum) alone(change unit.Mass) {
	s.add(bridgeWork, change)
	s.add(bridgeEfficiency, 0)
	s.add(bridgeSite, 0)
	s.add(bridgeGrid, 0)
}

func (s *bridgeSum) embodied(side *BridgeSide, sign unit.Mass) {
	if side != nil && side.Embodied != nil {
		s.add(bridgeEmbodied, sign**side.Embodied)
	}
}

func (s *bridgeSum) bridge() Bridge {
	b := Bridge{Work: s.of(bridgeWork), Efficiency: s.of(bridgeEfficiency), Energy: s.of(bridgeEnergy),
		Site: s.of(bridgeSite), Grid: s.of(bridgeGrid), Embodied: s.of(bridgeEmbodied)}
	if s.told[bridgeZone] && !s.partless {
		b.Parts = &BridgeGrid{Zone: *s.of(bridgeZone), Day: *s.of(bridgeDay), Hour: *s.of(bridgeHour)}
	}
	return b
}
