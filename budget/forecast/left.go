package forecast

import "budgetcheck/budget/unit"

// Left are the firings whose run is still to be expected at now: those to come,
// and past ones within their window that no run is booked for. firings and
// starts (of booked runs) are in order; starts after now are not known yet.
//
// A run stands for the latest firing at or before its start that no earlier run
// stands for, and not beyond that firing's window. window is how much later a
// run may start, both ends included; nil is until the next firing. The last
// firing then waits as long as the one before it, a single one for a day.
func Left(firings, starts []unit.Instant, now unit.Instant, window *unit.Duration) (left []unit.Instant) {
	ends := ends(firings, window)
	done := matched(firings, ends, starts, now)
	for n, f := range firings {
		if !done[n] && now <= ends[n] {
			left = append(left, f)
		}
	}
	return left
}

// matched tells for each firing whether a booked run stands for it. waiting is
// the stack of firings without a run, the latest on top: where a run is too
// late for that one, it is too late for all.
func matched(firings, ends, starts []unit.Instant, now unit.Instant) []bool {
	done := make([]bool, len(firings))
	var waiting []int
	next := 0
	for _, start := range starts {
		if start > now {
			break
		}
		for ; next < len(firings) && firings[next] <= start; next++ {
			waiting = append(waiting, next)
		}
		if top := len(waiting) - 1; top >= 0 && start <= ends[waiting[top]] {
			done[waiting[top]] = true
			waiting = waiting[:top]
		}
	}
	return done
}

// ends are the last moments at which the firings' runs may start.
func ends(firings []unit.Instant, window *unit.Duration) []unit.Instant {
	ends := make([]unit.Instant, len(firings))
	wait := unit.Day
	for n, f := range firings {
		switch {
		case window != nil:
			wait = *window
		case n+1 < len(firings): // up to, not including, the next
			wait = firings[n+1].Sub(f) - 1
		}
		ends[n] = f.Add(wait)
	}
	return ends
}

// Rate is how often a job without a schedule runs: Runs in the last Over.
type Rate struct {
	Runs int
	Over unit.Duration // 1 to 28 days
}

// The rate of a job without schedule looks at four weeks, so that every weekday
// counts as often.
const rateSpan = 28 * unit.Day

// RateOf counts the runs of the last 28 days before now, or of the days since
// the books were opened if these are fewer. starts need no order.
func RateOf(starts []unit.Instant, opened, now unit.Instant) Rate {
	r := Rate{Over: min(max(now.Sub(opened), unit.Day), rateSpan)}
	for _, s := range starts {
		if s <= now && now.Sub(s) <= r.Over {
			r.Runs++
		}
	}
	return r
}

// expected is how many runs of the rate fall in a span.
func (r Rate) expected(span unit.Duration) float64 {
	return float64(r.Runs) * span.Seconds() / r.Over.Seconds()
}
