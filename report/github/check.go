package github

import (
	"context"
	"slices"
	"strings"

	"github.com/google/go-github/v60/github"
)

// The check is found by its name, its commit and a reference that no other
// program gives its checks: a job of the workflow that is called like us has a
// check of the same name, made by the same app.
//
// The host adds annotations up and takes none away, so that a second statement
// on one commit would stand beside the first one's annotations. The reference
// therefore also says which annotations a check has. One with other annotations
// is not changed: a new check of the name takes its place on the host's pages
// and in its rules.

// reference begins the external id of our checks.
const reference = "budgetcheck:"

// checkRun is the check that is to be.
type checkRun struct {
	h           *Host
	p           Posting
	output      *github.CheckRunOutput
	annotations []*github.CheckRunAnnotation
	reference   string
	status      string
	conclusion  *string
	details     *string
}

// postCheck posts the check and tells which app did it, as far as it knows.
func (h *Host) postCheck(ctx context.Context, p Posting) (app string, err error) {
	c := h.newCheck(p)
	there, err := c.list(ctx)
	if err != nil {
		return "", err
	}
	for _, old := range there {
		if !c.canChange(old) {
			continue
		}
		made, err := c.update(ctx, old, c.start(old))
		if err == nil || !denied(err) {
			return made.GetApp().GetSlug(), err
		}
	}
	made, err := c.create(ctx, there)
	return made.GetApp().GetSlug(), err
}

func (h *Host) newCheck(p Posting) *checkRun {
	c := &checkRun{h: h, p: p, annotations: p.annotations()}
	c.reference = reference + safeName(p.Name) + ":" + digest(c.annotations)
	title := clipped(p.line(), mostTitle)
	// The host speaks of characters and has been seen to mean bytes, of which
	// there are never fewer.
	summary := p.fitted(mostCheckText, func(s string) int { return len(s) }, h.run)
	c.output = &github.CheckRunOutput{Title: &title, Summary: &summary}
	c.status, c.conclusion = p.conclusion()
	if h.run != "" {
		c.details = &h.run
	}
	return c
}

// conclusion is what a verdict is to the host. A gate that could not be judged
// is never passed, not even where it only reports.
func (p Posting) conclusion() (state string, conclusion *string) {
	word := "failure"
	switch v := p.verdict(); {
	case v == gatePending:
		return "in_progress", nil
	case v == gateOpen:
		word = "success"
	case v == gateClosed && p.ReportOnly:
		word = "neutral"
	}
	return "completed", &word
}

// list lists our checks on the commit, newest first.
func (c *checkRun) list(ctx context.Context) (ours []*github.CheckRun, err error) {
	latest := "latest"
	o := &github.ListCheckRunsOptions{CheckName: &c.p.Name, Filter: &latest, ListOptions: github.ListOptions{PerPage: 100}}
	found, _, err := c.h.client.Checks.ListCheckRunsForRef(ctx, c.h.owner, c.h.repo, c.p.Commit, o)
	if err != nil {
		return nil, err
	}
	mine := reference + safeName(c.p.Name) + ":"
	for _, r := range found.CheckRuns {
		if r.GetHeadSHA() == c.p.Commit && strings.HasPrefix(r.GetExternalID(), mine) {
			ours = append(ours, r)
		}
	}
	slices.SortFunc(ours, func(a, b *github.CheckRun) int { return int(b.GetID() - a.GetID()) })
	return ours, nil
}

// canChange tells whether a check can become what is to be. The host does not
// take a conclusion back.
func (c *checkRun) canChange(old *github.CheckRun) bool {
	if old.GetStatus() == "completed" && c.conclusion == nil {
		return false
	}
	has := old.GetOutput().GetAnnotationsCount()
	return has == 0 || old.GetExternalID() == c.reference && has <= len(c.annotations)
}
