package cli

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"syscall"
	"testing"
)

func TestExitStatus(t *testing.T) {
	disk := &fs.PathError{Op: "open", Path: "part.stl", Err: fs.ErrNotExist}
	for _, tc := range []struct {
		name string
		err  error
		want int
	}{
		{"done", nil, 0},
		{"disk", disk, 1},
		{"interrupted", fmt.Errorf("factor: %w", context.Canceled), 1},
		{"interrupted-while-reading", refuse(context.Canceled), 1},
		{"usage", usagef("--time 0: want a number above 0"), 2},
		{"unreadable-mesh", refuse(disk), 3},
		{"wrapped-refusal", fmt.Errorf("check: %w", refusef("no triangle")), 3},
		{"accuracy", &accuracyError{errors.New("0.3 % where 0.2 % was asked for")}, 4},
		{"our-mistake", &internalError{slip: "index out of range"}, 1},
	} {
		t.Run(tc.name, func(t *testing.T) {
			if got := exitStatus(tc.err); got != tc.want {
				t.Errorf("%v: exit status %d, want %d", tc.err, got, tc.want)
			}
		})
	}
}

func TestMessageIsOneLineOrNone(t *testing.T) {
	if got := message(refuse(errors.New("bad\nfile"))); got != "bad file" {
		t.Errorf("got %q", got)
	}
	if got := message(fmt.Errorf("writing: %w", &fs.PathError{Op: "write", Path: "|1", Err: syscall.EPIPE})); got != "" {
		t.Errorf("a closed pipe is told: %q", got)
	}
}

// Known distances between words, counted by hand.
func TestEditDistance(t *testing.T) {
	for _, tc := range []struct {
		a, b string
		want int
	}{{"time", "time", 0}, {"tmie", "time", 2}, {"probe", "probe-out", 4}, {"", "out", 3}, {"steper", "stepper", 1}} {
		if got := editDistance(tc.a, tc.b); got != tc.want {
			t.Errorf("%q to %q: got %d, want %d", tc.a, tc.b, got, tc.want)
		}
	}
}
