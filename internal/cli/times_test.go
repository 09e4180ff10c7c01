package cli

import (
	"slices"
	"testing"
)

func TestTimesKeepTheUsersText(t *testing.T) {
	var times timesFlag
	for _, list := range []string{"0.50, 1e1", "+3"} {
		if err := times.Set(list); err != nil {
			t.Fatal(err)
		}
	}
	if want := []string{"u_t0.50", "u_t1e1", "u_t+3"}; !slices.Equal(times.names("u_t"), want) {
		t.Errorf("columns %v, want %v", times.names("u_t"), want)
	}
	if want := []float64{0.5, 10, 3}; !slices.Equal(times.seconds, want) {
		t.Errorf("seconds %v, want %v", times.seconds, want)
	}
}

func TestTimesRefuse(t *testing.T) {
	for _, list := range []string{"", "0", "-1", "nan", "inf", "1,", "1;2", "1 2", "1,1", "1e999"} {
		if err := new(timesFlag).Set(list); err == nil {
			t.Errorf("--time %q was taken", list)
		}
	}
}
