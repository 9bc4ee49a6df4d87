package main

import (
	"fmt"
	"os"
	"time"

	"golang.org/x/term"
)

// progress is one line on a terminal that says how far a run is. It shows
// only when the work takes a while, and goes away at the end.
type progress struct {
	app   *app
	on    bool
	each  bool // every step on a line of its own, terminal or not
	begun time.Time
	last  time.Time
	shown int // length of the line that stands there
}

const (
	progressAfter = time.Second            // quicker work shows nothing
	progressEvery = 100 * time.Millisecond // and the line does not flicker
)

func newProgress(a *app, quiet bool) *progress {
	f, isFile := a.err.(*os.File)
	return &progress{app: a, on: !quiet && isFile && term.IsTerminal(int(f.Fd())), begun: time.Now()}
}

// step is told of each finished step.
func (p *progress) step(done, all int, what string) {
	now := time.Now()
	if p.each {
		fmt.Fprintln(p.app.err, printable(fmt.Sprintf("%.1f s: %d of %d: %s", now.Sub(p.begun).Seconds(), done, all, what)))
		return
	}
	if !p.on || now.Sub(p.begun) < progressAfter || now.Sub(p.last) < progressEvery {
		return
	}
	p.last = now
	line := printable(fmt.Sprintf("%d of %d: %s", done, all, what))
	fmt.Fprintf(p.app.err, "\r%-*s", p.shown, line)
	p.shown = max(p.shown, len(line))
}

// done takes the line away.
func (p *progress) done() {
	if p.shown > 0 {
		fmt.Fprintf(p.app.err, "\r%*s\r", p.shown, "")
	}
}
