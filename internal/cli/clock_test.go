package cli

import (
	"bytes"
	"strings"
	"sync"
	"testing"
	"time"
)

// A locked buffer, since the bar is drawn from a timer's goroutine.
type screen struct {
	mu sync.Mutex
	b  bytes.Buffer
}

func (s *screen) Write(p []byte) (int, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.b.Write(p)
}

func (s *screen) String() string {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.b.String()
}

func TestClockTimesStagesInOrder(t *testing.T) {
	c := newClock(&screen{}, false)
	c.enter("read")
	c.progress("order", 0)
	c.progress("order", 1)
	c.progress("factor", 0.5)
	c.stop()
	var names []string
	for _, s := range c.timed() {
		names = append(names, s.Name)
		if s.Seconds < 0 {
			t.Errorf("%s took %g s", s.Name, s.Seconds)
		}
	}
	if got := strings.Join(names, " "); got != "read order factor" {
		t.Errorf("stages %q", got)
	}
}

func TestBarOnlyForLongStages(t *testing.T) {
	var quick, slow, hidden screen
	c := newClock(&quick, true)
	c.enter("read")
	c.progress("read", 0.5)
	c.stop()
	if quick.String() != "" {
		t.Errorf("a bar for a short stage: %q", quick.String())
	}
	for _, tc := range []struct {
		w       *screen
		visible bool
	}{{&slow, true}, {&hidden, false}} {
		c := newClock(tc.w, tc.visible)
		c.after = time.Millisecond
		c.enter("factor")
		for deadline := time.Now().Add(5 * time.Second); time.Now().Before(deadline); time.Sleep(time.Millisecond) {
			c.progress("factor", 0.25)
			if strings.Contains(tc.w.String(), "25%") || !tc.visible {
				break
			}
		}
		c.above(func() { tc.w.Write([]byte("a line\n")) })
		c.stop()
	}
	if got := slow.String(); !strings.Contains(got, "factor") || !strings.Contains(got, "25%") {
		t.Errorf("no bar for a long stage: %q", got)
	}
	if got := hidden.String(); got != "a line\n" {
		t.Errorf("a bar where there is no terminal: %q", got)
	}
}
