package github

import (
	"context"
	"crypto/x509"
	"errors"
	"io"
	"log"
	"net"
	"net/http"
	"net/http/httptest"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/google/go-github/v60/github"
	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/report/github/apitest"
)

// read is a call that reads.
func read(h *Host) error {
	_, _, err := h.client.Issues.ListComments(context.Background(), h.owner, h.repo, 214, nil)
	return err
}

// create is a call that creates.
func create(h *Host) error {
	body := "tide"
	_, _, err := h.client.Issues.CreateComment(context.Background(), h.owner, h.repo, 214, &github.IssueComment{Body: &body})
	return err
}

func seconds(list ...int) (waits []time.Duration) {
	for _, n := range list {
		waits = append(waits, time.Duration(n)*time.Second)
	}
	return waits
}

func TestReadsAreSentAgain(t *testing.T) {
	for name, f := range map[string]apitest.Fault{
		"500": {Status: 500}, "502": {Status: 502}, "503": {Status: 503}, "504": {Status: 504},
		"dropped": {Drop: true}, "dropped afterwards": {Drop: true, Done: true},
	} {
		t.Run(name, func(t *testing.T) {
			s := apitest.New(t, apitest.Options{})
			f.Times = 3
			s.Plant(f)
			h, c := patient(t, s, freshConnections)
			require.NoError(t, read(h))
			assert.Equal(t, seconds(1, 2, 4), c.waits)
			assert.Equal(t, 4, h.Calls())
			assert.Len(t, s.Calls(), 4)
		})
	}
}

// freshConnections keeps the standard library from sending a request again by
// itself, which it does where a connection that it kept is gone.
func freshConnections(o *Options) { o.Transport = &http.Transport{DisableKeepAlives: true} }

func TestNobodyTriesForEver(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.Plant(apitest.Fault{Status: 503})
	h, c := patient(t, s)
	err := read(h)
	require.ErrorContains(t, err, "503")
	assert.Equal(t, 503, status(err))
	assert.Equal(t, seconds(1, 2, 4, 8), c.waits)
}

func TestWhatCreatesIsNotSentAgain(t *testing.T) {
	for name, f := range map[string]apitest.Fault{
		"502": {Status: 502, Done: true}, "dropped": {Drop: true, Done: true}, "500 before": {Status: 500},
	} {
		t.Run(name, func(t *testing.T) {
			s := apitest.New(t, apitest.Options{})
			s.Plant(f)
			h, _ := patient(t, s)
			err := create(h)
			require.Error(t, err)
			assert.True(t, unsure(err))
			assert.Equal(t, 1, h.Calls())
		})
	}
}

func TestStatusesThatSettleItAreNotAskedAgain(t *testing.T) {
	for _, code := range []int{400, 401, 403, 404, 409, 410, 422, 501} {
		s := apitest.New(t, apitest.Options{})
		s.Plant(apitest.Fault{Status: code})
		h, _ := patient(t, s)
		err := read(h)
		assert.Equal(t, code, status(err))
		assert.Equal(t, 1, h.Calls(), code)
		assert.Equal(t, code >= 500, unsure(err))
	}
}

// Nothing was done where the host limits calls, so that everything is sent
// again, and not before the host wants it.
func TestLimits(t *testing.T) {
	at := time.Now().Truncate(time.Second).Add(7 * time.Second)
	reset := map[string]string{"X-RateLimit-Remaining": "0", "X-RateLimit-Reset": "2000000000"}
	for name, c := range map[string]struct {
		f    apitest.Fault
		want time.Duration // with one second of back-off
	}{
		"429":                 {apitest.Fault{Status: 429}, 61 * time.Second},
		"429, Retry-After":    {apitest.Fault{Status: 429, Header: map[string]string{"Retry-After": "5"}}, 6 * time.Second},
		"429, a date":         {apitest.Fault{Status: 429, Header: map[string]string{"Retry-After": at.UTC().Format(http.TimeFormat)}}, time.Until(at) + time.Second},
		"403, Retry-After":    {apitest.Fault{Status: 403, Header: map[string]string{"Retry-After": "30"}}, 31 * time.Second},
		"403, nothing left":   {apitest.Fault{Status: 403, Header: reset}, 0},
		"403, in words":       {apitest.Fault{Status: 403, Body: `{"message":"You have exceeded a secondary rate limit."}`}, 61 * time.Second},
		"403, in the address": {apitest.Fault{Status: 403, Body: `{"documentation_url":"https://docs.harbour.example/overview#secondary-rate-limits"}`}, 61 * time.Second},
	} {
		t.Run(name, func(t *testing.T) {
			for _, call := range []func(*Host) error{read, create} {
				s := apitest.New(t, apitest.Options{})
				c.f.Times = 1
				s.Plant(c.f)
				h, clock := patient(t, s, func(o *Options) { o.Deadline = 100 * 365 * 24 * time.Hour })
				want := c.want
				if want == 0 {
					want = time.Unix(2_000_000_000, 0).Sub(clock.at) + time.Second
				}
				require.NoError(t, call(h))
				require.Len(t, clock.waits, 1)
				assert.InDelta(t, want.Seconds(), clock.waits[0].Seconds(), 2)
				assert.Equal(t, 2, h.Calls())
			}
		})
	}
}

func TestRetryAfterIsHonouredOn503(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.Plant(apitest.Fault{Status: 503, Times: 1, Header: map[string]string{"Retry-After": "20"}})
	h, c := patient(t, s)
	require.NoError(t, read(h))
	assert.Equal(t, seconds(20), c.waits)
}

// A wait that the deadline does not leave time for is not begun.
func TestALongLimitIsToldAtOnce(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.Plant(apitest.Fault{Status: 429, Header: map[string]string{"Retry-After": "3600"}})
	h, c := patient(t, s)
	err := create(h)
	require.ErrorIs(t, err, errLimited)
	assert.ErrorContains(t, err, "it asks to wait 1h0m1s more")
	assert.False(t, unsure(err), "nothing was created")
	assert.False(t, denied(err), "it is no refusal")
	assert.Empty(t, c.waits)
	assert.Equal(t, 1, h.Calls())
}

// The client library turns calls away by itself after such an answer.
func TestTheLastCallOfALimitIsNoObstacle(t *testing.T) {
	s := httptest.NewServer(http.HandlerFunc(func(w http.ResponseWriter, _ *http.Request) {
		w.Header().Set("X-RateLimit-Limit", "1000")
		w.Header().Set("X-RateLimit-Remaining", "0")
		w.Header().Set("X-RateLimit-Reset", "4000000000")
		io.WriteString(w, "[]")
	}))
	t.Cleanup(s.Close)
	h := hostAt(t, s.URL, nil)
	require.NoError(t, read(h))
	require.NoError(t, read(h))
	assert.Equal(t, 2, h.Calls())
}

func hostAt(t *testing.T, api string, next http.RoundTripper) *Host {
	t.Helper()
	h, err := NewHost(Options{API: api, Repository: harbour, Token: secret, Transport: next,
		Sleep: func(context.Context, time.Duration) error { return nil }})
	require.NoError(t, err)
	return h
}

func TestTheDeadlineIsForAllCallsTogether(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.Plant(apitest.Fault{Status: 503})
	h, c := patient(t, s, func(o *Options) { o.Deadline = 20 * time.Second })
	require.Error(t, read(h))
	assert.Equal(t, seconds(1, 2, 4, 8), c.waits)
	require.Error(t, read(h))
	assert.Equal(t, seconds(1, 2, 4, 8, 1, 2), c.waits, "four more seconds are not left")
}

func TestACallIsCutOffAtTheDeadline(t *testing.T) {
	hang := roundTrip(func(r *http.Request) (*http.Response, error) {
		<-r.Context().Done()
		return nil, r.Context().Err()
	})
	h := hostAt(t, "https://api.harbour.example", hang)
	h.wire.patience = time.Millisecond
	require.ErrorIs(t, read(h), errLate)
	assert.Equal(t, 1, h.Calls())
}

type roundTrip func(*http.Request) (*http.Response, error)

func (f roundTrip) RoundTrip(r *http.Request) (*http.Response, error) { return f(r) }

func TestACallerWhoLeavesIsNotKeptWaiting(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.Plant(apitest.Fault{Status: 503})
	ctx, cancel := context.WithCancel(context.Background())
	h, _ := patient(t, s, func(o *Options) {
		o.Sleep = func(ctx context.Context, d time.Duration) error { cancel(); return sleep(ctx, time.Hour) }
	})
	_, _, err := h.client.Issues.ListComments(ctx, h.owner, h.repo, 214, nil)
	require.ErrorIs(t, err, context.Canceled)
	assert.Equal(t, 1, h.Calls())
}

func TestWhatNeverLeftIsSentAgain(t *testing.T) {
	left := 2
	flaky := roundTrip(func(r *http.Request) (*http.Response, error) {
		if left--; left >= 0 {
			return nil, &net.OpError{Op: "dial", Err: errors.New("connection refused")}
		}
		return &http.Response{StatusCode: 201, Body: io.NopCloser(strings.NewReader("{}"))}, nil
	})
	h := hostAt(t, "https://api.harbour.example", flaky)
	require.NoError(t, create(h))
	assert.Equal(t, 3, h.Calls())
}

// A certificate does not get better by asking again.
func TestAStrangersCertificateIsNotAskedTwice(t *testing.T) {
	s := httptest.NewUnstartedServer(http.NotFoundHandler())
	s.Config.ErrorLog = log.New(io.Discard, "", 0)
	s.StartTLS()
	t.Cleanup(s.Close)
	h := hostAt(t, s.URL, nil)
	err := read(h)
	var authority x509.UnknownAuthorityError
	require.ErrorAs(t, err, &authority)
	assert.Equal(t, 1, h.Calls())
}

func TestAnAnswerThatBreaksOffIsAskedForAgain(t *testing.T) {
	left := 1
	s := httptest.NewServer(http.HandlerFunc(func(w http.ResponseWriter, _ *http.Request) {
		if left--; left >= 0 {
			w.Header().Set("Content-Length", "1000")
			io.WriteString(w, "[")
			return
		}
		io.WriteString(w, "[]")
	}))
	t.Cleanup(s.Close)
	h := hostAt(t, s.URL, nil)
	require.NoError(t, read(h))
	assert.Equal(t, 2, h.Calls())

	left = attempts + 1
	require.ErrorIs(t, read(h), io.ErrUnexpectedEOF)
	assert.Equal(t, 2+attempts, h.Calls())
	err := create(h)
	require.ErrorIs(t, err, io.ErrUnexpectedEOF)
	assert.True(t, unsure(err))
	assert.Equal(t, 2+attempts+1, h.Calls())
}

func TestTheBodyIsSentWholeEachTime(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.Plant(apitest.Fault{Status: 429, Times: 2, Header: map[string]string{"Retry-After": "1"}})
	h, _ := patient(t, s)
	require.NoError(t, create(h))
	calls := s.Calls()
	require.Len(t, calls, 3)
	assert.Contains(t, calls[0].Body, "tide")
	assert.Equal(t, calls[0].Body, calls[2].Body)
}

func TestJitterTakesAwayUpToHalf(t *testing.T) {
	var seen []time.Duration
	for range 200 {
		d := jitter(time.Second)
		assert.LessOrEqual(t, d, time.Second)
		assert.GreaterOrEqual(t, d, time.Second/2)
		seen = append(seen, d)
	}
	slices.Sort(seen)
	assert.Greater(t, len(slices.Compact(seen)), 100)
	assert.Zero(t, jitter(0))
}

// Weighing a large record between two calls takes nothing of their time.
func TestTheDeadlineDoesNotRunBetweenCalls(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, c := patient(t, s, func(o *Options) { o.Deadline = 20 * time.Second })
	require.NoError(t, read(h))
	require.NoError(t, c.sleep(context.Background(), time.Hour))
	s.Plant(apitest.Fault{Status: 503, Times: 1})
	require.NoError(t, read(h))
}
