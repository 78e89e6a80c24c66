package github

import (
	"cmp"
	"context"
	"crypto/sha256"
	"fmt"
	"net/http"
	"slices"
	"strings"
	"unicode/utf8"

	"github.com/google/go-github/v60/github"
)

// A pull request carries one comment for each name. It is found by a marker in
// its first line, which no page shows, and by its author.
//
// Anybody can write our marker into a comment of their own. Had we edited that
// one, our statement would stand in a comment whose author can change it at any
// time to say that the gate is open; most tokens are allowed to edit everybody's
// comments, so that the host would not stop us. A stranger's comment is
// therefore never edited, deleted, or taken for the statement, whatever is in
// it. How we know who we are is told in poster.go.

// marker is the first line of the comment with a name.
func marker(name string) string { return "<!-- budgetcheck:" + safeName(name) + " -->" }

// safeName keeps what can stand in an HTML comment and escapes the rest, so
// that no two names look alike. "--" would end the comment. A long name is cut,
// and told from others by its hash.
func safeName(name string) string {
	const most = 80
	var b strings.Builder
	for i := range len(name) {
		switch c := name[i]; {
		case c >= 'a' && c <= 'z', c >= 'A' && c <= 'Z', c >= '0' && c <= '9', c == '_', c == '.',
			c == '-' && i > 0 && name[i-1] != '-':
			b.WriteByte(c)
		default:
			fmt.Fprintf(&b, "%%%02x", c)
		}
	}
	if safe := b.String(); len(safe) <= most {
		return safe
	}
	return fmt.Sprintf("%s.%x", b.String()[:most/2], sha256.Sum256([]byte(name)))
}

// commentBody is the comment's text. The host counts its characters as code
// points, the marker among them.
func (h *Host) commentBody(p Posting) string {
	first := marker(p.Name) + "\n"
	return first + p.fitted(mostComment-utf8.RuneCountInString(first), utf8.RuneCountInString, h.run)
}

// thread is the comments of a pull request that may be ours.
type thread struct {
	h    *Host
	pull int
	name string
	body string // what our comment should say
	me   poster
}

// postComment creates the comment, or edits the one that is there.
func (h *Host) postComment(ctx context.Context, p Posting, me poster) error {
	t := &thread{h, p.Pull, p.Name, h.commentBody(p), me}
	found, err := t.list(ctx)
	if err != nil {
		return err
	}
	if t.me, err = h.who(ctx, me, found); err != nil {
		return err
	}
	done, err := t.settle(ctx, found)
	if done || err != nil {
		return err
	}
	return t.create(ctx, found)
}

// list lists the comments with our marker, whoever wrote them, oldest first.
func (t *thread) list(ctx context.Context) (found []*github.IssueComment, err error) {
	o := &github.IssueListCommentsOptions{ListOptions: github.ListOptions{PerPage: 100}}
	for {
		page, resp, err := t.h.client.Issues.ListComments(ctx, t.h.owner, t.h.repo, t.pull, o)
		if err != nil {
			return nil, err
		}
		for _, c := range page {
			if first, _, _ := strings.Cut(c.GetBody(), "\n"); strings.TrimSpace(first) == marker(t.name) {
				found = append(found, c)
			}
		}
		if resp.NextPage <= o.Page {
			slices.SortFunc(found, func(a, b *github.IssueComment) int { return cmp.Compare(a.GetID(), b.GetID()) })
			return found, nil
		}
		o.Page = resp.NextPage
	}
}

// settle brings the oldest of our comments up to date and deletes the others,
// which are left from jobs that ran at the same time. done is false if we have
// none. Every job keeps the oldest, so that together they keep one.
func (t *thread) settle(ctx context.Context, found []*github.IssueComment) (done bool, err error) {
	ours := slices.DeleteFunc(slices.Clone(found), func(c *github.IssueComment) bool { return !t.me.wrote(c) })
	for i, c := range ours {
		err := t.edit(ctx, c)
		if denied(err) {
			continue // deleted meanwhile, or locked: the next will do
		}
		if err != nil || !t.me.known() {
			return true, err
		}
		return true, t.drop(ctx, ours[i+1:])
	}
	return false, nil
}

// edit brings a comment up to date. One that says the same is left alone.
func (t *thread) edit(ctx context.Context, c *github.IssueComment) error {
	if same(c.GetBody(), t.body) {
		return nil
	}
	_, _, err := t.h.client.Issues.EditComment(ctx, t.h.owner, t.h.repo, c.GetID(), &github.IssueComment{Body: &t.body})
	return err
}

// same compares without what hosts change in a text that they keep.
func same(a, b string) bool {
	plain := func(s string) string { return strings.TrimSpace(strings.ReplaceAll(s, "\r\n", "\n")) }
	return plain(a) == plain(b)
}

// drop deletes comments of ours.
func (t *thread) drop(ctx context.Context, ours []*github.IssueComment) error {
	for _, c := range ours {
		_, err := t.h.client.Issues.DeleteComment(ctx, t.h.owner, t.h.repo, c.GetID())
		if err != nil && status(err) != http.StatusNotFound { // else another job was faster
			return fmt.Errorf("the comment is up to date, but a second one could not be deleted: %w", err)
		}
	}
	return nil
}

// create makes the comment and looks whether another job has made one at the
// same time. Where the answer to a creation gets lost, it looks before it tries
// again: a second comment would be worse than a late one.
func (t *thread) create(ctx context.Context, before []*github.IssueComment) error {
	for try := 1; ; try++ {
		made, _, err := t.h.client.Issues.CreateComment(ctx, t.h.owner, t.h.repo, t.pull, &github.IssueComment{Body: &t.body})
		if err != nil && !unsure(err) {
			return err
		}
		now, lost := t.list(ctx)
		if lost != nil {
			return lost
		}
		if err != nil {
			made = t.recognise(now, before)
		}
		if made != nil {
			t.me = authorOf(made)
			_, err := t.settle(ctx, now)
			return err
		}
		if try == attempts {
			return err
		}
		if err := t.h.wire.pause(ctx, try); err != nil {
			return err
		}
	}
}

// recognise finds the comment that we made without learning of it: ours, or if
// we do not know who we are, a new one that says just what we said.
func (t *thread) recognise(now, before []*github.IssueComment) *github.IssueComment {
	for _, c := range now {
		old := slices.ContainsFunc(before, func(b *github.IssueComment) bool { return b.GetID() == c.GetID() })
		mine := t.me.wrote(c)
		if !t.me.known() {
			mine = same(c.GetBody(), t.body)
		}
		if mine && !old {
			return c
		}
	}
	return nil
}
