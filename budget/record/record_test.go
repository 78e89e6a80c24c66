package record

import (
	"fmt"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/unit"
)

// TestWholeRecord reads one line of every kind and all that they say.
func TestWholeRecord(t *testing.T) {
	got := read(t, text(
		`{"k":"open","format":1,"run":"r1","attempt":2,"part":3,"parts":4,"host":"h3","job":"retrain-tide","stage":"training","at":"2031-03-04T03:15:00+01:00",`+
			`"site":"quay-north","machine":"quad","reserved":2.5,"commit":"c0ffee","branch":"main","pull":214,"labels":{"team":"tide"}}`,
		power(10, "gpu0", 412.5),
		wrapping(11, "package", 262143.5, 262144),
		power(12, "gpu0", 0),
		energy(13, "package", 17),
		`{"k":"work","at":`+at(14)+`,"unit":"step","done":100,"planned":4000,"of":"part"}`,
		closing(15, "ok"),
	))
	assert.Empty(t, got.findings)
	assert.Empty(t, got.notes)
	assert.Equal(t, []string{"gpu0", "package"}, got.meters)
	second := func(n int) unit.Instant { return start.Add(unit.Duration(n) * unit.Second) }
	assert.Equal(t, []Line{
		{No: 1, Kind: KindOpen, At: start, Open: &Open{Run: "r1", Attempt: 2, Part: "3", Parts: 4, Host: "h3", Job: "retrain-tide", Stage: "training",
			At: start, Site: "quay-north", Machine: "quad", Reserved: 2.5, Commit: "c0ffee", Branch: "main", Pull: 214, Labels: map[string]string{"team": "tide"}}},
		{No: 2, Kind: KindPower, At: second(10), Meter: 0, Power: 412.5},
		{No: 3, Kind: KindEnergy, At: second(11), Meter: 1, Joules: 262143.5, Wrap: 262144},
		{No: 4, Kind: KindPower, At: second(12), Meter: 0, Power: 0},
		{No: 5, Kind: KindEnergy, At: second(13), Meter: 1, Joules: 17, Wrap: 262144},
		{No: 6, Kind: KindWork, At: second(14), Work: &Work{Unit: "step", Done: 100, Planned: 4000, OfPart: true}},
		{No: 7, Kind: KindClose, At: second(15), Close: &Close{OK}},
	}, got.lines)
}

func TestUsed(t *testing.T) {
	got := read(t, text(opening, used(0, 60, 0.5), `{"k":"used","from":`+at(60)+`,"to":`+at(90)+`,"kwh":0,"how":"estimated"}`, closing(90, "ok")))
	assert.Empty(t, got.findings)
	assert.Equal(t, &Used{From: start, To: start.Add(unit.Minute), Energy: 0.5, Measured: true}, got.lines[1].Used)
	assert.Equal(t, &Used{From: start.Add(unit.Minute), To: start.Add(90 * unit.Second)}, got.lines[2].Used)
	assert.Equal(t, start.Add(unit.Minute), got.lines[1].At, "the end of the span, for the end of a run that did not close")
}

// TestDefaults: what an open line need not say.
func TestDefaults(t *testing.T) {
	got := read(t, text(`{"k":"open","format":1,"run":"r1","job":"retrain-tide","at":`+at(0)+`}`))
	assert.Empty(t, got.findings)
	assert.Equal(t, &Open{Run: "r1", Attempt: 1, Parts: 1, Job: "retrain-tide", At: start}, got.lines[0].Open)
	got = read(t, text(opening, work(1, "step", 5)))
	assert.Equal(t, &Work{Unit: "step", Done: 5}, got.lines[1].Work, "of the run, nothing planned")
	got = read(t, text(opening, `{"k":"work","at":`+at(1)+`,"unit":"step","done":5,"of":"run"}`))
	assert.False(t, got.lines[1].Work.OfPart)
}

// TestOutcomes: all are charged, but only three tell what the code does.
func TestOutcomes(t *testing.T) {
	for outcome, evidence := range map[Outcome]bool{OK: true, Pilot: true, Stopped: true, Failed: false, Cancelled: false} {
		got := read(t, text(opening, closing(5, string(outcome))))
		assert.Empty(t, got.findings)
		require.Len(t, got.lines, 2)
		assert.Equal(t, outcome, got.lines[1].Close.Outcome)
		assert.Equal(t, evidence, outcome.Evidence(), outcome)
	}
	assert.False(t, Outcome("").Evidence())
}

// TestMissingClose: a killed job's record is whole without its close line.
func TestMissingClose(t *testing.T) {
	got := read(t, text(opening, power(1, "gpu0", 400)))
	assert.Empty(t, got.findings)
	assert.Empty(t, got.notes)
	assert.Equal(t, []int{1, 2}, got.numbers())
}

// TestParts: a part is named by a number or by a text, which are the same name.
func TestParts(t *testing.T) {
	for written, want := range map[string]string{`3`: "3", `"3"`: "3", `0`: "0", `"rack-b"`: "rack-b", `3.0`: "3", `"\u0061"`: "a"} {
		got := read(t, text(strings.Replace(opening, `"run"`, `"parts":4,"part":`+written+`,"run"`, 1)))
		assert.Empty(t, got.findings, written)
		require.Len(t, got.lines, 1)
		assert.Equal(t, want, got.lines[0].Open.Part, written)
	}
}

// TestWholeNumbers: 2.0 is how some languages write 2.
func TestWholeNumbers(t *testing.T) {
	for _, two := range []string{"2", "2.0", "2e0", "0.2e1"} {
		got := read(t, text(strings.Replace(opening, `"run"`, fmt.Sprintf(`"attempt":%s,"pull":%s,"run"`, two, two), 1)))
		assert.Empty(t, got.findings, two)
		require.Len(t, got.lines, 1)
		assert.Equal(t, 2, got.lines[0].Open.Attempt)
		assert.Equal(t, 2, got.lines[0].Open.Pull)
	}
	got := read(t, text(strings.Replace(opening, `"format":1`, `"format":1.0`, 1)))
	assert.Empty(t, got.findings)
}

// TestMetersInterleave: each meter has its own time order.
func TestMetersInterleave(t *testing.T) {
	got := read(t, text(opening, power(10, "gpu0", 1), power(5, "gpu1", 2), power(6, "gpu1", 3), power(11, "gpu0", 4), energy(5, "cpu", 5)))
	assert.Empty(t, got.findings)
	assert.Equal(t, []int{0, 0, 1, 1, 0, 2}, []int{got.lines[0].Meter, got.lines[1].Meter, got.lines[2].Meter, got.lines[3].Meter, got.lines[4].Meter, got.lines[5].Meter})
}

// TestUnknown: keys that this version does not know are passed over; kinds are
// passed over too, and vet can tell of them.
func TestUnknown(t *testing.T) {
	got := read(t, text(opening,
		`{"k":"power","at":`+at(1)+`,"meter":"gpu0","w":400,"volts":{"a":[1,null]},"K":"open","volts":7,"done":"yes"}`,
		`{"k":"heat","at":"whenever","at":"never"}`,
		`{"k":"Power","at":`+at(2)+`,"meter":"gpu0","w":400}`,
		closing(3, "ok")))
	assert.Empty(t, got.findings)
	assert.Equal(t, []int{1, 2, 5}, got.numbers())
	assert.Equal(t, []string{
		`tide.ndjson:3: unknown kind of line "heat"; write one of [open power energy used work close]`,
		`tide.ndjson:4: unknown kind of line "Power"; write one of [open power energy used work close]`,
	}, got.unknown)
}

func TestNames(t *testing.T) {
	r, err := NewReader(strings.NewReader(""), "tide.ndjson")
	require.NoError(t, err)
	assert.Equal(t, "tide.ndjson", r.Name())
	for k := KindOpen; k <= KindClose; k++ {
		assert.Equal(t, k, kindOf(k.String()))
	}
	assert.Equal(t, KindUnknown, kindOf("unknown"), "the word for none is none of them")
}
