package budget

import (
	"slices"
	"time"

	"budgetcheck/budget/forecast"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/unit"
)

// span is what a period budget adds up: an account over a time.
type span struct {
	forecast.Period        // its Name is empty where the calendar has none: pull, release
	account         string // that is charged
	ends            bool   // the period's end is known
	opened          string // what a release period counts from, for people
}

// location is the time zone of the policy's calendar.
func (p *Policy) location() *time.Location {
	where, err := time.LoadLocation(p.Account.Timezone)
	if err != nil { // the policy was checked
		return time.UTC
	}
	return where
}

// span is the current one of a budget.
func (j *judgement) span(b *Budget) span {
	c := j.c
	switch b.Per {
	case "pull":
		return span{Period: forecast.Period{Per: b.Per, To: c.Now}, account: ledger.PullAccount(c.Pull)}
	case "release":
		s := span{Period: forecast.Period{Per: b.Per, To: c.Now}, account: c.Branch, opened: "the first entry, for there is no release yet"}
		if m := j.lastRelease(c.Now); m != nil {
			s.From, s.opened = m.At, "release "+m.Tag
		}
		return s
	}
	period, err := forecast.Holding(b.Per, c.Now, j.policy.location())
	if err != nil { // the policy was checked
		panic(err)
	}
	return span{Period: period, account: c.Branch, ends: true}
}

// lastRelease is the newest release of the branch before t: by the ledger's
// marks, else by tags; nil if there is none.
func (j *judgement) lastRelease(t unit.Instant) (last *ledger.Mark) {
	marks := j.c.Tags
	if b := j.c.Books; b != nil && slices.ContainsFunc(b.ledger.Marks, j.ofBranch) {
		marks = b.ledger.Marks
	}
	for _, m := range marks {
		if j.ofBranch(m) && m.At <= t && (last == nil || m.At > last.At) {
			last = m
		}
	}
	return last
}

func (j *judgement) ofBranch(m *ledger.Mark) bool { return m.Branch == j.c.Branch }

// window is the part of the span that is over.
func (j *judgement) window(s span) ledger.Window {
	return ledger.Window{Repository: j.c.Repository, Account: s.account, From: s.From, To: max(s.From, min(s.To, j.c.Now)), Known: j.c.Now}
}

// touches tells whether a time lies within the span, at least in part.
func (s span) touches(from, to unit.Instant) bool {
	return from < s.To && (to > s.From || from >= s.From)
}
