package output

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"sync"
)

// Precision is the width of a panel's money and state columns.
type Precision int

// The precisions of a panel.
const (
	Double Precision = iota // float64: what the simulation computed, bit for bit
	Single                  // float32: rounded to 24 bits, about 7 digits
)

// String returns "double" or "single".
func (p Precision) String() string {
	if p == Single {
		return "single"
	}
	return "double"
}

// DefaultUnit is the number of households a row group holds.
const DefaultUnit = 4096

// PanelOptions says what a panel holds. There is no useful zero value.
type PanelOptions struct {
	From, To   int64             // household ids of this panel: From ≤ id < To
	Unit       int               // households a call of Encode (one row group); 0 = DefaultUnit
	Block      int               // households a part file, a multiple of Unit
	Precision  Precision         // of money and states
	Groups     []string          // names of the groups, in the order of Span.Group
	Currency   string            // unit of money, a label
	Provenance map[string]string // for the footer of every part: scenario hash, seed, program version, …; no times
	Workers    int               // number of workers that call Encode, at least 1
}

// Validate reports every bad field at once.
//
// The rule for Block: a row group is never split between two parts, and parts
// must hold the same households whoever writes them, so Block is a positive
// multiple of Unit, and From is a multiple of Block: a panel begins where a
// part begins. From = To is a panel with nothing left to write.
func (o PanelOptions) Validate() error {
	var errs []error
	bad := func(format string, a ...any) { errs = append(errs, fmt.Errorf("output: panel: "+format, a...)) }
	if o.Unit < 1 {
		bad("unit is %d households, want at least 1", o.Unit)
	} else if o.Block < 1 || o.Block%o.Unit != 0 {
		bad("block is %d households, want a positive multiple of %d", o.Block, o.Unit)
	} else if o.From < 0 || o.From%int64(o.Block) != 0 && o.From != o.To {
		bad("first household is %d, want a multiple of the block, %d", o.From, o.Block)
	} else if o.Block/o.Unit > maxRowGroups {
		bad("block is %d households, want at most %d (%d row groups)", o.Block, maxRowGroups*o.Unit, maxRowGroups)
	}
	if o.To < o.From {
		bad("households end at %d, want at least %d", o.To, o.From)
	}
	if o.Precision != Double && o.Precision != Single {
		bad("precision is %d, want double or single", int(o.Precision))
	}
	if len(o.Groups) == 0 {
		bad("no groups, want at least one name")
	}
	if o.Workers < 1 {
		bad("workers is %d, want at least 1", o.Workers)
	}
	return errors.Join(errs...)
}

// maxRowGroups is what the file format can count in one file.
const maxRowGroups = 32767

// Span says which age and group the rows From ≤ k < To of a unit have.
type Span struct {
	Age      int32
	Group    int // index into PanelOptions.Groups
	From, To int
}

// Rows are the rows of one unit: consecutive households, all their years alive.
// Every slice has N entries (longer ones are cut), in any order that Position
// undoes; the simulation's order is by age, then by household. Encode reads
// them and keeps no reference.
type Rows struct {
	First      int64   // id of the first household
	Households int     // number of households, at most Unit; fewer only at the panel's end
	N          int     // number of rows
	Spans      []Span  // age and group of every row; adjoining, from 0 to N
	Position   []int32 // row k's place in the order household, age: a permutation of 0 … N−1
	Household  []int64

	Persistent, Transitory           []float64
	Employed                         []bool
	Earnings, Pension, Taxes, Income []float64 // money a year
	CashOnHand, Consumption, Assets  []float64 // money
	Died                             []bool
}

// Panel writes part files. Encode may be called by several workers at once,
// each with its own number; the functions it returns, Close and Abort must be
// called one at a time.
type Panel struct {
	dir        string
	o          PanelOptions
	file       *panelFormat
	work       []*encoder    // one a worker
	next       int64         // first household not yet committed
	publishing chan struct{} // closed when the part finished last is on disk; nil before the first
	mu         sync.Mutex    // guards parts and fault
	parts      map[int64]*part
	fault      error // first error; nothing is written after it
}

// NewPanel prepares a panel in the folder dir, which is made if it is absent.
// No file appears before the first commit.
func NewPanel(dir string, o PanelOptions) (*Panel, error) {
	if o.Unit == 0 {
		o.Unit = DefaultUnit
	}
	if err := o.Validate(); err != nil {
		return nil, err
	}
	format, err := newPanelFormat(o)
	if err != nil {
		return nil, err
	}
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return nil, fmt.Errorf("output: %w", err)
	}
	p := &Panel{dir: dir, o: o, file: format, next: o.From, parts: map[int64]*part{}}
	for range o.Workers {
		p.work = append(p.work, newEncoder(format))
	}
	return p, nil
}

// PartName returns the name of part k: part-00000.parquet.
func PartName(k int64) string { return fmt.Sprintf("part-%05d.parquet", k) }

// Encode puts the rows of a unit in order, encodes and compresses them on the
// calling goroutine, worker 0 … Workers−1, and returns the function that
// appends them to their part file. Those functions must be called one at a
// time, in ascending order of households, each exactly once; rows may be reused
// as soon as Encode has returned.
//
// Memory goes with the units encoded and not yet committed (about 40 bytes a
// row each), never with the number of households, so a caller that lets workers
// run ahead of the commits must bound by how much.
//
// A value that is not finite is refused with a *ValueError. After any error the
// panel is lost: every later call returns that error, and Close removes what is
// unfinished. Parts already whole stay.
func (p *Panel) Encode(worker int, rows Rows) (commit func() error, err error) {
	if worker < 0 || worker >= len(p.work) {
		panic(fmt.Sprintf("output: worker %d of %d", worker, len(p.work)))
	}
	if err := p.failed(); err != nil {
		return nil, err
	}
	if err := rows.check(&p.o); err != nil {
		return nil, p.fail(err)
	}
	k := rows.First / int64(p.o.Block)
	pt, group := p.take(k)
	if err := p.work[worker].encode(group, &rows); err != nil {
		return nil, p.fail(err)
	}
	first, households := rows.First, int64(rows.Households)
	return func() error {
		if err := p.failed(); err != nil {
			return err
		}
		if first != p.next {
			return p.fail(fmt.Errorf("output: panel: households from %d committed where %d were due", first, p.next))
		}
		if err := pt.commit(group); err != nil {
			return p.fail(err)
		}
		p.give(pt, group)
		p.next += households
		if p.next == pt.end {
			return p.fail(p.finish(pt))
		}
		return nil
	}, nil
}

// Close completes the panel. If households are missing or an error occurred
// before, what is unfinished is removed and the error returned.
func (p *Panel) Close() error {
	p.settle()
	if err := p.failed(); err != nil {
		return errors.Join(err, p.Abort())
	}
	if p.next != p.o.To {
		return errors.Join(fmt.Errorf("output: panel: households from %d to %d were never written", p.next, p.o.To-1), p.Abort())
	}
	return nil
}

// Abort gives the panel up: the part being written is removed, the parts that
// are whole stay. It may follow Close, and then does nothing.
func (p *Panel) Abort() error {
	p.settle()
	p.mu.Lock()
	defer p.mu.Unlock()
	if p.fault == nil {
		p.fault = errors.New("output: panel: given up")
	}
	var errs []error
	for _, pt := range p.parts {
		if pt.out != nil {
			errs = append(errs, pt.out.Abort())
		}
	}
	clear(p.parts)
	return errors.Join(errs...)
}

func (p *Panel) failed() error {
	p.mu.Lock()
	defer p.mu.Unlock()
	return p.fault
}

// fail remembers the first error and returns its argument.
func (p *Panel) fail(err error) error {
	p.mu.Lock()
	defer p.mu.Unlock()
	if p.fault == nil {
		p.fault = err
	}
	return err
}

// path returns where part k goes.
func (p *Panel) path(k int64) string { return filepath.Join(p.dir, PartName(k)) }
