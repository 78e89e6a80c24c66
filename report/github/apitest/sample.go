package apitest

import (
	"fmt"
	"maps"
	"slices"
	"strings"

	"github.com/getkin/kin-openapi/openapi3"
)

// object is a JSON object.
type object = map[string]any

// sample makes the smallest value that a schema allows, with the parts that
// given says. The answers of the server have what the description promises and
// no more: code that relies on more fails here, and not on some host.
func sample(s *openapi3.Schema, given any) any {
	if alternatives := slices.Concat(s.OneOf, s.AnyOf); len(alternatives) > 0 {
		return fitting(alternatives, given)
	}
	switch given := given.(type) {
	case object:
		return sampleObject(s, given)
	case []object:
		if s.Items == nil {
			return given // not this schema: an alternative that does not fit
		}
		list := make([]any, len(given))
		for i, item := range given {
			list[i] = sample(s.Items.Value, item)
		}
		return list
	case nil:
		return smallest(s)
	}
	return given
}

// fitting is the sample of the first alternative that the schema accepts.
func fitting(alternatives openapi3.SchemaRefs, given any) (last any) {
	for _, a := range alternatives {
		last = sample(a.Value, given)
		if len(unknown(a.Value, given)) == 0 && a.Value.VisitJSON(plainJSON(last)) == nil {
			return last
		}
	}
	return last
}

func sampleObject(s *openapi3.Schema, given object) any {
	out := object{}
	for name, p := range properties(s) {
		value, set := given[name]
		switch {
		case set && value == nil:
			out[name] = nil
		case set || slices.Contains(required(s), name):
			out[name] = sample(p, or(value, timeFor(name, p)))
		}
	}
	for name, value := range given {
		if _, known := out[name]; !known {
			out[name] = value
		}
	}
	return out
}

// timeFor is a moment where a name says so and the description does not.
func timeFor(name string, s *openapi3.Schema) any {
	if strings.HasSuffix(name, "_at") && s.Type.Is("string") && !s.Nullable {
		return moment
	}
	return nil
}

func or(value, otherwise any) any {
	if value == nil {
		return otherwise
	}
	return value
}

// properties are those of a schema and of all that it is composed of.
func properties(s *openapi3.Schema) map[string]*openapi3.Schema {
	all := map[string]*openapi3.Schema{}
	for _, part := range s.AllOf {
		maps.Copy(all, properties(part.Value))
	}
	for name, p := range s.Properties {
		all[name] = p.Value
	}
	return all
}

func required(s *openapi3.Schema) []string {
	all := slices.Clone(s.Required)
	for _, part := range s.AllOf {
		all = append(all, required(part.Value)...)
	}
	return all
}

// smallest is a value with nothing given. Text that says what it is for shows
// up in a test that looks at the wrong key.
func smallest(s *openapi3.Schema) any {
	switch {
	case s.Nullable:
		return nil
	case len(s.Enum) > 0:
		return s.Enum[0]
	case s.Type.Is("string"):
		return smallestText(s)
	case s.Type.Is("integer"), s.Type.Is("number"):
		return 1
	case s.Type.Is("boolean"):
		return false
	case s.Type.Is("array"):
		return []any{}
	}
	return sampleObject(s, object{})
}

func smallestText(s *openapi3.Schema) string {
	switch s.Format {
	case "date-time":
		return moment
	case "uri":
		return "https://harbour.example/sample"
	case "email":
		return "keeper@harbour.example"
	}
	return "sample"
}

// unknown names the keys of a given value that a schema does not know. The
// description allows any key, so that a misspelt one would show nowhere.
func unknown(s *openapi3.Schema, given any) []error {
	if o, ok := given.(object); ok {
		return unknownKeys(s, o, "")
	}
	return nil
}

func unknownKeys(s *openapi3.Schema, given object, at string) (wrong []error) {
	known := properties(s)
	if len(known) == 0 {
		return nil // an object with any keys, or alternatives
	}
	for _, key := range slices.Sorted(maps.Keys(given)) {
		p := known[key]
		if p == nil {
			wrong = append(wrong, fmt.Errorf("the description has no key %s%s", at, key))
			continue
		}
		wrong = append(wrong, unknownBelow(p, given[key], at+key)...)
	}
	return wrong
}

func unknownBelow(s *openapi3.Schema, value any, at string) (wrong []error) {
	switch value := value.(type) {
	case object:
		return unknownKeys(s, value, at+".")
	case []any:
		for i, item := range value {
			if s.Items != nil {
				wrong = append(wrong, unknownBelow(s.Items.Value, item, fmt.Sprintf("%s[%d]", at, i))...)
			}
		}
	}
	return wrong
}
