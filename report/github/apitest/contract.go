package apitest

import (
	"context"
	_ "embed" // the description
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"net/http"
	"net/url"
	"strings"
	"sync"

	"github.com/getkin/kin-openapi/openapi3"
	"github.com/getkin/kin-openapi/openapi3filter"
	"github.com/getkin/kin-openapi/routers"
	"github.com/getkin/kin-openapi/routers/gorillamux"
)

//go:embed description.json
var description []byte

// contract is the code host's published description of its API.
type contract struct {
	doc    *openapi3.T
	router routers.Router
}

// published is read once, for all servers of a test binary.
var published = sync.OnceValues(readContract)

func readContract() (*contract, error) {
	// Two parameters of the description take several segments of a path.
	whole := strings.NewReplacer("/contents/{path}", "/contents/{path:.+}", "/git/ref/{ref}", "/git/ref/{ref:.+}").Replace(string(description))
	doc, err := openapi3.NewLoader().LoadFromData([]byte(whole))
	if err != nil {
		return nil, err
	}
	doc.Servers = nil // it is served wherever the test server listens
	amend(doc)
	if err := doc.Validate(context.Background()); err != nil {
		return nil, err
	}
	router, err := gorillamux.NewRouter(doc)
	return &contract{doc, router}, err
}

// amend says what the host does and the description forgets: the head of a
// pull request has no repository once that was deleted.
func amend(doc *openapi3.T) {
	for _, name := range []string{"pull-request", "pull-request-simple"} {
		head := doc.Components.Schemas[name].Value.Properties["head"].Value
		gone := *head.Properties["repo"].Value
		gone.Nullable = true
		head.Properties["repo"] = openapi3.NewSchemaRef("", &gone)
	}
}

// brief tells a breach in a line, not with the whole schema.
var brief = []openapi3.SchemaValidationOption{openapi3.DisableSchemaErrorDetails()}

// call is a request that was found in the description.
type call struct {
	operation string // "GET /repos/{owner}/{repo}/pulls"
	params    map[string]string
	query     url.Values
	body      map[string]any // nil without one
	input     *openapi3filter.RequestValidationInput
}

// number is a parameter of the path as a number.
func (c *call) number(name string) (n int64) {
	fmt.Sscan(c.params[name], &n)
	return n
}

// text is a string of the body, empty if it is not there.
func (c *call) text(key string) string {
	text, _ := c.body[key].(string)
	return text
}

// request checks a request. path is without the base address of the API.
func (c *contract) request(r *http.Request, path string) (*call, error) {
	r = r.Clone(r.Context())
	at, err := url.Parse(path)
	if err != nil {
		return nil, err
	}
	r.URL.Path, r.URL.RawPath = at.Path, at.RawPath
	route, params, err := c.router.FindRoute(r)
	if err != nil {
		return nil, fmt.Errorf("%s %s: %w", r.Method, path, err)
	}
	in := &openapi3filter.RequestValidationInput{Request: r, PathParams: params, Route: route, Options: &openapi3filter.Options{
		MultiError: true, SkipSettingDefaults: true, RejectWhenRequestBodyNotSpecified: true, SchemaValidationOptions: brief,
	}}
	if err := openapi3filter.ValidateRequest(r.Context(), in); err != nil {
		return nil, fmt.Errorf("%s %s: %w", r.Method, path, err)
	}
	found := &call{operation: r.Method + " " + route.Path, params: map[string]string{}, query: r.URL.Query(), input: in}
	for name, value := range params {
		name, _, _ = strings.Cut(name, ":")
		if found.params[name], err = url.PathUnescape(value); err != nil {
			return nil, err
		}
	}
	return found, found.strict(r.Body)
}

// strict refuses what the description does not name. It allows any further
// key, so that one we misspelt would pass and do nothing.
func (c *call) strict(body io.Reader) error {
	op := c.input.Route.Operation
	var wrong []error
	for name := range c.query {
		if op.Parameters.GetByInAndName("query", name) == nil {
			wrong = append(wrong, fmt.Errorf("%s: the description has no query parameter %q", c.operation, name))
		}
	}
	if op.RequestBody == nil {
		return errors.Join(wrong...)
	}
	if err := json.NewDecoder(body).Decode(&c.body); err != nil {
		return fmt.Errorf("%s: the body is no JSON object: %w", c.operation, err)
	}
	schema := op.RequestBody.Value.Content.Get("application/json").Schema.Value
	return errors.Join(append(wrong, unknownKeys(schema, c.body, "")...)...)
}

// response checks what the server is about to answer. The description leaves
// out many refusals; they all have the form of its basic error.
func (c *contract) response(in *call, status int, header http.Header, body []byte) error {
	v := &openapi3filter.ResponseValidationInput{RequestValidationInput: in.input, Status: status, Header: header,
		Options: &openapi3filter.Options{MultiError: true, IncludeResponseStatus: true, SchemaValidationOptions: brief}}
	v.SetBodyBytes(body)
	if status >= 400 && in.input.Route.Operation.Responses.Status(status) == nil {
		var value any
		if err := json.Unmarshal(body, &value); err != nil {
			return err
		}
		return c.doc.Components.Schemas["basic-error"].Value.VisitJSON(value)
	}
	if err := openapi3filter.ValidateResponse(in.input.Request.Context(), v); err != nil {
		return fmt.Errorf("answer %d to %s: %w", status, in.operation, err)
	}
	return nil
}

// answers is the schema of an operation's answer; nil if it has no body.
func (c *call) answers(status int) *openapi3.Schema {
	response := c.input.Route.Operation.Responses.Status(status)
	if response == nil || response.Value.Content.Get("application/json") == nil {
		return nil
	}
	return response.Value.Content.Get("application/json").Schema.Value
}
