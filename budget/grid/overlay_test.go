package grid_test

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

const seconds = 60 // the drawn files lie within this span

func second(n int) unit.Instant { return midnight.Add(unit.Duration(n) * unit.Second) }

// drawSteps draws steps on whole seconds, in order, with holes and without
// overlap. Few values, so that files agree often.
func drawSteps(t *rapid.T, label string) (steps []grid.Interval) {
	for at := rapid.IntRange(0, 10).Draw(t, label+" start"); at < seconds; {
		length := rapid.IntRange(1, 12).Draw(t, label+" length")
		steps = append(steps, grid.Interval{From: second(at), To: second(at + length), I: unit.Intensity(rapid.IntRange(0, 2).Draw(t, label+" g"))})
		at += length + rapid.SampledFrom([]int{0, 0, 1, 7}).Draw(t, label+" hole")
	}
	return steps
}

// naive is the same thing done second by second in a map.
type naive struct {
	at      map[unit.Instant]unit.Intensity
	differs bool
}

func (n *naive) lay(steps []grid.Interval) {
	for _, s := range steps {
		for at := s.From; at < s.To; at = at.Add(unit.Second) {
			old, known := n.at[at]
			n.differs = n.differs || known && old != s.I
			n.at[at] = s.I
		}
	}
}

// TestOverlay: files laid over one another are, at every moment, the last file
// that has a value there.
func TestOverlay(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		want := naive{at: map[unit.Instant]unit.Intensity{}}
		var files []*grid.File
		for range rapid.IntRange(1, 5).Draw(t, "files") {
			steps := drawSteps(t, "steps")
			want.lay(steps)
			files = append(files, clean(t, "north.csv", header+rows("NORTH", grid.Average, rapid.Permutation(steps).Draw(t, "order")...)))
		}
		set := grid.NewSet(grid.Direct, files...)
		s := set.Series("NORTH", grid.Average)
		inOrder(t, s)
		for at := second(-1); at < second(2*seconds); at = at.Add(unit.Second) {
			g, known := want.at[at]
			for _, moment := range []unit.Instant{at, at.Add(unit.Second) - 1} {
				got, ok := s.At(moment)
				require.Equal(t, known, ok, moment)
				require.Equal(t, g, got, moment)
			}
		}
		assert.Equal(t, want.differs, len(set.Notes()) == 1, set.Notes())
		assert.LessOrEqual(t, len(set.Notes()), 1)
	})
}
