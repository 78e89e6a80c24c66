package ledger

import (
	"encoding/json"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/record"
)

// TestAnswers tries what may become of an entry, one rule at a time.
func TestAnswers(t *testing.T) {
	closed, killed := entry("r1"), entry("r1", unclosed)
	fixed := entry("r1", energy(2), correcting(closed))
	for name, c := range map[string]struct {
		e, inForce *Entry
		want       Answer
	}{
		"first":                          {closed, nil, Booked},
		"the same":                       {entry("r1"), closed, Already},
		"other energy":                   {entry("r1", energy(2)), closed, Refused},
		"longer, but it was closed":      {entry("r1", lasting(0, 2)), closed, Refused},
		"closed at the same moment":      {closed, killed, Longer},
		"unclosed at the same moment":    {killed, closed, Already},
		"a nanosecond longer":            {entry("r1", unclosed, func(e *Entry) { e.End++ }), killed, Longer},
		"a nanosecond shorter":           {entry("r1", unclosed, func(e *Entry) { e.End-- }), killed, Already},
		"another start":                  {entry("r1", lasting(0.5, 2)), killed, Refused},
		"other energy, as long":          {entry("r1", unclosed, energy(2)), killed, Refused},
		"a correction of nothing":        {fixed, nil, Unfounded},
		"a correction":                   {fixed, closed, Booked},
		"the same correction":            {entry("r1", energy(2), correcting(closed), func(e *Entry) { e.BookedAt = hours(9) }), fixed, Already},
		"another one of the same":        {entry("r1", energy(3), correcting(closed)), fixed, Unfounded},
		"a correction of the correction": {entry("r1", energy(3), correcting(fixed)), fixed, Booked},
		"a correction that says nothing": {entry("r1", correcting(closed)), closed, Booked},
		"the record that was corrected":  {closed, fixed, Refused},
	} {
		assert.Equal(t, c.want, answer(c.e, c.inForce), name)
	}
}

// TestID: the ID is that of the content: it survives writing and reading, and
// no two contents share it.
func TestID(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		e := entry(rapid.String().Draw(t, "run"), lasting(float64(rapid.IntRange(0, 50).Draw(t, "start")), rapid.Float64Range(0.1, 5).Draw(t, "length")))
		if rapid.Bool().Draw(t, "unpriced") {
			unpriced(e)
		}
		e.Work, e.WorkOfPart = &record.Work{Unit: "step", OfPart: true}, true
		e.Labels = rapid.MapOf(rapid.String(), rapid.String()).Draw(t, "labels")
		text, err := json.Marshal(e)
		require.NoError(t, err)
		var back Entry
		require.NoError(t, json.Unmarshal(text, &back))
		assert.Equal(t, e.ID(), back.ID())
		assert.True(t, back.same(e), "what was read is the same record")
		back.GapUG += 1e-9
		assert.NotEqual(t, e.ID(), back.ID())
	})
	assert.Regexp(t, "^[0-9a-f]{32}$", entry("r1").ID())
}

// TestForce: of what was let in, the last of a key is in force.
func TestForce(t *testing.T) {
	killed := entry("r1", unclosed)
	longer := entry("r1", lasting(0, 2), unclosed)
	fixed := entry("r1", energy(2), correcting(longer))
	closed := entry("r1", lasting(0, 3))
	var f force
	assert.Nil(t, f.get(killed.Key()))
	for _, e := range []*Entry{killed, longer, fixed} {
		f.add(e)
		assert.Same(t, e, f.get(killed.Key()))
	}
	f.add(entry("r2"))
	f.add(closed) // nobody let it in: the correction was of a closed record
	assert.Len(t, f.list, 2)
	assert.Same(t, fixed, f.get(killed.Key()))
}

// TestPull: accounts of pull requests, and branches that only look like one.
func TestPull(t *testing.T) {
	assert.Equal(t, "pull/214", PullAccount(214))
	assert.Equal(t, 214, Pull(PullAccount(214)))
	for _, branch := range []string{"main", "pull/", "pull/x", "pull/7x", "pull/07", "pull/7/head", " pull/7", "pull/ 7", "Pull/7"} {
		assert.Zero(t, Pull(branch), branch)
	}
}

// TestKeyText is what messages call an entry.
func TestKeyText(t *testing.T) {
	assert.Equal(t, "run r1, attempt 1", entry("r1").Key().String())
	assert.Equal(t, "run r1, attempt 1, part b", entry("r1", part("b", 2)).Key().String())
}
