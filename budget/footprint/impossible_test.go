package footprint_test

import (
	"io"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// TestLongestSpan: times more than two years after open are mistakes, however
// far off. They cost no memory and leave nothing proven.
func TestLongestSpan(t *testing.T) {
	for name, c := range map[string]struct {
		opens, at string
		late      bool
	}{
		"two years":                    {"2031-03-04T02:00:00Z", "2033-03-03T02:00:00Z", false}, // of 365 days
		"a second more":                {"2031-03-04T02:00:00Z", "2033-03-03T02:00:01Z", true},
		"a century":                    {"2031-03-04T02:00:00Z", "2131-03-04T02:00:00Z", true},
		"further than a duration goes": {"1700-01-01T00:00:00Z", "2250-01-01T00:00:00Z", true},
		"all of time":                  {"1677-09-21T00:12:44Z", "2262-04-11T23:47:16Z", true},
		"in the last hour of time":     {"2262-04-11T22:10:00Z", "2262-04-11T23:40:00Z", false},
	} {
		t.Run(name, func(t *testing.T) {
			opens, err := unit.ParseInstant(c.opens)
			require.NoError(t, err)
			at, err := unit.ParseInstant(c.at)
			require.NoError(t, err)
			s := open(t, func(o *record.Open) { o.At = opens })
			require.NoError(t, s.w.Energy(opens, "m", 0, 0))
			require.NoError(t, s.w.Energy(at, "m", 3.6e6, 0))
			r := s.run(plain(nil), method)
			assert.Equal(t, c.late, r.Refuted())
			assert.LessOrEqual(t, len(r.Hours), 2*365*24+1)
			if !c.late {
				assert.InEpsilon(t, 1, value(t, r.Measured), 1e-9)
			}
		})
	}
}

// TestBeyondMeasure: numbers that nothing measures do not count and leave
// nothing proven; sums stay finite, so that no comparison with a limit is
// decided by what is not a number.
func TestBeyondMeasure(t *testing.T) {
	for name, write := range map[string]func(*sheet) *sheet{
		"power":   func(s *sheet) *sheet { return s.power(hour+1, "m", 1e308) },
		"counter": func(s *sheet) *sheet { return s.energy(0, "n", 0, 0).energy(hour+1, "n", 1e308, 0) },
		"wrap":    func(s *sheet) *sheet { return s.energy(hour+1, "n", 0, 1e308) },
		"work":    func(s *sheet) *sheet { return s.work(hour+1, steps(1e308)) },
		"planned": func(s *sheet) *sheet { return s.work(hour+1, record.Work{Unit: "step", Planned: 1e308}) },
		"little":  func(s *sheet) *sheet { return s.work(hour+1, steps(5e-324)) },
	} {
		t.Run(name, func(t *testing.T) {
			r := write(open(t).powers(0, hour, 60, "m", 1000)).close(hour+1).run(plain(flat(400)), method)
			assert.True(t, r.Refuted())
			assert.Contains(t, r.Doubts[len(r.Doubts)-1].Reason, "beyond anything that can be")
			assert.InEpsilon(t, 1, value(t, r.Measured), 1e-3)
			assert.Nil(t, r.Work)
		})
	}
	used := open(t).used(0, hour, 1e308, true).close(hour).run(plain(flat(400)), method)
	assert.True(t, used.Refuted())
	assert.Nil(t, used.Measured)
}

// lines is a source of ready lines, for what the reader never lets through.
type lines struct{ left []record.Line }

func (l *lines) Next() (*record.Line, error) {
	if len(l.left) == 0 {
		return nil, io.EOF
	}
	next := l.left[0]
	l.left = l.left[1:]
	return &next, nil
}

func (l *lines) Meters() []string        { return []string{"m"} }
func (l *lines) Findings() *finding.List { return &finding.List{} }
func (l *lines) Notes() []string         { return nil }
func (l *lines) Name() string            { return "lines" }

// TestBeforeOpen: a source that is not as strict as the reader cannot have
// energy from before the run.
func TestBeforeOpen(t *testing.T) {
	power := func(no int, at float64) record.Line {
		return record.Line{No: no, Kind: record.KindPower, At: after(at), Power: 1000}
	}
	src := &lines{[]record.Line{
		{No: 1, Kind: record.KindOpen, At: start, Open: &record.Open{Run: "r1", At: start}},
		power(2, -60), power(3, 0), power(4, 60),
	}}
	p, err := footprint.Weigh(src, method, func(*record.Open) footprint.Facts { return plain(nil) })
	require.NoError(t, err)
	require.NotEmpty(t, p.Doubts)
	assert.Contains(t, p.Doubts[0].Reason, "lines:2: a time before the record opens")
	assert.InEpsilon(t, 1000*60/3.6e6, float64(p.Meters[0].Measured), 1e-14)
}
