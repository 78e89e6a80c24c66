package github

import (
	"context"

	"github.com/google/go-github/v60/github"
)

// postStatus posts a commit status. The host keeps all of them and shows the
// last one of each context, so that posting twice does no harm.
func (h *Host) postStatus(ctx context.Context, p Posting) error {
	state, text := p.state(), clipped(p.line(), mostDescription)
	s := &github.RepoStatus{State: &state, Context: &p.Name, Description: &text}
	if h.run != "" {
		s.TargetURL = &h.run
	}
	_, _, err := h.client.Repositories.CreateStatus(sent(ctx, harmless), h.owner, h.repo, p.Commit, s)
	return err
}

// state is what a verdict is to the host. It has no word for a verdict that
// only reports: then the description says so.
func (p Posting) state() string {
	switch v := p.verdict(); {
	case v == gatePending:
		return "pending"
	case v == gateOpen, v == gateClosed && p.ReportOnly:
		return "success"
	}
	return "failure"
}
