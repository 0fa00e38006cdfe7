package output

import (
	"fmt"
	"strconv"

	"github.com/parquet-go/parquet-go"
)

// part is a part file that is being written: a Parquet writer, the row groups
// free for encoding into it, and the file once the first of them is committed.
type part struct {
	index int64
	end   int64 // first household beyond this part
	path  string
	w     *parquet.GenericWriter[any]
	free  []*parquet.ConcurrentRowGroupWriter
	out   *File // nil before the first commit
}

// Write sends the bytes of the Parquet writer to the file.
func (pt *part) Write(b []byte) (int, error) { return pt.out.Write(b) }

// take returns part k and an empty row group of it.
func (p *Panel) take(k int64) (*part, *parquet.ConcurrentRowGroupWriter) {
	p.mu.Lock()
	defer p.mu.Unlock()
	pt := p.parts[k]
	if pt == nil {
		pt = p.open(k)
		p.parts[k] = pt
	}
	if n := len(pt.free); n > 0 {
		g := pt.free[n-1]
		pt.free = pt.free[:n-1]
		return pt, g
	}
	return pt, pt.w.BeginRowGroup()
}

// open starts part k with a writer of its own. Resetting a finished one would
// save a few allocations, but the library then clears the column paths of row
// groups it still refers to.
func (p *Panel) open(k int64) *part {
	first := k * int64(p.o.Block)
	pt := &part{index: k, path: p.path(k), end: min(first+int64(p.o.Block), p.o.To)}
	pt.w = parquet.NewGenericWriter[any](pt, p.file.options...)
	// Both keys are there from the start, so the footer's order never changes.
	pt.w.SetKeyValueMetadata(keyFirst, strconv.FormatInt(first, 10))
	pt.w.SetKeyValueMetadata(keyHouseholds, strconv.FormatInt(pt.end-first, 10))
	return pt
}

// give returns a committed row group to its part.
func (p *Panel) give(pt *part, g *parquet.ConcurrentRowGroupWriter) {
	p.mu.Lock()
	defer p.mu.Unlock()
	pt.free = append(pt.free, g)
}

// commit appends an encoded row group to the part file.
func (pt *part) commit(g *parquet.ConcurrentRowGroupWriter) error {
	if pt.out == nil {
		out, err := CreateFile(pt.path)
		if err != nil {
			return err
		}
		pt.out = out
	}
	if _, err := g.Commit(); err != nil {
		return fmt.Errorf("output: %s: %w", pt.path, err)
	}
	return nil
}

// finish writes the footer and has the part published.
func (p *Panel) finish(pt *part) error {
	if err := pt.w.Close(); err != nil {
		return fmt.Errorf("output: %s: %w", pt.path, err)
	}
	p.mu.Lock()
	delete(p.parts, pt.index)
	p.mu.Unlock()
	p.settle() // one part at a time: they appear in order
	published := make(chan struct{})
	p.publishing = published
	go func() {
		defer close(published)
		if p.failed() != nil {
			_ = pt.out.Abort() // the first error is what counts
			return
		}
		if err := pt.out.Commit(); err != nil {
			_ = p.fail(err)
		}
	}()
	return nil
}

// settle waits until the part finished last is on disk under its name. Bringing
// it there takes the disk's time, and meanwhile the workers encode the next.
func (p *Panel) settle() {
	if p.publishing != nil {
		<-p.publishing
	}
}
