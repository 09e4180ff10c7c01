package cli

import (
	"bytes"
	"encoding/json"
	"math"
	"os"
	"strings"
	"testing"
)

// distances runs heatskin distance on the demo part, by the front alone, and returns its
// summary.
func distances(t *testing.T, args ...string) (s struct {
	Mean float64 `json:"estimated_mean_error"`
	Most float64 `json:"estimated_max_error"`
}) {
	t.Helper()
	var out, told bytes.Buffer
	file := t.TempDir() + "/sum.json"
	args = append([]string{"distance", "../../testdata/demo/cap.stl", "--quiet", "--max-edge", "9", "--summary", file}, args...)
	if status := Main(args, Streams{In: strings.NewReader(""), Out: &out, Err: &told}); status != statusDone {
		t.Fatalf("status %d: %s", status, told.String())
	}
	data, err := os.ReadFile(file)
	if err == nil {
		err = json.Unmarshal(data, &s)
	}
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// With a column for each source the estimate is that of the worst of them. Sources at
// vertices leave the mesh as it is, so that it is the same number to the last digit.
func TestEstimateIsTheWorstColumn(t *testing.T) {
	near, far := distances(t, "--at-vertex", "12"), distances(t, "--at-vertex", "500")
	both := distances(t, "--at-vertex", "12", "--at-vertex", "500", "--each")
	if both.Mean != math.Max(near.Mean, far.Mean) || both.Most != math.Max(near.Most, far.Most) {
		t.Errorf("both: %+v, want the greater of %+v and %+v", both, near, far)
	}
	if near == far {
		t.Errorf("the two sources have the same estimate %+v", near)
	}
	union := distances(t, "--at-vertex", "12", "--at-vertex", "500")
	if union == both {
		t.Errorf("the union's estimate is that of the columns, %+v", union)
	}
}

func TestShare(t *testing.T) {
	for text, want := range map[string]float64{"0.2%": 0.002, "0.002": 0.002, " 5 % ": 0.05, "1e-3%": 1e-5} {
		if got, err := share(text); err != nil || math.Abs(got-want) > 1e-16 {
			t.Errorf("%q: got %g, %v, want %g", text, got, err, want)
		}
	}
	for _, text := range []string{"", "%", "0", "0%", "1", "100%", "-1%", "nan", "inf", "0.2%%", "2 percent"} {
		if got, err := share(text); err == nil {
			t.Errorf("%q: got %g, want an error", text, got)
		}
	}
}

func TestRoughly(t *testing.T) {
	for want, x := range map[string]float64{"0 %": 3e-31, "below 0.0001 %": 1e-13, "0.00012 %": 1.23e-6, "0.29 %": 0.00288, "72 %": 0.72} {
		if got := roughly(x); got != want {
			t.Errorf("%g: got %q, want %q", x, got, want)
		}
	}
}
