package apitest

import (
	"context"
	"fmt"
	"io"
	"net/http"
	"net/url"
	"strings"
	"testing"

	"github.com/google/go-github/v60/github"
	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// recorder is a test that remembers its errors instead of failing.
type recorder struct {
	*testing.T
	errors []string
}

func (r *recorder) Errorf(format string, args ...any) {
	r.errors = append(r.errors, fmt.Sprintf(format, args...))
}

const owner, repo = "harbour", "tide-forecast"

// client is the library's client for a server.
func client(t *testing.T, s *Server) *github.Client {
	base, err := url.Parse(s.URL + "/")
	require.NoError(t, err)
	c := github.NewClient(nil).WithAuthToken(Token)
	c.BaseURL = base
	return c
}

// send makes a request by hand and returns the status and body of the answer.
func send(t *testing.T, s *Server, method, path, body string, header ...string) (int, string) {
	t.Helper()
	r, err := http.NewRequest(method, s.URL+"/repos/harbour/tide-forecast/"+path, strings.NewReader(body))
	require.NoError(t, err)
	r.Header.Set("Authorization", "Bearer "+Token)
	if body != "" {
		r.Header.Set("Content-Type", "application/json")
	}
	for i := 0; i < len(header); i += 2 {
		r.Header.Set(header[i], header[i+1])
	}
	resp, err := http.DefaultClient.Do(r)
	require.NoError(t, err)
	defer resp.Body.Close()
	text, err := io.ReadAll(resp.Body)
	require.NoError(t, err)
	return resp.StatusCode, string(text)
}

// Every breach here was made by somebody once, or could be.
func TestBreachesBite(t *testing.T) {
	for name, c := range map[string]struct{ method, path, body, want string }{
		"missing field":      {"POST", "issues/7/comments", `{}`, `property "body" is missing`},
		"wrong type":         {"POST", "issues/7/comments", `{"body":7}`, "value must be a string"},
		"unknown word":       {"POST", "statuses/abc", `{"state":"closed"}`, "not one of the allowed values"},
		"misspelt key":       {"POST", "statuses/abc", `{"state":"success","contxt":"tide"}`, "no key contxt"},
		"misspelt below":     {"POST", "check-runs", `{"name":"tide","head_sha":"abc","output":{"title":"x","summary":"x","txt":"x"}}`, "no key output.txt"},
		"misspelt in list":   {"POST", "check-runs", `{"name":"tide","head_sha":"abc","output":{"title":"x","summary":"x","annotations":[{"path":"a","start_line":1,"end_line":1,"annotation_level":"notice","message":"m","line":1}]}}`, "no key output.annotations[0].line"},
		"unknown query":      {"GET", "pulls?stat=open", "", `no query parameter "stat"`},
		"bad query":          {"GET", "pulls?state=ajar", "", "state"},
		"unknown path":       {"GET", "tides", "", "no matching operation"},
		"unknown method":     {"PUT", "check-runs", `{}`, "method not allowed"},
		"not a number":       {"GET", "pulls/seven", "", "an invalid integer"},
		"no JSON":            {"POST", "issues/7/comments", `{"body":`, "failed to decode request body"},
		"body where none":    {"DELETE", "issues/comments/7", `{"body":"x"}`, "body"},
		"no conclusion":      {"POST", "check-runs", `{"name":"tide","head_sha":"abc","status":"completed"}`, "without a conclusion"},
		"output, no text":    {"POST", "check-runs", `{"name":"tide","head_sha":"abc","output":{"title":"x"}}`, `property "summary" is missing`},
		"nameless check":     {"POST", "check-runs", `{"head_sha":"abc"}`, `property "name" is missing`},
		"comment too long":   {"POST", "issues/7/comments", `{"body":"` + strings.Repeat("x", mostComment+1) + `"}`, "65537 characters"},
		"summary too long":   {"POST", "check-runs", `{"name":"tide","head_sha":"abc","output":{"title":"x","summary":"` + strings.Repeat("x", 65535+1) + `"}}`, "maximum string length is 65535"},
		"status too long":    {"POST", "statuses/abc", `{"state":"success","description":"` + strings.Repeat("x", mostDescription+1) + `"}`, "141 characters"},
		"51 annotations":     {"POST", "check-runs", `{"name":"tide","head_sha":"abc","output":{"title":"x","summary":"x","annotations":[` + strings.TrimSuffix(strings.Repeat(`{"path":"a","start_line":1,"end_line":1,"annotation_level":"notice","message":"m"},`, 51), ",") + `]}}`, "maximum number of items is 50"},
		"level of no kind":   {"POST", "check-runs", `{"name":"tide","head_sha":"abc","output":{"title":"x","summary":"x","annotations":[{"path":"a","start_line":1,"end_line":1,"annotation_level":"error","message":"m"}]}}`, "not one of the allowed values"},
		"half an annotation": {"POST", "check-runs", `{"name":"tide","head_sha":"abc","output":{"title":"x","summary":"x","annotations":[{"path":"a"}]}}`, `property "start_line" is missing`},
	} {
		t.Run(name, func(t *testing.T) {
			r := &recorder{T: t}
			s := New(r, Options{})
			status, _ := send(t, s, c.method, c.path, c.body)
			require.NotEmpty(t, r.errors, "the breach went through with %d", status)
			assert.Contains(t, strings.Join(r.errors, "\n"), c.want)
		})
	}
}

func TestWrongContentTypeBites(t *testing.T) {
	r := &recorder{T: t}
	s := New(r, Options{})
	send(t, s, "POST", "issues/7/comments", `{"body":"tide"}`, "Content-Type", "text/plain")
	require.Len(t, r.errors, 1)
	assert.Contains(t, r.errors[0], `Content-Type`)
}

// A handler that answers what the description does not allow is told too.
func TestOwnBreachesBite(t *testing.T) {
	for name, c := range map[string]struct {
		value any
		want  string
	}{
		"wrong type":   {object{"body": "x", "id": "seven"}, "value must be an integer"},
		"missing":      {object{"body": "x", "html_url": nil}, "html_url"},
		"misspelt key": {object{"boddy": "x"}, "no key boddy"},
	} {
		t.Run(name, func(t *testing.T) {
			r := &recorder{T: t}
			s := New(r, Options{})
			real := handlers["POST issues/{issue_number}/comments"]
			t.Cleanup(func() { handlers["POST issues/{issue_number}/comments"] = real })
			handlers["POST issues/{issue_number}/comments"] = func(*Server, *call) answer { return answer{status: 201, value: c.value} }
			send(t, s, "POST", "issues/7/comments", `{"body":"tide"}`)
			require.NotEmpty(t, r.errors)
			assert.Contains(t, strings.Join(r.errors, "\n"), c.want)
		})
	}
}

func TestUndocumentedStatusBites(t *testing.T) {
	r := &recorder{T: t}
	s := New(r, Options{})
	real := handlers["GET pulls"]
	t.Cleanup(func() { handlers["GET pulls"] = real })
	handlers["GET pulls"] = func(*Server, *call) answer { return answer{status: 206, value: []object{}} }
	send(t, s, "GET", "pulls", "")
	require.Len(t, r.errors, 1)
	assert.Contains(t, r.errors[0], "status is not supported")
}

func TestEveryOperationHasAHandlerAndNoOther(t *testing.T) {
	c, err := published()
	require.NoError(t, err)
	n := 0
	for path, item := range c.doc.Paths.Map() {
		for method := range item.Operations() {
			if path != "/user" {
				assert.Contains(t, handlers, method+" "+strings.TrimPrefix(path, repository))
				n++
			}
		}
	}
	assert.Len(t, handlers, n)
	assert.NotEmpty(t, handlers)
}

func TestCredentials(t *testing.T) {
	s := New(t, Options{})
	status, body := send(t, s, "GET", "pulls", "", "Authorization", "Bearer wrong")
	assert.Equal(t, 401, status)
	assert.Contains(t, body, "Bad credentials")
	resp, err := http.Get(s.URL + "/repos/harbour/tide-forecast/pulls")
	require.NoError(t, err)
	resp.Body.Close()
	assert.Equal(t, 200, resp.StatusCode, "a public repository can be read without a token")
	resp, err = http.Get(s.URL + "/repos/harbour/other/pulls")
	require.NoError(t, err)
	resp.Body.Close()
	assert.Equal(t, 404, resp.StatusCode)
}

func TestUserIsForPeopleOnly(t *testing.T) {
	ctx := context.Background()
	_, resp, err := client(t, New(t, Options{})).Users.Get(ctx, "")
	require.Error(t, err)
	assert.Equal(t, 403, resp.StatusCode)
	u, _, err := client(t, New(t, Options{As: Person("pilot")})).Users.Get(ctx, "")
	require.NoError(t, err)
	assert.Equal(t, "pilot", u.GetLogin())
}
