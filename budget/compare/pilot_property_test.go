package compare_test

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"pgregory.net/rapid"

	"budgetcheck/budget/compare"
	"budgetcheck/budget/unit"
)

// pilotDrawn draws a pilot that can be projected, its lines at uneven steps.
func pilotDrawn(t *rapid.T) compare.Pilot {
	p := compare.Pilot{Measured: unit.Energy(rapid.Float64Range(0, 100).Draw(t, "start-up"))}
	done := rapid.Float64Range(0, 50).Draw(t, "first")
	p.Lines = append(p.Lines, compare.PilotLine{Done: done, Energy: p.Measured})
	for range rapid.IntRange(16, 40).Draw(t, "lines") {
		done += rapid.Float64Range(5, 10).Draw(t, "work")
		p.Measured += unit.Energy(rapid.Float64Range(0.1, 5).Draw(t, "kWh"))
		p.Lines = append(p.Lines, compare.PilotLine{Done: done, Energy: p.Measured})
	}
	p.Planned = done * rapid.Float64Range(1.01, 19).Draw(t, "planned")
	if _, doubt := p.Project(); doubt != "" {
		t.Skip(doubt)
	}
	return p
}

// pilotChanged is the pilot with its counts and energies put through a line.
func pilotChanged(p compare.Pilot, work, energy, more float64) compare.Pilot {
	out := compare.Pilot{Planned: p.Planned * work, Measured: p.Measured*unit.Energy(energy) + unit.Energy(more)}
	for _, l := range p.Lines {
		out.Lines = append(out.Lines, compare.PilotLine{Done: l.Done * work, Energy: l.Energy*unit.Energy(energy) + unit.Energy(more)})
	}
	return out
}

func pilotSame(t assert.TestingT, energy, width float64, got compare.Projection) {
	assert.InEpsilon(t, energy, float64(got.Energy), 1e-8)
	assert.InDelta(t, width, float64(got.HalfWidth), 1e-6*width+1e-9*energy)
}

// TestPilotScales: the unit of work does not matter, energy scales, and a
// longer start-up is spent once.
func TestPilotScales(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p := pilotDrawn(t)
		was := pilotProjected(t, p)
		energy, width := float64(was.Energy), float64(was.HalfWidth)
		c := rapid.Float64Range(0.01, 100).Draw(t, "c")
		pilotSame(t, energy, width, pilotProjected(t, pilotChanged(p, c, 1, 0)))
		pilotSame(t, c*energy, c*width, pilotProjected(t, pilotChanged(p, 1, c, 0)))
		pilotSame(t, c+energy, width, pilotProjected(t, pilotChanged(p, 1, 1, c)))
		p.Measured += unit.Energy(c) // after the last work line
		pilotSame(t, c+energy, width, pilotProjected(t, p))
	})
}

// TestPilotLinesBetween: lines that lie on the straight between two others tell
// nothing new.
func TestPilotLinesBetween(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p := pilotDrawn(t)
		was, finer := pilotProjected(t, p), p
		finer.Lines = nil
		for n, l := range p.Lines {
			if n > 0 {
				before, share := p.Lines[n-1], rapid.Float64Range(0, 1).Draw(t, "share")
				finer.Lines = append(finer.Lines, compare.PilotLine{Done: before.Done + share*(l.Done-before.Done),
					Energy: before.Energy + unit.Energy(share)*(l.Energy-before.Energy)})
			}
			finer.Lines = append(finer.Lines, l)
		}
		pilotSame(t, float64(was.Energy), float64(was.HalfWidth), pilotProjected(t, finer))
	})
}
