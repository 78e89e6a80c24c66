package github

import (
	"bytes"
	"encoding/json"
	"maps"
	"slices"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"
)

// FuzzReadEvent wants no panic, a plain message or a subject that is safe to
// ask the API about and to print, and the same again the second time.
func FuzzReadEvent(f *testing.F) {
	seeds := 0
	for _, name := range slices.Sorted(maps.Keys(expected)) {
		env := environment(f, name)
		var short bytes.Buffer
		require.NoError(f, json.Compact(&short, env.Payload))
		if env.Payload = short.Bytes(); len(env.Payload) > 4<<10 {
			continue // nearly all of it is keys that are not read
		}
		seeds++
		f.Add(env.Event, env.Payload, env.Repository, env.SHA, env.Ref, "", "", "")
		f.Add(env.Event, env.Payload, "", "", "", "release", "7", headSHA)
	}
	require.GreaterOrEqual(f, seeds, 9)
	f.Add("push", []byte(`{"ref":"refs/heads/\u0000","after":12}`), "", "", "", "a..b", "0", "x")
	f.Add("workflow_run", []byte(`{"workflow_run":{"event":"pull_request","head_sha":"`+headSHA+`","pull_requests":[null,{}]}}`), "", "", "", "main", "1", "")
	f.Fuzz(func(t *testing.T, event string, payload []byte, repository, sha, ref, branch, pull, commit string) {
		env := Environment{Event: event, Payload: payload, Repository: repository, SHA: sha, Ref: ref}
		s, err := ReadEvent(env)
		requireSound(t, s, err)
		again, _ := ReadEvent(env)
		require.Equal(t, s, again)
		if err == nil {
			s, err = s.With(branch, pull, commit)
			requireSound(t, s, err)
		}
	})
}

func requireSound(t *testing.T, s Subject, err error) {
	t.Helper()
	if err != nil {
		require.Equal(t, Subject{}, s)
		assertPlain(t, err)
		return
	}
	for _, id := range []string{s.Head, s.Base} {
		require.True(t, id == "" || isCommit(id) && !isNone(id) && id == strings.ToLower(id), id)
	}
	for _, name := range []string{s.Branch, s.Tag, s.HeadBranch, s.DefaultBranch} {
		require.True(t, name == "" || wrongName(name) == "", "%q", name)
	}
	require.True(t, s.NeedsLookup || s.Head != "" && s.Branch != "", "%+v", s)
	require.GreaterOrEqual(t, s.Pull, 0)
	require.Equal(t, s.Pull != 0, len(s.Pulls) == 1)
}
