package pages

import (
	"fmt"
	"net/http"
	"slices"
	"strings"

	yaml "github.com/pb33f/go-yaml"
)

// reference is the OpenAPI document, laid out to be read.
type reference struct {
	Title, Version, Summary string
	Description             []paragraph
	Groups                  []operationGroup
	Schemas                 []schemaEntry
}

type operationGroup struct {
	Name, Description string
	Operations        []operation
}

type operation struct {
	ID, Method, Path, Summary string
	Description               []paragraph
	Parameters                []parameter
	Request                   string // the type of its body
	Named                     bool   // Request is the name of a schema
	Answers                   []answerEntry
	Examples                  []example
}

type parameter struct{ Name, In, Required, Description string }

type answerEntry struct{ Status, Description, Schema string }

type example struct {
	Summary     string
	Description []paragraph
	Value       string
}

type schemaEntry struct {
	Name, Description string
	Members           []member
	Words             string
}

type member struct{ Name, Type, Required, Description string }

// paragraph is a piece of text with its code and its stress marked.
type paragraph []span

type span struct {
	Text         string
	Code, Strong bool
}

// node walks the document; a missing member is an empty node.
type node struct{ n *yaml.Node }

func (n node) at(path ...string) node {
	for _, name := range path {
		found := node{}
		if n.n != nil && n.n.Kind == yaml.MappingNode {
			for i := 0; i+1 < len(n.n.Content); i += 2 {
				if n.n.Content[i].Value == name {
					found = node{n.n.Content[i+1]}
				}
			}
		}
		n = found
	}
	return n
}

func (n node) text() string {
	if n.n == nil || n.n.Kind != yaml.ScalarNode {
		return ""
	}
	return n.n.Value
}

// each calls for every member of a mapping, or every item of a list.
func (n node) each(do func(name string, value node)) {
	if n.n == nil {
		return
	}
	switch n.n.Kind {
	case yaml.MappingNode:
		for i := 0; i+1 < len(n.n.Content); i += 2 {
			do(n.n.Content[i].Value, node{n.n.Content[i+1]})
		}
	case yaml.SequenceNode:
		for _, item := range n.n.Content {
			do("", node{item})
		}
	}
}

// follow returns what a reference within the document stands for.
func (n node) follow(root node) node {
	if ref, ok := strings.CutPrefix(n.at("$ref").text(), "#/"); ok {
		return root.at(strings.Split(ref, "/")...)
	}
	return n
}

// readReference reads an OpenAPI document.
func readReference(text []byte) (*reference, error) {
	var document yaml.Node
	if err := yaml.Unmarshal(text, &document); err != nil {
		return nil, fmt.Errorf("the OpenAPI document cannot be read: %w", err)
	}
	if len(document.Content) != 1 {
		return nil, fmt.Errorf("the OpenAPI document is not one document")
	}
	root := node{document.Content[0]}
	info := root.at("info")
	r := &reference{
		Title: info.at("title").text(), Version: info.at("version").text(), Summary: info.at("summary").text(),
		Description: paragraphs(info.at("description").text()),
	}
	root.at("tags").each(func(_ string, tag node) {
		r.Groups = append(r.Groups, operationGroup{Name: tag.at("name").text(), Description: tag.at("description").text()})
	})
	root.at("paths").each(func(path string, methods node) {
		methods.each(func(method string, o node) {
			if o.at("operationId").text() == "" {
				return
			}
			tag := ""
			o.at("tags").each(func(_ string, t node) { tag = t.text() })
			i := slices.IndexFunc(r.Groups, func(g operationGroup) bool { return g.Name == tag })
			if i < 0 {
				i = len(r.Groups)
				r.Groups = append(r.Groups, operationGroup{Name: tag})
			}
			r.Groups[i].Operations = append(r.Groups[i].Operations, operationOf(root, strings.ToUpper(method), path, o))
		})
	})
	root.at("components", "schemas").each(func(name string, s node) { r.Schemas = append(r.Schemas, schemaOf(name, s)) })
	return r, nil
}

func operationOf(root node, method, path string, o node) operation {
	out := operation{
		ID: o.at("operationId").text(), Method: method, Path: path, Summary: o.at("summary").text(), Description: paragraphs(o.at("description").text()),
	}
	o.at("parameters").each(func(_ string, p node) {
		p = p.follow(root)
		required := ""
		if p.at("required").text() == "true" {
			required = "required"
		}
		out.Parameters = append(out.Parameters, parameter{p.at("name").text(), p.at("in").text(), required, p.at("description").text()})
	})
	o.at("requestBody").follow(root).at("content").each(func(_ string, content node) {
		out.Request, out.Named = typeOf(content.at("schema")), content.at("schema", "$ref").text() != ""
		content.at("examples").each(func(_ string, e node) {
			e = e.follow(root)
			out.Examples = append(out.Examples, exampleOf(e))
		})
	})
	o.at("responses").each(func(status string, a node) {
		a = a.follow(root)
		schema := ""
		a.at("content").each(func(media string, content node) {
			if schema = typeOf(content.at("schema")); schema == "string" || schema == "" {
				schema = media
			}
		})
		out.Answers = append(out.Answers, answerEntry{status, a.at("description").text(), schema})
	})
	return out
}

func exampleOf(e node) example {
	out := example{Summary: e.at("summary").text(), Description: paragraphs(e.at("description").text())}
	if value := e.at("value"); value.n != nil {
		if text, err := yaml.Marshal(value.n); err == nil {
			out.Value = string(text)
		}
	}
	return out
}

// typeOf names the type of a schema; that of a reference is its name.
func typeOf(s node) string {
	if ref := s.at("$ref").text(); ref != "" {
		return ref[strings.LastIndexByte(ref, '/')+1:]
	}
	for _, list := range []string{"anyOf", "oneOf", "allOf"} {
		var names []string
		s.at(list).each(func(_ string, one node) { names = append(names, typeOf(one)) })
		if names != nil {
			return strings.Join(names, " or ")
		}
	}
	if constant := s.at("const").text(); constant != "" {
		return `"` + constant + `"`
	}
	var words []string
	s.at("enum").each(func(_ string, word node) { words = append(words, `"`+word.text()+`"`) })
	if words != nil {
		return strings.Join(words, ", ")
	}
	kind := s.at("type").text()
	if kind == "" {
		var kinds []string
		s.at("type").each(func(_ string, one node) { kinds = append(kinds, one.text()) })
		kind = strings.Join(kinds, " or ")
	}
	switch kind {
	case "array":
		if item := typeOf(s.at("items")); item != "" {
			return "list of " + item
		}
		return "list"
	case "":
		return "any"
	}
	return kind
}

func schemaOf(name string, s node) schemaEntry {
	out := schemaEntry{Name: name, Description: s.at("description").text()}
	required := map[string]bool{}
	s.at("required").each(func(_ string, r node) { required[r.text()] = true })
	s.at("properties").each(func(property string, p node) {
		m := member{Name: property, Type: typeOf(p), Description: p.at("description").text()}
		if required[property] {
			m.Required = "required"
		}
		if d := p.at("default"); d.text() != "" {
			m.Description = strings.TrimSpace(m.Description + " Default " + d.text() + ".")
		}
		out.Members = append(out.Members, m)
	})
	if len(out.Members) == 0 {
		out.Words = typeOf(s)
	}
	return out
}

// paragraphs splits the little Markdown of the document: blank lines between
// paragraphs, code in backquotes, stress in double asterisks.
func paragraphs(text string) []paragraph {
	var all []paragraph
	for _, block := range strings.Split(strings.TrimSpace(text), "\n\n") {
		block = strings.Join(strings.Fields(block), " ")
		if block == "" {
			continue
		}
		var p paragraph
		for i, piece := range strings.Split(block, "`") {
			if i%2 == 1 {
				p = append(p, span{Text: piece, Code: true})
				continue
			}
			for k, part := range strings.Split(piece, "**") {
				if part != "" {
					p = append(p, span{Text: part, Strong: k%2 == 1})
				}
			}
		}
		all = append(all, p)
	}
	return all
}

func (p *Pages) document(v *visit) error {
	reference, err := p.reference()
	if err != nil {
		return err
	}
	p.show(v, http.StatusOK, "document", "The API", reference)
	return nil
}
