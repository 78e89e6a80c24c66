// Package record reads and writes records: what one job run leaves behind, a
// file of newline-delimited JSON with one object a line, plain, gzip or zstd.
//
// The Reader streams: its memory does not grow with the length of a record. It
// returns only lines that hold together and collects the rest as findings, so
// that one bad line hides nothing after it. schema.json in this folder
// describes every line for other programs.
package record

import "budgetcheck/budget/unit"

// Kind names what a line says.
type Kind uint8

// The kinds of line, in the words of the "k" key.
const (
	KindUnknown Kind = iota // a word this version does not know; vet reports it
	KindOpen
	KindPower
	KindEnergy
	KindUsed
	KindWork
	KindClose
)

var kindWords = [...]string{"unknown", "open", "power", "energy", "used", "work", "close"}

func (k Kind) String() string { return kindWords[k] }

func kindOf(word string) Kind {
	for k := KindOpen; k <= KindClose; k++ {
		if kindWords[k] == word {
			return k
		}
	}
	return KindUnknown
}

// Outcome is how a run ended.
type Outcome string

// The outcomes. A record without a close line is of a run that failed.
const (
	OK        Outcome = "ok"
	Pilot     Outcome = "pilot"
	Stopped   Outcome = "stopped" // ended early on purpose
	Failed    Outcome = "failed"
	Cancelled Outcome = "cancelled"
)

// Evidence tells whether a run that ended so can show what its code does. All
// outcomes are charged to budgets.
func (o Outcome) Evidence() bool { return o == OK || o == Stopped || o == Pilot }

// Line is one line of a record. Fields beyond No, Kind and At are set by Kind.
type Line struct {
	No   int // in the file, from 1
	Kind Kind
	At   unit.Instant // of a used line, its end

	Meter  int         // of power and energy: index into Reader.Meters
	Power  unit.Power  // of power: the reading
	Joules unit.Joules // of energy: the counter's reading
	Wrap   unit.Joules // of energy: where this meter's counter starts again; 0 if never said

	Open  *Open
	Used  *Used
	Work  *Work
	Close *Close
}

// Open is the first line: which run this is, where, on what.
type Open struct {
	Run      string            `json:"run"`
	Attempt  int               `json:"attempt"`         // from 1
	Part     string            `json:"part,omitempty"`  // a number or a name; empty in a run of one part
	Parts    int               `json:"parts,omitempty"` // how many in all, at least 1
	Host     string            `json:"host,omitempty"`
	Job      string            `json:"job"`
	Stage    string            `json:"stage,omitempty"` // training, evaluation, or any other word
	At       unit.Instant      `json:"at"`
	Site     string            `json:"site,omitempty"`
	Machine  string            `json:"machine,omitempty"`
	Reserved float64           `json:"reserved,omitempty"` // units of the machine; 0 means all
	Commit   string            `json:"commit,omitempty"`
	Branch   string            `json:"branch,omitempty"`
	Pull     int               `json:"pull,omitempty"`
	Labels   map[string]string `json:"labels,omitempty"`
}

// Used is a total without samples, taken as constant power.
type Used struct {
	From, To unit.Instant
	Energy   unit.Energy
	Measured bool // how = "measured"; false is "estimated"
}

// Work is progress in functional units.
type Work struct {
	Unit    string  `json:"unit"`
	Done    float64 `json:"done"`              // from 0, never falling
	Planned float64 `json:"planned,omitempty"` // 0 if not said
	OfPart  bool    `json:"-"`                 // parts add; else all parts tell one shared count
}

// Close is the last line.
type Close struct {
	Outcome Outcome
}

// Limits of one record; beyond them a line is refused, not cut.
const (
	MaxLine   = 1 << 20 // bytes in a line
	MaxMeters = 4096    // meters in a record
	MaxName   = 1024    // bytes in the name of a meter, for they are all kept
)
