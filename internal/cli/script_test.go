package cli

import (
	"bytes"
	"compress/gzip"
	"encoding/csv"
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"

	"github.com/rogpeppe/go-internal/testscript"
)

func TestMain(m *testing.M) {
	testscript.Main(m, map[string]func(){
		"heatskin": func() { os.Exit(Main(os.Args[1:], Streams{In: os.Stdin, Out: os.Stdout, Err: os.Stderr})) },
	})
}

// TestScripts runs testdata/*.txtar: each is one story at the command line. Beside
// testscript's own commands they use
//
//	exits N COMMAND...                       the command ends with exactly this status
//	value FILE KEY=ROW COLUMN WANT TOLERANCE a number in a CSV, in the row that KEY names
//	close FILE COLUMN FILE COLUMN TOLERANCE  two columns agree row by row
//	rows FILE N                              a CSV has N rows below its header
//	key FILE PATH [WANT [TOLERANCE]]         a value in a JSON file, "mesh.vertices"
//	gzip FILE OUT                            compress
//	cut FILE BYTES OUT                       the first bytes only
//	clean                                    no temporary file was left in the directory
//
// $CAP is the part of `make demo`, $PROBES its places of known distance.
func TestScripts(t *testing.T) {
	demo, err := filepath.Abs("../../testdata/demo")
	if err != nil {
		t.Fatal(err)
	}
	testscript.Run(t, testscript.Params{
		Dir:                "testdata",
		RequireUniqueNames: true,
		Setup: func(env *testscript.Env) error {
			env.Setenv("CAP", filepath.Join(demo, "cap.stl"))
			env.Setenv("PROBES", filepath.Join(demo, "probes.csv"))
			return nil
		},
		Cmds: map[string]func(*testscript.TestScript, bool, []string){
			"exits": scriptExits,
			"value": scriptValue,
			"close": scriptClose,
			"rows":  scriptRows,
			"key":   scriptKey,
			"gzip":  scriptGzip,
			"cut":   scriptCut,
			"clean": scriptClean,
		},
	})
}

// want stops a script whose command is not used as it should be.
func want(ts *testscript.TestScript, ok bool, usage string) {
	if !ok {
		ts.Fatalf("usage: %s", usage)
	}
}

func scriptExits(ts *testscript.TestScript, neg bool, args []string) {
	want(ts, !neg && len(args) >= 2, "exits N COMMAND...")
	status := 0
	if err := ts.Exec(args[1], args[2:]...); err != nil {
		var exit *exec.ExitError
		if !errors.As(err, &exit) {
			ts.Fatalf("%s: %v", args[1], err)
		}
		status = exit.ExitCode()
	}
	if strconv.Itoa(status) != args[0] {
		ts.Fatalf("exit status %d, want %s", status, args[0])
	}
}

func readCSV(ts *testscript.TestScript, file string) (header []string, rows [][]string) {
	all, err := csv.NewReader(strings.NewReader(ts.ReadFile(file))).ReadAll()
	ts.Check(err)
	if len(all) == 0 {
		ts.Fatalf("%s is empty", file)
	}
	return all[0], all[1:]
}

func scriptValue(ts *testscript.TestScript, neg bool, args []string) {
	const use = "value FILE KEY=ROW COLUMN WANT TOLERANCE"
	want(ts, !neg && len(args) == 5, use)
	key, row, found := strings.Cut(args[1], "=")
	want(ts, found, use)
	header, rows := readCSV(ts, args[0])
	k, c := slices.Index(header, key), slices.Index(header, args[2])
	if k < 0 || c < 0 {
		ts.Fatalf("%s has the columns %v", args[0], header)
	}
	for _, fields := range rows {
		if fields[k] == row {
			compare(ts, fields[c], args[3], args[4])
			return
		}
	}
	ts.Fatalf("%s has no row with %s", args[0], args[1])
}

// compare checks a number against what is wanted: within an absolute tolerance, or
// a relative one that ends in %.
func compare(ts *testscript.TestScript, got, wanted, tolerance string) {
	g, err := strconv.ParseFloat(got, 64)
	ts.Check(err)
	w, err := strconv.ParseFloat(wanted, 64)
	ts.Check(err)
	percent, relative := strings.CutSuffix(tolerance, "%")
	tol, err := strconv.ParseFloat(percent, 64)
	ts.Check(err)
	if relative {
		tol *= math.Abs(w) / 100
	}
	if !(math.Abs(g-w) <= tol) {
		ts.Fatalf("got %s, want %s within %s", got, wanted, tolerance)
	}
}

func scriptClose(ts *testscript.TestScript, neg bool, args []string) {
	want(ts, !neg && len(args) == 5, "close FILE COLUMN FILE COLUMN TOLERANCE")
	var columns [2][]string
	for i := range columns {
		header, rows := readCSV(ts, args[2*i])
		c := slices.Index(header, args[2*i+1])
		if c < 0 {
			ts.Fatalf("%s has the columns %v", args[2*i], header)
		}
		for _, fields := range rows {
			columns[i] = append(columns[i], fields[c])
		}
	}
	if len(columns[0]) == 0 || len(columns[0]) != len(columns[1]) {
		ts.Fatalf("%d rows and %d rows", len(columns[0]), len(columns[1]))
	}
	for i, got := range columns[0] {
		compare(ts, got, columns[1][i], args[4])
	}
}

func scriptRows(ts *testscript.TestScript, neg bool, args []string) {
	want(ts, !neg && len(args) == 2, "rows FILE N")
	if _, rows := readCSV(ts, args[0]); strconv.Itoa(len(rows)) != args[1] {
		ts.Fatalf("%s has %d rows, want %s", args[0], len(rows), args[1])
	}
}

func scriptKey(ts *testscript.TestScript, neg bool, args []string) {
	want(ts, len(args) >= 2 && len(args) <= 4, "key FILE PATH [WANT [TOLERANCE]]")
	var at any
	ts.Check(json.Unmarshal([]byte(ts.ReadFile(args[0])), &at))
	found := true
	for step := range strings.SplitSeq(args[1], ".") {
		switch node := at.(type) {
		case map[string]any:
			at, found = node[step]
		case []any:
			i, err := strconv.Atoi(step)
			if found = err == nil && i < len(node); found {
				at = node[i]
			}
		default:
			found = false
		}
		if !found {
			break
		}
	}
	if found == neg {
		ts.Fatalf("%s: key %s there: %v", args[0], args[1], found)
	}
	switch got := fmt.Sprint(at); len(args) {
	case 3:
		if got != args[2] {
			ts.Fatalf("%s is %s, want %s", args[1], got, args[2])
		}
	case 4:
		compare(ts, got, args[2], args[3])
	}
}

func scriptGzip(ts *testscript.TestScript, neg bool, args []string) {
	want(ts, !neg && len(args) == 2, "gzip FILE OUT")
	var b bytes.Buffer
	w := gzip.NewWriter(&b)
	_, err := w.Write([]byte(ts.ReadFile(args[0])))
	ts.Check(err)
	ts.Check(w.Close())
	ts.Check(os.WriteFile(ts.MkAbs(args[1]), b.Bytes(), 0o666))
}

func scriptCut(ts *testscript.TestScript, neg bool, args []string) {
	want(ts, !neg && len(args) == 3, "cut FILE BYTES OUT")
	n, err := strconv.Atoi(args[1])
	ts.Check(err)
	ts.Check(os.WriteFile(ts.MkAbs(args[2]), []byte(ts.ReadFile(args[0])[:n]), 0o666))
}

func scriptClean(ts *testscript.TestScript, neg bool, args []string) {
	want(ts, !neg && len(args) == 0, "clean")
	entries, err := os.ReadDir(ts.MkAbs("."))
	ts.Check(err)
	for _, entry := range entries {
		// Every script's own files have plain names; a file under way begins with a dot.
		if name := entry.Name(); name != ".tmp" && strings.HasPrefix(name, ".") {
			ts.Fatalf("%s was left behind", name)
		}
	}
}
