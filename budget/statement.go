package budget

import (
	"budgetcheck/budget/compare"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// State is what one rule makes of a change.
type State string

// The states, from worst to best. Waived stands in for over.
const (
	Over     State = "over"
	Unproven State = "unproven" // the evidence does not allow a ruling
	Near     State = "near"
	Within   State = "within"
	Waived   State = "waived"
)

// severity orders states by precedence, worst first.
var severity = map[State]int{Over: 0, Unproven: 1, Near: 2, Within: 3, Waived: 4}

// Gate is the verdict on the whole change.
type Gate string

// The verdicts.
const (
	Open   Gate = "open"
	Closed Gate = "closed"
)

// Statement is the whole answer for one change. Its JSON is statement.json;
// report/statement.schema.json describes it.
type Statement struct {
	Format       int              `json:"format"`
	Gate         Gate             `json:"gate"`
	Reason       string           `json:"reason"`
	Branch       string           `json:"branch"`
	Pull         int              `json:"pull,omitempty"`
	BaseCommit   string           `json:"base_commit,omitempty"`
	HeadCommit   string           `json:"head_commit,omitempty"`
	Now          unit.Instant     `json:"now"`
	PolicySource string           `json:"policy_source"`
	Runs         []*footprint.Run `json:"runs"`
	Changes      []Change         `json:"changes"`
	Rulings      []Ruling         `json:"rulings"`
	Accounts     []AccountLine    `json:"accounts"`
	Landings     []Landing        `json:"landings,omitempty"`
	Edits        []Edit           `json:"policy_edits,omitempty"`
	Replay       *Replay          `json:"replay,omitempty"` // of past changes, where the change edits the policy
	Notes        []string         `json:"notes,omitempty"`  // what the reader must know beside the rulings

	Preview  *Statement `json:"-"` // by the head's policy, where it differs
	unruled  bool       // no rule of the policy applies to the branch
	adoption bool       // the target has no policy yet
	broken   bool       // the head's policy cannot be used
	warns    bool       // unproven does not close the gate
}

// Kind tells which sort of rule a ruling is about.
type Kind string

// The kinds of ruling.
const (
	KindBudget     Kind = "budget"
	KindRegression Kind = "regression"
	KindEvidence   Kind = "evidence"
)

// Ruling is one rule of the policy applied to the change.
type Ruling struct {
	Kind        Kind     `json:"kind"`
	Name        string   `json:"name"`
	Branch      string   `json:"branch,omitempty"`
	Job         string   `json:"job,omitempty"`
	Per         string   `json:"per,omitempty"`
	Observed    *float64 `json:"observed,omitempty"` // in Unit, like Limit
	Limit       *float64 `json:"limit,omitempty"`
	Unit        string   `json:"unit,omitempty"`
	Share       *float64 `json:"share,omitempty"` // of the limit
	State       State    `json:"state"`
	Reason      string   `json:"reason,omitempty"`
	Conformance *float64 `json:"conformance,omitempty"` // probability that the true value is within
	Confidence  *float64 `json:"confidence,omitempty"`
	PolicyLine  int      `json:"policy_line,omitempty"`
	PolicyFile  string   `json:"-"`
	Missing     bool     `json:"-"` // unproven only for records that are still to come

	// ObservedText and LimitText are for people: with units, and with as many
	// figures as it takes to tell them apart.
	ObservedText string `json:"-"`
	LimitText    string `json:"-"`
	IntervalText string `json:"-"` // observed with its expanded uncertainty (k = 2); empty if not declared
	ExcessText   string `json:"-"` // of an over ruling: observed less limit
}

// Change is one job and stage on both sides. Ratios are head/base - 1.
type Change struct {
	Job       string     `json:"job"`
	Stage     string     `json:"stage,omitempty"`
	BaseRuns  int        `json:"base_runs"`
	HeadRuns  int        `json:"head_runs"`
	Base      *unit.Mass `json:"base_g,omitempty"` // arithmetic means, as charged
	Head      *unit.Mass `json:"head_g,omitempty"`
	Change    *unit.Mass `json:"change_g,omitempty"`
	BaseHeld  *unit.Mass `json:"base_held_g,omitempty"` // geometric means, grid held
	HeadHeld  *unit.Mass `json:"head_held_g,omitempty"`
	HeldRatio *float64   `json:"held_ratio,omitempty"`
	LowRatio  *float64   `json:"low_ratio,omitempty"` // bounds of HeldRatio
	HighRatio *float64   `json:"high_ratio,omitempty"`

	Detectable *float64        `json:"detectable_ratio,omitempty"` // the least true rise that would be found
	RunsNeeded *int            `json:"runs_needed,omitempty"`      // head runs in all that would settle it
	Confidence *float64        `json:"confidence,omitempty"`       // of each bound
	Bridge     *compare.Bridge `json:"bridge,omitempty"`           // Change split by cause

	ratioU, ratioDF float64 // standard uncertainty of HeldRatio and its degrees of freedom
}

// AccountLine is one account against its limit. With per = "run" nothing is
// brought forward: each run has the limit to itself. Where nothing of the change
// is charged yet, only what is brought forward is there, and the landing.
type AccountLine struct {
	Name    string     `json:"name"`
	Per     string     `json:"per"`
	Period  string     `json:"period,omitempty"` // like 2031-03
	Brought *unit.Mass `json:"brought_g,omitempty"`
	Change  *unit.Mass `json:"change_g,omitempty"`
	Carried *unit.Mass `json:"carried_g,omitempty"`
	Limit   unit.Mass  `json:"limit_g"`
	State   State      `json:"-"`
	Page    []PageLine `json:"-"` // the account line by line, as it stands and as it would stand
	Landing *Landing   `json:"-"` // the worse one of those that decide, of a change that is not on the branch yet
}

// PageLine is one line of an account's page: runs that were, runs that are
// left, or the landing.
type PageLine struct {
	Job, Stage string
	Head       bool // as it would stand; else as it stands
	Runs       int
	Left       float64    // runs that are left; 0 in lines about runs that were
	Lands      bool       // where the period lands: Each is all of it
	Each       unit.Mass  // mean of a run
	Low, High  *unit.Mass // least and greatest run, or the interval of the landing; nil for one run
}
