package main

import (
	"encoding/json"
	"fmt"
	"io"
	"maps"
	"slices"
	"strings"
)

// operation is a method, in lower case, of a path of the description.
type operation struct{ method, path string }

// object is a JSON object.
type object = map[string]any

// prose are the keys that say nothing about what is valid. They are most of
// the description. Where keys are names (of properties, of parameters) a
// property called "description" stays.
var prose = []string{"description", "summary", "example", "examples", "externalDocs", "tags", "operationId"}

// names are the keys whose values are objects keyed by names of their own.
var names = []string{"properties", "headers", "responses", "content", "paths", "schemas", "parameters"}

// prune reads a description and writes what the operations need of it, one
// line for each path and component so that a new version can be compared.
func prune(r io.Reader, wanted []operation) ([]byte, error) {
	var whole object
	if err := json.NewDecoder(r).Decode(&whole); err != nil {
		return nil, fmt.Errorf("the description cannot be read: %w", err)
	}
	paths := object{}
	for _, o := range wanted {
		if err := take(paths, whole, o); err != nil {
			return nil, err
		}
	}
	c := components{whole: whole, kept: object{}}
	if err := c.follow(paths); err != nil {
		return nil, err
	}
	info, _ := whole["info"].(object)
	return lines(object{
		"openapi": whole["openapi"], "servers": whole["servers"], "paths": paths, "components": c.kept,
		"info": object{"title": info["title"], "version": info["version"], "license": info["license"]},
	})
}

// take copies one operation, without prose.
func take(paths, whole object, o operation) error {
	all, _ := whole["paths"].(object)
	item, _ := all[o.path].(object)
	op, _ := item[o.method].(object)
	if op == nil {
		return fmt.Errorf("the description has no operation %s %s", o.method, o.path)
	}
	kept, _ := paths[o.path].(object)
	if kept == nil {
		kept = object{}
		paths[o.path] = kept
	}
	kept[o.method] = bare(op, false)
	return nil
}

// bare copies a value without prose and extensions. keyed says that the keys
// of this object are names.
func bare(v any, keyed bool) any {
	switch v := v.(type) {
	case object:
		out := object{}
		for key, inner := range v {
			if keyed || !slices.Contains(prose, key) && !strings.HasPrefix(key, "x-") {
				out[key] = bare(inner, !keyed && slices.Contains(names, key))
			}
		}
		return described(out, v)
	case []any:
		out := make([]any, len(v))
		for i, inner := range v {
			out[i] = bare(inner, false)
		}
		return out
	}
	return v
}

// described keeps an empty description where OpenAPI demands one: in a
// response, which is what has a description and either content or nothing.
func described(out, from object) object {
	_, had := from["description"].(string)
	_, content := from["content"]
	if had && (content || len(out) == 0) {
		out["description"] = ""
	}
	return out
}

// components are the parts that others refer to.
type components struct{ whole, kept object }

// follow keeps all that v refers to, and what that refers to.
func (c components) follow(v any) error {
	switch v := v.(type) {
	case object:
		if ref, ok := v["$ref"].(string); ok {
			return c.keep(ref)
		}
		for _, key := range slices.Sorted(maps.Keys(v)) {
			if err := c.follow(v[key]); err != nil {
				return err
			}
		}
	case []any:
		for _, inner := range v {
			if err := c.follow(inner); err != nil {
				return err
			}
		}
	}
	return nil
}

func (c components) keep(ref string) error {
	kind, name, ok := strings.Cut(strings.TrimPrefix(ref, "#/components/"), "/")
	all, _ := c.whole["components"].(object)
	of, _ := all[kind].(object)
	part := of[name]
	if !ok || part == nil {
		return fmt.Errorf("the description has no %s", ref)
	}
	kept, _ := c.kept[kind].(object)
	if kept == nil {
		kept = object{}
		c.kept[kind] = kept
	}
	if kept[name] != nil {
		return nil
	}
	kept[name] = bare(part, false)
	return c.follow(kept[name])
}

// lines writes an object with one line for each of its grandchildren.
func lines(o object) ([]byte, error) {
	var b strings.Builder
	err := nest(&b, o, 2)
	b.WriteString("\n")
	return []byte(b.String()), err
}

func nest(b *strings.Builder, v any, depth int) error {
	o, ok := v.(object)
	if !ok || depth < 0 {
		text, err := json.Marshal(v)
		b.Write(text)
		return err
	}
	separator := "{\n"
	for _, key := range slices.Sorted(maps.Keys(o)) {
		fmt.Fprintf(b, "%s%q: ", separator, key)
		if err := nest(b, o[key], depth-1); err != nil {
			return err
		}
		separator = ",\n"
	}
	if separator == "{\n" {
		b.WriteString("{")
	}
	b.WriteString("}")
	return nil
}
