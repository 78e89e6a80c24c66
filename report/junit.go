package report

import (
	"encoding/xml"
	"io"

	"budgetcheck/budget"
)

// suites is the JUnit XML that CI systems read (common practice, no source).
type suites struct {
	XMLName xml.Name `xml:"testsuites"`
	Suite   suite    `xml:"testsuite"`
}

type suite struct {
	Name      string     `xml:"name,attr"`
	Tests     int        `xml:"tests,attr"`
	Failures  int        `xml:"failures,attr"`
	Errors    int        `xml:"errors,attr"`
	Skipped   int        `xml:"skipped,attr"`
	Timestamp string     `xml:"timestamp,attr"`
	Cases     []testCase `xml:"testcase"`
}

type testCase struct {
	Class   string   `xml:"classname,attr"`
	Name    string   `xml:"name,attr"`
	Failure *message `xml:"failure"`
	Error   *message `xml:"error"`
	Skipped *message `xml:"skipped"`
	Out     string   `xml:"system-out,omitempty"`
}

type message struct {
	Message string `xml:"message,attr"`
	Text    string `xml:",chardata"`
}

// JUnit writes one test case for each ruling: over is a failure, unproven an
// error. What does not close the gate is skipped: unproven where the policy only
// warns of it, and everything where the branch has no policy yet.
func JUnit(w io.Writer, s *budget.Statement) error {
	out := suites{Suite: suite{Name: "budgetcheck, branch " + Inert(s.Branch), Tests: len(s.Rulings), Timestamp: s.Now.Time().Format("2006-01-02T15:04:05")}}
	for _, r := range s.Rulings {
		out.Suite.add(r, s.Gate == budget.Open || r.State == budget.Unproven && s.Warns())
	}
	if _, err := io.WriteString(w, xml.Header); err != nil {
		return err
	}
	e := xml.NewEncoder(w)
	e.Indent("", "  ")
	if err := e.Encode(out); err != nil {
		return err
	}
	_, err := io.WriteString(w, "\n")
	return err
}

func (s *suite) add(r budget.Ruling, harmless bool) {
	text := Inert(told(r))
	m := &message{text, text}
	if at := place(r); at != "" {
		m.Text = Inert(at) + ": " + text
	}
	c := testCase{Class: "budgetcheck." + string(r.Kind), Name: Inert(r.Name)}
	if r.Job != "" {
		c.Name = Inert(r.Name + ", job " + r.Job)
	}
	switch {
	case harmless && (r.State == budget.Over || r.State == budget.Unproven):
		c.Skipped = m
		s.Skipped++
	case r.State == budget.Over:
		c.Failure = m
		s.Failures++
	case r.State == budget.Unproven:
		c.Error = m
		s.Errors++
	default:
		c.Out = text
	}
	s.Cases = append(s.Cases, c)
}
