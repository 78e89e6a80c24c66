package github

import (
	"context"
	"fmt"
	"slices"
	"strings"

	"budgetcheck/budget"
	"budgetcheck/report"
)

// Place is where a statement is posted.
type Place string

// The places, by their words in the action's input.
const (
	Comment Place = "comment" // on the pull request
	Check   Place = "check"   // on the head commit; a commit status where there are no checks
	Status  Place = "status"  // commit status
	Summary Place = "summary" // of the job
)

// ParsePlaces reads the action's input post. No words mean that nothing is
// posted.
func ParsePlaces(words ...string) ([]Place, error) {
	var places []Place
	for _, word := range words {
		p := Place(word)
		if !slices.Contains([]Place{Comment, Check, Status, Summary}, p) {
			return nil, fmt.Errorf("the input post has the word %q; write any of comment, check, status, summary, or leave it empty", word)
		}
		if !slices.Contains(places, p) {
			places = append(places, p)
		}
	}
	return places, nil
}

// Posting is what to post, and where to.
type Posting struct {
	Places []Place
	Name   string // of the check, the status and the comment; "budgetcheck" if empty
	Pull   int    // with the comment; 0: there is none to comment on
	Commit string // with the check: the head commit, never a test merge

	Statement *budget.Statement // nil where nothing could be judged
	Trouble   string            // why nothing could be judged
	Markdown  string            // as report.Markdown writes it; written here if empty

	Await      bool // only records are missing: the check stays pending
	ReportOnly bool // a closed gate fails nothing

	// Line is where the rule of a ruling stands in the head commit, for
	// annotations: a path from the root of the repository, and a line from 1 on.
	// An empty path means that it is not there. Nil: there are no annotations.
	Line func(budget.Ruling) (path string, line int)

	Runner *Runner // writes the summary; nil: there is none
}

// Notice is something that was not posted, and why.
type Notice struct {
	Place  Place
	Failed bool // it should have worked; else the host does not allow it here
	Text   string
}

// String is the notice in a line.
func (n Notice) String() string { return fmt.Sprintf("%s: %s", n.Place, n.Text) }

// Post posts to all places, one after the other: what fails in one is told and
// stops no other, and nothing here changes the verdict. A host without a token
// posts the summary alone.
func (h *Host) Post(ctx context.Context, p Posting) (notices []Notice) {
	if h == nil {
		h = &Host{} // nowhere to post to but the summary
	}
	p = p.complete()
	tell := func(place Place, err error, refused bool) {
		if err != nil {
			notices = append(notices, Notice{place, !refused, report.Inert(err.Error())})
		}
	}
	if p.wants(Summary) {
		tell(Summary, p.Runner.summary(p, h.run), false)
	}
	if !h.canPost {
		return append(notices, p.withoutToken()...)
	}
	me := poster{login: h.login}
	status := p.wants(Status)
	if p.wants(Check) && p.hasCommit(Check, &notices) {
		app, err := h.postCheck(ctx, p)
		me = me.orApp(app)
		if denied(err) { // a token without checks, or a host without them
			status, err = true, nil
		}
		tell(Check, err, false)
	}
	if status && p.hasCommit(Status, &notices) {
		err := h.postStatus(ctx, p)
		tell(Status, explained(err, "a check or status to this commit"), denied(err))
	}
	if p.wants(Comment) && p.Pull > 0 {
		err := h.postComment(ctx, p, me)
		tell(Comment, explained(err, "a comment to this pull request"), denied(err))
	}
	return notices
}

func (p Posting) wants(place Place) bool { return slices.Contains(p.Places, place) }

// complete makes what the caller left open or wrote loosely fit for the host.
func (p Posting) complete() Posting {
	p.Name = clipped(report.Inert(strings.TrimSpace(p.Name)), mostName)
	if p.Name == "" {
		p.Name = "budgetcheck"
	}
	if p.Markdown == "" {
		p.Markdown = p.render()
	}
	return p
}

// render writes the statement for whoever did not.
func (p Posting) render() string {
	var b strings.Builder // never fails
	if p.Statement == nil {
		report.Unjudged(&b, p.Trouble)
	} else {
		report.Markdown(&b, p.Statement)
	}
	return b.String()
}

// hasCommit tells whether there is a commit to post to.
func (p Posting) hasCommit(place Place, notices *[]Notice) bool {
	if isCommit(p.Commit) {
		return true
	}
	*notices = append(*notices, Notice{place, true, "the commit to post to is not known"})
	return false
}

func (p Posting) withoutToken() (notices []Notice) {
	for _, place := range p.Places {
		if place != Summary && (place != Comment || p.Pull > 0) {
			notices = append(notices, Notice{place, false, "not posted, for there is no token"})
		}
	}
	return notices
}

// explained says what a refusal means.
func explained(err error, what string) error {
	if !denied(err) {
		return err
	}
	return fmt.Errorf("not posted, for the token may not add %s; that of a pull request from a fork never may, and the workflow_run after it posts instead (%w)", what, err)
}

// clipped is at most so many characters of a text, as hosts count: code points.
func clipped(text string, most int) string {
	runes := []rune(text)
	if len(runes) <= most {
		return text
	}
	return string(runes[:most-3]) + "..."
}
