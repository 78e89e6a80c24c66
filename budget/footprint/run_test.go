package footprint_test

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/record"
)

// worked weighs one part of 1 kWh for each work line.
func worked(t *testing.T, lines ...record.Work) *footprint.Run {
	var parts []*footprint.Part
	for n, w := range lines {
		s := open(t, part(string(rune('a'+n)), len(lines))).powers(0, hour, 60, "m", 1000)
		if w.Unit != "" {
			s.work(1800, record.Work{Unit: w.Unit, Done: w.Done / 2, Planned: w.Planned, OfPart: w.OfPart}).work(hour, w)
		}
		parts = append(parts, s.close(hour).weigh(plain(flat(100)), method))
	}
	return footprint.Combine(parts, method)
}

// TestWorkOverParts: parts tell one shared count, of which the largest holds,
// unless they say that theirs is of the part, then they add.
func TestWorkOverParts(t *testing.T) {
	of := func(done, planned float64, ofPart bool) record.Work {
		return record.Work{Unit: "step", Done: done, Planned: planned, OfPart: ofPart}
	}
	for name, c := range map[string]struct {
		lines         []record.Work
		done, planned float64
	}{
		"one part":             {[]record.Work{of(40, 50, false)}, 40, 50},
		"shared, last largest": {[]record.Work{of(30, 50, false), of(40, 60, false)}, 40, 60},
		"shared, first":        {[]record.Work{of(40, 60, false), of(30, 50, false)}, 40, 60},
		"shared, one silent":   {[]record.Work{{}, of(30, 50, false)}, 30, 50},
		"of the part":          {[]record.Work{of(30, 50, true), of(40, 60, true), of(1, 1, true)}, 71, 111},
		"of the part, one mum": {[]record.Work{of(30, 50, true), {}}, 30, 50},
	} {
		t.Run(name, func(t *testing.T) {
			r := worked(t, c.lines...)
			require.NotNil(t, r.Work)
			assert.InDelta(t, c.done, r.Work.Done, 0)
			assert.InDelta(t, c.planned, r.Work.Planned, 0)
			assert.Empty(t, r.Doubts)
			assert.InEpsilon(t, value(t, r.Total)/c.done, value(t, r.Rate), 1e-15)
		})
	}
}

// TestWorkIsNotShared: adding up a run leaves its parts as they were.
func TestWorkIsNotShared(t *testing.T) {
	r := worked(t, record.Work{Unit: "step", Done: 30, OfPart: true}, record.Work{Unit: "step", Done: 40, OfPart: true})
	assert.InDelta(t, 30, r.Pieces[0].Work.Done, 0)
	again := footprint.Combine(r.Pieces, method)
	assert.Equal(t, r.Work, again.Work)
}

// TestNoRate: nothing done is no rate, and so is work that the parts tell
// differently; the doubt names both words.
func TestNoRate(t *testing.T) {
	assert.Nil(t, worked(t, record.Work{Unit: "step", Planned: 100}).Rate)
	assert.Nil(t, worked(t, record.Work{}).Work)

	mixed := worked(t, record.Work{Unit: "step", Done: 10}, record.Work{Unit: "token", Done: 1000}, record.Work{Unit: "step", Done: 10})
	assert.Nil(t, mixed.Rate)
	assert.Nil(t, mixed.Work)
	require.Len(t, mixed.Doubts, 1)
	assert.Contains(t, mixed.Doubts[0].Reason, `"step"`)
	assert.Contains(t, mixed.Doubts[0].Reason, `"token"`)
	assert.NotNil(t, mixed.Total)

	of := worked(t, record.Work{Unit: "step", Done: 10}, record.Work{Unit: "step", Done: 10, OfPart: true})
	assert.Nil(t, of.Rate)
	assert.Len(t, of.Doubts, 1)
}

// TestGrades: from best to worst; a grade is not worse than itself.
func TestGrades(t *testing.T) {
	assert.Equal(t, []footprint.Grade{"measured", "filled", "averaged", "estimated"}, footprint.Grades)
	for n, g := range footprint.Grades {
		for k, least := range footprint.Grades {
			assert.Equal(t, n > k, g.Worse(least), "%s against %s", g, least)
		}
	}
}

// TestOutcome: a run ends as its worst part.
func TestOutcome(t *testing.T) {
	for _, c := range [][3]record.Outcome{
		{record.OK, record.OK, record.OK},
		{record.OK, record.Pilot, record.Pilot},
		{record.Pilot, record.Stopped, record.Stopped},
		{record.Cancelled, record.Stopped, record.Cancelled},
		{record.Cancelled, record.Failed, record.Failed},
		{record.Failed, record.OK, record.Failed},
	} {
		a := open(t, part("a", 2)).powers(0, 60, 60, "m", 100).closes(60, c[0]).weigh(plain(nil), method)
		b := open(t, part("b", 2)).powers(0, 60, 60, "m", 100).closes(60, c[1]).weigh(plain(nil), method)
		assert.Equal(t, c[2], footprint.Combine([]*footprint.Part{a, b}, method).Outcome, c)
	}
}

// TestPartsOfOneRun: a run is whole when all its parts are there and tell of
// the same thing.
func TestPartsOfOneRun(t *testing.T) {
	weigh := func(edits ...func(*record.Open)) *footprint.Part {
		return open(t, edits...).powers(60, 120, 60, "m", 100).close(120).weigh(plain(flat(400)), method)
	}
	a, b := weigh(part("a", 2)), weigh(part("b", 2))
	assert.Empty(t, footprint.Combine([]*footprint.Part{a, b}, method).Doubts)

	missing := footprint.Combine([]*footprint.Part{a}, method)
	require.Len(t, missing.Doubts, 1)
	assert.Equal(t, "part missing: run r1 has 1 of 2 parts", missing.Doubts[0].Reason)
	assert.InDelta(t, 1, missing.Doubts[0].Observed, 0)
	assert.InDelta(t, 2, missing.Doubts[0].Limit, 0)

	for name, edit := range map[string]func(*record.Open){
		"job":   func(o *record.Open) { o.Job = "check-tide" },
		"stage": func(o *record.Open) { o.Stage = "evaluation" },
		"parts": func(o *record.Open) { o.Parts = 3 },
	} {
		r := footprint.Combine([]*footprint.Part{a, weigh(part("b", 2), edit)}, method)
		require.NotEmpty(t, r.Doubts, name)
		assert.Contains(t, r.Doubts[0].Reason, "parts disagree", name)
	}
}

// TestRunOfParts: what all parts share is the run's; its span is from the
// first open to the last close.
func TestRunOfParts(t *testing.T) {
	on := func(host string, from float64) func(*record.Open) {
		return func(o *record.Open) { o.Host, o.At = host, after(from) }
	}
	a := open(t, part("a", 2), on("h1", 60)).powers(60, 300, 60, "m", 100).close(300).weigh(plain(flat(400)), method)
	b := open(t, part("b", 2), on("h2", 0)).powers(0, 120, 60, "m", 300).close(120).weigh(plain(flat(400)), method)
	r := footprint.Combine([]*footprint.Part{a, b}, method)
	assert.Equal(t, after(0), r.Start)
	assert.Equal(t, after(300), r.End)
	assert.Equal(t, "quay-north", r.Site)
	assert.Equal(t, "NORTH", r.Zone)
	assert.Equal(t, "quad", r.Machine)
	assert.Empty(t, r.Host)
	require.Len(t, r.Parts, 2)
	assert.Equal(t, "h2", r.Parts[1].Host)
	assert.Equal(t, []string{"m"}, r.Parts[1].Meters)
	assert.InEpsilon(t, 300*120/3.6e6, value(t, r.Parts[1].Measured), 1e-14)
	assert.InEpsilon(t, value(t, r.Parts[0].Measured)+value(t, r.Parts[1].Measured), value(t, r.Measured), 1e-14)
}
