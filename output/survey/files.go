package survey

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"sync"

	"cistern/output"
)

// layout is what all files have in common: the columns that are read.
type layout struct {
	o         *Options
	variables []string
	optional  []bool // [variable] values may be missing
	groups    []rowGroup
	rows      int64
}

// rowGroup is a piece of a file.
type rowGroup struct {
	file, group int
	before      int64 // rows of the file before it
	rows        int64
}

// examine opens every file once and sees to it that the columns are there.
func examine(o *Options) (*layout, error) {
	l := &layout{o: o, variables: o.Variables}
	for i, path := range o.Files {
		if err := l.examineFile(i, path); err != nil {
			return nil, err
		}
	}
	return l, nil
}

func (l *layout) examineFile(i int, path string) error {
	s, err := output.OpenParquet(path)
	if err != nil {
		return err
	}
	defer func() { _ = s.Close() }()
	if l.variables == nil {
		for _, name := range s.Names() {
			kind, _, readable := s.Has(name)
			if readable && kind != output.String && name != l.o.Unit && name != l.o.Weight && !slices.Contains(l.o.By, name) {
				l.variables = append(l.variables, name)
			}
		}
		if len(l.variables) == 0 {
			return fmt.Errorf("%s: no column of numbers is left to describe", path)
		}
	}
	if l.optional == nil {
		l.optional = make([]bool, len(l.variables))
	}
	for k, name := range l.variables {
		kind, optional, readable := s.Has(name)
		if !readable || kind == output.String {
			return l.refuse(s, path, name, readable, "is text, want numbers")
		}
		l.optional[k] = l.optional[k] || optional
	}
	for _, c := range []struct {
		names  []string
		refuse output.Kind
		why    string
	}{{[]string{l.o.Unit}, output.Float, "has fractions, want whole numbers or text"}, {[]string{l.o.Weight}, output.String, "is text, want numbers"},
		{l.o.By, output.Float, "has fractions, want whole numbers, bools or text"}} {
		for _, name := range c.names {
			kind, _, readable := s.Has(name)
			if name != "" && (!readable || kind == c.refuse) {
				return l.refuse(s, path, name, readable, c.why)
			}
		}
	}
	before := int64(0)
	for g := range s.Groups() {
		n := s.GroupRows(g)
		if n > 0 {
			l.groups = append(l.groups, rowGroup{i, g, before, n})
		}
		before += n
	}
	l.rows += before
	return nil
}

func (l *layout) refuse(s *output.Source, path, name string, readable bool, why string) error {
	if readable {
		return &ColumnError{File: path, Column: name, Problem: why}
	}
	if _, err := s.NewColumn(name); slices.Contains(s.Names(), name) {
		return err
	}
	return &ColumnError{File: path, Column: name, Problem: "is not there", Known: s.Names()}
}

// reader is one worker's view of the files: one open at a time.
type reader struct {
	o       *Options
	file    int
	source  *output.Source
	columns map[string]*output.Column
}

// column reads a column of a row group. It is valid until the next call for the
// same column.
func (r *reader) column(g rowGroup, name string) (*output.Column, error) {
	if r.source == nil || r.file != g.file {
		r.close()
		s, err := output.OpenParquet(r.o.Files[g.file])
		if err != nil {
			return nil, err
		}
		r.source, r.file = s, g.file
	}
	c := r.columns[name]
	fresh, err := r.source.NewColumn(name)
	if err != nil {
		return nil, err
	}
	if c == nil || c.Kind != fresh.Kind {
		if r.columns == nil {
			r.columns = map[string]*output.Column{}
		}
		c = fresh
		r.columns[name] = c
	}
	c.Reset()
	return c, r.source.ReadColumn(g.group, c)
}

func (r *reader) close() {
	if r.source != nil {
		_ = r.source.Close()
		r.source = nil
	}
}

// sweep reads all row groups, shared out over workers, in any order; what work
// returns is called in the order of row groups, one at a time.
func (l *layout) sweep(ctx context.Context, stage string, work func(worker, k int, g rowGroup, r *reader) (commit func() error, err error)) error {
	var mu sync.Mutex
	turn := sync.NewCond(&mu)
	next, done := 0, 0
	var fault error
	fail := func(err error) { // mu is held
		if fault == nil {
			fault = err
		}
		turn.Broadcast()
	}
	if ctx.Err() != nil {
		return context.Cause(ctx)
	}
	stop := context.AfterFunc(ctx, func() { mu.Lock(); defer mu.Unlock(); fail(context.Cause(ctx)) })
	defer stop()
	var wg sync.WaitGroup
	for w := range min(l.o.Workers, max(1, len(l.groups))) {
		wg.Go(func() {
			r := &reader{o: l.o}
			defer r.close()
			for {
				mu.Lock()
				k := next
				next++
				over := fault != nil || k >= len(l.groups)
				mu.Unlock()
				if over {
					return
				}
				commit, err := work(w, k, l.groups[k], r)
				mu.Lock()
				for done < k && fault == nil {
					turn.Wait()
				}
				if fault == nil && err == nil && commit != nil {
					err = commit()
				}
				if err != nil {
					fail(err)
				}
				done++
				turn.Broadcast()
				if fault == nil && l.o.OnProgress != nil {
					l.o.OnProgress(stage, int64(done), int64(len(l.groups)))
				}
				mu.Unlock()
			}
		})
	}
	wg.Wait()
	return fault
}

// errNothing says that there is nothing to describe.
var errNothing = errors.New("the files have no rows")
