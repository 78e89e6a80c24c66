package budget

import (
	"fmt"
	"reflect"
	"slices"
	"strings"

	"github.com/agnivade/levenshtein"
	"github.com/pelletier/go-toml/v2"

	"budgetcheck/budget/finding"
)

// Place is where a table of the policy stands.
type Place struct {
	File string
	Line int
	keys map[string]*node // as written; files that add up may share one table
}

// said tells whether the table has the key.
func (p Place) said(key string) bool { return p.keys[key] != nil }

// item is where an item of one of the table's lists stands.
func (p Place) item(key string, n int) Place {
	i := p.keys[key].list[n]
	return Place{File: i.file, Line: i.line}
}

// either is the one of two keys that the table has.
func (p Place) either(a, b string) string {
	if p.said(a) {
		return a
	}
	return b
}

// of is where a key of the table stands, or the table itself.
func (p Place) of(key string) (file string, line int) {
	if n := p.keys[key]; n != nil {
		return n.file, n.line
	}
	return p.File, p.Line
}

// setter is a value that is written as text, like the quantities of unit.
type setter interface{ Set(string) error }

// decoder fills structs from nodes. Fields carry the tags
//
//	toml:"key"           the key; "key,required" where it must be there
//	oneof:"a b"          the words allowed
//
// and every struct of a table embeds Place. A key without a field is a finding
// that names the nearest one: a misspelt key must not pass in silence.
type decoder struct{ report func(finding.Finding) }

func (d decoder) refuse(n *node, do, format string, args ...any) {
	d.report(finding.Finding{File: n.file, Line: n.line, What: fmt.Sprintf(format, args...), Do: do})
}

// table fills the struct v from n. name is what messages call the table.
func (d decoder) table(n *node, v reflect.Value, name string) {
	if p := v.FieldByName("Place"); p.IsValid() {
		p.Set(reflect.ValueOf(Place{n.file, n.line, n.table}))
	}
	if n.table == nil {
		d.refuse(n, "write it as a table", "%s is not a table", name)
		return
	}
	fields := fieldsOf(v)
	for _, key := range n.keys() {
		inner := n.table[key]
		f, ok := fields[key]
		if !ok {
			d.refuse(inner, suggest(key, fields), "unknown key %s", qualified(name, key))
			continue
		}
		d.value(inner, f, qualified(name, key))
	}
	for _, key := range required(v.Type()) {
		switch inner := n.table[key]; {
		case inner == nil:
			d.refuse(n, "add it", "%s has no %s", or(name, "the policy"), key)
		case inner.value == "":
			d.refuse(inner, "write what it is", "%s is empty", qualified(name, key))
		}
	}
}

func qualified(table, key string) string {
	if table == "" {
		return key
	}
	return table + "." + key
}

func or(text, instead string) string {
	if text == "" {
		return instead
	}
	return text
}

// field is where a key's value goes.
type field struct {
	value reflect.Value
	oneOf []string
}

func fieldsOf(v reflect.Value) map[string]field {
	fields := map[string]field{}
	for i := range v.NumField() {
		tag := v.Type().Field(i).Tag
		if key, _, _ := strings.Cut(tag.Get("toml"), ","); key != "" {
			fields[key] = field{v.Field(i), strings.Fields(tag.Get("oneof"))}
		}
	}
	return fields
}

func required(t reflect.Type) (keys []string) {
	for i := range t.NumField() {
		if key, option, _ := strings.Cut(t.Field(i).Tag.Get("toml"), ","); option == "required" {
			keys = append(keys, key)
		}
	}
	return keys
}

// suggest names the nearest known key.
func suggest(key string, fields map[string]field) string {
	var known []string
	for k := range fields {
		known = append(known, k)
	}
	slices.Sort(known)
	return "use one of " + strings.Join(known, ", ") + nearest(key, known)
}

func nearest(word string, known []string) string {
	best, distance := "", len(word)/2+1
	for _, k := range known {
		if n := levenshtein.ComputeDistance(word, k); n < distance {
			best, distance = k, n
		}
	}
	if best == "" {
		return ""
	}
	return fmt.Sprintf("; did you mean %s?", best)
}

func (d decoder) value(n *node, f field, name string) {
	v := f.value
	if v.Kind() == reflect.Pointer {
		v.Set(reflect.New(v.Type().Elem()))
		f.value = v.Elem()
		d.value(n, f, name)
		return
	}
	if s, ok := v.Addr().Interface().(setter); ok {
		d.set(n, s, name)
		return
	}
	switch v.Kind() {
	case reflect.Struct:
		d.structure(n, v, name)
	case reflect.Map:
		d.named(n, v, name)
	case reflect.Slice:
		d.items(n, f, name)
	default:
		d.scalar(n, f, name)
	}
}

// set parses a quantity. A bare number is passed on as text: a share needs no
// unit, and the other quantities say which unit they miss.
func (d decoder) set(n *node, s setter, name string) {
	if n.value == nil {
		d.refuse(n, "write it in quotation marks", "%s is not a text", name)
		return
	}
	if err := s.Set(fmt.Sprint(n.value)); err != nil {
		what, do, _ := strings.Cut(err.Error(), "; ")
		d.refuse(n, do, "%s: %s", name, what)
	}
}

func (d decoder) structure(n *node, v reflect.Value, name string) {
	if date, ok := v.Addr().Interface().(*toml.LocalDate); ok {
		if *date, ok = n.value.(toml.LocalDate); !ok {
			d.refuse(n, "write a date without quotation marks, like 2031-04-01", "%s is not a date", name)
		}
		return
	}
	d.table(n, v, name)
}

// named fills a map of tables, [site.quay-north].
func (d decoder) named(n *node, v reflect.Value, name string) {
	if n.table == nil {
		d.refuse(n, fmt.Sprintf("write [%s.NAME]", name), "%s is not a table of names", name)
		return
	}
	v.Set(reflect.MakeMap(v.Type()))
	for _, key := range n.keys() {
		item := reflect.New(v.Type().Elem().Elem())
		d.table(n.table[key], item.Elem(), qualified(name, key))
		item.Elem().FieldByName("Name").SetString(key)
		v.SetMapIndex(reflect.ValueOf(key), item)
	}
}

// items fills a list of texts or an array of tables.
func (d decoder) items(n *node, f field, name string) {
	if n.list == nil {
		d.refuse(n, "write it as a list", "%s is not a list", name)
		return
	}
	out := reflect.MakeSlice(f.value.Type(), len(n.list), len(n.list))
	for i, inner := range n.list {
		d.value(inner, field{out.Index(i), f.oneOf}, name)
	}
	f.value.Set(out)
}

func (d decoder) scalar(n *node, f field, name string) {
	v := reflect.ValueOf(n.value)
	switch kind := f.value.Kind(); {
	case !v.IsValid():
		d.refuse(n, "write one value", "%s is a table or a list", name)
	case kind == reflect.Float64 && v.Kind() == reflect.Int64:
		f.value.SetFloat(float64(v.Int()))
	case v.Kind() == kind || kind == reflect.Int && v.Kind() == reflect.Int64:
		f.value.Set(v.Convert(f.value.Type()))
	default:
		d.refuse(n, fmt.Sprintf("write a %s", wordFor(kind)), "%s is %v", name, n.value)
	}
	if word, ok := n.value.(string); ok && len(f.oneOf) > 0 && !slices.Contains(f.oneOf, word) {
		d.refuse(n, "write one of "+strings.Join(f.oneOf, ", ")+nearest(word, f.oneOf), "%s is %q", name, word)
	}
}

func wordFor(k reflect.Kind) string {
	return map[reflect.Kind]string{reflect.String: "text in quotation marks", reflect.Bool: "bare true or false",
		reflect.Int: "whole number", reflect.Float64: "number"}[k]
}
