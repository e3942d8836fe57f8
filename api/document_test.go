package api_test

import (
	"encoding/json"
	"os"
	"regexp"
	"slices"
	"strings"
	"sync"
	"testing"

	"github.com/pb33f/go-yaml"
	"github.com/pb33f/libopenapi"
	validator "github.com/pb33f/libopenapi-validator"
	"github.com/pb33f/libopenapi-validator/config"
	"github.com/pb33f/libopenapi-validator/content"
	"github.com/pb33f/libopenapi-validator/schema_validation"
	"github.com/pb33f/libopenapi/datamodel/high/base"
	v3 "github.com/pb33f/libopenapi/datamodel/high/v3"

	"jointledger/api"
	"jointledger/service"
)

// document is openapi.yaml with what holds exchanges against it.
type document struct {
	bytes     []byte
	model     *v3.Document
	validator validator.Validator
	schemas   schema_validation.SchemaValidator
}

// readDocument reads openapi.yaml once.
var readDocument = sync.OnceValues(func() (*document, error) {
	data, err := os.ReadFile("../openapi.yaml")
	if err != nil {
		return nil, err
	}
	parsed, err := libopenapi.NewDocument(data)
	if err != nil {
		return nil, err
	}
	built, err := parsed.BuildV3Model()
	if err != nil {
		return nil, err
	}
	options := []config.Option{config.WithFormatAssertions(), config.WithRejectUnsupportedBodyContent(), config.WithRejectUndeclaredRequestBody()}
	for _, media := range []string{"text/plain", "text/html", "application/yaml", "application/x-ndjson", "application/openmetrics-text"} {
		options = append(options, config.WithBodyDecoder(media, content.TextDecoder()))
	}
	held, errs := validator.NewValidator(parsed, options...)
	if len(errs) > 0 {
		return nil, errs[0]
	}
	return &document{data, &built.Model, held, schema_validation.NewSchemaValidator(options...)}, nil
})

func theDocument(t testing.TB) *document {
	t.Helper()
	d, err := readDocument()
	if err != nil {
		t.Fatalf("openapi.yaml: %v", err)
	}
	return d
}

// operation is one operation of the document.
type operation struct {
	method, path string
	*v3.Operation
}

func (d *document) operations() []operation {
	var list []operation
	for path, item := range d.model.Paths.PathItems.FromOldest() {
		for method, op := range item.GetOperations().FromOldest() {
			list = append(list, operation{strings.ToUpper(method), path, op})
		}
	}
	return list
}

func (d *document) operation(t testing.TB, id string) operation {
	t.Helper()
	for _, op := range d.operations() {
		if op.OperationId == id {
			return op
		}
	}
	t.Fatalf("the document has no operation %s", id)
	return operation{}
}

// media is the media type of the operation's body, empty for none.
func (o operation) media() string {
	if o.RequestBody == nil {
		return ""
	}
	return o.RequestBody.Content.First().Key()
}

// statuses are those that the operation documents.
func (o operation) statuses() []string {
	var list []string
	for status := range o.Responses.Codes.FromOldest() {
		list = append(list, status)
	}
	return list
}

var leastRole = regexp.MustCompile(`Least role: ([a-z]+)`)

// least is the role that the description asks for, empty for an operation that
// is open to everybody.
func (o operation) least() service.Role {
	if found := leastRole.FindStringSubmatch(o.Description); found != nil {
		return service.Role(found[1])
	}
	return ""
}

// takes reports whether the operation knows a header.
func (o operation) takes(header string) bool {
	return slices.ContainsFunc(o.Parameters, func(p *v3.Parameter) bool { return p.In == "header" && p.Name == header })
}

// examples are the named bodies of the operation, as JSON.
func (o operation) examples(t testing.TB) map[string][]byte {
	t.Helper()
	bodies := map[string][]byte{}
	if o.RequestBody == nil {
		return bodies
	}
	for _, media := range o.RequestBody.Content.FromOldest() {
		for name, example := range media.Examples.FromOldest() {
			bodies[name] = exampleJSON(t, example)
		}
	}
	return bodies
}

func exampleJSON(t testing.TB, example *base.Example) []byte {
	t.Helper()
	var value any
	if err := example.Value.Decode(&value); err != nil {
		t.Fatal(err)
	}
	if text, ok := value.(string); ok {
		return []byte(text) // of many lines
	}
	body, err := json.Marshal(value)
	if err != nil {
		t.Fatal(err)
	}
	return body
}

func TestDocumentIsOpenAPI(t *testing.T) {
	d := theDocument(t)
	if ok, errs := d.validator.ValidateDocument(); !ok {
		for _, err := range errs {
			t.Error(err)
		}
	}
	// A comma in a text without quotes makes a member without a value of what
	// follows it, which no validator minds.
	var root yaml.Node
	if err := yaml.Unmarshal(d.bytes, &root); err != nil {
		t.Fatal(err)
	}
	var walk func(*yaml.Node)
	walk = func(n *yaml.Node) {
		for i, child := range n.Content {
			if n.Kind == yaml.MappingNode && i%2 == 1 && child.Tag == "!!null" && n.Content[i-1].Value != "between" {
				t.Errorf("line %d: %q has no value", child.Line, n.Content[i-1].Value)
			}
			walk(child)
		}
	}
	walk(&root)
	ids := map[string]bool{}
	for _, op := range d.operations() {
		where := op.method + " " + op.path
		if op.OperationId == "" || ids[op.OperationId] {
			t.Errorf("%s: the operationId %q is missing or taken", where, op.OperationId)
		}
		ids[op.OperationId] = true
		if op.Summary == "" || op.Description == "" || len(op.Tags) != 1 {
			t.Errorf("%s: summary, description or tag is missing", where)
		}
		for _, p := range op.Parameters {
			if p.Description == "" || p.Schema == nil {
				t.Errorf("%s: the parameter %s has no description or no schema", where, p.Name)
			}
			if p.In == "query" && p.Required != nil && *p.Required && p.Example == nil {
				t.Errorf("%s: the parameter %s is required and has no example", where, p.Name)
			}
		}
		if op.RequestBody != nil && len(op.examples(t)) == 0 {
			t.Errorf("%s: the body has no example", where)
		}
		for status, response := range op.Responses.Codes.FromOldest() {
			if response.Headers.GetOrZero("X-Request-Id") == nil {
				t.Errorf("%s: the answer %s does not document X-Request-Id", where, status)
			}
			if isProblem := response.Content != nil && response.Content.GetOrZero("application/problem+json") != nil; isProblem != (status >= "400") {
				t.Errorf("%s: the answer %s is a problem: %t", where, status, isProblem)
			}
		}
	}
	for name, proxy := range d.model.Components.Schemas.FromOldest() {
		schema := proxy.Schema()
		if slices.Contains(schema.Type, "object") && schema.AdditionalProperties == nil {
			t.Errorf("the schema %s lets unknown members pass", name)
		}
		if schema.Properties == nil {
			continue
		}
		for _, required := range schema.Required {
			if schema.Properties.GetOrZero(required) == nil {
				t.Errorf("the schema %s requires the member %s, which it does not have", name, required)
			}
		}
	}
}

var pathParameter = regexp.MustCompile(`:(\w+)`)

func TestRoutesAndDocumentAreTheSame(t *testing.T) {
	d := theDocument(t)
	type face struct {
		least service.Role
		query string
		media string
	}
	documented := map[string]face{}
	for _, op := range d.operations() {
		var query []string
		for _, p := range op.Parameters {
			if p.In == "query" {
				query = append(query, p.Name)
			}
		}
		slices.Sort(query)
		documented[op.method+" "+op.path] = face{op.least(), strings.Join(query, " "), op.media()}
		if open := op.Security != nil && len(op.Security) == 0; open != (op.least() == "") {
			t.Errorf("%s %s: security and least role contradict each other", op.method, op.path)
		}
	}
	for _, r := range api.Routes() {
		key := r.Method + " " + pathParameter.ReplaceAllString(r.Path, "{$1}")
		query := slices.Sorted(slices.Values(r.Query))
		found, ok := documented[key]
		if want := (face{r.Least, strings.Join(query, " "), r.Media}); !ok {
			t.Errorf("%s is not documented", key)
		} else if found != want {
			t.Errorf("%s: documented %+v, served %+v", key, found, want)
		}
		delete(documented, key)
	}
	for key := range documented {
		t.Errorf("%s is documented and not served", key)
	}
}
