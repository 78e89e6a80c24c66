package github

import (
	"encoding/base64"
	"fmt"
	"net/http"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/inputs"
	"budgetcheck/report/github/apitest"
)

// bounded reads files of up to so many bytes.
func bounded(t *testing.T, s *apitest.Server, most int) *repository {
	t.Helper()
	return &repository{host: hostOf(t, s), most: most}
}

func TestBlobIsWhatGitSays(t *testing.T) {
	repo, commit := motley(t)
	local, err := inputs.OpenGit(t.Context(), repo.Dir)
	require.NoError(t, err)
	remote := hostOf(t, apitest.New(t, apitest.Options{Git: repo.Dir})).Repository()
	tree, err := remote.Tree(t.Context(), commit)
	require.NoError(t, err)
	require.Len(t, tree, 14)
	for _, f := range tree {
		want, wantErr := local.Blob(t.Context(), f)
		got, err := remote.Blob(t.Context(), f)
		assert.Equal(t, want, got, f.Path)
		assert.Equal(t, f.Path == "vendor/gauges", err != nil, "only a submodule has no content: %s", f.Path)
		assert.Equal(t, wantErr != nil, err != nil, f.Path)
	}
}

func TestEmptyBlob(t *testing.T) {
	repo := apitest.NewRepo(t)
	repo.Git("hash-object", "-w", "--stdin")
	got, err := bounded(t, apitest.New(t, apitest.Options{Git: repo.Dir}), 0).Blob(t.Context(), inputs.File{Blob: "e69de29bb2d1d6434b8b29ae775ad8c2e48c5391"})
	require.NoError(t, err)
	assert.Empty(t, got)
}

func TestTheLargestBlob(t *testing.T) {
	const most = 100_000
	repo := apitest.NewRepo(t)
	commit := repo.Commit("files", map[string]string{"fits": strings.Repeat("x", most), "larger": strings.Repeat("x", most+1), "far": strings.Repeat("x", 3*most)})
	server := apitest.New(t, apitest.Options{Git: repo.Dir})
	r := bounded(t, server, most)
	tree, err := r.Tree(t.Context(), commit)
	require.NoError(t, err)
	fits, _ := tree.Find("fits")
	got, err := r.Blob(t.Context(), fits)
	require.NoError(t, err)
	assert.Len(t, got, most)
	for _, path := range []string{"larger", "far"} {
		f, _ := tree.Find(path)
		_, err = r.Blob(t.Context(), f)
		require.EqualError(t, err, path+": the file has more than 100000 bytes, the most that is read through the API; judge in a job with a clone")
		assert.NotErrorIs(t, err, inputs.ErrUnknown)
	}
	assert.Equal(t, 50<<20, hostOf(t, server).Repository().(*repository).most)
}

func TestBlobRefusesOddAnswers(t *testing.T) {
	content := func(size int, encoding, text string) string {
		return fmt.Sprintf(`{"size":%d,"encoding":%q,"content":%q}`, size, encoding, text)
	}
	four := base64.StdEncoding.EncodeToString([]byte("four"))
	for body, says := range map[string]string{
		content(5, "base64", four):                          "a: the host sends 4 bytes of 5",
		content(0, "base64", four):                          "a: the host sends 4 bytes of 0",
		content(4, "base64", ""):                            "a: the host sends 0 bytes of 4",
		`{"encoding":"base64","content":"` + four + `"}`:    "a: the host sends 4 bytes of 0",
		content(4, "utf-8", "four"):                         `a: the host sends the content as "utf-8", not as base64`,
		content(4, "none", ""):                              `a: the host sends the content as "none", not as base64`,
		content(4, "base64", "f*ur"):                        "a: the content is not base64: illegal base64 data at input byte 1",
		content(1<<40, "base64", four):                      "a: the file has more than 1000 bytes, the most that is read through the API; judge in a job with a clone",
		content(4, "base64", strings.Repeat("eA==", 1<<14)): "a: the file has more than 1000 bytes, the most that is read through the API; judge in a job with a clone",
		"<html>":   "a: the host's answer is not JSON: invalid character '<' looking for beginning of value",
		`{"size":`: "a: the host's answer is not JSON: unexpected end of JSON input",
	} {
		server := apitest.New(t, apitest.Options{})
		server.Plant(apitest.Fault{Path: "git/blobs", Status: http.StatusOK, Body: body})
		got, err := bounded(t, server, 1000).Blob(t.Context(), inputs.File{Path: "a", Blob: headSHA})
		require.EqualError(t, err, says)
		assert.Nil(t, got)
	}
}

func TestBlobThatBreaksOff(t *testing.T) {
	server := apitest.New(t, apitest.Options{})
	server.Plant(apitest.Fault{Path: "git/blobs", Status: http.StatusOK, Header: map[string]string{"Content-Length": "500"}, Body: `{"size":4`})
	_, err := bounded(t, server, 1000).Blob(t.Context(), inputs.File{Path: "a", Blob: headSHA})
	require.EqualError(t, err, "a: the content broke off: unexpected EOF")
}
