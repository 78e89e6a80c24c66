package github

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// parsed reads the file of outputs as a runner does.
func parsed(t *testing.T, text string) map[string]string {
	t.Helper()
	out := map[string]string{}
	lines := strings.Split(strings.TrimSuffix(text, "\n"), "\n")
	for i := 0; i < len(lines); i++ {
		name, end, ok := strings.Cut(lines[i], "<<")
		require.True(t, ok, lines[i])
		var value []string
		for i++; lines[i] != end; i++ {
			value = append(value, lines[i])
		}
		require.NotContains(t, out, name)
		out[name] = strings.Join(value, "\n")
	}
	return out
}

func TestOutputs(t *testing.T) {
	f := newFiles(t)
	s := statement(1)
	a, b, ratio, lesser := unit.Mass(1_200_000.5), unit.Mass(0.25), 0.0821, -0.1
	s.Runs = []*footprint.Run{{Side: "head", Total: &a}, {Side: "base"}, {Side: "head", Total: &b}}
	s.Changes = []budget.Change{{HeldRatio: &lesser}, {HeldRatio: &ratio}, {}}
	require.NoError(t, f.runner().Outputs(OutputsOf(s, "out/statement.md", `C:\out\statement.json`)))
	assert.Equal(t, map[string]string{"gate": "closed", "total-g": "1200000.75", "held-ratio": "0.0821",
		"statement-md": "out/statement.md", "statement-json": `C:\out\statement.json`}, parsed(t, f.read(t, "output")))
}

func TestWhatIsNotKnownIsEmpty(t *testing.T) {
	s := statement(1)
	assert.Equal(t, Outputs{Gate: "closed"}, OutputsOf(s, "", ""))
	one := unit.Mass(1)
	s.Runs = []*footprint.Run{{Side: "head", Total: &one}, {Side: "head"}}
	assert.Empty(t, OutputsOf(s, "", "").TotalG, "a part of the sum would be no sum")
	assert.Equal(t, Outputs{Gate: "unknown", StatementMD: "a"}, OutputsOf(nil, "a", ""))
	tiny := 1e-9
	s.Changes = []budget.Change{{HeldRatio: &tiny}}
	assert.Equal(t, "0.000000001", OutputsOf(s, "", "").HeldRatio)
}

// A value that the runner would read as several sets no output at all.
func TestNoOutputCanSetAnother(t *testing.T) {
	for _, path := range []string{"a\ngate<<x\nopen\nx", "a\rb", "a\x00", outputEnd, "x" + outputEnd, "a\n" + outputEnd + "\ngate=open"} {
		f := newFiles(t)
		err := f.runner().Outputs(Outputs{Gate: "closed", StatementMD: path})
		require.ErrorContains(t, err, "the output statement-md is")
		assert.Empty(t, f.read(t, "output"))
	}
	f := newFiles(t)
	require.NoError(t, f.runner().Outputs(Outputs{Gate: "closed", StatementMD: "::set-output name=gate::open%0A<<EOF"}))
	assert.Equal(t, "closed", parsed(t, f.read(t, "output"))["gate"])
}

func TestOutsideOfARunnerThereAreNoOutputs(t *testing.T) {
	require.NoError(t, NewRunner(&strings.Builder{}, none).Outputs(Outputs{Gate: "open"}))
}
