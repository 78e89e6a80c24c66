package ledger

import (
	"context"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/unit"
)

// Store keeps lines. It is safe for use by many processes at once: none of
// what it confirmed is ever lost, and nothing is in it twice.
type Store interface {
	// Book enters entries and marks in one step, all or none, and answers for
	// each entry, in their order. An error means that it is not known whether
	// they are in: booking them again settles it, for what is there already is
	// not entered twice. Refused entries are an Answer, not an error.
	Book(ctx context.Context, entries []*Entry, marks []*Mark) ([]Answer, error)
	// Read gives the entries and marks that the query asks for.
	Read(ctx context.Context, q Query) (*Books, error)
	// Vet checks all that is kept: lines that cannot be read, keys that are in
	// force twice, corrections of what is not there, a history that is not
	// append-only.
	Vet(ctx context.Context) (*finding.List, error)
	Close() error
}

// Query says which entries to read. The zero value asks for all.
type Query struct {
	Repository string       // empty: any
	Accounts   []string     // empty: any
	Since      unit.Instant // runs that ended after it, and marks from it on
	Until      unit.Instant // runs that started before it, and marks before it; 0: no end
	Last       int          // at most so many runs of each account, job and stage, the newest; 0: all
	Inputs     []string     // any of Inputs, Commits and Digests; all empty: any
	Commits    []string
	Digests    []string
	OnlyMarks  bool // no entries
}

// Summing is a store that adds up by itself, without handing entries out.
type Summing interface {
	// Spent is what Books.Spent gives of the whole store.
	Spent(ctx context.Context, w Window) (Spending, error)
}

// Answer is what became of an entry.
type Answer string

// The answers.
const (
	Booked  Answer = "booked"
	Already Answer = "already booked" // the same key with the same content
	// Longer: booked, and stands in for the entry of a job that had not closed.
	Longer Answer = "booked, stands in for an unclosed entry"
	// Refused: the key is in force with other content. A correction would do.
	Refused Answer = "refused: booked before with other content"
	// Unfounded: it corrects an entry that is not in force.
	Unfounded Answer = "refused: corrects an entry that is not there"
)
