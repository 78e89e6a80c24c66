package apitest

import (
	"io"
	"net/http"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

func TestFaultsStrikeAsOftenAsTheyShould(t *testing.T) {
	s := New(t, Options{})
	s.Plant(Fault{Method: "GET", Path: "pulls?state=all", Skip: 1, Times: 2, Status: 503, Header: map[string]string{"Retry-After": "3"}})
	var codes []int
	for range 4 {
		code, _ := send(t, s, "GET", "pulls?state=all", "")
		codes = append(codes, code)
	}
	assert.Equal(t, []int{200, 503, 503, 200}, codes)
	s.Plant(Fault{Status: 500})
	for range 3 {
		code, _ := send(t, s, "GET", "pulls", "")
		assert.Equal(t, 500, code)
	}
}

func TestFaultsChooseTheirRequests(t *testing.T) {
	s := New(t, Options{})
	s.Plant(Fault{Method: "POST", Path: "comments", Status: 502})
	s.Refuse("", "check-runs")
	code, _ := send(t, s, "GET", "issues/7/comments", "")
	assert.Equal(t, 200, code)
	code, _ = send(t, s, "POST", "issues/7/comments", `{"body":"x"}`)
	assert.Equal(t, 502, code)
	code, body := send(t, s, "GET", "commits/abc/check-runs", "")
	assert.Equal(t, 403, code)
	assert.Contains(t, body, `"message"`)
	assert.Empty(t, s.Comments(7))
}

func TestADoneFaultComesAfterTheWork(t *testing.T) {
	s := New(t, Options{})
	s.Plant(Fault{Method: "POST", Path: "comments", Status: 502, Done: true, Body: "<html>", Times: 1})
	code, body := send(t, s, "POST", "issues/7/comments", `{"body":"x"}`)
	assert.Equal(t, 502, code)
	assert.Equal(t, "<html>", body)
	assert.Len(t, s.Comments(7), 1)
}

func TestADroppedConnectionAnswersNothing(t *testing.T) {
	for _, done := range []bool{false, true} {
		s := New(t, Options{})
		s.Plant(Fault{Method: "POST", Drop: true, Done: done, Times: 1})
		r, err := http.NewRequest("POST", s.URL+"/repos/harbour/tide-forecast/statuses/abc", strings.NewReader(`{"state":"success"}`))
		require.NoError(t, err)
		r.Header.Set("Content-Type", "application/json")
		r.Header.Set("Authorization", "Bearer "+Token)
		_, err = http.DefaultClient.Do(r)
		require.ErrorIs(t, err, io.EOF)
		assert.Equal(t, done, len(s.Statuses()) == 1)
	}
}

func TestAFaultMayOnlyWait(t *testing.T) {
	s := New(t, Options{})
	waited := 0
	s.Plant(Fault{Before: func() { waited++ }, Times: 1})
	code, _ := send(t, s, "GET", "pulls", "")
	assert.Equal(t, 200, code)
	assert.Equal(t, 1, waited)
}

// A request that a fault answers is held against the description all the same.
func TestFaultsHideNoBreach(t *testing.T) {
	r := &recorder{T: t}
	s := New(r, Options{})
	s.Plant(Fault{Status: 503})
	send(t, s, "POST", "issues/7/comments", `{}`)
	assert.Len(t, r.errors, 1)
}

func TestCallsAreKept(t *testing.T) {
	s := New(t, Options{})
	send(t, s, "GET", "pulls?state=all", "")
	send(t, s, "POST", "issues/7/comments", `{"body":"x"}`)
	assert.Equal(t, []Call{{"GET", "pulls?state=all", ""}, {"POST", "issues/7/comments", `{"body":"x"}`}}, s.Calls())
	assert.Equal(t, []int{1, 0, 1}, []int{s.Count("GET", "pulls"), s.Count("POST", "pulls"), s.Count("POST", "")})
}
