package main

import (
	"encoding/json"
	"os"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

const whole = `{"openapi":"3.0.3","info":{"title":"harbour","version":"1","description":"long","license":{"name":"MIT"}},"servers":[{"url":"https://h.example"}],
"paths":{
 "/berths":{"get":{"operationId":"x","summary":"s","parameters":[{"$ref":"#/components/parameters/page"}],"responses":{"200":{"description":"d","content":{"application/json":{"schema":{"$ref":"#/components/schemas/berth"},"examples":{"e":{"$ref":"#/components/examples/e"}}}}},"204":{"description":"d"}},"x-host":{"a":1}},"post":{"responses":{}}},
 "/ships":{"get":{"responses":{"200":{"description":"d"}}}}},
"components":{"parameters":{"page":{"in":"query","name":"page","description":"d","schema":{"type":"integer","example":3}}},
 "schemas":{"berth":{"type":"object","properties":{"description":{"type":"string"},"tags":{"type":"array","items":{"$ref":"#/components/schemas/tag"}}}},"tag":{"type":"object","properties":{"up":{"$ref":"#/components/schemas/berth"}}},"ship":{"type":"object"}},
 "examples":{"e":{"value":1}}}}`

func TestPruneKeepsWhatIsUsed(t *testing.T) {
	out, err := prune(strings.NewReader(whole), []operation{{"get", "/berths"}})
	require.NoError(t, err)
	assert.JSONEq(t, `{"openapi":"3.0.3","info":{"title":"harbour","version":"1","license":{"name":"MIT"}},"servers":[{"url":"https://h.example"}],
"paths":{"/berths":{"get":{"parameters":[{"$ref":"#/components/parameters/page"}],"responses":{"200":{"description":"","content":{"application/json":{"schema":{"$ref":"#/components/schemas/berth"}}}},"204":{"description":""}}}}},
"components":{"parameters":{"page":{"in":"query","name":"page","schema":{"type":"integer"}}},
 "schemas":{"berth":{"type":"object","properties":{"description":{"type":"string"},"tags":{"type":"array","items":{"$ref":"#/components/schemas/tag"}}}},"tag":{"type":"object","properties":{"up":{"$ref":"#/components/schemas/berth"}}}}}}`, string(out))
	again, err := prune(strings.NewReader(whole), []operation{{"get", "/berths"}})
	require.NoError(t, err)
	assert.Equal(t, string(out), string(again))
	assert.Contains(t, string(out), "\n\"/berths\": {\n\"get\": {", "a line for each operation")
}

func TestPruneNamesWhatIsMissing(t *testing.T) {
	_, err := prune(strings.NewReader(whole), []operation{{"get", "/tides"}})
	require.EqualError(t, err, "the description has no operation get /tides")
	_, err = prune(strings.NewReader(strings.Replace(whole, `"tag":{`, `"tog":{`, 1)), []operation{{"get", "/berths"}})
	require.EqualError(t, err, "the description has no #/components/schemas/tag")
	_, err = prune(strings.NewReader("{"), nil)
	require.ErrorContains(t, err, "cannot be read")
}

// What is kept beside the server is what prune writes, for just these
// operations: pruning it again changes nothing.
func TestTheKeptDescriptionIsPruned(t *testing.T) {
	kept, err := os.ReadFile("../description.json")
	require.NoError(t, err)
	again, err := prune(strings.NewReader(string(kept)), operations)
	require.NoError(t, err)
	assert.Equal(t, string(kept), string(again))
	var doc struct{ Paths map[string]map[string]any }
	require.NoError(t, json.Unmarshal(kept, &doc))
	n := 0
	for _, item := range doc.Paths {
		n += len(item)
	}
	assert.Len(t, operations, n)
}
