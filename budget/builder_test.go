package budget_test

import (
	"bytes"
	"encoding/json"
	"fmt"
	"slices"
	"strconv"
	"strings"
	"time"

	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// test is a test, a fuzz target, or a drawn case of a property.
type test interface {
	require.TestingT
	Helper()
}

// now is the gate's clock; two is when the night's run starts.
var (
	now = unit.At(time.Date(2031, 3, 10, 12, 0, 0, 0, time.UTC))
	two = unit.At(time.Date(2031, 3, 10, 2, 0, 0, 0, time.UTC))
)

// plain is a policy by which night comes to exactly 1 kWh and 100 g.
const plain = `format = 1

[account]
decision = "simple"

[evidence]
unproven = "close"

[site.quay-north]
zone = "NORTH"
pue = 1.0

[site.quay-south]
zone = "SOUTH"
pue = 1.0

[machine.quad]
units = 4
measured_share = 1.0
meters = 4

[[job]]
name = "retrain-tide"
stage = "training"
required = true

[[budget]]
name = "one training"
branch = "main"
job = "retrain-tide"
limit = "150 g"
per = "run"
`

// steady is a series that stays the same all month: 100 g/kWh in the north,
// 200 g/kWh in the south.
const steady = `zone,from,to,g_per_kwh,factor
NORTH,2031-03-01T00:00:00Z,2031-03-12T00:00:00Z,100,average
SOUTH,2031-03-01T00:00:00Z,2031-03-12T00:00:00Z,200,average
`

// edit replaces pairs of texts; each old one must stand in the text once.
func edit(t test, text string, pairs ...string) string {
	t.Helper()
	for n := 0; n < len(pairs); n += 2 {
		require.Equal(t, 1, strings.Count(text, pairs[n]), "%q stands once in the text", pairs[n])
		text = strings.Replace(text, pairs[n], pairs[n+1], 1)
	}
	return text
}

// policyOf parses a policy that must have nothing wrong with it.
func policyOf(t test, text string) *budget.Policy {
	t.Helper()
	p, found := budget.ParsePolicy(budget.PolicyFile{Name: "budgetcheck.toml", Data: []byte(text)})
	require.Empty(t, found)
	return p
}

// seriesOf reads one series file.
func seriesOf(t test, text string) *grid.Set {
	t.Helper()
	f, err := grid.ReadCSV(strings.NewReader(text), "grid.csv", grid.Columns{})
	require.NoError(t, err)
	return grid.NewSet(grid.Direct, f)
}

// weigh weighs a record's text.
func weigh(t test, p *budget.Policy, set *grid.Set, file, text string) *footprint.Part {
	t.Helper()
	r, err := record.NewReader(strings.NewReader(text), file)
	require.NoError(t, err)
	part, err := p.Weigh(r, set)
	require.NoError(t, err)
	return part
}

// sketch is a record to be written: meters of constant power.
type sketch struct {
	file    string
	open    record.Open
	meters  []string
	watts   []float64
	length  unit.Duration
	every   unit.Duration    // between two readings
	hole    [2]unit.Duration // no reading between these
	used    []record.Used
	work    []record.Work
	lines   []string       // written as they are, before the close line
	outcome record.Outcome // empty: no close line
	counter bool           // the meters count energy
	raw     string         // instead of all that, where it is not empty
}

// night is the training as it should be, with changes.
func night(changes ...func(*sketch)) sketch {
	s := sketch{
		file: "night.ndjson",
		open: record.Open{Run: "n1", Attempt: 1, Job: "retrain-tide", Stage: "training", At: two,
			Site: "quay-north", Machine: "quad", Host: "mole-1"},
		meters: []string{"gpu0", "gpu1", "gpu2", "gpu3"}, watts: []float64{250, 250, 250, 250},
		length: unit.Hour, every: unit.Minute, outcome: record.OK,
		work: []record.Work{{Unit: "step", Done: 1000}},
	}
	for _, change := range changes {
		change(&s)
	}
	return s
}

// called names the record's file and its run.
func called(file, run string) func(*sketch) {
	return func(s *sketch) { s.file, s.open.Run = file, run }
}

// scaled makes the run take so many times the power.
func scaled(by float64) func(*sketch) {
	return func(s *sketch) {
		s.watts = slices.Clone(s.watts)
		for n := range s.watts {
			s.watts[n] *= by
		}
	}
}

func (s sketch) text(t test) string {
	t.Helper()
	if s.raw != "" {
		return s.raw
	}
	var b bytes.Buffer
	w := record.NewWriter(&b)
	require.NoError(t, w.Open(s.open))
	for at := unit.Duration(0); at <= s.length; at += s.every {
		if at > s.hole[0] && at < s.hole[1] {
			continue
		}
		for n, watts := range s.watts {
			if s.counter {
				require.NoError(t, w.Energy(s.open.At.Add(at), s.meters[n], unit.Joules(watts*at.Seconds()), 0))
				continue
			}
			require.NoError(t, w.Power(s.open.At.Add(at), s.meters[n], unit.Power(watts)))
		}
	}
	for _, u := range s.used {
		require.NoError(t, w.Used(u))
	}
	end := s.open.At.Add(s.length)
	for _, done := range s.work {
		require.NoError(t, w.Work(end, done))
	}
	for _, line := range s.lines {
		b.WriteString(line + "\n")
	}
	if s.outcome != "" {
		require.NoError(t, w.Close(end, s.outcome))
	}
	return b.String()
}

// scene is a case to be judged.
type scene struct {
	policy, series string
	head, base     []sketch
	books          []booked
	marks          []*ledger.Mark
	keeps          bool        // there is a ledger, though nothing is in it
	about          budget.Case // the rest
}

// booked is a record in the books.
type booked struct {
	sketch
	account string
	inputs  string
}

// bookedNights are runs on main, one a night, the last one `last` nights before the
// head's.
func bookedNights(n, last int, changes ...func(*sketch)) (list []booked) {
	for back := last + n - 1; back >= last; back-- {
		s := night(changes...)
		s.open.Run = fmt.Sprintf("b%d", back)
		s.open.At = two.Add(-unit.Duration(back) * unit.Day)
		list = append(list, booked{sketch: s, account: "main"})
	}
	return list
}

// ledger books the records by the policy, each when it ended.
func (s *scene) ledger(t test, p *budget.Policy, set *grid.Set) *ledger.Books {
	read := &ledger.Books{Marks: s.marks}
	for _, b := range s.books {
		part := weigh(t, p, set, b.open.Run, b.text(t))
		e, err := p.Entry(part, budget.Booking{Branch: b.account, Now: part.End})
		require.NoError(t, err)
		e.Inputs = b.inputs
		read.Entries = append(read.Entries, e)
	}
	return ledger.Merge(read)
}

// sceneOf judges the head runs by plain, under steady.
func sceneOf(head ...sketch) *scene {
	return &scene{policy: plain, series: steady, head: head,
		about: budget.Case{Branch: "main", Now: now, PolicySource: "budgetcheck.toml"}}
}

func (s *scene) judge(t test) *budget.Statement {
	t.Helper()
	p, set, c := policyOf(t, s.policy), seriesOf(t, s.series), s.about
	for _, one := range s.head {
		c.Head = append(c.Head, weigh(t, p, set, one.file, one.text(t)))
	}
	for _, one := range s.base {
		c.Base = append(c.Base, weigh(t, p, set, one.file, one.text(t)))
	}
	if len(s.books)+len(s.marks) > 0 || s.keeps {
		c.Books = p.Books(s.ledger(t, p, set), set)
	}
	return p.Judge(c)
}

// ruling is the only ruling on a budget or regression of that name.
func ruling(t test, s *budget.Statement, name string) budget.Ruling {
	t.Helper()
	var found []budget.Ruling
	for _, r := range s.Rulings {
		if r.Kind != budget.KindEvidence && r.Name == name {
			found = append(found, r)
		}
	}
	require.Len(t, found, 1, "rulings on %q", name)
	return found[0]
}

// doubts are the reasons of the evidence rulings that are unproven.
func doubts(s *budget.Statement) (reasons []string) {
	for _, r := range s.Rulings {
		if r.Kind == budget.KindEvidence && r.State == budget.Unproven {
			reasons = append(reasons, r.Reason)
		}
	}
	return reasons
}

// machineText is the statement as programs read it.
func machineText(t test, s *budget.Statement) string {
	t.Helper()
	text, err := json.Marshal(s)
	require.NoError(t, err)
	return string(text)
}

// lineOf is the number of the first line in which the words stand.
func lineOf(t test, text, words string) int {
	t.Helper()
	before, _, found := strings.Cut(text, words)
	require.True(t, found, "%q stands in the text", words)
	return strings.Count(before, "\n") + 1
}

func lineNumber(t test, text, words string) string { return strconv.Itoa(lineOf(t, text, words)) }
