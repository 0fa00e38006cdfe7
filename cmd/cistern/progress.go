package main

import (
	"fmt"
	"io"
	"os"
	"sync"
	"time"

	"github.com/vbauerster/mpb/v8"
	"github.com/vbauerster/mpb/v8/decor"
)

// lineEvery is how often progress is told where there is no terminal.
const lineEvery = 5 * time.Second

// progress tells on standard error how far a long step has come: a bar on a
// terminal, a line every few seconds elsewhere, nothing with --quiet.
type progress struct {
	bars *mpb.Progress
	bar  *mpb.Bar

	mu    sync.Mutex
	w     io.Writer
	what  string
	total int64
	done  int64
	start time.Time
	last  time.Time
}

func (g *globals) newProgress(what string, total int64) *progress {
	now := time.Now()
	p := &progress{what: what, total: total, start: now, last: now}
	switch {
	case g.quiet:
	case isTerminal(g.stderr):
		p.bars = mpb.New(mpb.WithOutput(g.stderr), mpb.WithWidth(40))
		p.bar = p.bars.AddBar(total, mpb.BarRemoveOnComplete(),
			mpb.PrependDecorators(decor.Name(what, decor.WC{C: decor.DindentRight, W: 22})),
			mpb.AppendDecorators(decor.Percentage(decor.WC{W: 5}), decor.Name("  "), decor.AverageETA(decor.ET_STYLE_GO)))
	default:
		p.w = g.stderr
	}
	return p
}

// isTerminal reports whether a bar can be drawn on w.
func isTerminal(w io.Writer) bool {
	f, ok := w.(*os.File)
	if !ok || os.Getenv("TERM") == "dumb" || os.Getenv("TERM") == "" || os.Getenv("CI") != "" {
		return false
	}
	info, err := f.Stat()
	return err == nil && info.Mode()&os.ModeCharDevice != 0
}

// add says that n more are done.
func (p *progress) add(n int64) {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.tell(p.done + n)
}

// set says that n are done in all.
func (p *progress) set(n int64) {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.tell(n)
}

func (p *progress) tell(done int64) {
	p.done = done
	if p.bar != nil {
		p.bar.SetCurrent(done)
		return
	}
	now := time.Now()
	if p.w == nil || now.Sub(p.last) < lineEvery || done == 0 {
		return
	}
	p.last = now
	left := time.Duration(float64(now.Sub(p.start)) * float64(p.total-done) / float64(done)).Round(time.Second)
	fmt.Fprintf(p.w, "%s: %d of %d, about %v left\n", p.what, done, p.total, left)
}

// finish removes the bar.
func (p *progress) finish() {
	if p.bar == nil {
		return
	}
	if !p.bar.Completed() {
		p.bar.Abort(true)
	}
	p.bars.Wait()
}
