package configs

import (
	"fmt"
	"math"
	"regexp"
	"slices"
	"strconv"
	"strings"
)

// walk is one pass over a scenario: it reads values, collects faults, and records
// the resolved scenario and the schema on the way.
type walk struct {
	faults *faults
}

// section is a mapping of the scenario on a walk, present or not.
type section struct {
	w     *walk
	path  string
	n     *node // nil: absent, every key takes its default
	known []string
	out   *tree   // resolved values
	doc   *schema // what the section may hold
}

// bounds of a number.
type span struct {
	low, high         float64
	lowOpen, highOpen bool
}

func atLeast(low float64) span  { return span{low: low, high: math.Inf(1)} }
func above(low float64) span    { return span{low: low, high: math.Inf(1), lowOpen: true} }
func within(a, b float64) span  { return span{low: a, high: b} }
func between(a, b float64) span { return span{a, b, true, true} }
func aboveTo(a, b float64) span { return span{low: a, high: b, lowOpen: true} }
func anyNumber() span           { return span{low: math.Inf(-1), high: math.Inf(1)} }
func (s span) holds(x float64) bool {
	return (x > s.low || x == s.low && !s.lowOpen) && (x < s.high || x == s.high && !s.highOpen)
}

// String says the range in words.
func (s span) String() string {
	switch {
	case math.IsInf(s.low, -1) && math.IsInf(s.high, 1):
		return "a finite number"
	case math.IsInf(s.high, 1) && s.lowOpen:
		return "above " + format(s.low)
	case math.IsInf(s.high, 1):
		return "at least " + format(s.low)
	case s.lowOpen && s.highOpen:
		return "strictly between " + format(s.low) + " and " + format(s.high)
	case s.lowOpen:
		return "above " + format(s.low) + " and at most " + format(s.high)
	}
	return "from " + format(s.low) + " to " + format(s.high)
}

func format(x float64) string { return strconv.FormatFloat(x, 'g', -1, 64) }

// number is a key with a number.
type number struct {
	key, meaning string // the meaning with its unit
	in           span
	def          float64 // default
	required     bool
}

// fault reports a mistake at a node; nil means the section itself.
func (s *section) fault(n *node, key, format string, args ...any) {
	e := &PosError{Key: join(s.path, key), Message: fmt.Sprintf(format, args...)}
	if n == nil {
		n = s.n
	}
	if n != nil {
		e.File, e.Line, e.Column = n.source, n.line, n.column
	}
	s.w.faults.add(e)
}

// child returns the value of a key and notes that the format has it.
func (s *section) child(key string, required bool) *node {
	s.known = append(s.known, key)
	v := s.n.get(key)
	if v != nil && v.null {
		s.fault(v, key, "has no value")
		return nil
	}
	if v == nil && required && !s.n.lost() {
		s.fault(nil, key, "is missing, and has no default")
	}
	return v
}

// lost reports whether a node was already found to be of the wrong kind.
func (n *node) lost() bool { return n != nil && n.kind != mapping }

// number reads a number.
func (s *section) number(f number) float64 {
	v := s.child(f.key, f.required)
	s.doc.number(f, "number")
	x := f.def
	if v != nil {
		x = s.value(v, f.key, f.in, f.def)
	}
	s.out.put(f.key, format(x))
	return x
}

// integer reads a whole number.
func (s *section) integer(f number) int64 {
	v := s.child(f.key, f.required)
	s.doc.number(f, "integer")
	x := int64(f.def)
	if v != nil {
		if y, ok := s.whole(v, f); ok {
			x = y
		}
	}
	s.out.put(f.key, strconv.FormatInt(x, 10))
	return x
}

var (
	decimal = regexp.MustCompile(`^[+-]?(0|[1-9][0-9]*|\.[0-9]+|(0|[1-9][0-9]*)\.[0-9]*)([eE][+-]?[0-9]+)?$`)
	counted = regexp.MustCompile(`^[+-]?(0|[1-9][0-9]*)$`)
)

// value reads one number, or reports why it is none and returns def.
func (s *section) value(v *node, key string, in span, def float64) float64 {
	if v.kind != scalar || v.quoted || !decimal.MatchString(v.text) {
		s.fault(v, key, "is %s, want a number %s", v.show(), in.words())
		return def
	}
	x, err := strconv.ParseFloat(v.text, 64)
	if err != nil || !in.holds(x) || math.IsInf(x, 0) {
		s.fault(v, key, "is %s, want %s", v.text, in)
		return def
	}
	return x + 0 // no negative zero
}

func (s span) words() string {
	if math.IsInf(s.low, -1) && math.IsInf(s.high, 1) {
		return "in decimal form"
	}
	return s.String()
}

func (s *section) whole(v *node, f number) (int64, bool) {
	if v.kind != scalar || v.quoted || !counted.MatchString(v.text) {
		s.fault(v, f.key, "is %s, want a whole number %s", v.show(), f.in)
		return 0, false
	}
	x, err := strconv.ParseInt(v.text, 10, 64)
	if err != nil || !f.in.holds(float64(x)) {
		s.fault(v, f.key, "is %s, want a whole number %s", v.text, f.in)
		return 0, false
	}
	return x, true
}

// show is a value as an error quotes it.
func (n *node) show() string {
	switch {
	case n.kind == mapping:
		return "a block of keys"
	case n.kind == list:
		return "a list"
	case n.quoted:
		return strconv.Quote(clip(n.text))
	}
	return clip(n.text)
}

func clip(s string) string {
	if r := []rune(s); len(r) > 40 {
		return string(r[:40]) + "…"
	}
	return s
}

// text reads a string of at most most characters.
func (s *section) text(key, meaning, def string, required bool, most int) string {
	v := s.child(key, required)
	s.doc.text(key, meaning, def, required, most)
	x := def
	if v != nil {
		switch {
		case v.kind != scalar:
			s.fault(v, key, "is %s, want a text", v.show())
		case len([]rune(v.text)) > most:
			s.fault(v, key, "is %d characters long, want at most %d", len([]rune(v.text)), most)
		case strings.ContainsFunc(v.text, func(r rune) bool { return r < ' ' || r == 0x7f || r == '\uFFFD' }):
			s.fault(v, key, "holds a control character")
		default:
			x = v.text
		}
	}
	s.out.put(key, strconv.Quote(x))
	return x
}

// choice reads one of a few words.
func (s *section) choice(key, meaning, def string, words ...string) string {
	v := s.child(key, def == "")
	s.doc.choice(key, meaning, def, words)
	x := def
	if v != nil {
		if v.kind == scalar && slices.Contains(words, v.text) {
			x = v.text
		} else {
			s.fault(v, key, "is %s, want %s%s", v.show(), oneOf(words), suggest(v.text, words))
		}
	}
	s.out.put(key, x)
	return x
}

// boolean reads true or false.
func (s *section) boolean(key, meaning string, def bool) bool {
	v := s.child(key, false)
	s.doc.boolean(key, meaning, def)
	x := def
	if v != nil {
		if v.kind == scalar && !v.quoted && (v.text == "true" || v.text == "false") {
			x = v.text == "true"
		} else {
			s.fault(v, key, "is %s, want true or false", v.show())
		}
	}
	s.out.put(key, strconv.FormatBool(x))
	return x
}

// numbers reads a list of numbers.
func (s *section) numbers(f number, def []float64, most int) []float64 {
	v := s.child(f.key, f.required)
	s.doc.numbers(f, def, most)
	x := def
	if v != nil {
		switch {
		case v.kind != list:
			s.fault(v, f.key, "is %s, want a list of numbers, such as [1, 2]", v.show())
		case len(v.values) < 1 || len(v.values) > most:
			s.fault(v, f.key, "has %d entries, want 1 to %d", len(v.values), most)
		default:
			x = nil
			for i, e := range v.values {
				x = append(x, s.value(e, fmt.Sprintf("%s[%d]", f.key, i), f.in, f.def))
			}
		}
	}
	var words []string
	for _, y := range x {
		words = append(words, format(y))
	}
	s.out.put(f.key, "["+strings.Join(words, ", ")+"]")
	return x
}

// integers reads a list of whole numbers.
func (s *section) integers(f number, def []int, most int) []int {
	v := s.child(f.key, f.required)
	s.doc.integers(f, def, most)
	x := def
	if v != nil {
		switch {
		case v.kind != list:
			s.fault(v, f.key, "is %s, want a list of whole numbers, such as [1, 2]", v.show())
		case len(v.values) < 1 || len(v.values) > most:
			s.fault(v, f.key, "has %d entries, want 1 to %d", len(v.values), most)
		default:
			x = nil
			for i, e := range v.values {
				entry := f
				entry.key = fmt.Sprintf("%s[%d]", f.key, i)
				if y, ok := s.whole(e, entry); ok {
					x = append(x, int(y))
				}
			}
		}
	}
	var words []string
	for _, y := range x {
		words = append(words, strconv.Itoa(y))
	}
	s.out.put(f.key, "["+strings.Join(words, ", ")+"]")
	return x
}

// words reads a list of distinct words out of a few.
func (s *section) words(key, meaning string, def []string, allowed ...string) []string {
	v := s.child(key, false)
	s.doc.words(key, meaning, def, allowed)
	x := def
	if v != nil {
		x = nil
		if v.kind != list {
			s.fault(v, key, "is %s, want a list of %s", v.show(), oneOf(allowed))
		}
		for _, e := range v.values {
			if e.kind != scalar || !slices.Contains(allowed, e.text) || slices.Contains(x, e.text) {
				s.fault(e, key, "has %s, want each of %s at most once", e.show(), oneOf(allowed))
				continue
			}
			x = append(x, e.text)
		}
	}
	s.out.put(key, "["+strings.Join(x, ", ")+"]")
	return x
}

// section reads a mapping.
func (s *section) section(key, meaning string, required bool) *section {
	v := s.child(key, false)
	if v == nil && required && !s.n.lost() {
		s.fault(nil, key, "is missing: this block is required")
	}
	sub := &section{w: s.w, path: join(s.path, key), n: v, out: s.out.branch(key), doc: s.doc.section(key, meaning, required)}
	if v != nil && v.kind != mapping {
		s.fault(v, key, "is %s, want a block of keys", v.show())
	}
	if v == nil && s.n != nil {
		sub.n = &node{kind: mapping, source: s.n.source, line: s.n.line, column: s.n.column}
	}
	return sub
}

// optional reads a mapping whose absence means something: it is nil then.
func (s *section) optional(key, meaning string) *section {
	if v := s.n.get(key); s.doc == nil && (v == nil || v.null) {
		s.child(key, false)
		return nil
	}
	return s.section(key, meaning, false)
}

// done reports keys that the format does not have.
func (s *section) done() {
	if s.n == nil {
		return
	}
	for _, k := range s.n.keys {
		if !slices.Contains(s.known, k.text) {
			s.fault(k, k.text, "is not a key of the format; allowed here: %s%s", strings.Join(s.known, ", "), suggest(k.text, s.known))
		}
	}
}

func oneOf(words []string) string {
	if len(words) == 1 {
		return words[0]
	}
	return strings.Join(words[:len(words)-1], ", ") + " or " + words[len(words)-1]
}

// suggest names the word that a misspelt one is likely meant to be.
func suggest(got string, words []string) string {
	best, word := 3, ""
	for _, w := range words {
		if d := distance(got, w); d < best && d < len(w) {
			best, word = d, w
		}
	}
	if word == "" {
		return ""
	}
	return fmt.Sprintf("; did you mean %s?", word)
}

// distance is the number of letters to insert, delete or change.
func distance(a, b string) int {
	if len(a) > 64 {
		return 64
	}
	row := make([]int, len(b)+1)
	for j := range row {
		row[j] = j
	}
	for i := range len(a) {
		diagonal := row[0]
		row[0] = i + 1
		for j := range len(b) {
			change := diagonal
			if a[i] != b[j] {
				change++
			}
			diagonal = row[j+1]
			row[j+1] = min(change, row[j]+1, row[j+1]+1)
		}
	}
	return row[len(b)]
}
