package config

import (
	"fmt"
	"maps"
	"math"
	"reflect"
	"slices"
	"strings"
)

// read assigns the values of a file to the fields of cfg. Unknown keys become
// problems at once; values of a wrong type are only marked, so that the check of
// their key can say what is allowed.
func (c *checker) read(cfg *Config, values map[string]any) {
	c.readTable("", values, reflect.ValueOf(cfg).Elem())
}

// readTable assigns the keys of one table to the struct v.
func (c *checker) readTable(path string, values map[string]any, v reflect.Value) {
	for _, key := range slices.Sorted(maps.Keys(values)) {
		field, ok := fieldOf(v, key)
		if !ok {
			c.unknown(path, key, values[key], v.Type())
			continue
		}
		c.readValue(join(path, key), values[key], field)
	}
}

// readValue assigns one value to a field, or marks it as of a wrong type.
func (c *checker) readValue(path string, value any, field reflect.Value) {
	ok := false
	switch field.Kind() {
	case reflect.Struct:
		var table map[string]any
		if table, ok = value.(map[string]any); ok {
			c.readTable(path, table, field)
		}
	case reflect.Pointer:
		ok = c.readOptional(path, value, field)
	case reflect.Slice:
		ok = c.readList(path, value, field)
	default:
		ok = assign(field, value)
	}
	if !ok {
		c.wrong[path] = kindOf(value)
	}
}

// readOptional reads a table that may be left out.
func (c *checker) readOptional(path string, value any, field reflect.Value) bool {
	table, ok := value.(map[string]any)
	if !ok {
		return false
	}
	if field.Type() == reflect.TypeFor[*Rig]() {
		field.Set(reflect.ValueOf(defaultRig()))
	} else {
		field.Set(reflect.New(field.Type().Elem()))
	}
	c.readTable(path, table, field.Elem())
	return true
}

// readList reads a list; one whole number stands for a list of one.
func (c *checker) readList(path string, value any, field reflect.Value) bool {
	list, ok := value.([]any)
	if n, whole := value.(int64); whole && field.Type().Elem().Kind() == reflect.Int {
		list, ok = []any{n}, true
	}
	if !ok {
		return false
	}
	field.Set(reflect.MakeSlice(field.Type(), len(list), len(list)))
	for i, element := range list {
		c.readValue(path+index(i), element, field.Index(i))
	}
	return true
}

// assign sets a field to a value of its type; a whole number will do for a
// number. A whole number beyond 32 bits is cut to them, which is outside every
// range, so that all boards say the same of it.
func assign(field reflect.Value, value any) bool {
	switch x := value.(type) {
	case string:
		if field.Kind() == reflect.String {
			field.SetString(x)
			return true
		}
	case bool:
		if field.Kind() == reflect.Bool {
			field.SetBool(x)
			return true
		}
	case int64:
		switch field.Kind() {
		case reflect.Int:
			field.SetInt(min(max(x, math.MinInt32), math.MaxInt32))
			return true
		case reflect.Float64:
			field.SetFloat(float64(x))
			return true
		}
	case float64:
		if field.Kind() == reflect.Float64 {
			field.SetFloat(x)
			return true
		}
	}
	return false
}

// kindOf returns the kind of a TOML value in words.
func kindOf(value any) string {
	switch value.(type) {
	case string:
		return "text"
	case bool:
		return "true or false"
	case int64:
		return "a whole number"
	case float64:
		return "a number"
	case []any:
		return "a list"
	case map[string]any:
		return "a table"
	}
	return "a date or time"
}

// keyOf returns the TOML key of a field, "" when it has none.
func keyOf(f reflect.StructField) string {
	key, _, _ := strings.Cut(f.Tag.Get("toml"), ",")
	return key
}

// keysOf returns the keys of a table in the order of its struct.
func keysOf(t reflect.Type) []string {
	var keys []string
	for i := range t.NumField() {
		if key := keyOf(t.Field(i)); key != "" {
			keys = append(keys, key)
		}
	}
	return keys
}

// fieldOf returns the field of v that a key stands for.
func fieldOf(v reflect.Value, key string) (reflect.Value, bool) {
	for i := range v.NumField() {
		if keyOf(v.Type().Field(i)) == key {
			return v.Field(i), true
		}
	}
	return reflect.Value{}, false
}

// unknown tells of a key that nobody knows, with the one that may be meant. The
// value is not shown: it may be a secret in the wrong place.
func (c *checker) unknown(path, key string, value any, t reflect.Type) {
	what := "key"
	switch value.(type) {
	case map[string]any:
		what = "table"
	}
	known := keysOf(t)
	text := fmt.Sprintf("unknown %s; known here: %s", what, strings.Join(known, ", "))
	if near := nearest(key, known); near != "" {
		text = fmt.Sprintf("unknown %s; did you mean %s?", what, near)
	} else if home := homeOf(key); home != "" {
		text = fmt.Sprintf("unknown key here; it belongs in %s", home)
	}
	if path == "mqtt" && strings.HasPrefix(key, "pass") {
		text = "a password does not stand in this file; put it in a file of its own and name that in password_file"
	}
	c.problems = append(c.problems, Problem{
		File: c.origin.file, Line: c.origin.line(join(path, key)), Key: join(path, key), Text: text,
	})
}

// homeOf returns the header of the first table that has a key, "" for none.
func homeOf(key string) string {
	tables := reflect.TypeFor[Config]()
	for i := range tables.NumField() {
		field := tables.Field(i)
		t, header := field.Type, "["+keyOf(field)+"]"
		if t.Kind() == reflect.Slice {
			header = "[" + header + "]"
		}
		if t.Kind() != reflect.Struct {
			if t.Kind() != reflect.Slice && t.Kind() != reflect.Pointer {
				continue
			}
			t = t.Elem()
		}
		if keyOf(field) != "" && slices.Contains(keysOf(t), key) {
			return header
		}
	}
	return ""
}
