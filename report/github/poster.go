package github

import (
	"context"
	"net/http"
	"strings"

	"github.com/google/go-github/v60/github"
)

// poster is who we are to the host, as far as we know.
//
// The host does not say whose token a workflow has, and the answer differs from
// host to host. We take it from what it costs nothing to know, in this order:
//
//  1. what the caller was told (Options.Login);
//  2. the check that was posted just before: its answer names the app, and only
//     the app itself can create or change its checks;
//  3. the account behind the token, asked for only where there is a comment with
//     our marker at all. A person's token gets an answer;
//  4. the token of an app is refused one. Then comments of apps are taken for
//     ours: the owners of the repository let in every app that comments there,
//     and people, who can write anything, are never apps. Nothing is deleted on
//     this guess;
//  5. where nothing helps, no comment is taken for ours and one is created. Its
//     answer says who wrote it; older ones of ours are then found, the oldest is
//     kept and the new one deleted.
type poster struct {
	login string // of the account; empty if not known
	id    int64  // of the account; 0 if not known
	app   bool   // an app, not known which
}

// known tells whether we know who we are, and not only what.
func (p poster) known() bool { return p.login != "" || p.id != 0 }

// orApp is what a check's answer adds.
func (p poster) orApp(slug string) poster {
	if p.known() || slug == "" {
		return p
	}
	return poster{login: slug + "[bot]"}
}

// wrote tells whether a comment is ours.
func (p poster) wrote(c *github.IssueComment) bool {
	u := c.GetUser()
	switch {
	case p.id != 0:
		return u.GetID() == p.id
	case p.login != "":
		return strings.EqualFold(u.GetLogin(), p.login)
	}
	return p.app && u.GetType() == "Bot"
}

// authorOf is whoever wrote a comment.
func authorOf(c *github.IssueComment) poster {
	return poster{login: c.GetUser().GetLogin(), id: c.GetUser().GetID()}
}

// who finds out who we are, if there is a comment that it matters for.
func (h *Host) who(ctx context.Context, p poster, found []*github.IssueComment) (poster, error) {
	if p.known() || len(found) == 0 {
		return p, nil
	}
	u, _, err := h.client.Users.Get(ctx, "")
	switch {
	case err == nil && (u.GetID() != 0 || u.GetLogin() != ""):
		return poster{login: u.GetLogin(), id: u.GetID()}, nil
	case status(err) == http.StatusForbidden:
		return poster{app: true}, nil
	case status(err) != 0 || err == nil:
		return p, nil // hosts that have no such question
	}
	return p, err
}
