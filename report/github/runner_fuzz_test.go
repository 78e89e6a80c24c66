package github

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/require"
)

func FuzzLog(f *testing.F) {
	for _, text := range hostileTexts {
		f.Add(text)
	}
	f.Fuzz(func(t *testing.T, text string) {
		var log strings.Builder
		require.NoError(t, NewRunner(&log, none).Log(text, text))
		got := commands(log.String())
		require.Len(t, got, 2)
		require.True(t, strings.HasPrefix(got[0], "::group::"))
		require.Equal(t, "::endgroup::", got[1])
	})
}

func FuzzOutputs(f *testing.F) {
	for _, text := range hostileTexts {
		f.Add(text)
	}
	f.Fuzz(func(t *testing.T, text string) {
		files := newFiles(t)
		if files.runner().Outputs(Outputs{Gate: "closed", StatementMD: text, StatementJSON: "x"}) != nil {
			require.Empty(t, files.read(t, "output"))
			return
		}
		require.Equal(t, map[string]string{"gate": "closed", "total-g": "", "held-ratio": "", "statement-md": text, "statement-json": "x"},
			parsed(t, files.read(t, "output")))
	})
}

// Two names never share a comment, and no name leaves the marker.
func FuzzSafeName(f *testing.F) {
	for _, text := range hostileTexts {
		f.Add(text, text+"-")
	}
	f.Fuzz(func(t *testing.T, a, b string) {
		require.Regexp(t, `^<!-- budgetcheck:[A-Za-z0-9_.%-]* -->$`, marker(a))
		require.NotContains(t, safeName(a), "--")
		if a != b {
			require.NotEqual(t, marker(a), marker(b))
		}
	})
}
