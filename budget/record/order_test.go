package record

import (
	"fmt"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
)

func TestMeterOrder(t *testing.T) {
	const oneKind = "; write one kind of line for each meter"
	refuses(t, []refusal{
		{"two kinds on one meter", text(opening, power(1, "gpu0", 400), energy(2, "gpu0", 900), power(3, "gpu0", 401)), []int{1, 2, 4},
			`3: meter "gpu0" has power lines and now a line of kind energy` + oneKind},
		{"two kinds, energy first", text(opening, energy(1, "gpu0", 400), power(2, "gpu0", 900)), []int{1, 2},
			`3: meter "gpu0" has energy lines and now a line of kind power` + oneKind},
		{"out of order", text(opening, power(5, "gpu0", 400), power(4, "gpu0", 401), power(6, "gpu0", 402)), []int{1, 2, 4},
			`3: meter "gpu0" goes back in time, from 2031-03-04T02:15:05Z to 2031-03-04T02:15:04Z; write each meter's samples in time order`},
		{"two values at one time", text(opening, power(5, "gpu0", 400), power(5, "gpu0", 401), power(6, "gpu0", 402)), []int{1, 2, 4},
			`3: meter "gpu0" has two readings at 2031-03-04T02:15:05Z, 400 and 401; write one reading for each time`},
		{"before the record opens", text(opening, power(-1, "gpu0", 400), power(0, "gpu0", 401)), []int{1, 3},
			`2: 2031-03-04T02:14:59Z is before the record opens at 2031-03-04T02:15:00Z; open the record before its first line`},
		{"one meter too many", text(append([]string{opening}, manyMeters(MaxMeters+1)...)...), upTo(MaxMeters + 1),
			`4098: meter "m4096" is one more than 4096 meters; name meters by device, not by sample, and write a part for each host`},
		{"a meter's name too long", text(opening, power(1, strings.Repeat("m", MaxName), 1), power(1, strings.Repeat("m", MaxName+1), 1)), []int{1, 2},
			`3: the name of the meter is longer than 1024 bytes; name meters by device`},
	})
}

func manyMeters(n int) (lines []string) {
	for i := range n {
		lines = append(lines, power(1, fmt.Sprint("m", i), 1))
	}
	return lines
}

func upTo(n int) (numbers []int) {
	for i := range n {
		numbers = append(numbers, i+1)
	}
	return numbers
}

// TestRepeats: logs repeat readings exactly; those count once, and it is said.
func TestRepeats(t *testing.T) {
	got := read(t, text(opening, power(5, "gpu0", 400), power(5, "gpu0", 400.0), power(5, "gpu1", 400), power(6, "gpu0", 400), energy(5, "cpu", 7), energy(5, "cpu", 7)))
	assert.Empty(t, got.findings)
	assert.Equal(t, []int{1, 2, 4, 5, 6}, got.numbers())
	assert.Equal(t, []string{"tide.ndjson: 2 repeated samples counted once"}, got.notes)
	got = read(t, text(opening, power(5, "gpu0", 400), strings.Replace(power(5, "gpu0", 400), "02:15:05Z", "04:15:05+02:00", 1)))
	assert.Equal(t, []int{1, 2}, got.numbers(), "the same moment in another zone is the same sample")
}

func TestCounters(t *testing.T) {
	got := read(t, text(opening, wrapping(1, "cpu", 262144, 262144), wrapping(2, "cpu", 5, 262144), energy(3, "cpu", 2), energy(1, "dram", 9), energy(2, "dram", 3)))
	assert.Empty(t, got.findings, "a reading at wrap_j, wrap_j said again, and counters going back are for the footprint to judge")
	refuses(t, []refusal{
		{"wrap_j changes", text(opening, wrapping(1, "cpu", 5, 100), wrapping(2, "cpu", 6, 101), energy(3, "cpu", 7)), []int{1, 2, 4},
			`3: meter "cpu" changes its wrap_j from 100 to 101; write wrap_j on the meter's first line, once`},
		{"wrap_j comes late", text(opening, energy(1, "cpu", 5), wrapping(2, "cpu", 6, 100)), []int{1, 2},
			`3: meter "cpu" changes its wrap_j from 0 to 100; write wrap_j on the meter's first line, once`},
		{"first reading above wrap_j", text(opening, wrapping(1, "cpu", 100.5, 100), wrapping(2, "cpu", 5, 100)), []int{1, 3},
			`2: meter "cpu" reads 100.5 J, above its wrap_j of 100; write the counter's real range`},
		{"later reading above wrap_j", text(opening, wrapping(1, "cpu", 5, 100), energy(2, "cpu", 100.00000000000001), energy(3, "cpu", 100)), []int{1, 2, 4},
			`3: meter "cpu" reads 100.00000000000001 J, above its wrap_j of 100; write the counter's real range`},
	})
}

func TestTotals(t *testing.T) {
	const twice = "; write totals in time order, each span once"
	refuses(t, []refusal{
		{"overlap", text(opening, used(0, 60, 1), used(59, 90, 1), used(60, 90, 1)), []int{1, 2, 4},
			"3: the total from 2031-03-04T02:15:59Z overlaps or precedes that of line 2, which ends at 2031-03-04T02:16:00Z" + twice},
		{"twice the same", text(opening, used(0, 60, 1), used(0, 60, 1)), []int{1, 2},
			"3: the total from 2031-03-04T02:15:00Z overlaps or precedes that of line 2, which ends at 2031-03-04T02:16:00Z" + twice},
		{"back in time", text(opening, used(60, 90, 1), used(0, 60, 1)), []int{1, 2},
			"3: the total from 2031-03-04T02:15:00Z overlaps or precedes that of line 2, which ends at 2031-03-04T02:16:30Z" + twice},
		{"no span", text(opening, used(5, 5, 1)), []int{1},
			`2: "to" (2031-03-04T02:15:05Z) is not after "from" (2031-03-04T02:15:05Z); write the span that the total covers`},
		{"backwards", text(opening, used(6, 5, 1)), []int{1},
			`2: "to" (2031-03-04T02:15:05Z) is not after "from" (2031-03-04T02:15:06Z); write the span that the total covers`},
		{"before open", text(opening, used(-1, 60, 1), used(0, 60, 1)), []int{1, 3},
			"2: the total starts at 2031-03-04T02:14:59Z, before the record opens at 2031-03-04T02:15:00Z; open the record before it"},
	})
}

// TestLongAgo: clocks that were never set stand before 1970; the checks do not
// take the epoch for a time that was read.
func TestLongAgo(t *testing.T) {
	got := read(t, strings.ReplaceAll(text(opening, used(0, 60, 1), used(60, 61, 1), power(3, "gpu0", 1), closing(70, "ok")), "2031-", "1931-"))
	assert.Empty(t, got.findings)
	assert.Equal(t, upTo(5), got.numbers())
}

func TestProgress(t *testing.T) {
	refuses(t, []refusal{
		{"falls", text(opening, work(1, "step", 10), work(2, "step", 9), work(3, "step", 10)), []int{1, 2, 4},
			"3: work done falls from 10 to 9; write the work done since the start of the run"},
		{"another unit", text(opening, work(1, "step", 10), work(2, "epoch", 11), work(3, "step", 12)), []int{1, 2, 4},
			`3: work is told in "step" and in "epoch"; use one unit in a record`},
		{"of another whole", text(opening, work(1, "step", 10), `{"k":"work","at":`+at(2)+`,"unit":"step","done":11,"of":"part"}`), []int{1, 2},
			`3: "of" changes within the record; write run or part on every work line`},
		{"goes back in time", text(opening, work(2, "step", 10), work(1, "step", 11), work(2, "step", 12)), []int{1, 2, 4},
			"3: work goes back in time, from 2031-03-04T02:15:02Z to 2031-03-04T02:15:01Z; write work lines in time order"},
	})
	got := read(t, text(opening, work(0, "step", 0), work(1, "step", 0), work(1, "step", 0)))
	assert.Empty(t, got.findings, "standing still is not falling")
}

// TestEnds: open first, close last, each once.
func TestEnds(t *testing.T) {
	refuses(t, []refusal{
		{"close before the latest line", text(opening, power(1, "gpu0", 400), power(9, "gpu0", 400), power(5, "gpu1", 400), closing(8, "ok")), []int{1, 2, 3, 4},
			"5: the record closes at 2031-03-04T02:15:08Z, before line 3 at 2031-03-04T02:15:09Z; write the time at which the job ended"},
		{"stop stamp copied from the start", text(opening, power(1, "gpu0", 400), closing(0, "ok")), []int{1, 2},
			"3: the record closes at 2031-03-04T02:15:00Z, before line 2 at 2031-03-04T02:15:01Z; write the time at which the job ended"},
		{"close before the end of a total", text(opening, used(0, 60, 1), closing(59, "ok")), []int{1, 2},
			"3: the record closes at 2031-03-04T02:15:59Z, before line 2 at 2031-03-04T02:16:00Z; write the time at which the job ended"},
		{"close before open", text(opening, closing(-1, "ok")), []int{1},
			"2: 2031-03-04T02:14:59Z is before the record opens at 2031-03-04T02:15:00Z; open the record before its first line"},
		{"line after close", text(opening, closing(5, "ok"), power(6, "gpu0", 400)), []int{1, 2},
			"3: a line after the close line; write close last, and one record a file"},
		{"total after close", text(opening, closing(5, "ok"), used(0, 1, 1)), []int{1, 2},
			"3: a line after the close line; write close last, and one record a file"},
		{"close twice", text(opening, closing(5, "ok"), closing(5, "ok")), []int{1, 2},
			"3: a line after the close line; write close last, and one record a file"},
		{"open twice", text(opening, opening, power(1, "gpu0", 400)), []int{1, 3},
			"2: a second open line; write each part of each run to a file of its own"},
		{"open after close", text(opening, closing(5, "ok"), opening), []int{1, 2},
			"3: a second open line; write each part of each run to a file of its own"},
	})
	got := read(t, text(opening, power(0, "gpu0", 400), closing(0, "ok")))
	assert.Empty(t, got.findings, "everything within one clock tick")
}

// TestFirstLine: without an open line nothing counts, for no one knows whose
// it is; the cause is said before its consequences.
func TestFirstLine(t *testing.T) {
	got := read(t, text(power(1, "gpu0", 400), opening, power(2, "gpu0", 400)))
	assert.Equal(t, []string{
		"tide.ndjson:1: the first line is of kind power; write an open line first",
		"tide.ndjson:2: the open line is not the first line; write it first",
		"tide.ndjson:3: no open line stands before this line; mend the open line",
	}, got.findings)
	assert.Empty(t, got.lines)

	got = read(t, text(strings.Replace(opening, `"run":"r1"`, `"run":""`, 1), power(2, "gpu0", 400), closing(3, "ok")))
	assert.Equal(t, []string{
		`tide.ndjson:1: "run" is empty; write it as text that is not empty`,
		"tide.ndjson:2: no open line stands before this line; mend the open line",
		"tide.ndjson:3: no open line stands before this line; mend the open line",
	}, got.findings)
	assert.Empty(t, got.lines)
}
