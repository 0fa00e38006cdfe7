package configs

import (
	"errors"
	"fmt"
	"strings"

	"go.yaml.in/yaml/v4"
	"go.yaml.in/yaml/v4/plugin/loaderlimits"
)

// Limits of what a scenario may be. They are far above any real one; the size
// bounds the time that looking for repeated keys can take.
const (
	maxScenarioBytes = 64 << 10
	maxDepth         = 32
)

// kind is the kind of a node.
type kind int

const (
	scalar kind = iota
	mapping
	list
)

// node is a piece of a scenario with its place. Everything about YAML ends here.
type node struct {
	kind   kind
	text   string // scalar
	quoted bool   // scalar written as a string
	null   bool
	keys   []*node // mapping
	values []*node // mapping, list

	source       string // file, or "--set key"
	line, column int    // 0 for overrides
}

// get returns the value of a key, nil if it is absent.
func (n *node) get(key string) *node {
	if n == nil {
		return nil
	}
	for i, k := range n.keys {
		if k.text == key {
			return n.values[i]
		}
	}
	return nil
}

// parse reads a document. All faults of form are reported at once.
func parse(source string, data []byte) (*node, *faults) {
	f := new(faults)
	if len(data) > maxScenarioBytes {
		f.add(&PosError{File: source, Message: fmt.Sprintf("is %d bytes long, want at most %d", len(data), maxScenarioBytes)})
		return nil, f
	}
	var doc yaml.Node
	limits := loaderlimits.New(loaderlimits.DepthValue(maxDepth), loaderlimits.AliasValue(1))
	empty := &node{kind: mapping, source: source, line: 1, column: 1}
	if err := yaml.Load(data, &doc, yaml.WithPlugin(limits)); err != nil {
		if strings.Contains(err.Error(), "no documents in stream") {
			return empty, f
		}
		addYAML(f, source, err)
		return nil, f
	}
	c := converter{source: source, faults: f}
	root := &doc
	for root.Kind == yaml.DocumentNode || root.Kind == yaml.StreamNode {
		if len(root.Content) == 0 {
			return empty, f
		}
		root = root.Content[0]
	}
	return c.convert(root, ""), f
}

func addYAML(f *faults, source string, err error) {
	add := func(e *yaml.LoadError) {
		f.add(&PosError{File: source, Line: e.Mark.Line, Column: e.Mark.Column, Message: plain(e.Message)})
	}
	var many *yaml.LoadErrors
	var one *yaml.LoadError
	switch {
	case errors.As(err, &many):
		for _, e := range many.Errors {
			add(e)
		}
	case errors.As(err, &one):
		add(one)
	default:
		f.add(&PosError{File: source, Message: plain(strings.TrimPrefix(err.Error(), "yaml: "))})
	}
}

// plain says common faults of form so that they help.
func plain(message string) string {
	switch {
	case strings.Contains(message, "tab character"), strings.Contains(message, "cannot start any token"):
		return message + "; indent with spaces, not tabs"
	case strings.Contains(message, "document"):
		return message + "; the file is one document"
	}
	return message
}

type converter struct {
	source string
	faults *faults
}

func (c *converter) convert(y *yaml.Node, path string) *node {
	n := &node{source: c.source, line: y.Line, column: y.Column}
	if y.Kind == yaml.AliasNode || y.Anchor != "" {
		c.fault(y, path, "anchors and aliases are not part of the format; write the value out")
		n.null = true
		return n
	}
	switch y.Kind {
	case yaml.MappingNode:
		n.kind = mapping
		c.pairs(n, y, path)
	case yaml.SequenceNode:
		n.kind = list
		for i, item := range y.Content {
			n.values = append(n.values, c.convert(item, fmt.Sprintf("%s[%d]", path, i)))
		}
	default:
		n.text = y.Value
		n.quoted = y.Style&(yaml.SingleQuotedStyle|yaml.DoubleQuotedStyle|yaml.LiteralStyle|yaml.FoldedStyle) != 0
		n.null = y.ShortTag() == "!!null" && !n.quoted
		if t := y.ShortTag(); strings.HasPrefix(y.Tag, "!") && !strings.HasPrefix(t, "!!") {
			c.fault(y, path, fmt.Sprintf("tag %s is not part of the format", t))
		}
	}
	return n
}

func (c *converter) pairs(n *node, y *yaml.Node, path string) {
	for i := 0; i+1 < len(y.Content); i += 2 {
		k, v := y.Content[i], y.Content[i+1]
		key := join(path, k.Value)
		if k.Kind != yaml.ScalarNode {
			c.fault(k, path, "a key must be a word")
			continue
		}
		if first := n.get(k.Value); first != nil {
			c.fault(k, key, fmt.Sprintf("stands twice: the first is in line %d", n.keyLine(k.Value)))
			continue
		}
		n.keys = append(n.keys, &node{text: k.Value, source: c.source, line: k.Line, column: k.Column})
		n.values = append(n.values, c.convert(v, key))
	}
}

func (n *node) keyLine(key string) int {
	for _, k := range n.keys {
		if k.text == key {
			return k.line
		}
	}
	return 0
}

func (c *converter) fault(y *yaml.Node, path, message string) {
	c.faults.add(&PosError{File: c.source, Line: y.Line, Column: y.Column, Key: path, Message: message})
}

func join(path, key string) string {
	switch {
	case path == "":
		return key
	case key == "":
		return path
	}
	return path + "." + key
}
