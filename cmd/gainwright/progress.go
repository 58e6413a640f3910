package main

import (
	"fmt"
	"io"
	"strings"
	"sync"
	"time"
)

// progress shows how far a long statement is, on a terminal only, and takes it away again.
type progress struct {
	out    io.Writer // nil when there is no terminal
	mutex  sync.Mutex
	begin  time.Time
	last   time.Time
	shown  int // cells on the screen
	latest int
}

// how long a statement runs before it shows its progress, and how often it does
const (
	quietFor   = 400 * time.Millisecond
	everySoFar = 100 * time.Millisecond
)

func newProgress(stream io.Writer) *progress {
	p := &progress{}
	if _, ok := terminalOf(stream); ok {
		p.out = stream
	}
	return p
}

// report hears from the evaluator, from any goroutine.
func (p *progress) report(done, total int) {
	if p.out == nil || total <= 0 {
		return
	}
	p.mutex.Lock()
	defer p.mutex.Unlock()
	now := time.Now()
	if p.begin.IsZero() || done < p.latest {
		p.begin = now
	}
	p.latest = done
	if now.Sub(p.begin) < quietFor || now.Sub(p.last) < everySoFar {
		return
	}
	p.last = now
	text := fmt.Sprintf("%d of %d (%d %%)", done, total, done*100/total)
	if done > 0 && done < total {
		left := time.Duration(float64(now.Sub(p.begin)) / float64(done) * float64(total-done))
		text += fmt.Sprintf(", about %v left", left.Round(time.Second))
	}
	fmt.Fprintf(p.out, "\r%s%s", text, strings.Repeat(" ", max(0, p.shown-len(text))))
	p.shown = max(p.shown, len(text))
}

// clear takes the line away before something else is written.
func (p *progress) clear() {
	if p.out == nil {
		return
	}
	p.mutex.Lock()
	defer p.mutex.Unlock()
	if p.shown > 0 {
		fmt.Fprintf(p.out, "\r%s\r", strings.Repeat(" ", p.shown))
	}
	p.shown, p.latest = 0, 0
	p.begin = time.Time{}
}
