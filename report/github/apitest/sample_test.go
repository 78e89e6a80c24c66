package apitest

import (
	"testing"

	"github.com/getkin/kin-openapi/openapi3"
	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

func schemaOf(t *testing.T, text string) *openapi3.Schema {
	t.Helper()
	var s openapi3.SchemaRef
	require.NoError(t, s.UnmarshalJSON([]byte(text)))
	return s.Value
}

const berth = `{"type":"object","required":["name","depth","open","since","page","kind","ships","tug"],"properties":{
	"name":{"type":"string"},"depth":{"type":"integer"},"open":{"type":"boolean"},"since":{"type":"string","format":"date-time"},
	"page":{"type":"string","format":"uri"},"kind":{"enum":["quay","pier"],"type":"string"},"ships":{"type":"array","items":{"type":"object","required":["name"],"properties":{"name":{"type":"string"},"flag":{"type":"string"}}}},
	"tug":{"type":"string","nullable":true},"note":{"type":"string"}}}`

func TestSamplesHaveWhatIsPromisedAndNoMore(t *testing.T) {
	got := sample(schemaOf(t, berth), nil)
	assert.Equal(t, object{"name": "sample", "depth": 1, "open": false, "since": moment, "page": "https://harbour.example/sample", "kind": "quay", "ships": []any{}, "tug": nil}, got)
	require.NoError(t, schemaOf(t, berth).VisitJSON(plainJSON(got)))
}

func TestSamplesTakeWhatIsGiven(t *testing.T) {
	got := sample(schemaOf(t, berth), object{"depth": 9, "note": "deep", "ships": []object{{"flag": "x"}}}).(object)
	assert.Equal(t, 9, got["depth"])
	assert.Equal(t, "deep", got["note"])
	assert.Equal(t, []any{object{"name": "sample", "flag": "x"}}, got["ships"])
	require.NoError(t, schemaOf(t, berth).VisitJSON(plainJSON(got)))
}

func TestSamplesPickTheAlternativeThatFits(t *testing.T) {
	s := schemaOf(t, `{"oneOf":[{"type":"object","required":["a"],"properties":{"a":{"type":"integer"}}},{"type":"object","required":["b"],"properties":{"b":{"type":"integer"}}},{"type":"array","items":{"type":"object","properties":{"c":{"type":"string"}}}}]}`)
	assert.Equal(t, object{"b": 2}, sample(s, object{"b": 2}))
	assert.Equal(t, []any{object{"c": "x"}}, sample(s, []object{{"c": "x"}}))
}

func TestSamplesOfComposedSchemas(t *testing.T) {
	s := schemaOf(t, `{"allOf":[{"type":"object","required":["a"],"properties":{"a":{"type":"string"}}},{"type":"object","required":["b"],"properties":{"b":{"type":"string"}}}]}`)
	assert.Equal(t, object{"a": "sample", "b": "x"}, sample(s, object{"b": "x"}))
}

func TestUnknownKeysAreNamed(t *testing.T) {
	s := schemaOf(t, berth)
	assert.Empty(t, unknown(s, object{"depth": 1}))
	wrong := unknownKeys(s, object{"dept": 1, "ships": []any{object{"nam": "x"}}}, "")
	require.Len(t, wrong, 2)
	assert.EqualError(t, wrong[0], "the description has no key dept")
	assert.EqualError(t, wrong[1], "the description has no key ships[0].nam")
}
