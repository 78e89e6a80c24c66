package github

import (
	"errors"
	"fmt"
	"io"
	"os"
	"slices"
	"strings"
	"unicode"

	"github.com/sethvargo/go-githubactions"

	"budgetcheck/budget"
	"budgetcheck/report"
)

// Runner is what runs the job: it reads commands in the log, and files for
// outputs and the summary. The library behind it panics where it cannot write;
// here that is an error.
type Runner struct {
	action *githubactions.Action
	getenv func(string) string
}

// NewRunner speaks to the runner through the log that it reads.
func NewRunner(log io.Writer, getenv func(string) string) *Runner {
	return &Runner{githubactions.New(githubactions.WithWriter(log), githubactions.WithGetenv(getenv)), getenv}
}

// safely turns a panic of the library into an error.
func safely(do func()) (err error) {
	defer func() {
		if r := recover(); r != nil {
			err = fmt.Errorf("the runner could not be told: %v", r)
		}
	}()
	do()
	return nil
}

// running tells whether there is a runner that takes commands out of the log.
func (r *Runner) running() bool { return r.getenv("GITHUB_ACTIONS") == "true" }

// Mask keeps the token out of the log. Where no runner reads the log, the
// command to hide it would be what shows it.
func (r *Runner) Mask(token string) error {
	if token == "" || !r.running() {
		return nil
	}
	return safely(func() { r.action.AddMask(token) })
}

// Annotate marks the rulings that are over or unproven in the log, with the
// lines of the policy as in Posting. What closes the gate is an error there,
// anything else a warning.
func (r *Runner) Annotate(p Posting) error {
	if p.Statement == nil {
		return nil
	}
	return safely(func() {
		for _, ruling := range p.Statement.Rulings {
			switch {
			case ruling.State != budget.Over && ruling.State != budget.Unproven:
			case p.closedBy(ruling):
				r.at(ruling, p.Line).Errorf("%s", told(ruling))
			default:
				r.at(ruling, p.Line).Warningf("%s", told(ruling))
			}
		}
	})
}

// closedBy tells whether the gate is closed by a ruling: by what is over, or
// where nothing is, by what is unproven.
func (p Posting) closedBy(r budget.Ruling) bool {
	over := slices.ContainsFunc(p.Statement.Rulings, func(r budget.Ruling) bool { return r.State == budget.Over })
	return p.verdict() == gateClosed && !p.ReportOnly && (r.State == budget.Over || !over)
}

// at is the place of a ruling's annotation.
func (r *Runner) at(ruling budget.Ruling, place func(budget.Ruling) (string, int)) *githubactions.Action {
	fields := map[string]string{"title": subjectOf(ruling)}
	if place != nil {
		if path, line := place(ruling); path != "" {
			fields["file"], fields["line"] = path, fmt.Sprint(max(line, 1))
		}
	}
	return r.action.WithFieldsMap(fields)
}

// Tell says what was not posted.
func (r *Runner) Tell(notices []Notice) error {
	return safely(func() {
		for _, n := range notices {
			if n.Failed {
				r.action.Warningf("%s", n)
				continue
			}
			r.action.Noticef("%s", n)
		}
	})
}

// Log writes a text into the log, folded under its title. No line of it can be
// a command, wherever it comes from.
func (r *Runner) Log(title, text string) error {
	return safely(func() {
		r.action.Group(report.Inert(title))
		text = strings.NewReplacer("\r\n", "\n", "\r", "\n").Replace(strings.TrimRight(text, "\r\n"))
		for line := range strings.SplitSeq(text, "\n") {
			r.action.Infof("%s", disarmed(line))
		}
		r.action.EndGroup()
	})
}

// disarmed is a line that no runner takes for a command: "::" begins one at the
// start of a line, spaces left out, and "##[" anywhere.
func disarmed(line string) string {
	if bare := strings.TrimLeftFunc(line, unicode.IsSpace); strings.HasPrefix(bare, "::") {
		line = line[:len(line)-len(bare)] + `\` + bare
	}
	return strings.ReplaceAll(line, "##[", `##\[`)
}

// summary adds the statement to the job's summary. The host takes no more than
// a bound from each step, what is there already included.
func (r *Runner) summary(p Posting, run string) error {
	if r == nil || r.getenv("GITHUB_STEP_SUMMARY") == "" {
		return nil // not in a runner that shows one
	}
	room := mostSummary - len("\n")
	if info, err := os.Stat(r.getenv("GITHUB_STEP_SUMMARY")); err == nil {
		room -= int(info.Size())
	}
	p.Places = nil // the pointer cannot point to the summary itself
	text := p.fitted(room, func(s string) int { return len(s) }, run)
	if text == "" {
		return errors.New("the summary of this step is full")
	}
	return safely(func() { r.action.AddStepSummary(text) })
}
