package runfile

import (
	"bytes"
	"errors"
	"fmt"
	"maps"
	"reflect"
	"regexp"
	"slices"
	"strconv"
	"strings"

	"omen/data"

	"github.com/pelletier/go-toml/v2"
	"github.com/pelletier/go-toml/v2/unstable"
)

// Parse reads a run file and applies the settings (key=value, as --set takes
// them) on top. The file is checked first, so that its own mistakes carry its
// own lines.
func Parse(file string, text []byte, sets []string) (*Run, error) {
	text = bytes.TrimPrefix(text, []byte("\xef\xbb\xbf")) // some editors begin UTF-8 with a mark
	run, err := decode(file, text)
	if err != nil {
		return nil, err
	}
	if len(sets) > 0 {
		if run, err = override(run, text, sets); err != nil {
			return nil, err
		}
	}
	return run, run.check()
}

// decode is the strict decoding of one text.
func decode(file string, text []byte) (*Run, error) {
	run := Default()
	run.File = file
	dec := toml.NewDecoder(bytes.NewReader(text)).DisallowUnknownFields()
	if err := dec.Decode(&run); err != nil {
		return nil, explain(file, err)
	}
	run.lines = positions(text)
	return &run, nil
}

// explain turns a decoder's error into ours: one line, with a remedy.
func explain(file string, err error) error {
	var strict *toml.StrictMissingError
	if errors.As(err, &strict) && len(strict.Errors) > 0 {
		first := strict.Errors[0]
		line, _ := first.Position()
		key := []string(first.Key())
		known := keysAt(reflect.TypeFor[Run](), key[:len(key)-1])
		name := key[len(key)-1]
		return &Error{file, line, fmt.Sprintf("unknown key %q; the nearest known one is %q (known here: %s)",
			strings.Join(key, "."), data.Nearest(name, known), strings.Join(known, ", "))}
	}
	var wrong *toml.DecodeError
	if errors.As(err, &wrong) {
		line, _ := wrong.Position()
		msg := plain(err)
		if key := strings.Join(wrong.Key(), "."); key != "" {
			msg = key + ": " + msg
		} else {
			msg += "; expected a run file: TOML in UTF-8, with [tables] of key = value and text in quotation marks"
		}
		return &Error{file, line, msg}
	}
	return &Error{File: file, Msg: plain(err)}
}

// mismatch is how the decoder tells that a value does not fit the Go type meant for it.
var mismatch = regexp.MustCompile(`^cannot (?:decode|store|assign) (?:a |an )?(?:TOML )?([a-z -]+?) (?:in|into|to) (?:an? )?(?:struct field (\S+) of type )?(\S+)$`)

// plain is a decoder's message without the names of Go's types.
func plain(err error) string {
	msg := strings.TrimPrefix(err.Error(), "toml: ")
	m := mismatch.FindStringSubmatch(msg)
	if m == nil {
		return msg
	}
	want := "another kind of value"
	for _, known := range []struct{ prefix, words string }{
		{"int", "a whole number"}, {"uint", "a whole number, 0 or more"}, {"float", "a number"}, {"string", "text in quotation marks"},
		{"bool", "true or false"}, {"runfile.Duration", "a duration in quotation marks, such as \"8h\""},
		{"[]runfile.Data", "tables, each begun by [[data]]"}, {"map[string]string", "pairs such as { z = \"zHD\" }"},
		{"map", "a table of keys"}, {"runfile.", "a table of keys"}, {"*runfile.", "a table of keys"},
	} {
		if strings.HasPrefix(m[3], known.prefix) {
			want = known.words
			break
		}
	}
	return "found " + article(m[1]) + ", expected " + want
}

// article names a kind of TOML value.
func article(kind string) string {
	switch kind {
	case "integer", "array", "inline table":
		return "an " + kind
	}
	return "a " + kind
}

// keysAt lists the keys that a struct type knows at a path.
func keysAt(t reflect.Type, path []string) []string {
	for _, step := range path {
		for f := range fields(t) {
			if tag(f) == step {
				t = elem(f.Type)
				break
			}
		}
	}
	var keys []string
	for f := range fields(t) {
		if name := tag(f); name != "" && name != "-" {
			keys = append(keys, name)
		}
	}
	return keys
}

func fields(t reflect.Type) func(yield func(reflect.StructField) bool) {
	return func(yield func(reflect.StructField) bool) {
		for i := 0; t.Kind() == reflect.Struct && i < t.NumField(); i++ {
			if !yield(t.Field(i)) {
				return
			}
		}
	}
}

func tag(f reflect.StructField) string {
	name, _, _ := strings.Cut(f.Tag.Get("toml"), ",")
	return name
}

func elem(t reflect.Type) reflect.Type {
	for t.Kind() == reflect.Pointer || t.Kind() == reflect.Slice {
		t = t.Elem()
	}
	return t
}

// positions finds the line of every key. Tables in an array are numbered from 1:
// data.1 is the first [[data]].
func positions(text []byte) map[string]int {
	lines := map[string]int{}
	var p unstable.Parser
	p.Reset(text)
	prefix, count := "", map[string]int{}
	for p.NextExpression() {
		node := p.Expression()
		key, line := keyOf(&p, node)
		switch node.Kind {
		case unstable.Table:
			prefix = key
			lines[key] = line
		case unstable.ArrayTable:
			count[key]++
			prefix = key + "." + strconv.Itoa(count[key])
			lines[prefix] = line
		case unstable.KeyValue:
			lines[join(prefix, key)] = line
			inline(&p, node.Value(), join(prefix, key), line, lines)
		}
	}
	return lines
}

// inline records the keys of an inline table, which share their parent's line.
func inline(p *unstable.Parser, value *unstable.Node, prefix string, line int, lines map[string]int) {
	if value.Kind != unstable.InlineTable {
		return
	}
	for it := value.Children(); it.Next(); {
		key, _ := keyOf(p, it.Node())
		lines[join(prefix, key)] = line
	}
}

func keyOf(p *unstable.Parser, n *unstable.Node) (key string, line int) {
	var parts []string
	for it := n.Key(); it.Next(); {
		part := it.Node()
		parts = append(parts, string(part.Data))
		if line == 0 {
			line = p.Shape(part.Raw).Start.Line
		}
	}
	return strings.Join(parts, "."), line
}

func join(prefix, key string) string {
	if prefix == "" {
		return key
	}
	return prefix + "." + key
}

func parent(key string) string {
	i := strings.LastIndexByte(key, '.')
	return key[:max(i, 0)]
}

// override applies settings to the file's tree and decodes the result again.
func override(run *Run, text []byte, sets []string) (*Run, error) {
	tree := map[string]any{}
	if err := toml.Unmarshal(text, &tree); err != nil {
		return nil, explain(run.File, err)
	}
	given := map[string]bool{}
	for _, set := range sets {
		key, value, ok := strings.Cut(set, "=")
		key = strings.TrimSpace(key)
		if !ok || key == "" {
			return nil, &Error{File: "--set " + set, Msg: `found no key=value; write for example --set sampling.seed=7 or --set 'prior.Om={flat=[0,1]}'`}
		}
		if err := assign(tree, strings.Split(key, "."), parseValue(value)); err != nil {
			return nil, &Error{File: "--set " + set, Msg: err.Error()}
		}
		given[key] = true
	}
	merged, err := toml.Marshal(tree)
	if err != nil {
		return nil, &Error{File: "--set", Msg: err.Error()}
	}
	out, err := decode("--set "+strings.Join(sets, " "), merged)
	var wrong *Error
	if errors.As(err, &wrong) {
		wrong.Line = 0 // the merged text is nowhere to be seen
	}
	if err != nil {
		return nil, err
	}
	out.File, out.lines, out.sets = run.File, run.lines, given
	return out, nil
}

// parseValue reads a TOML value; anything that is none is a string.
func parseValue(s string) any {
	var v struct{ V any }
	if err := toml.Unmarshal([]byte("V = "+s), &v); err == nil {
		return v.V
	}
	return strings.TrimSpace(s)
}

// assign sets tree[path] = value, making tables on the way; the name "none"
// removes the key.
func assign(tree map[string]any, path []string, value any) error {
	if len(path) == 1 {
		if value == "none" {
			delete(tree, path[0])
		} else {
			tree[path[0]] = value
		}
		return nil
	}
	switch next := tree[path[0]].(type) {
	case nil:
		child := map[string]any{}
		tree[path[0]] = child
		return assign(child, path[1:], value)
	case map[string]any:
		return assign(next, path[1:], value)
	case []any:
		return assignIn(next, path, value)
	default:
		return fmt.Errorf("%s is a value, not a table; the keys of the file are %s", path[0],
			strings.Join(slices.Sorted(maps.Keys(tree)), ", "))
	}
}

// assignIn sets a key in one of several tables, numbered from 1.
func assignIn(list []any, path []string, value any) error {
	i, err := strconv.Atoi(path[1])
	if err != nil || i < 1 || i > len(list) || len(path) < 3 {
		return fmt.Errorf("expected %s.N.key with N from 1 to %d", path[0], len(list))
	}
	child, ok := list[i-1].(map[string]any)
	if !ok {
		return fmt.Errorf("%s.%d is not a table", path[0], i)
	}
	return assign(child, path[2:], value)
}
