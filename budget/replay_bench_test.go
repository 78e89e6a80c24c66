package budget_test

import (
	"fmt"
	"strings"
	"testing"

	"budgetcheck/budget"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/unit"
)

// BenchmarkReplay judges 10,000 past changes again: nightly runs on main and
// some twenty pull requests a day, with a budget for a month, a landing that
// closes, and a regression, over a year and a half of hourly series.
func BenchmarkReplay(b *testing.B) {
	for _, changes := range []int{1000, 10000} {
		b.Run(fmt.Sprint(changes), func(b *testing.B) {
			policy := policyOf(b, scheduled(b, monthly("3.3 kg", "landing = \"close\"\n")+"\n[[regression]]\nname = \"no creep\"\nmax_rise = \"5%\"\n"))
			set := seriesOf(b, hourly(550))
			read, now := pastBooks(b, policy, set, changes)
			b.ReportAllocs()
			for b.Loop() {
				r := budget.NewReplay(read, budget.Case{Branch: "main", Now: now}, budget.Replayed{Policy: policy, Set: set, Source: "p"}, nil)
				if len(r.Changes) < changes {
					b.Fatal("too few changes", len(r.Changes))
				}
			}
		})
	}
}

// hourly is a series of so many days with a daily course.
func hourly(days int) string {
	var rows strings.Builder
	rows.WriteString("zone,from,to,g_per_kwh,factor\n")
	at := two.Add(-unit.Duration(days) * unit.Day)
	for n := range (days + 2) * 24 {
		from := at.Add(unit.Duration(n) * unit.Hour)
		fmt.Fprintf(&rows, "NORTH,%s,%s,%d,average\n", from, from.Add(unit.Hour), 80+40*((n*7)%11)/10+n%24)
	}
	return rows.String()
}

// pastBooks is books with so many changes: of twenty runs a day one is main's.
func pastBooks(b *testing.B, policy *budget.Policy, set *grid.Set, changes int) (*ledger.Books, unit.Instant) {
	model := night()
	part := weigh(b, policy, set, "night.ndjson", model.text(b))
	first, err := policy.Entry(part, budget.Booking{Branch: "main", Now: part.End})
	if err != nil {
		b.Fatal(err)
	}
	read := &ledger.Books{}
	days := changes/20 + 1
	for n := range changes {
		e := *first
		back := -unit.Duration(days-n/20)*unit.Day + unit.Duration(n%20)*unit.Hour
		e.Start, e.End, e.BookedAt = e.Start.Add(back), e.End.Add(back), e.BookedAt.Add(back)
		e.Run.Run, e.Commit, e.Digest = fmt.Sprint("r", n), fmt.Sprintf("%040x", n), fmt.Sprintf("%064x", n)
		e.Hours = append(e.Hours[:0:0], e.Hours...)
		for i := range e.Hours {
			e.Hours[i].From = e.Hours[i].From.Add(back)
		}
		e.Parts = append(e.Parts[:0:0], e.Parts...)
		e.Parts[0].Start, e.Parts[0].End, e.Parts[0].Digest, e.Parts[0].Host = e.Start, e.End, e.Digest, fmt.Sprint("h", n%20)
		if n%20 > 0 {
			e.Account = ledger.PullAccount(n)
		}
		read.Entries = append(read.Entries, &e)
	}
	return ledger.Merge(read), two.Add(unit.Day)
}
