package meshfile

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"strconv"
	"strings"
	"testing"
)

// Numbers must come out as strconv rounds them: to the last bit, in one rounding.
// The seeds are fixed; formats and lengths are those that mesh files hold.
func TestNumbersMatchStrconv(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 11))
	longExponent := "1e" + strings.Repeat("0", 500) + "7"
	words := []string{
		"0", "-0", "+1", "1.", ".5", "-.5e1", "1e22", "1e23", "1E-22", "9007199254740993", "9007199254740992.5",
		"0.000000000000000000000000000001", "12345678901234567890", "18446744073709551617", "0.18446744073709551617", "1e-320", "1e38", "3.4028235e38", "1e-45", "1e-46",
		"16777217", "16777219", "1.00000017881393432617187499", "1.00000017881393432617187501", "1.1754943e-38",
		"00000000000000000000000000000000000000000000000000000000000000000000000000000001.5",
		longExponent, longExponent, longExponent, // which the buffer's end cuts
		"1.500000000000000000000000000000000000000000000000000000000000000000000000000000e0000000000000000001",
	}
	for range 50_000 {
		v := rng.NormFloat64() * math.Pow(10, float64(rng.IntN(16)-8))
		switch rng.IntN(7) {
		case 0:
			words = append(words, strconv.FormatFloat(v, 'e', rng.IntN(18), 64))
		case 1:
			words = append(words, strconv.FormatFloat(v, 'f', rng.IntN(12), 64))
		case 2:
			words = append(words, strconv.FormatFloat(v, 'g', -1, 64))
		case 3:
			words = append(words, strconv.FormatFloat(v, 'g', -1, 32))
		case 4:
			words = append(words, strconv.Itoa(rng.IntN(1<<40)))
		case 5: // half-way between two singles, where rounding twice goes wrong, and beside it
			half := float64(float32(v)) * (1 + 0x1p-24)
			half = math.Nextafter(half, half+float64(rng.IntN(3)-1))
			words = append(words, strconv.FormatFloat(half, 'f', 40, 64))
			half = 8 + (float64(rng.IntN(1<<20))+0.5)*0x1p-20 // 16 digits tell it apart from its double
			words = append(words, strconv.FormatFloat(half, 'f', 15, 64))
		case 6:
			words = append(words, strconv.FormatFloat(v*1e-40, 'e', 8, 64)) // singles below the normal ones
		}
	}
	text := strings.Join(words, " ")
	wide, narrow := textSource(text), textSource(text)
	for _, word := range words {
		var got float64
		want, err := strconv.ParseFloat(word, 64)
		if ok := wide.number(&got); !ok || err != nil || math.Float64bits(got) != math.Float64bits(want) {
			t.Fatalf("%s: got %v (%v), want %v (%v)", word, got, ok, want, err)
		}
		want, err = strconv.ParseFloat(word, 32)
		if ok := narrow.number32(&got); ok != (err == nil) || ok && math.Float64bits(got) != math.Float64bits(want) {
			t.Fatalf("%s in single precision: got %v (%v), want %v (%v)", word, got, ok, want, err)
		}
	}
}

func TestWordsThatAreNoNumbers(t *testing.T) {
	for word, want := range map[string]string{
		"nan": `"nan", which is not finite`, "-inf": `"-inf", which is not finite`, "1e999": `"1e999", which is not finite`,
		"1,5": `"1,5"`, "1.5.2": `"1.5.2"`, "--1": `"--1"`, "e5": `"e5"`, "1e": `"1e"`, ".": `"."`, "-": `"-"`,
		"1.0#QNAN": `"1.0#QNAN"`, "": "end of file", "\n1": "end of line",
	} {
		s := textSource(word)
		var x float64
		if s.number(&x) || s.got != want {
			t.Errorf("%q: number %v, got %s, want %s", word, x, s.got, want)
		}
	}
}

func textSource(text string) *source {
	s := newSource(context.Background(), "test", strings.NewReader(text), make([]byte, 1<<10))
	s.line = 1
	return s
}

// Words and lines must not depend on where the buffer happens to end.
func TestWordsAcrossBuffers(t *testing.T) {
	const text = "one two\r\n\r\nthree\\\r\n four # not this\rfive\\six \\\nseven"
	want := "1:one 1:two 3:three 4:four 5:five\\six 6:seven"
	for size := 12; size < 60; size++ {
		s := newSource(context.Background(), "test", strings.NewReader(text), make([]byte, size))
		s.line, s.continues = 1, true
		var got []string
		for w := s.nextWord(); len(w) > 0; w = s.nextWord() {
			got = append(got, fmt.Sprintf("%d:%s", s.line, w))
		}
		if joined := strings.Join(got, " "); joined != want || s.err != nil {
			t.Fatalf("buffer of %d bytes: got %s (%v), want %s", size, joined, s.err, want)
		}
	}
}
