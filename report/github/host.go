// Package github speaks with the code host on whose runners the gate runs: it
// derives from an event what is to be judged, reads commits that are not in the
// local clone, and posts the statement as a comment, a check or commit status,
// and a job summary. It works with every host that speaks the same REST API.
package github

import (
	"errors"
	"net/http"
	"net/url"
	"strings"
	"time"

	"github.com/google/go-github/v60/github"
)

// Host is one repository on a code host.
type Host struct {
	client      *github.Client
	owner, repo string
}

// Options say which host and how patient to be with it.
type Options struct {
	API        string        // base address of the REST API (GITHUB_API_URL)
	Repository string        // "owner/name" (GITHUB_REPOSITORY)
	Token      string        // empty: nothing can be posted
	Deadline   time.Duration // for all calls together
	Transport  http.RoundTripper
}

// NewHost makes a client. It does not speak to the host yet.
func NewHost(o Options) (*Host, error) {
	owner, repo, ok := strings.Cut(o.Repository, "/")
	if !ok || owner == "" || repo == "" || strings.Contains(repo, "/") {
		return nil, errors.New(`the repository is not of the form "owner/name"; set GITHUB_REPOSITORY`)
	}
	base, err := url.Parse(strings.TrimSuffix(o.API, "/") + "/")
	if err != nil || base.Host == "" {
		return nil, errors.New("the API's address is not a URL; set GITHUB_API_URL")
	}
	client := github.NewClient(&http.Client{Transport: o.Transport})
	if o.Token != "" {
		client = client.WithAuthToken(o.Token)
	}
	client.BaseURL = base
	return &Host{client, owner, repo}, nil
}
