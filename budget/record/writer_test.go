package record

import (
	"bytes"
	"errors"
	"math"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/unit"
)

// calls keeps what each Write call brought.
type calls struct {
	each []string
	fail error
}

func (c *calls) Write(b []byte) (int, error) {
	c.each = append(c.each, string(b))
	return len(b), c.fail
}

func TestWriter(t *testing.T) {
	var out calls
	w := NewWriter(&out)
	second := func(n int) unit.Instant { return start.Add(unit.Duration(n) * unit.Second) }
	require.NoError(t, w.Open(Open{Run: "r1", Attempt: 2, Part: "rack-b", Parts: 4, Job: "retrain-tide", At: start, Reserved: 2, Labels: map[string]string{"team": "tide"}}))
	require.NoError(t, w.Power(second(1), "gpu0", 412.5))
	require.NoError(t, w.Energy(second(1), `odd "name"`, 1e21, 2e21))
	require.NoError(t, w.Energy(second(2), `odd "name"`, 5, 0))
	require.NoError(t, w.Used(Used{From: second(1), To: second(2), Energy: 0.5, Measured: true}))
	require.NoError(t, w.Used(Used{From: second(2), To: second(3), Energy: 0.5}))
	require.NoError(t, w.Work(second(3), Work{Unit: "step", Done: 0, Planned: 4000, OfPart: true}))
	require.NoError(t, w.Work(second(3), Work{Unit: "step", Done: 7}))
	require.NoError(t, w.Close(second(4), Stopped))
	assert.Equal(t, []string{
		`{"k":"open","format":1,"run":"r1","attempt":2,"part":"rack-b","parts":4,"job":"retrain-tide","at":"2031-03-04T02:15:00Z","reserved":2,"labels":{"team":"tide"}}` + "\n",
		`{"k":"power","at":"2031-03-04T02:15:01Z","meter":"gpu0","w":412.5}` + "\n",
		`{"k":"energy","at":"2031-03-04T02:15:01Z","meter":"odd \"name\"","j":1e+21,"wrap_j":2e+21}` + "\n",
		`{"k":"energy","at":"2031-03-04T02:15:02Z","meter":"odd \"name\"","j":5}` + "\n",
		`{"k":"used","from":"2031-03-04T02:15:01Z","to":"2031-03-04T02:15:02Z","kwh":0.5,"how":"measured"}` + "\n",
		`{"k":"used","from":"2031-03-04T02:15:02Z","to":"2031-03-04T02:15:03Z","kwh":0.5,"how":"estimated"}` + "\n",
		`{"k":"work","at":"2031-03-04T02:15:03Z","unit":"step","done":0,"planned":4000,"of":"part"}` + "\n",
		`{"k":"work","at":"2031-03-04T02:15:03Z","unit":"step","done":7}` + "\n",
		`{"k":"close","at":"2031-03-04T02:15:04Z","outcome":"stopped"}` + "\n",
	}, out.each, "one Write call for each line, so that a killed job tears one line at most")
}

// TestWriterRefuses: what is no number is not written, nor half of its line.
func TestWriterRefuses(t *testing.T) {
	var out calls
	w := NewWriter(&out)
	for _, bad := range []float64{math.NaN(), math.Inf(1), math.Inf(-1)} {
		assert.Error(t, w.Power(start, "gpu0", unit.Power(bad)))
		assert.Error(t, w.Energy(start, "cpu", unit.Joules(bad), 0))
		assert.Error(t, w.Energy(start, "cpu", 1, unit.Joules(bad)))
		assert.Error(t, w.Used(Used{From: start, To: start + 1, Energy: unit.Energy(bad)}))
		assert.Error(t, w.Work(start, Work{Unit: "step", Done: bad}))
		assert.Error(t, w.Work(start, Work{Unit: "step", Planned: bad}))
		assert.Error(t, w.Open(Open{Run: "r1", Attempt: 1, Job: "j", At: start, Reserved: bad}))
	}
	assert.Empty(t, out.each)
}

// TestWriterFails: a full disk is told at once, for every kind of line.
func TestWriterFails(t *testing.T) {
	full := errors.New("no space left on device")
	w := NewWriter(&calls{fail: full})
	for _, err := range []error{w.Open(Open{}), w.Power(start, "gpu0", 1), w.Energy(start, "cpu", 1, 0), w.Used(Used{}), w.Work(start, Work{}), w.Close(start, OK)} {
		assert.ErrorIs(t, err, full)
	}
}

// script is a record that makes sense: its lines as a Reader should give them.
type script struct {
	lines  []Line
	meters []string
}

var (
	someText   = rapid.StringN(0, 40, 200)
	someWord   = rapid.StringN(1, 40, 200)
	someNumber = rapid.OneOf(rapid.Float64Range(0, math.MaxFloat64), rapid.Float64Range(0, 3000),
		rapid.SampledFrom([]float64{0, 5e-324, 1e-7, 0.1, 412.5, 262144, 1 << 53, 1e21, math.MaxFloat64}))
)

func drawOpen(t *rapid.T) *Open {
	return &Open{
		Run: someWord.Draw(t, "run"), Attempt: rapid.IntRange(1, 1e6).Draw(t, "attempt"), Part: someWord.Draw(t, "part"), Parts: rapid.IntRange(1, 99).Draw(t, "parts"),
		Host: someText.Draw(t, "host"), Job: someWord.Draw(t, "job"), Stage: someText.Draw(t, "stage"),
		At:   unit.Instant(rapid.Int64Range(-8e18, 9e18).Draw(t, "at")),
		Site: someText.Draw(t, "site"), Machine: someText.Draw(t, "machine"), Reserved: someNumber.Draw(t, "reserved"),
		Commit: someText.Draw(t, "commit"), Branch: someText.Draw(t, "branch"), Pull: rapid.IntRange(0, 1e6).Draw(t, "pull"),
		Labels: rapid.OneOf(rapid.Just(map[string]string(nil)), rapid.MapOfN(someText, someText, 1, 3)).Draw(t, "labels"),
	}
}

// drawScript draws a record and writes it to w.
func drawScript(t *rapid.T, w *Writer) (s script) {
	open := drawOpen(t)
	require.NoError(t, w.Open(*open))
	s.lines = []Line{{Kind: KindOpen, At: open.At, Open: open}}
	s.meters = rapid.SliceOfNDistinct(someWord, 1, 4, rapid.ID).Draw(t, "meters")
	counters := rapid.SliceOfN(rapid.Bool(), len(s.meters), len(s.meters)).Draw(t, "counters")
	now, done := open.At, 0.0
	for i := range rapid.IntRange(0, 20).Draw(t, "samples") {
		now = now.Add(unit.Duration(rapid.Int64Range(1, int64(unit.Hour)).Draw(t, "pause")))
		m := i % len(s.meters) // in turns, so that the reader meets them in this order
		value := someNumber.Draw(t, "value")
		l := Line{Kind: KindPower, At: now, Meter: m, Power: unit.Power(value)}
		if counters[m] {
			l = Line{Kind: KindEnergy, At: now, Meter: m, Joules: unit.Joules(value), Wrap: math.MaxFloat64}
			require.NoError(t, w.Energy(now, s.meters[m], l.Joules, l.Wrap))
		} else {
			require.NoError(t, w.Power(now, s.meters[m], l.Power))
		}
		s.lines = append(s.lines, l)
		if rapid.Bool().Draw(t, "work") {
			done += rapid.Float64Range(0, 1e6).Draw(t, "done")
			p := &Work{Unit: "step", Done: done, Planned: someNumber.Draw(t, "planned"), OfPart: counters[0]}
			require.NoError(t, w.Work(now, *p))
			s.lines = append(s.lines, Line{Kind: KindWork, At: now, Work: p})
		}
	}
	u := &Used{From: now, To: now + 1, Energy: unit.Energy(someNumber.Draw(t, "kwh")), Measured: rapid.Bool().Draw(t, "measured")}
	require.NoError(t, w.Used(*u))
	outcome := rapid.SampledFrom([]Outcome{OK, Pilot, Stopped, Failed, Cancelled}).Draw(t, "outcome")
	require.NoError(t, w.Close(u.To, outcome))
	s.lines = append(s.lines, Line{Kind: KindUsed, At: u.To, Used: u}, Line{Kind: KindClose, At: u.To, Close: &Close{outcome}})
	for i := range s.lines {
		s.lines[i].No = i + 1
	}
	return s
}

// TestWrittenIsRead: whatever the Writer writes, the Reader gives back equal.
func TestWrittenIsRead(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		var out bytes.Buffer
		want := drawScript(t, NewWriter(&out))
		got := read(t, out.String())
		assert.Empty(t, got.findings)
		assert.Empty(t, got.notes)
		assert.Equal(t, want.lines, got.lines)
		assert.Equal(t, want.meters[:len(got.meters)], append([]string{}, got.meters...))
		assert.Equal(t, len(want.lines), strings.Count(out.String(), "\n"))
	})
}
