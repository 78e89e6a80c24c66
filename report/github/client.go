package github

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"net"
	"net/http"
	"net/url"
	"strings"
	"sync"
	"sync/atomic"
	"time"

	"github.com/google/go-github/v60/github"
)

// patience is how long all calls together may take if nobody says.
const patience = 2 * time.Minute

// mostAnswer is more than any host sends: 100 MB of a file in base64.
const mostAnswer = 160 << 20

// wire is the way to the host. It shows the token to the host alone, keeps it
// out of what comes back, counts, keeps the deadline, and sends again what may
// be sent again (retry.go).
type wire struct {
	next         http.RoundTripper
	scheme, host string
	token        string
	sleep        func(context.Context, time.Duration) error
	jitter       func(time.Duration) time.Duration
	now          func() time.Time
	calls        atomic.Int64

	patience time.Duration // for all calls together
	mu       sync.Mutex
	spent    time.Duration // of it
}

func newWire(o Options, base *url.URL) *wire {
	w := &wire{next: o.Transport, scheme: base.Scheme, host: base.Host, token: o.Token,
		sleep: o.Sleep, jitter: o.Jitter, now: time.Now, patience: o.Deadline}
	if w.next == nil {
		w.next = http.DefaultTransport
	}
	if w.sleep == nil {
		w.sleep = sleep
	}
	if w.jitter == nil {
		w.jitter = jitter
	}
	if w.patience == 0 {
		w.patience = patience
	}
	return w
}

// errLate is told where the deadline for all calls has passed.
var errLate = errors.New("the time for all calls to the host is used up")

// within bounds a call by what is left of the time for all. What is done
// between calls, such as judging, takes nothing of it.
func (w *wire) within(ctx context.Context) (context.Context, func()) {
	began := w.now()
	w.mu.Lock()
	left := w.patience - w.spent
	w.mu.Unlock()
	ctx, cancel := context.WithDeadlineCause(ctx, began.Add(left), errLate)
	return ctx, func() {
		cancel()
		w.mu.Lock()
		w.spent += w.now().Sub(began)
		w.mu.Unlock()
	}
}

// tooLong tells whether a wait would end after the deadline.
func (w *wire) tooLong(ctx context.Context, wait time.Duration) bool {
	end, bound := ctx.Deadline()
	return bound && w.now().Add(wait).After(end)
}

// once sends a request and reads the whole answer, so that one that breaks off
// can be asked for again. Then there is an error and also what came: whoever
// reads it to the end meets the error there.
func (w *wire) once(ctx context.Context, r *http.Request) (*http.Response, error) {
	r, err := w.copied(ctx, r)
	if err != nil {
		return nil, err
	}
	w.calls.Add(1)
	resp, err := w.next.RoundTrip(r)
	if err != nil {
		return nil, w.failed(ctx, err)
	}
	defer resp.Body.Close()
	body, err := io.ReadAll(io.LimitReader(resp.Body, mostAnswer+1))
	if len(body) > mostAnswer {
		return nil, fmt.Errorf("the answer is longer than %d bytes", mostAnswer)
	}
	if resp.StatusCode >= http.StatusBadRequest && w.token != "" {
		body = bytes.ReplaceAll(body, []byte(w.token), []byte("***")) // hosts have been known to repeat what they refuse
	}
	resp.Body = io.NopCloser(bytes.NewReader(body))
	if err != nil {
		err = w.failed(ctx, err)
		resp.Body = io.NopCloser(io.MultiReader(resp.Body, broken{err}))
	}
	return resp, err
}

// broken is the end of an answer that broke off.
type broken struct{ error }

func (b broken) Read([]byte) (int, error) { return 0, b.error }

// copied is a copy of a request that can be sent, with the token if it goes to
// the host and not to where the host redirects.
func (w *wire) copied(ctx context.Context, r *http.Request) (*http.Request, error) {
	out := r.Clone(ctx)
	if r.GetBody != nil {
		body, err := r.GetBody()
		if err != nil {
			return nil, err
		}
		out.Body = body
	}
	if w.token != "" && r.URL.Scheme == w.scheme && r.URL.Host == w.host {
		out.Header.Set("Authorization", "Bearer "+w.token)
	}
	return out, nil
}

func (w *wire) failed(ctx context.Context, err error) error {
	if cause := context.Cause(ctx); cause != nil {
		err = cause
	}
	return cleaned{err, w.token}
}

// cleaned is an error whose text has no token in it.
type cleaned struct {
	error
	token string
}

// Error is the text without the token.
func (c cleaned) Error() string {
	if c.token == "" {
		return c.error.Error()
	}
	return strings.ReplaceAll(c.error.Error(), c.token, "***")
}

// Unwrap is for those who look at what happened, not at its text.
func (c cleaned) Unwrap() error { return c.error }

// status is the host's answer as a number, 0 if there was none.
func status(err error) int {
	var refused *github.ErrorResponse
	if errors.As(err, &refused) && refused.Response != nil {
		return refused.Response.StatusCode
	}
	return 0
}

// denied tells whether the host does not let the token do it, or has no such
// thing: it does not tell these apart.
func denied(err error) bool {
	return status(err) == http.StatusForbidden || status(err) == http.StatusNotFound
}

// unsure tells whether the host may have done what was asked although the
// answer says nothing of it. A refusal is sure, and so is a connection that
// never came about.
func unsure(err error) bool {
	if err == nil || errors.Is(err, errLimited) || unsent(err) {
		return false
	}
	code := status(err)
	return code == 0 || code >= http.StatusInternalServerError
}

// unsent tells whether the request never left.
func unsent(err error) bool {
	var op *net.OpError
	return errors.As(err, &op) && op.Op == "dial"
}
