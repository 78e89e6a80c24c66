package compare_test

import (
	"encoding/json"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/compare"
	"budgetcheck/budget/unit"
)

func bridgeOf[T any](v T) *T { return &v }

// bridgeSide is a side without embodied emissions, its intensities Z, A and I.
func bridgeSide(work float64, machine, pue, z, a, i float64) *compare.BridgeSide {
	return &compare.BridgeSide{Work: &unit.Work{Amount: work, Unit: "step"},
		Machine: unit.Energy(machine), Facility: unit.Energy(machine * pue), Operational: unit.Mass(machine * pue * i),
		Days: &compare.BridgeDays{Zone: unit.Intensity(z), Day: unit.Intensity(a)}}
}

// bridgeK is the worked case: W 1000 to 1100, E 100 to 126.5 kWh, PUE 1.2 to
// 1.14, Z 450 to 300, A 420 to 480, I 400 to 500, so O 48000 to 72105 g.
func bridgeK() compare.BridgeJob {
	return compare.BridgeJob{Base: bridgeSide(1000, 100, 1.2, 450, 420, 400), Head: bridgeSide(1100, 126.5, 1.14, 300, 480, 500)}
}

// bridgeNear checks a mass that must be there, to two places.
func bridgeNear(t assert.TestingT, want float64, got *unit.Mass, what string) {
	if assert.NotNil(t, got, what) {
		assert.InDelta(t, want, float64(*got), 0.005, what)
	}
}

// K: work 5645.92, efficiency 8279.13, site -3038.48, zone -24018.68, day
// 31928.72, hour 5308.39; sum 24105.
func TestBridge(t *testing.T) {
	b := compare.NewBridge(bridgeK())
	bridgeNear(t, 5645.92, b.Work, "work")
	bridgeNear(t, 8279.13, b.Efficiency, "efficiency")
	bridgeNear(t, -3038.48, b.Site, "site")
	bridgeNear(t, -24018.68+31928.72+5308.39, b.Grid, "grid")
	require.NotNil(t, b.Parts)
	bridgeNear(t, -24018.68, &b.Parts.Zone, "zone")
	bridgeNear(t, 31928.72, &b.Parts.Day, "day")
	bridgeNear(t, 5308.39, &b.Parts.Hour, "hour")
	assert.InEpsilon(t, 24105, float64(b.Change()), 1e-12)
	assert.Nil(t, b.Energy)
	assert.Nil(t, b.Embodied, "none is declared")
}

// TestBridgeWithoutWork: where work is not told, done, or counted alike, energy
// stands for work and efficiency, and is their sum.
func TestBridgeWithoutWork(t *testing.T) {
	for name, work := range map[string]*unit.Work{"none": nil, "another unit": {Amount: 1100, Unit: "token"}, "nothing done": {Unit: "step"}} {
		for _, side := range []string{"base", "head"} {
			j := bridgeK()
			if side == "base" {
				j.Base.Work = work
			} else {
				j.Head.Work = work
			}
			b := compare.NewBridge(j)
			bridgeNear(t, 5645.92+8279.13, b.Energy, name)
			assert.Nil(t, b.Work, name)
			assert.Nil(t, b.Efficiency, name)
			bridgeNear(t, -3038.48, b.Site, name)
			assert.InEpsilon(t, 24105, float64(b.Change()), 1e-12)
		}
	}
}

// TestBridgeOneSide: a job that is new or gone is work and embodied emissions.
func TestBridgeOneSide(t *testing.T) {
	side := bridgeK().Head
	side.Work, side.Embodied = nil, bridgeOf(unit.Mass(895))
	for sign, job := range map[float64]compare.BridgeJob{1: {Head: side}, -1: {Base: side}} {
		b := compare.NewBridge(job)
		bridgeNear(t, sign*72105, b.Work, "work")
		bridgeNear(t, sign*895, b.Embodied, "embodied")
		for what, zero := range map[string]*unit.Mass{"efficiency": b.Efficiency, "site": b.Site, "grid": b.Grid} {
			bridgeNear(t, 0, zero, what)
		}
		assert.Nil(t, b.Energy)
		assert.Nil(t, b.Parts, "there is no change of grid to be split")
		assert.InEpsilon(t, sign*73000, float64(b.Change()), 1e-12)
	}
	assert.Equal(t, compare.Bridge{}, compare.NewBridge(compare.BridgeJob{}), "a job on neither side")
	assert.Zero(t, compare.NewBridge().Change())
}

// TestBridgeCleanGrid: operational zero on one side with energy on both is all
// grid: the hour's, unless all hours of the day or of the zone were clean.
func TestBridgeCleanGrid(t *testing.T) {
	for _, c := range []struct {
		z, a, i float64
		want    compare.BridgeGrid
	}{
		{450, 420, 0, compare.BridgeGrid{Hour: -72105}},
		{450, 0, 0, compare.BridgeGrid{Day: -72105}},
		{0, 0, 0, compare.BridgeGrid{Zone: -72105}},
	} {
		j := compare.BridgeJob{Base: bridgeK().Head, Head: bridgeSide(1000, 100, 1.2, c.z, c.a, c.i)}
		b := compare.NewBridge(j)
		bridgeNear(t, -72105, b.Grid, "grid")
		require.NotNil(t, b.Parts)
		for _, part := range [][2]unit.Mass{{c.want.Zone, b.Parts.Zone}, {c.want.Day, b.Parts.Day}, {c.want.Hour, b.Parts.Hour}} {
			bridgeNear(t, float64(part[0]), &part[1], "a part of the grid")
		}
		for what, zero := range map[string]*unit.Mass{"work": b.Work, "efficiency": b.Efficiency, "site": b.Site} {
			bridgeNear(t, 0, zero, what)
		}
		j.Base.Days = nil
		b = compare.NewBridge(j)
		bridgeNear(t, -72105, b.Grid, "grid as a whole")
		assert.Nil(t, b.Parts)
	}
}

// TestBridgeWithoutEnergy: a side that took no energy has no PUE and no
// intensity; what explains the change is that it took none.
func TestBridgeWithoutEnergy(t *testing.T) {
	j := bridgeK()
	j.Base.Machine, j.Base.Facility, j.Base.Operational = 0, 0, 0
	b := compare.NewBridge(j)
	bridgeNear(t, 72105, b.Efficiency, "efficiency")
	for what, zero := range map[string]*unit.Mass{"work": b.Work, "site": b.Site, "grid": b.Grid} {
		bridgeNear(t, 0, zero, what)
	}
	j.Base.Work = nil
	bridgeNear(t, 72105, compare.NewBridge(j).Energy, "energy")
	j.Head = j.Base
	bridgeNear(t, 0, compare.NewBridge(j).Energy, "nothing on both sides")
}

// TestBridgeDaysThatCannotTell: emissions on a day without any were not priced
// by the series; the grid is then told as a whole.
func TestBridgeDaysThatCannotTell(t *testing.T) {
	want := compare.NewBridge(bridgeK()).Grid
	for _, days := range []*compare.BridgeDays{nil, {Zone: 450, Day: 0}, {Zone: 0, Day: 420}, {}} {
		for _, side := range []func(*compare.BridgeJob) *compare.BridgeSide{
			func(j *compare.BridgeJob) *compare.BridgeSide { return j.Base },
			func(j *compare.BridgeJob) *compare.BridgeSide { return j.Head }} {
			j := bridgeK()
			side(&j).Days = days
			b := compare.NewBridge(j)
			bridgeNear(t, float64(*want), b.Grid, "grid")
			assert.Nil(t, b.Parts)
		}
	}
}

// TestBridgeEmbodied: head less base, none counting as nothing where the other
// side has some, as it does in the totals.
func TestBridgeEmbodied(t *testing.T) {
	for _, c := range []struct {
		base, head *unit.Mass
		want       float64
	}{{bridgeOf(unit.Mass(5)), bridgeOf(unit.Mass(7)), 2}, {nil, bridgeOf(unit.Mass(7)), 7}, {bridgeOf(unit.Mass(5)), nil, -5}, {bridgeOf(unit.Mass(5)), bridgeOf(unit.Mass(5)), 0}} {
		j := bridgeK()
		j.Base.Embodied, j.Head.Embodied = c.base, c.head
		b := compare.NewBridge(j)
		bridgeNear(t, c.want, b.Embodied, "embodied")
		assert.InEpsilon(t, 24105+c.want, float64(b.Change()), 1e-12)
	}
}

// TestBridgeSum: jobs add up cause by cause, and one job whose grid is known
// as a whole only leaves the sum without parts.
func TestBridgeSum(t *testing.T) {
	one := compare.NewBridge(bridgeK())
	energyOnly, alone := bridgeK(), compare.BridgeJob{Head: bridgeK().Base}
	energyOnly.Head.Work = nil
	b := compare.NewBridge(bridgeK(), energyOnly, alone, bridgeK())
	bridgeNear(t, float64(2**one.Work)+48000, b.Work, "work")
	bridgeNear(t, float64(2**one.Efficiency), b.Efficiency, "efficiency")
	bridgeNear(t, float64(*one.Work+*one.Efficiency), b.Energy, "energy")
	bridgeNear(t, float64(3**one.Site), b.Site, "site")
	assert.InEpsilon(t, 3*24105+48000, float64(b.Change()), 1e-12)
	if assert.NotNil(t, b.Parts, "a job on one side has no grid to split") {
		bridgeNear(t, float64(3*one.Parts.Zone), &b.Parts.Zone, "zone")
	}
	energyOnly.Base.Days = nil
	less := compare.NewBridge(bridgeK(), energyOnly, alone, bridgeK())
	assert.Nil(t, less.Parts)
	bridgeNear(t, float64(*b.Grid), less.Grid, "grid")
}

// TestBridgeJSON: the keys that other programs read, in grams; what does not
// apply is absent.
func TestBridgeJSON(t *testing.T) {
	keys := func(b compare.Bridge) (all []string) {
		text, err := json.Marshal(b)
		require.NoError(t, err)
		var top map[string]json.RawMessage
		require.NoError(t, json.Unmarshal(text, &top))
		for k, v := range top {
			var parts map[string]float64
			if all = append(all, k); k == "grid" {
				require.NoError(t, json.Unmarshal(v, &parts))
			}
			for p := range parts {
				all = append(all, "grid."+p)
			}
		}
		return all
	}
	j := bridgeK()
	j.Head.Embodied = bridgeOf(unit.Mass(1))
	assert.ElementsMatch(t, []string{"work_g", "efficiency_g", "site_g", "grid_g", "embodied_g", "grid", "grid.zone_g", "grid.day_g", "grid.hour_g"},
		keys(compare.NewBridge(j)))
	j.Head.Work, j.Head.Days = nil, nil
	assert.ElementsMatch(t, []string{"energy_g", "site_g", "grid_g", "embodied_g"}, keys(compare.NewBridge(j)))
	assert.Empty(t, keys(compare.NewBridge()))
}
