package github

import (
	"context"
	"slices"

	"github.com/google/go-github/v60/github"
)

// start is how many of the annotations a check has already.
func (c *checkRun) start(old *github.CheckRun) int { return old.GetOutput().GetAnnotationsCount() }

// batch is the output with the next annotations.
func (c *checkRun) batch(from int) (out *github.CheckRunOutput, to int) {
	to = min(from+mostAnnotations, len(c.annotations))
	return &github.CheckRunOutput{Title: c.output.Title, Summary: c.output.Summary, Annotations: c.annotations[from:to]}, to
}

// create makes the check, and looks whether it was made where the answer says
// nothing of it.
func (c *checkRun) create(ctx context.Context, before []*github.CheckRun) (*github.CheckRun, error) {
	for try := 1; ; try++ {
		output, next := c.batch(0)
		made, _, err := c.h.client.Checks.CreateCheckRun(ctx, c.h.owner, c.h.repo, github.CreateCheckRunOptions{
			Name: c.p.Name, HeadSHA: c.p.Commit, ExternalID: &c.reference, DetailsURL: c.details,
			Status: &c.status, Conclusion: c.conclusion, Output: output})
		if unsure(err) {
			if made, err = c.recognise(ctx, before, err); made != nil {
				next = c.start(made)
			}
		}
		switch {
		case made != nil && err == nil:
			return c.rest(ctx, made, next)
		case !unsure(err) || try == attempts:
			return nil, err
		}
		if err := c.h.wire.pause(ctx, try); err != nil {
			return nil, err
		}
	}
}

// recognise finds the check that we made without learning of it. lost is what
// came instead of an answer.
func (c *checkRun) recognise(ctx context.Context, before []*github.CheckRun, lost error) (*github.CheckRun, error) {
	now, err := c.list(ctx)
	if err != nil {
		return nil, err
	}
	for _, r := range now {
		old := slices.ContainsFunc(before, func(b *github.CheckRun) bool { return b.GetID() == r.GetID() })
		if !old && r.GetExternalID() == c.reference {
			return r, nil
		}
	}
	return nil, lost
}

// rest sends the annotations that did not fit into the first request.
func (c *checkRun) rest(ctx context.Context, made *github.CheckRun, from int) (*github.CheckRun, error) {
	if from >= len(c.annotations) {
		return made, nil
	}
	return c.update(ctx, made, from)
}

// update changes a check, with the annotations from one on.
func (c *checkRun) update(ctx context.Context, old *github.CheckRun, from int) (*github.CheckRun, error) {
	for try := 1; ; try++ {
		output, next := c.batch(from)
		once := ctx
		if next > from {
			once = sent(ctx, adding)
		}
		made, _, err := c.h.client.Checks.UpdateCheckRun(once, c.h.owner, c.h.repo, old.GetID(), github.UpdateCheckRunOptions{
			Name: c.p.Name, ExternalID: &c.reference, DetailsURL: c.details, Status: &c.status, Conclusion: c.conclusion, Output: output})
		switch {
		case err == nil:
			return c.rest(ctx, made, next)
		case !unsure(err) || next == from || try == attempts:
			return nil, err
		}
		if from, err = c.reached(ctx, old, from); err != nil {
			return nil, err
		}
		if err := c.h.wire.pause(ctx, try); err != nil {
			return nil, err
		}
	}
}

// reached asks how many annotations a check has by now.
func (c *checkRun) reached(ctx context.Context, old *github.CheckRun, from int) (int, error) {
	now, err := c.list(ctx)
	if err != nil {
		return from, err
	}
	for _, r := range now {
		if r.GetID() == old.GetID() {
			return c.start(r), nil
		}
	}
	return from, nil
}
