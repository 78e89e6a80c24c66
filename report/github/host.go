// Package github speaks with the code host on whose runners the gate runs: it
// derives from an event what is to be judged, reads commits that are not in the
// local clone, and posts the statement as a comment, a check or commit status,
// and a job summary. It works with every host that speaks the same REST API.
package github

import (
	"context"
	"errors"
	"fmt"
	"net/http"
	"net/url"
	"strings"
	"time"
	"unicode"

	"github.com/google/go-github/v60/github"
)

// Host is one repository on a code host.
type Host struct {
	client      *github.Client
	owner, repo string
	wire        *wire
	run         string // address of the workflow's run; empty where it is not known
	login       string // see Options
	canPost     bool
}

// Options say which host and how patient to be with it.
type Options struct {
	API        string        // base address of the REST API (GITHUB_API_URL)
	Repository string        // "owner/name" (GITHUB_REPOSITORY)
	Token      string        // empty: nothing can be posted
	Deadline   time.Duration // for all calls together, the waits between attempts included; 0: two minutes
	Transport  http.RoundTripper

	Server string // address for browsers (GITHUB_SERVER_URL); empty: no links
	RunID  string // of the workflow's run (GITHUB_RUN_ID); empty: no links
	Login  string // author of what the token posts; empty: found out, see comment.go

	// Sleep waits between attempts, and Jitter makes a wait a little different
	// from that of other jobs. Both have defaults; tests have no time to wait.
	Sleep  func(context.Context, time.Duration) error
	Jitter func(time.Duration) time.Duration
}

// FromEnvironment are the options that a runner's environment gives.
func FromEnvironment(getenv func(string) string, token string) Options {
	return Options{API: getenv("GITHUB_API_URL"), Repository: getenv("GITHUB_REPOSITORY"), Token: token,
		Server: getenv("GITHUB_SERVER_URL"), RunID: getenv("GITHUB_RUN_ID")}
}

// NewHost makes a client. It does not speak to the host yet.
func NewHost(o Options) (*Host, error) {
	owner, repo, ok := strings.Cut(o.Repository, "/")
	if !ok || !segment(owner) || !segment(repo) {
		return nil, errors.New(`the repository is not of the form "owner/name"; set GITHUB_REPOSITORY`)
	}
	base, err := url.Parse(strings.TrimSuffix(o.API, "/") + "/")
	if err != nil || base.Host == "" || base.Scheme != "https" && base.Scheme != "http" {
		return nil, errors.New("the API's address is not a URL; set GITHUB_API_URL")
	}
	if base.User != nil {
		return nil, errors.New("the API's address holds a user or password, which would show in messages; give the token by itself")
	}
	if strings.ContainsFunc(o.Token, func(r rune) bool { return r > unicode.MaxASCII || !unicode.IsGraphic(r) || r == ' ' }) {
		return nil, errors.New("the token has spaces or other characters that no token has; look for a line break at its end")
	}
	w := newWire(o, base)
	client := github.NewClient(&http.Client{Transport: w})
	client.BaseURL = base
	return &Host{client: client, owner: owner, repo: repo, wire: w, run: runAddress(o), login: o.Login, canPost: o.Token != ""}, nil
}

// segment tells whether a name can stand in an address as it is.
func segment(name string) bool {
	return name != "" && name != "." && name != ".." && url.PathEscape(name) == name
}

// runAddress is where people see the workflow's run. It is empty unless
// everything in it is as plain as it should be: it is put into Markdown.
func runAddress(o Options) string {
	server, err := url.Parse(o.Server)
	if err != nil || server.Host == "" || server.Scheme != "https" && server.Scheme != "http" || strings.ContainsAny(o.Server, "<>()[] \t\r\n\"'`") {
		return ""
	}
	if o.RunID == "" || strings.Trim(o.RunID, "0123456789") != "" {
		return ""
	}
	return fmt.Sprintf("%s/%s/actions/runs/%s", strings.TrimSuffix(o.Server, "/"), o.Repository, o.RunID)
}

// Calls is how many requests were sent so far, repeated ones included.
func (h *Host) Calls() int { return int(h.wire.calls.Load()) }
