package github

import (
	"fmt"
	"slices"
	"strings"
	"testing"
	"unicode"
	"unicode/utf8"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// needed are the keys without which a payload cannot be read, by file.
var needed = map[string][]string{
	"pull_request.fork":   {"pull_request", "pull_request.head", "pull_request.head.sha", "pull_request.head.ref", "pull_request.base", "pull_request.base.ref"},
	"merge_group.slash":   {"merge_group", "merge_group.head_sha", "merge_group.head_ref", "merge_group.base_ref"},
	"workflow_run.push":   {"workflow_run", "workflow_run.event", "workflow_run.head_sha", "workflow_run.head_branch", "workflow_run.head_repository"},
	"workflow_run.fork":   {"workflow_run.head_sha"},
	"push.branch":         {"ref", "after"},
	"push.annotated-tag":  {"ref", "head_commit.id"},
	"pull_request.opened": {"pull_request.head.sha"},
	"push.branch-created": {"after"},
	"schedule.nightly":    {"GITHUB_SHA"},
}

func TestMissingKeysAreNamed(t *testing.T) {
	for name, keys := range needed {
		for _, key := range keys {
			env := environment(t, name)
			env.SHA, env.Ref = "", ""
			if key != "GITHUB_SHA" {
				env.Payload = changed(t, name, map[string]any{key: nil})
			}
			s, err := ReadEvent(env)
			require.Error(t, err, "%s without %s", name, key)
			assert.Contains(t, err.Error(), "event "+env.Event+": "+key, name)
			assert.Equal(t, Subject{}, s)
		}
	}
}

// Keys that may be missing, or null, without harm.
func TestOptionalKeys(t *testing.T) {
	for name, keys := range map[string][]string{
		"pull_request.fork":         {"number", "pull_request.base.sha", "pull_request.base.repo", "repository", "repository.default_branch", "sender"},
		"push.branch":               {"before", "base_ref", "head_commit", "repository", "deleted"},
		"merge_group.slash":         {"merge_group.base_sha", "merge_group.head_commit", "repository"},
		"workflow_run.pull_request": {"workflow_run.pull_requests", "workflow_run.head_repository", "workflow_run.head_branch", "action"},
		"schedule.nightly":          {"repository", "schedule"},
	} {
		want := environment(t, name)
		for _, key := range keys {
			s, err := readChanged(t, name, map[string]any{key: nil})
			require.NoError(t, err, "%s without %s", name, key)
			whole, err := ReadEvent(want)
			require.NoError(t, err)
			assert.Equal(t, whole.Head, s.Head, "%s without %s", name, key)
		}
	}
}

func TestWrongTypesAreNamed(t *testing.T) {
	wrong := map[string]any{"a JSON number": 7, "a JSON bool": true, "a JSON array": []any{"x"}}
	keys := map[string][]string{
		"pull_request.fork":           {"pull_request", "pull_request.head", "pull_request.head.sha", "pull_request.base.ref", "pull_request.head.repo", "repository.default_branch"},
		"push.branch":                 {"ref", "before", "after", "base_ref", "head_commit", "head_commit.id", "repository"},
		"merge_group.slash":           {"merge_group", "merge_group.head_sha", "merge_group.base_ref"},
		"workflow_run.fork":           {"workflow_run", "workflow_run.event", "workflow_run.head_branch", "workflow_run.head_repository.full_name"},
		"workflow_dispatch.example":   {"ref"},
		"schedule.nightly":            {"repository"},
		"repository_dispatch.cluster": {"repository.default_branch"},
	}
	for name, paths := range keys {
		for _, path := range paths {
			for says, value := range wrong {
				_, err := readChanged(t, name, map[string]any{path: value})
				require.Error(t, err, "%s %s", name, path)
				assert.Contains(t, err.Error(), path+" is "+says+", where ", name)
			}
		}
	}
}

func TestNumbersOfPullRequests(t *testing.T) {
	for value, says := range map[any]string{
		0:     "pull_request.number is 0, not the number of a pull request (1 or more)",
		-3:    "pull_request.number is -3, not the number of a pull request (1 or more)",
		1.5:   "pull_request.number is a JSON number, where int is expected",
		1e300: "pull_request.number is a JSON number, where int is expected",
		"2":   "pull_request.number is a JSON string, where int is expected",
	} {
		_, err := readChanged(t, "pull_request.fork", map[string]any{"pull_request.number": value, "number": nil})
		require.EqualError(t, err, "event pull_request: "+says)
	}
}

func TestPayloadsThatAreNone(t *testing.T) {
	for payload, says := range map[string]string{
		"":                 "the payload is not JSON (unexpected end of JSON input)",
		"ref=refs/heads/x": "the payload is not JSON (invalid character 'r' looking for beginning of value)",
		"\x1b[31m":         `the payload is not JSON (invalid character '\x1b' looking for beginning of value)`,
		"[]":               "the payload is a JSON array, not an object",
		`"text"`:           "the payload is a JSON string, not an object",
		"12":               "the payload is a JSON number, not an object",
		"null":             "pull_request is missing",
		"{}":               "pull_request is missing",
		`{"pull_request":`: "the payload is not JSON (unexpected end of JSON input)",
		strings.Repeat(`{"pull_request":`, 20_000): "the payload is not JSON (invalid character '{' exceeded max depth)",
		strings.Repeat("9", 1<<20):                 "the payload is a JSON number, not an object",
	} {
		_, err := ReadEvent(Environment{Event: "pull_request", Payload: []byte(payload)})
		require.EqualError(t, err, "event pull_request: "+says)
	}
}

func TestHugePayload(t *testing.T) {
	payload := readPayload(t, "push.branch")
	padded := func(size int) Environment {
		return Environment{Event: "push", Payload: append(slices.Clone(payload), slices.Repeat([]byte(" "), size-len(payload))...)}
	}
	_, err := ReadEvent(padded(25 << 20))
	require.NoError(t, err)
	_, err = ReadEvent(padded(25<<20 + 1))
	require.EqualError(t, err, "the payload of the event is 26214401 bytes; hosts send at most 26214400")
}

func TestUnknownEvents(t *testing.T) {
	for event, shown := range map[string]string{
		"": `""`, "issue_comment": `"issue_comment"`, "Push": `"Push"`, "\x1b[2J\u202e": `"\x1b[2J\u202e"`,
		strings.Repeat("e", 500): `"` + strings.Repeat("e", 80) + `" (cut, 500 bytes)`,
	} {
		_, err := ReadEvent(Environment{Event: event, Payload: []byte("{}")})
		require.EqualError(t, err, "the event "+shown+" cannot be judged; start the workflow on one of merge_group, "+
			"pull_request, pull_request_target, push, repository_dispatch, schedule, workflow_dispatch, workflow_run")
	}
}

// badNames are names that no branch can have, or that nothing should print.
var badNames = []string{
	"a\nb", "a\x00b", "\x1b[31mred", "a\x7fb", "a\u0085b", "bad\xffutf8", "a b", "a..b", "a~1", "a^", "a:b", "a?b", "a*b", "a[b", `a\b`, "a@{1}",
	"-option", "/a", "a/", "a//b", ".hidden", "a/.b", "a.", "a./b", "a.lock", "a.lock/b", strings.Repeat("n", 1001),
}

// goodNames are unusual and allowed; what prints them makes them inert.
var goodNames = []string{"a", "HEAD", "feature/x/y", "ünïcode", "a\u202eb", "a\u200bb", "@everyone", "</details>", "a|b", "`tick`", "##set-output", "%0A", "a-", strings.Repeat("n", 1000)}

func TestNamesOfBranches(t *testing.T) {
	for _, name := range badNames {
		var c checker
		assert.Empty(t, c.branch("the branch", name))
		require.Error(t, c.err, "%q", name)
		assert.Contains(t, c.err.Error(), "not the name of a branch or tag: ")
		assertPlain(t, c.err)
	}
	for _, name := range goodNames {
		var c checker
		assert.Equal(t, name, c.branch("the branch", name))
		require.NoError(t, c.err, "%q", name)
	}
}

func TestHostileNamesInEvents(t *testing.T) {
	for _, name := range badNames {
		if !utf8.ValidString(name) {
			continue // JSON cannot carry it
		}
		for file, key := range map[string]string{
			"pull_request.fork": "pull_request.head.ref", "pull_request.opened": "pull_request.base.ref",
			"workflow_run.fork": "workflow_run.head_branch", "workflow_run.push": "workflow_run.head_branch", "push.branch": "repository.default_branch",
		} {
			_, err := readChanged(t, file, map[string]any{key: name})
			require.Error(t, err, "%s %q", key, name)
			assert.Contains(t, err.Error(), key+" is ")
			assertPlain(t, err)
		}
		for _, kind := range []string{"refs/heads/", "refs/tags/"} {
			_, err := readChanged(t, "push.branch", map[string]any{"ref": kind + name})
			require.Error(t, err, "%q", name)
			assertPlain(t, err)
		}
	}
	for _, ref := range []string{"main", "refs/pull/2/merge", "refs/heads/", "refs/tags/", "heads/main", "REFS/heads/main"} {
		_, err := readChanged(t, "push.branch", map[string]any{"ref": ref})
		require.Error(t, err, ref)
		assert.Contains(t, err.Error(), "event push: ref ")
	}
}

func TestIDsOfCommits(t *testing.T) {
	zeros := strings.Repeat("0", 40)
	for _, id := range []string{"main", headSHA[1:], headSHA + "a", headSHA[:39] + "g", " " + headSHA[1:], zeros, strings.Repeat("0", 64), "\x1b" + headSHA[1:], strings.Repeat("a", 1<<16)} {
		_, err := readChanged(t, "pull_request.fork", map[string]any{"pull_request.head.sha": id})
		require.Error(t, err, "%q", id)
		assert.Contains(t, err.Error(), "pull_request.head.sha is ")
		assert.Contains(t, err.Error(), "not the full id of a commit (40 or 64 hexadecimal digits)")
		assertPlain(t, err)
	}
	sha64 := strings.Repeat("0a", 32)
	s, err := readChanged(t, "pull_request.fork", map[string]any{"pull_request.head.sha": strings.ToUpper(sha64), "pull_request.base.sha": zeros})
	require.NoError(t, err)
	assert.Equal(t, sha64, s.Head, "in small letters")
	assert.Empty(t, s.Base)
	_, err = readChanged(t, "pull_request.fork", map[string]any{"pull_request.base.sha": "main"})
	require.Error(t, err)
	_, err = readChanged(t, "push.branch", map[string]any{"after": zeros})
	require.EqualError(t, err, `event push: "refs/heads/release/2031.1" was deleted, there is nothing to judge`)
	_, err = readChanged(t, "push.branch", map[string]any{"deleted": true})
	require.Error(t, err)
}

// assertPlain wants a message that is short, on one line and without anything
// that a terminal would obey.
func assertPlain(t *testing.T, err error) {
	t.Helper()
	text := err.Error()
	assert.Less(t, len(text), 1000)
	i := strings.IndexFunc(text, func(r rune) bool { return unicode.IsControl(r) || !unicode.IsPrint(r) || r == utf8.RuneError })
	if i >= 0 {
		assert.Fail(t, fmt.Sprintf("the message is not plain: %q", text))
	}
}
