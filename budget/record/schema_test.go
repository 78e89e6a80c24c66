package record

import (
	"bytes"
	"encoding/json"
	"os"
	"strings"
	"testing"

	"github.com/santhosh-tekuri/jsonschema/v6"
	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"
)

func schema(t require.TestingT) *jsonschema.Schema {
	file, err := os.Open("schema.json")
	require.NoError(t, err)
	defer file.Close()
	document, err := jsonschema.UnmarshalJSON(file)
	require.NoError(t, err)
	c := jsonschema.NewCompiler()
	c.AssertFormat()
	require.NoError(t, c.AddResource("schema.json", document))
	s, err := c.Compile("schema.json")
	require.NoError(t, err)
	return s
}

// valid tells whether the schema takes the line.
func valid(t require.TestingT, s *jsonschema.Schema, line string) error {
	value, err := jsonschema.UnmarshalJSON(strings.NewReader(line))
	require.NoError(t, err, line)
	return s.Validate(value)
}

// TestSchemaTakesWhatIsWritten: every line of the Writer is one of the schema.
func TestSchemaTakesWhatIsWritten(t *testing.T) {
	s := schema(t)
	rapid.Check(t, func(t *rapid.T) {
		var out bytes.Buffer
		drawScript(t, NewWriter(&out))
		for line := range strings.Lines(out.String()) {
			assert.NoError(t, valid(t, s, line), line)
		}
	})
}

// whole has every key of every kind of line.
var whole = []map[string]any{
	{"k": "open", "format": 1, "run": "r1", "attempt": 2, "part": "rack-b", "parts": 4, "host": "h3", "job": "retrain-tide", "stage": "training",
		"at": "2031-03-04T02:15:00Z", "site": "quay-north", "machine": "quad", "reserved": 2.5, "commit": "c0ffee", "branch": "main", "pull": 214,
		"labels": map[string]any{"team": "tide"}},
	{"k": "power", "at": "2031-03-04T02:15:00Z", "meter": "gpu0", "w": 412.5},
	{"k": "energy", "at": "2031-03-04T02:15:00Z", "meter": "cpu", "j": 7, "wrap_j": 262144},
	{"k": "used", "from": "2031-03-04T02:14:00Z", "to": "2031-03-04T03:15:00Z", "kwh": 0.5, "how": "measured"},
	{"k": "work", "at": "2031-03-04T02:15:00Z", "unit": "step", "done": 7, "planned": 4000, "of": "part"},
	{"k": "close", "at": "2031-03-04T02:15:00Z", "outcome": "stopped"},
}

// odd are values that are right for some keys and wrong for others.
var odd = []any{"", "1", "ok", "power", "run", "estimated", "2031-03-04T02:15:00Z", "2031-03-04T03:15:00.5+01:00", "2031-03-04T02:15:00", "2031-03-04t02:15:00z",
	"2031-02-29T00:00:00Z", "2031-03-04T02:15:60Z", "9999-01-01T00:00:00Z", "1600-12-31T00:00:00Z",
	0, 1, 2, -1, 1.5, -0.5, 1e18, json.Number("1.0"), json.Number("1e999"), json.Number("-1e999"), json.Number("9007199254740992"), true, false,
	[]any{}, []any{1}, map[string]any{}, map[string]any{"a": "b"}, map[string]any{"a": 1}, map[string]any{"a": map[string]any{}}, strings.Repeat("m", MaxName+1)}

// TestSchemaAgreesWithTheReader: another program that follows the schema writes
// lines that are read, and what the schema refuses is refused. Every key of
// every kind of line is left out, and is given every odd value. (That "to" is
// after "from" is beyond what a schema can say.)
func TestSchemaAgreesWithTheReader(t *testing.T) {
	s := schema(t)
	same := func(line map[string]any) bool {
		raw, err := json.Marshal(line)
		require.NoError(t, err)
		l, meter, _, wrong := decode(raw, nil)
		taken := wrong == nil && l.Kind != KindUnknown && len(meter) <= MaxName
		refused := valid(t, s, string(raw))
		assert.Equal(t, taken, refused == nil, "%s\nreader: %v\nschema: %v", raw, wrong, refused)
		return taken
	}
	taken, refused := 0, 0
	for _, line := range whole {
		assert.True(t, same(line))
		for key, value := range line {
			delete(line, key)
			same(line)
			for _, line[key] = range odd {
				if same(line) {
					taken++
				} else {
					refused++
				}
			}
			line[key] = value
		}
		line["another"] = []any{1, nil}
		assert.True(t, same(line), "unknown keys are allowed")
	}
	assert.Greater(t, taken, 100)
	assert.Greater(t, refused, 500)
}

func TestSchemaRefusesUnknownKinds(t *testing.T) {
	s := schema(t)
	for _, line := range []string{`{}`, `{"k":"heat"}`, `{"k":"Power"}`, `{"k":1}`, `[]`, `"power"`, `null`, `{"k":"power"}`} {
		assert.Error(t, valid(t, s, line), line)
	}
	assert.NoError(t, valid(t, s, opening))
	assert.NoError(t, valid(t, s, strings.Replace(opening, `"run"`, `"part":3,"run"`, 1)))
}
