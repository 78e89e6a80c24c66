package github

import (
	"bytes"
	"context"
	"crypto/tls"
	"errors"
	"fmt"
	"io"
	"math/rand/v2"
	"net/http"
	"regexp"
	"strconv"
	"time"
)

// How often a request is sent in all, and how long to wait in between: twice as
// long each time.
const (
	attempts  = 5
	firstWait = time.Second
	mostWait  = 30 * time.Second
	// The host's advice where it limits calls and does not say for how long.
	limitWait = time.Minute
)

// errLimited is wrapped where the host answers nothing but that it limits calls.
var errLimited = errors.New("the host limits how often it is called")

// sleep waits, or returns early with the reason why it should not.
func sleep(ctx context.Context, d time.Duration) error {
	timer := time.NewTimer(d)
	defer timer.Stop()
	select {
	case <-timer.C:
		return nil
	case <-ctx.Done():
		return context.Cause(ctx)
	}
}

// jitter takes away up to half of a wait, so that jobs that were turned away
// together do not come back together.
func jitter(d time.Duration) time.Duration {
	return d - time.Duration(rand.Int64N(int64(d)/2+1))
}

// how is how a request may be repeated, by its context.
type how int

const (
	// A POST that may be sent twice, for the last one counts.
	harmless how = iota + 1
	// A PATCH that adds to what is there.
	adding
)

type howKey struct{}

func sent(ctx context.Context, h how) context.Context { return context.WithValue(ctx, howKey{}, h) }

// repeatable tells whether a request may be sent again although it may have
// been carried out. One that creates may not: whoever makes it looks whether it
// has before trying again.
func repeatable(r *http.Request) bool {
	switch r.Context().Value(howKey{}) {
	case harmless:
		return true
	case adding:
		return false
	}
	return r.Method != http.MethodPost
}

// RoundTrip sends a request until there is an answer that settles it.
func (w *wire) RoundTrip(r *http.Request) (*http.Response, error) {
	if r.Body != nil {
		defer r.Body.Close()
	}
	ctx, done := w.within(r.Context())
	defer done()
	for try := 1; ; try++ {
		resp, err := w.once(ctx, r)
		wait, again := w.again(ctx, r, resp, err, try)
		if !again {
			return settled(resp, err)
		}
		if try == attempts || w.tooLong(ctx, wait) {
			return giveUp(resp, err, wait)
		}
		if err := w.sleep(ctx, wait); err != nil {
			return nil, cleaned{err, w.token}
		}
	}
}

// again tells whether to try again, and when.
func (w *wire) again(ctx context.Context, r *http.Request, resp *http.Response, err error, try int) (time.Duration, bool) {
	backoff := w.jitter(min(firstWait<<(try-1), mostWait))
	var untrusted *tls.CertificateVerificationError
	switch {
	case r.Body != nil && r.GetBody == nil, ctx.Err() != nil, errors.As(err, &untrusted):
		return 0, false
	case err != nil:
		return backoff, repeatable(r) || unsent(err)
	case limited(resp):
		return w.limit(resp) + backoff, true // nothing was done, so that everything may be sent again
	case resp.StatusCode >= http.StatusInternalServerError && resp.StatusCode != http.StatusNotImplemented:
		asked, _ := w.retryAfter(resp)
		return max(backoff, asked), repeatable(r)
	}
	return 0, false
}

// limited tells whether the host turned the request away because there were
// too many. Some hosts answer 403 then, which else says that something is not
// allowed.
func limited(resp *http.Response) bool {
	switch resp.StatusCode {
	case http.StatusTooManyRequests:
		return true
	case http.StatusForbidden:
		h := resp.Header
		return h.Get("Retry-After") != "" || h.Get("X-RateLimit-Remaining") == "0" || secondary.Match(peek(resp))
	}
	return false
}

// secondary is how hosts say so in words (common practice, from memory).
var secondary = regexp.MustCompile(`(?i)secondary[ -]rate[ -]limit`)

// peek reads the body and puts it back.
func peek(resp *http.Response) []byte {
	body, _ := io.ReadAll(resp.Body) // from memory
	resp.Body = io.NopCloser(bytes.NewReader(body))
	return body
}

// limit is how long the host asks to wait.
func (w *wire) limit(resp *http.Response) time.Duration {
	if d, ok := w.retryAfter(resp); ok {
		return d
	}
	reset, err := strconv.ParseInt(resp.Header.Get("X-RateLimit-Reset"), 10, 64)
	if err == nil && resp.Header.Get("X-RateLimit-Remaining") == "0" {
		return max(0, time.Unix(reset, 0).Sub(w.now()))
	}
	return limitWait
}

// retryAfter reads seconds or a date.
func (w *wire) retryAfter(resp *http.Response) (time.Duration, bool) {
	text := resp.Header.Get("Retry-After")
	if s, err := strconv.ParseUint(text, 10, 31); err == nil {
		return time.Duration(s) * time.Second, true
	}
	at, err := http.ParseTime(text)
	return max(0, at.Sub(w.now())), err == nil
}

// giveUp is what a request that was sent often enough comes to.
func giveUp(resp *http.Response, err error, wait time.Duration) (*http.Response, error) {
	if err == nil && limited(resp) {
		return nil, fmt.Errorf("%w; it asks to wait %s more", errLimited, wait.Round(time.Second))
	}
	return settled(resp, err)
}

// settled hands over what came, if anything did, else the error.
func settled(resp *http.Response, err error) (*http.Response, error) {
	if resp == nil {
		return nil, err
	}
	return plain(resp), nil
}

// plain takes the limits off an answer. The client library keeps them and turns
// later calls away by itself, without waiting; waiting is done here.
func plain(resp *http.Response) *http.Response {
	for _, key := range []string{"X-RateLimit-Limit", "X-RateLimit-Remaining", "X-RateLimit-Reset", "Retry-After"} {
		resp.Header.Del(key)
	}
	return resp
}

// pause waits before another attempt at something that was not simply sent
// again.
func (w *wire) pause(ctx context.Context, try int) error {
	ctx, done := w.within(ctx)
	defer done()
	wait := w.jitter(min(firstWait<<(try-1), mostWait))
	if w.tooLong(ctx, wait) {
		return errLate
	}
	return w.sleep(ctx, wait)
}
