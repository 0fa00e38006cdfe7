package configs

import (
	"fmt"
	"slices"
	"strconv"
	"strings"
)

// Override sets a key of a scenario from outside the file. Key is the dotted path;
// an element of a list is named by its number from 0 or, in groups, by its name.
// Value is written as in the file.
type Override struct{ Key, Value string }

// ParseOverride splits "key.path=value".
func ParseOverride(s string) (Override, error) {
	key, value, ok := strings.Cut(s, "=")
	if !ok || strings.TrimSpace(key) == "" {
		return Override{}, &PosError{File: "--set " + s, Message: "want key.path=value, such as saving.return=0.02"}
	}
	return Override{strings.TrimSpace(key), strings.TrimSpace(value)}, nil
}

// apply puts the override into the tree.
func (o Override) apply(root *node, f *faults) *node {
	source := "--set " + o.Key + "=" + o.Value
	value, form := parse(source, []byte(o.Value))
	for _, e := range form.list {
		f.add(&PosError{File: source, Key: e.Key, Message: e.Message})
	}
	if value == nil {
		return root
	}
	if strings.TrimSpace(o.Value) == "" {
		value = &node{null: true}
	}
	value.stamp(source)
	changed, err := replace(root, strings.Split(o.Key, "."), value, source)
	if err != nil {
		f.add(&PosError{File: source, Message: err.Error()})
		return root
	}
	return changed
}

// stamp marks a tree as coming from an override: it has no place in a file.
func (n *node) stamp(source string) {
	n.source, n.line, n.column = source, 0, 0
	for _, k := range n.keys {
		k.stamp(source)
	}
	for _, v := range n.values {
		v.stamp(source)
	}
}

// replace returns a copy of n with the value at path in place.
func replace(n *node, path []string, value *node, source string) (*node, error) {
	if len(path) == 0 {
		if value.kind == mapping && len(value.keys) == 0 {
			return value, nil // {} empties a block
		}
		return merge(n, value), nil
	}
	if n != nil && n.kind == list {
		return replaceElement(n, path, value, source)
	}
	m := &node{kind: mapping, source: source}
	if n != nil && n.kind == mapping {
		*m = *n
		m.keys, m.values = slices.Clone(n.keys), slices.Clone(n.values)
	}
	if path[0] == "" {
		return nil, fmt.Errorf("the key has an empty part")
	}
	v, err := replace(m.get(path[0]), path[1:], value, source)
	if err != nil {
		return nil, err
	}
	for _, k := range m.keys {
		if k.text == path[0] {
			m.set(k, v)
			return m, nil
		}
	}
	m.set(&node{text: path[0], source: source}, v)
	return m, nil
}

func replaceElement(n *node, path []string, value *node, source string) (*node, error) {
	m := *n
	m.values = slices.Clone(n.values)
	var names []string
	for i, v := range n.values {
		name := strconv.Itoa(i)
		if g := v.get("name"); g != nil {
			name = g.text
		}
		names = append(names, name)
		if path[0] == strconv.Itoa(i) || path[0] == name {
			e, err := replace(v, path[1:], value, source)
			m.values[i] = e
			return &m, err
		}
	}
	return nil, fmt.Errorf("there is no element %q, only %s", path[0], strings.Join(names, ", "))
}
