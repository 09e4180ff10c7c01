package cli

import (
	"io"
	"sync"
	"time"

	"github.com/schollz/progressbar/v3"
)

// A stage is one part of a run and how long it took.
type stage struct {
	Name    string  `json:"name"`
	Seconds float64 `json:"seconds"`
}

// A clock times the stages of a run, one after the other, and draws a bar for those
// that take long. Its methods may be called from any goroutine.
type clock struct {
	visible bool          // draw bars at all
	after   time.Duration // how long a stage may take before it gets one

	mu       sync.Mutex
	w        io.Writer
	stages   []stage
	current  string // "" between stages
	began    time.Time
	fraction float64 // of the current stage; below 0 where nobody says
	bar      *progressbar.ProgressBar
	drawn    time.Time // when the bar last changed
}

func newClock(w io.Writer, visible bool) *clock {
	return &clock{visible: visible, after: time.Second, w: w}
}

// enter ends the current stage and starts the next.
func (c *clock) enter(name string) {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.enterLocked(name)
}

// stop ends the current stage.
func (c *clock) stop() { c.enter("") }

func (c *clock) enterLocked(name string) {
	now := time.Now()
	if c.current != "" {
		c.stages = append(c.stages, stage{c.current, now.Sub(c.began).Seconds()})
	}
	c.wipe()
	c.current, c.began, c.fraction = name, now, -1
	if c.visible && name != "" {
		began := now
		time.AfterFunc(c.after, func() {
			c.mu.Lock()
			defer c.mu.Unlock()
			if c.current == name && c.began.Equal(began) {
				c.draw()
			}
		})
	}
}

// progress says how far a stage has come, from 0 to 1. A new name starts a new stage,
// so that a library's report of where it is also times it.
func (c *clock) progress(name string, fraction float64) {
	c.mu.Lock()
	defer c.mu.Unlock()
	if name != c.current {
		c.enterLocked(name)
	}
	known := c.fraction >= 0
	c.fraction = fraction
	if c.bar != nil && (!known || time.Since(c.drawn) > redraw) {
		if !known {
			c.wipe() // the bar without a length gives way to one that has it
		}
		c.draw()
	}
}

// above prints something while no bar is in the way.
func (c *clock) above(print func()) {
	c.mu.Lock()
	defer c.mu.Unlock()
	drawn := c.bar != nil
	c.wipe()
	print()
	if drawn {
		c.draw()
	}
}

// timed lists the stages that have ended.
func (c *clock) timed() []stage {
	c.mu.Lock()
	defer c.mu.Unlock()
	return append([]stage{}, c.stages...)
}

const (
	barSteps = 1000
	redraw   = 100 * time.Millisecond // a terminal, perhaps a slow one, is not to slow the work
)

// draw shows the bar of the current stage as it stands.
func (c *clock) draw() {
	if c.bar == nil {
		steps := barSteps
		if c.fraction < 0 {
			steps = -1
		}
		c.bar = progressbar.NewOptions(steps,
			progressbar.OptionSetWriter(c.w),
			progressbar.OptionSetDescription(c.current),
			progressbar.OptionSetWidth(30),
			progressbar.OptionClearOnFinish(),
			progressbar.OptionSetRenderBlankState(true),
		)
	}
	c.drawn = time.Now()
	// The bar reports a write that failed; a terminal that is gone must not end the run.
	if c.fraction >= 0 {
		_ = c.bar.Set(min(int(c.fraction*barSteps), barSteps-1)) // the last step would end the bar
	}
}

// wipe takes the bar away.
func (c *clock) wipe() {
	if c.bar != nil {
		_ = c.bar.Finish()
		c.bar = nil
	}
}
