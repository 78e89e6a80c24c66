package github

import (
	"context"
	"errors"
	"fmt"
	"net/http"
	"net/http/httptest"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/report/github/apitest"
)

// secret is a token that must show up nowhere.
const secret = "apitest-secret-0123456789abcdef"

// Whatever goes wrong, and whatever the host answers, no text has the token.
func TestTheTokenIsInNoText(t *testing.T) {
	for name, next := range map[string]http.RoundTripper{
		"error": roundTrip(func(r *http.Request) (*http.Response, error) {
			return nil, fmt.Errorf("cannot send %v", r.Header)
		}),
		"refusal":      answering(403, `{"message":"the token %s may not"}`),
		"no JSON":      answering(400, `the header was %s`),
		"validation":   answering(422, `{"message":"no","errors":[{"code":"custom","message":"%s"}]}`),
		"server error": answering(502, `<h1>%s</h1>`),
		"limit":        answering(429, `{"message":"%s calls too often"}`),
	} {
		t.Run(name, func(t *testing.T) {
			h := hostAt(t, "https://api.harbour.example", next)
			var log strings.Builder
			p := posting()
			p.Places = []Place{Comment, Check, Status, Summary}
			p.Runner = NewRunner(&log, none)
			notices := h.Post(context.Background(), p)
			require.NotEmpty(t, notices)
			require.NoError(t, p.Runner.Tell(notices))
			assert.NotContains(t, fmt.Sprintf("%+v %v", notices, log.String()), "secret")
			for _, err := range []error{read(h), create(h)} {
				require.Error(t, err)
				assert.NotContains(t, err.Error(), "secret")
				assert.NotContains(t, fmt.Sprintf("%v %+v %q", err, err, err), "secret")
			}
		})
	}
}

// answering answers with the token that it was shown in the text.
func answering(code int, text string) http.RoundTripper {
	return roundTrip(func(r *http.Request) (*http.Response, error) {
		rec := httptest.NewRecorder()
		rec.WriteHeader(code)
		shown := strings.TrimPrefix(r.Header.Get("Authorization"), "Bearer ")
		fmt.Fprintf(rec, strings.ReplaceAll(text, "%s", "%[1]s"), shown)
		resp := rec.Result()
		resp.Request = r
		return resp, nil
	})
}

// Somebody who reads the log of a test must see that the token was there to be
// found.
func TestTheTokenIsShownToTheHost(t *testing.T) {
	var shown string
	h := hostAt(t, "https://api.harbour.example", roundTrip(func(r *http.Request) (*http.Response, error) {
		shown = r.Header.Get("Authorization")
		return nil, errors.New("no")
	}))
	require.Error(t, read(h))
	assert.Equal(t, "Bearer "+secret, shown)
}

func TestTheTokenIsNotTakenElsewhere(t *testing.T) {
	var shown []string
	other := httptest.NewServer(http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		shown = append(shown, r.Header.Get("Authorization"))
		fmt.Fprint(w, "[]")
	}))
	t.Cleanup(other.Close)
	host := httptest.NewServer(http.RedirectHandler(other.URL, http.StatusTemporaryRedirect))
	t.Cleanup(host.Close)
	require.NoError(t, read(hostAt(t, host.URL, nil)))
	assert.Equal(t, []string{""}, shown)
}

func TestUnusableOptionsAreRefused(t *testing.T) {
	fine := Options{API: "https://api.harbour.example", Repository: harbour, Token: secret}
	_, err := NewHost(fine)
	require.NoError(t, err)
	for want, change := range map[string]func(*Options){
		"GITHUB_REPOSITORY":   func(o *Options) { o.Repository = "harbour" },
		"owner/name":          func(o *Options) { o.Repository = "harbour/tide/forecast" },
		`the form`:            func(o *Options) { o.Repository = "../tide" },
		"GITHUB_API_URL":      func(o *Options) { o.API = "api.harbour.example" },
		"not a URL":           func(o *Options) { o.API = "ftp://api.harbour.example" },
		"a user or password":  func(o *Options) { o.API = "https://keeper:" + secret + "@api.harbour.example" },
		"a line break":        func(o *Options) { o.Token = secret + "\n" },
		"no token has":        func(o *Options) { o.Token = "Bearer " + secret },
		"characters that no ": func(o *Options) { o.Token = secret + "\u200b" },
	} {
		o := fine
		change(&o)
		_, err := NewHost(o)
		require.ErrorContains(t, err, want)
		assert.NotContains(t, err.Error(), "secret")
	}
}

func TestTheRunsAddress(t *testing.T) {
	o := Options{Server: "https://harbour.example/", Repository: harbour, RunID: "42"}
	assert.Equal(t, "https://harbour.example/harbour/tide-forecast/actions/runs/42", runAddress(o))
	for _, bad := range []Options{
		{Repository: harbour, RunID: "42"}, {Server: "https://harbour.example", Repository: harbour}, {Server: "javascript:alert(1)", RunID: "42"},
		{Server: "https://harbour.example/)[x](y", RunID: "42"}, {Server: "https://harbour.example", RunID: "42)"},
	} {
		assert.Empty(t, runAddress(bad))
	}
}

func TestOptionsFromTheEnvironment(t *testing.T) {
	env := map[string]string{"GITHUB_API_URL": "https://api.harbour.example", "GITHUB_REPOSITORY": harbour,
		"GITHUB_SERVER_URL": "https://harbour.example", "GITHUB_RUN_ID": "42"}
	h, err := NewHost(FromEnvironment(func(key string) string { return env[key] }, secret))
	require.NoError(t, err)
	assert.Equal(t, "https://harbour.example/harbour/tide-forecast/actions/runs/42", h.run)
	assert.Equal(t, "https://api.harbour.example/", h.client.BaseURL.String())
	assert.True(t, h.canPost)
}

// A token of the runner works on its host.
func TestTheTokenOpensTheHost(t *testing.T) {
	s := apitest.New(t, apitest.Options{Token: secret})
	h, _ := patient(t, s, func(o *Options) { o.Token = secret })
	require.NoError(t, create(h))
	h, _ = patient(t, s, func(o *Options) { o.Token = "apitest-wrong" })
	require.Equal(t, 401, status(create(h)))
}
