// Package apitest is a code host for tests, on this machine's loopback. It
// keeps pull requests, comments, check runs and commit statuses in memory,
// answers for commits from a real git repository, and fails when it is told to.
//
// Every request and every answer is checked against the code host's published
// OpenAPI description (description.json, see README.md): a breach fails the
// test. So the server cannot agree with a client's mistakes.
package apitest

import (
	"bytes"
	"io"
	"net/http"
	"net/http/httptest"
	"strings"
	"sync"
)

// T is what the server needs of a test.
type T interface {
	Helper()
	Cleanup(func())
	Errorf(format string, args ...any)
}

// Options say what kind of host it is. The zero value is a code host with
// checks, on which the workflow's own token posts.
type Options struct {
	Repository string // "harbour/tide-forecast" if empty
	Token      string // what the client must show; Token if empty
	As         User   // whose token it is; the workflow's own app if empty
	Forge      bool   // another make of host: no checks, leaner answers, everything below /api/v1
	Git        string // folder of a git repository; empty: there are no commits
	OwnOnly    bool   // nobody may edit or delete the comments of others
	MostTree   int    // entries of a tree that is asked for in whole; the host's own bound if 0
}

// Token is the token of servers that were given none.
const Token = "apitest-0123456789abcdef0123456789abcdef"

// moment is when everything happens.
const moment = "2031-03-10T08:00:00Z"

// Server is a code host.
type Server struct {
	URL string // base address of the API

	t        T
	o        Options
	contract *contract
	prefix   string

	mu     sync.Mutex
	faults []*Fault
	calls  []Call
	state
}

// Call is a request that came in.
type Call struct {
	Method string
	Path   string // from the repository on, with its query: "pulls?state=open"
	Body   string
}

// New starts a server. It ends with the test.
func New(t T, o Options) *Server {
	t.Helper()
	c, err := published()
	if err != nil {
		t.Errorf("the published description cannot be used: %v", err)
		return nil
	}
	s := &Server{t: t, o: o.filled(), contract: c, state: newState()}
	if o.Forge {
		s.prefix = "/api/v1"
	}
	server := httptest.NewServer(s)
	t.Cleanup(server.Close)
	s.URL = server.URL + s.prefix
	return s
}

func (o Options) filled() Options {
	if o.Repository == "" {
		o.Repository = "harbour/tide-forecast"
	}
	if o.Token == "" {
		o.Token = Token
	}
	if o.As == (User{}) {
		o.As = Bot("github-actions")
	}
	if o.Forge {
		o.As.Type = ""
	}
	return o
}

// Calls lists the requests so far, in order.
func (s *Server) Calls() []Call {
	s.mu.Lock()
	defer s.mu.Unlock()
	return append([]Call(nil), s.calls...)
}

// Count tells how many requests with the method had a path that contains part.
func (s *Server) Count(method, part string) (n int) {
	for _, c := range s.Calls() {
		if c.Method == method && strings.Contains(c.Path, part) {
			n++
		}
	}
	return n
}

// ServeHTTP checks a request, carries it out, checks the answer and sends it,
// unless a fault was planted.
func (s *Server) ServeHTTP(w http.ResponseWriter, r *http.Request) {
	body, err := io.ReadAll(r.Body)
	if err != nil {
		return // the client gave up
	}
	r.Body = io.NopCloser(bytes.NewReader(body))
	s.note(r, string(body))
	path, ours := strings.CutPrefix(r.URL.EscapedPath(), s.prefix)
	if !ours {
		s.t.Errorf("breach of the description: %s %s is not below %s", r.Method, r.URL, s.prefix)
	}
	in, err := s.contract.request(r, path)
	if err != nil {
		s.t.Errorf("breach of the description: %v", err)
		refuse(http.StatusUnprocessableEntity, err.Error()).send(w)
		return
	}
	f := s.fault(r)
	if f != nil && !f.Done {
		f.send(w, r)
		return
	}
	a := s.answer(in, r)
	if f != nil {
		f.send(w, r)
		return
	}
	a.send(w)
}

func (s *Server) note(r *http.Request, body string) {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.calls = append(s.calls, Call{r.Method, s.below(r), body})
}

// below is the address of a request from the repository on.
func (s *Server) below(r *http.Request) string {
	return strings.TrimPrefix(strings.TrimPrefix(r.URL.RequestURI(), s.prefix), "/repos/"+s.o.Repository+"/")
}

// answer carries a request out and checks the outcome.
func (s *Server) answer(in *call, r *http.Request) answer {
	s.mu.Lock()
	defer s.mu.Unlock()
	a := s.handle(in, r)
	if wrong := a.fill(in); len(wrong) > 0 {
		s.t.Errorf("breach of the description in an answer to %s: %v", in.operation, wrong)
	}
	if s.o.Forge && a.status < 400 {
		a.lean() // the description is not this host's
		return a
	}
	if err := s.contract.response(in, a.status, a.header(), a.body); err != nil {
		s.t.Errorf("breach of the description: %v", err)
	}
	return a
}
