package report

import (
	"bytes"
	"strings"
	"testing"

	"github.com/santhosh-tekuri/jsonschema/v6"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
)

// schema compiles a schema file; times must be times.
func schema(t *testing.T, path string) *jsonschema.Schema {
	t.Helper()
	c := jsonschema.NewCompiler()
	c.AssertFormat()
	s, err := c.Compile(path)
	require.NoError(t, err)
	return s
}

func decoded(t *testing.T, text []byte) any {
	t.Helper()
	v, err := jsonschema.UnmarshalJSON(bytes.NewReader(text))
	require.NoError(t, err)
	return v
}

func asJSON(t *testing.T, s *budget.Statement) []byte {
	t.Helper()
	var b bytes.Buffer
	require.NoError(t, JSON(&b, s))
	return b.Bytes()
}

func TestStatementsFitTheSchema(t *testing.T) {
	want := schema(t, "statement.schema.json")
	for name, sc := range map[string]scenario{"closed": closed, "open": opened, "unproven": unprove, "warned": warnOnly,
		"no rule": noRule, "no base": noBase, "a run missing": noHead} {
		t.Run(name, func(t *testing.T) {
			require.NoError(t, want.Validate(decoded(t, asJSON(t, sc.judge(t)))))
		})
	}
}

func TestRunsFitTheSchema(t *testing.T) {
	want := schema(t, "runs.schema.json")
	for name, p := range map[string]*budget.Policy{"by the policy": demoPolicy(t), "without one": budget.Bare()} {
		t.Run(name, func(t *testing.T) {
			runs, _ := p.Runs(weighed(t, p, "head/*"))
			require.Len(t, runs, 2)
			var b bytes.Buffer
			require.NoError(t, RunsJSON(&b, runs))
			require.NoError(t, want.Validate(decoded(t, b.Bytes())))
		})
	}
}

func TestNoRunsFitTheSchema(t *testing.T) {
	var b bytes.Buffer
	require.NoError(t, RunsJSON(&b, nil))
	require.JSONEq(t, `{"format":1,"runs":[]}`, b.String())
	require.NoError(t, schema(t, "runs.schema.json").Validate(decoded(t, b.Bytes())))
}

// A schema that takes anything would pass all the tests above.
func TestSchemaRefusesBrokenStatements(t *testing.T) {
	whole := string(asJSON(t, closed.judge(t)))
	want := schema(t, "statement.schema.json")
	for name, c := range map[string]struct{ from, to string }{
		"another format":         {`"format": 1`, `"format": 2`},
		"no verdict":             {`"gate": "closed",`, ``},
		"a verdict of its own":   {`"gate": "closed"`, `"gate": "ajar"`},
		"an unknown key":         {`"gate": "closed"`, `"gate": "closed", "colour": "red"`},
		"an unknown key in runs": {`"attempt": 1,`, `"attempt": 1, "cost": 3,`},
		"a key without its unit": {`"total_g":`, `"total":`},
		"a number as text":       {`"limit_g": 2200`, `"limit_g": "2200"`},
		"a mass below zero":      {`"limit_g": 2200`, `"limit_g": -2200`},
		"null for a figure":      {`"limit_g": 2200`, `"limit_g": null`},
		"a state of its own":     {`"state": "near"`, `"state": "amber"`},
		"local time":             {`"now": "2031-03-10T12:00:00Z"`, `"now": "2031-03-10T13:00:00+01:00"`},
		"no time":                {`"now": "2031-03-10T12:00:00Z"`, `"now": "2031-13-10T12:00:00Z"`},
		"an unknown outcome":     {`"outcome": "ok"`, `"outcome": "fine"`},
		"attempt zero":           {`"attempt": 1`, `"attempt": 0`},
		"coverage above one":     {`"coverage": 1,`, `"coverage": 1.2,`},
		"a run without parts":    {`"parts": [`, `"pieces": [`},
		"a limit without unit":   {`"unit": "g",`, ``},
		"observed without limit": {`"limit": 2200,`, ``},
		"a short digest":         {`"digest": "`, `"digest": "0`},
	} {
		t.Run(name, func(t *testing.T) {
			require.Contains(t, whole, c.from)
			require.Error(t, want.Validate(decoded(t, []byte(strings.Replace(whole, c.from, c.to, 1)))))
		})
	}
}

// What later commands add to a statement has its place already.
func TestSchemaKnowsWhatIsToCome(t *testing.T) {
	whole := strings.TrimSuffix(strings.TrimSpace(string(asJSON(t, noRule.judge(t)))), "}")
	whole += `, "landings": [{"name": "main, month", "per": "month", "period": "2031-03", "spent_g": 31000, "expected_g": 38000, "low_g": 36000,
		"high_g": 40100, "limit_g": 40000, "runs_left": 15, "runs_out_on": "2031-03-30T00:00:00Z", "burn_ratio": 0.95, "state": "near"}],
		"remedies": [{"ruling": "main, month", "lever": "start", "value": "2031-03-10T10:00:00Z", "after_g": 2100, "saves_g": 270, "text": "start at ten"}],
		"policy_edits": [{"table": "budget \"main, month\"", "key": "limit", "from": "40 kg", "to": "44 kg"}]}`
	require.NoError(t, schema(t, "statement.schema.json").Validate(decoded(t, []byte(whole))))
	wrong := strings.Replace(whole, `"lever": "start"`, `"lever": "hope"`, 1)
	require.Error(t, schema(t, "statement.schema.json").Validate(decoded(t, []byte(wrong))))
}

// What speaks against a run's evidence has no ruling to stand in here.
func TestRunsTellTheirDoubts(t *testing.T) {
	p := budget.Bare()
	runs, _ := p.Runs(weighed(t, p, "head/score-tide.ndjson"))
	runs[0].Doubts = []footprint.Doubt{{Reason: "the gauge was asleep"}}
	before := len(runs[0].Notes)
	var b bytes.Buffer
	require.NoError(t, RunsJSON(&b, runs))
	require.Contains(t, b.String(), `"unproven: the gauge was asleep"`)
	require.Len(t, runs[0].Notes, before, "the run itself is left alone")
}
