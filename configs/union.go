package configs

import "slices"

// form is one of the forms that a value may have: a number, a word, or a block of
// keys recognised by one that only this form has.
type form struct {
	word  string         // the value is this word
	num   *number        // the value is a number
	mark  string         // the block has this key
	read  func(*section) // reads the block
	wants string         // how an error names the form
}

// oneForm reads a value that has one of several forms, and returns which; −1 if
// it has none of them. An absent value takes the form def, whose read is given
// an absent section.
func (s *section) oneForm(key, meaning string, def int, required bool, forms ...form) int {
	v := s.child(key, required)
	s.doc.oneForm(s, key, meaning, def, required, forms)
	at := def
	if v != nil {
		if at = match(v, forms); at < 0 {
			var wants []string
			for _, f := range forms {
				wants = append(wants, f.wants)
			}
			s.fault(v, key, "is %s, want %s", v.show(), oneOf(wants))
			return -1
		}
	}
	if at < 0 {
		return -1
	}
	switch f := forms[at]; {
	case f.word != "":
		s.out.put(key, f.word)
	case f.num != nil:
		x := f.num.def
		if v != nil {
			x = s.value(v, key, f.num.in, x)
		}
		f.num.def = x
		s.out.put(key, format(x))
	default:
		sub := &section{w: s.w, path: join(s.path, key), n: v, out: s.out.branch(key), doc: new(schema)}
		f.read(sub)
		sub.done()
	}
	return at
}

func match(v *node, forms []form) int {
	return slices.IndexFunc(forms, func(f form) bool {
		switch {
		case f.word != "":
			return v.kind == scalar && v.text == f.word
		case f.num != nil:
			return v.kind == scalar && !v.quoted && decimal.MatchString(v.text)
		}
		return v.kind == mapping && v.get(f.mark) != nil
	})
}
