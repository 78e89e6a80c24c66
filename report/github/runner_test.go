package github

import (
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
)

// files are what a runner reads after a step.
type files struct {
	dir string
	log strings.Builder
	env map[string]string
}

func newFiles(t *testing.T) *files {
	dir := t.TempDir()
	return &files{dir: dir, env: map[string]string{"GITHUB_ACTIONS": "true",
		"GITHUB_OUTPUT": filepath.Join(dir, "output"), "GITHUB_STEP_SUMMARY": filepath.Join(dir, "summary")}}
}

func (f *files) runner() *Runner {
	return NewRunner(&f.log, func(key string) string { return f.env[key] })
}

func (f *files) read(t *testing.T, name string) string {
	t.Helper()
	data, err := os.ReadFile(filepath.Join(f.dir, name))
	if !errors.Is(err, os.ErrNotExist) {
		require.NoError(t, err)
	}
	return string(data)
}

func (f *files) summary(t *testing.T) string { t.Helper(); return f.read(t, "summary") }

// commands are the lines that a runner carries out: those that begin with "::"
// after any spaces, and those with "##[" anywhere.
func commands(log string) (list []string) {
	for _, line := range strings.FieldsFunc(log, func(r rune) bool { return r == '\n' || r == '\r' }) {
		if strings.HasPrefix(strings.TrimSpace(line), "::") || strings.Contains(line, "##[") {
			list = append(list, line)
		}
	}
	return list
}

func TestAnnotationsInTheLog(t *testing.T) {
	f := newFiles(t)
	p := posting()
	require.NoError(t, f.runner().Annotate(p))
	assert.Equal(t, []string{
		"::error file=budgetcheck.toml,line=10,title=rule 1%2C job retrain-tide::over, observed 26.2 kg, limit 25 kg: because",
		"::warning file=budgetcheck.toml,line=20,title=rule 2%2C job retrain-tide::unproven, observed 26.2 kg, limit 25 kg: because",
	}, commands(f.log.String()))
}

func TestWhatClosesTheGateIsAnError(t *testing.T) {
	for name, c := range map[string]struct {
		change func(*Posting)
		want   []string
	}{
		"over":                {func(*Posting) {}, []string{"error", "warning"}},
		"unproven alone":      {func(p *Posting) { p.Statement.Rulings = p.Statement.Rulings[1:] }, []string{"error"}},
		"only warned of":      {func(p *Posting) { p.Statement.Gate, p.Statement.Rulings = budget.Open, p.Statement.Rulings[1:] }, []string{"warning"}},
		"report only":         {func(p *Posting) { p.ReportOnly = true }, []string{"warning", "warning"}},
		"waiting":             {func(p *Posting) { p.Await = true }, []string{"warning", "warning"}},
		"nothing":             {func(p *Posting) { p.Statement.Rulings = nil }, nil},
		"without a statement": {func(p *Posting) { p.Statement = nil }, nil},
	} {
		f := newFiles(t)
		p := posting()
		p.Line = nil
		c.change(&p)
		require.NoError(t, f.runner().Annotate(p))
		var got []string
		for _, line := range commands(f.log.String()) {
			word, _, _ := strings.Cut(strings.TrimPrefix(line, "::"), " ")
			got = append(got, word)
			assert.NotContains(t, line, "file=")
		}
		assert.Equal(t, c.want, got, name)
	}
}

func TestNoticesInTheLog(t *testing.T) {
	f := newFiles(t)
	require.NoError(t, f.runner().Tell([]Notice{{Check, true, "503"}, {Comment, false, "a fork"}}))
	assert.Equal(t, []string{"::warning::check: 503", "::notice::comment: a fork"}, commands(f.log.String()))
}

// Nothing that is logged is a command but what folds it.
func TestNoLoggedLineIsACommand(t *testing.T) {
	for _, text := range []string{
		"::set-output name=gate::open", "  ::error::x", "\t::error::x", "\u00a0::error::x", "\u2003::error::x", "\u0085::error::x", "a\n::stop-commands::x", "a\r::debug::x", "a\r\n::add-mask::x",
		"##[set-output name=gate]open", "text ##[error]x", "###[error]x", "%0A::warning::x", "::", ":::error::x", "\f\v::group::x",
	} {
		f := newFiles(t)
		require.NoError(t, f.runner().Log("statement\n"+text, text))
		got := commands(f.log.String())
		require.Len(t, got, 2, "%q", text)
		assert.True(t, strings.HasPrefix(got[0], "::group::statement\\u000a"))
		assert.Equal(t, "::endgroup::", got[1])
	}
}

func TestLoggedTextStaysReadable(t *testing.T) {
	f := newFiles(t)
	require.NoError(t, f.runner().Log("Statement", "Gate closed\n\n  account  main\r\n  a::b\n"))
	assert.Equal(t, "::group::Statement\nGate closed\n\n  account  main\n  a::b\n::endgroup::\n", f.log.String())
}

func TestTheTokenIsMaskedWhereARunnerReads(t *testing.T) {
	f := newFiles(t)
	require.NoError(t, f.runner().Mask(secret))
	require.NoError(t, f.runner().Mask(""))
	assert.Equal(t, "::add-mask::"+secret+"\n", f.log.String())
	var log strings.Builder
	require.NoError(t, NewRunner(&log, none).Mask(secret))
	assert.Empty(t, log.String(), "on a terminal the command would show it")
}

func TestTheSummary(t *testing.T) {
	f := newFiles(t)
	p := posting().complete()
	require.NoError(t, f.runner().summary(p, runPage))
	assert.Equal(t, p.Markdown+"\n", f.summary(t))
	require.NoError(t, f.runner().summary(p, runPage))
	assert.Equal(t, p.Markdown+"\n"+p.Markdown+"\n", f.summary(t), "what was there stays")
}

func TestOutsideOfARunnerThereIsNoSummary(t *testing.T) {
	p := posting().complete()
	require.NoError(t, NewRunner(&strings.Builder{}, none).summary(p, ""))
	require.NoError(t, (*Runner)(nil).summary(p, ""))
}

// The bound is for what the step has written in all.
func TestTheSummaryFitsTheHost(t *testing.T) {
	f := newFiles(t)
	require.NoError(t, os.WriteFile(f.env["GITHUB_STEP_SUMMARY"], []byte(strings.Repeat("x", 300_000)), 0o666))
	p := posting()
	p.Statement = statement(4000)
	for n := range p.Statement.Rulings {
		p.Statement.Rulings[n].Reason = strings.Repeat("because ", 40)
	}
	p = p.complete()
	require.Greater(t, len(p.Markdown), mostSummary)
	require.NoError(t, f.runner().summary(p, runPage))
	text := f.summary(t)
	assert.LessOrEqual(t, len(text), mostSummary)
	assert.Greater(t, len(text), mostSummary-1000)
	assert.Contains(t, text, "goes on in [the statement.md of this run]("+runPage+").")
	require.NoError(t, os.WriteFile(f.env["GITHUB_STEP_SUMMARY"], []byte(strings.Repeat("x", mostSummary-100)), 0o666))
	require.ErrorContains(t, f.runner().summary(p, runPage), "the summary of this step is full")
}

func TestFilesThatCannotBeWrittenAreAnError(t *testing.T) {
	f := newFiles(t)
	for key := range f.env {
		f.env[key] = filepath.Join(f.dir, "no", "such", "folder")
	}
	require.ErrorContains(t, f.runner().Outputs(Outputs{Gate: "open"}), "the runner could not be told")
	require.ErrorContains(t, f.runner().summary(posting().complete(), ""), "the runner could not be told")
	require.ErrorContains(t, NewRunner(full{}, none).Log("a", "b"), "no space")
	require.ErrorContains(t, NewRunner(full{}, none).Annotate(posting()), "no space")
	require.ErrorContains(t, NewRunner(full{}, none).Tell([]Notice{{}}), "no space")
}

type full struct{}

func (full) Write([]byte) (int, error) { return 0, errors.New("no space") }
