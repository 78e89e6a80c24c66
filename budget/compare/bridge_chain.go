package compare

import "math"

// bridgeChain is a job's operational emissions on both sides as a product of
// factors, one for each cause:
//
//	work x machine/work x facility/machine x operational/facility   g
//
// The last is the intensity I, which is Z x A/Z x I/A where the means Z of the
// zone and A of the day are known.
type bridgeChain struct {
	causes     []bridgeCause
	base, head []float64
}

func newBridgeChain(base, head *BridgeSide) (c bridgeChain) {
	if base.sameWork(head) {
		c.link(bridgeWork, base.Work.Amount, head.Work.Amount)
		c.link(bridgeEfficiency, float64(base.Machine)/base.Work.Amount, float64(head.Machine)/head.Work.Amount)
	} else {
		c.link(bridgeEnergy, float64(base.Machine), float64(head.Machine))
	}
	c.link(bridgeSite, float64(base.Facility/base.Machine), float64(head.Facility/head.Machine))
	if base.daysTell() && head.daysTell() {
		b, h := base.Days, head.Days
		c.link(bridgeZone, float64(b.Zone), float64(h.Zone))
		c.link(bridgeDay, float64(b.Day/b.Zone), float64(h.Day/h.Zone))
		c.link(bridgeHour, base.intensity()/float64(b.Day), head.intensity()/float64(h.Day))
	} else {
		c.link(bridgeGrid, base.intensity(), head.intensity())
	}
	return c
}

// link adds a factor. A side on which it is 0/0 has no say in it: it has no
// energy, say, and so no PUE. The factor before it is zero there, and explains
// the change alone.
func (c *bridgeChain) link(cause bridgeCause, base, head float64) {
	switch {
	case math.IsNaN(base) && math.IsNaN(head):
		base, head = 1, 1
	case math.IsNaN(base):
		base = head
	case math.IsNaN(head):
		head = base
	}
	c.causes = append(c.causes, cause)
	c.base, c.head = append(c.base, base), append(c.head, head)
}

// sameWork tells whether both sides did some work, counted alike.
func (s *BridgeSide) sameWork(o *BridgeSide) bool {
	return s.Work != nil && o.Work != nil && s.Work.Unit == o.Work.Unit && s.Work.Amount > 0 && o.Work.Amount > 0
}

// intensity is the mean carbon intensity, g/kWh; not a number without energy.
func (s *BridgeSide) intensity() float64 { return float64(s.Operational) / float64(s.Facility) }

// daysTell tells whether the means of the days are known and can be divided
// by: a day without emissions cannot contain a run with some, unless the run
// was not priced by the series.
func (s *BridgeSide) daysTell() bool {
	d := s.Days
	return d != nil && (d.Zone > 0 || d.Day == 0) && (d.Day > 0 || s.Operational == 0)
}
