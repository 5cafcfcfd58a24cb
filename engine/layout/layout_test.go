package layout

import (
	"strings"
	"testing"
	"unicode/utf8"
)

func TestTable(t *testing.T) {
	var b strings.Builder
	Table(&b, [][]string{{"", "σ", "p"}, {"a / b", "−1.3", "0.19"}, {"long name", "+0.1", ""}})
	want := "                σ     p\n  a / b      −1.3  0.19\n  long name  +0.1\n"
	if b.String() != want {
		t.Errorf("got\n%swant\n%s", b.String(), want)
	}
}

// A table that is too wide puts names on lines of their own.
func TestWideTable(t *testing.T) {
	var b strings.Builder
	name := strings.Repeat("n", 60)
	Table(&b, [][]string{{"", "head"}, {name, strings.Repeat("1", 40)}})
	want := "       " + strings.Repeat(" ", 36) + "head\n  " + name + "\n       " + strings.Repeat("1", 40) + "\n"
	if b.String() != want {
		t.Errorf("got\n%swant\n%s", b.String(), want)
	}
}

func TestWrap(t *testing.T) {
	var b strings.Builder
	words := strings.Repeat("größer ", 40)
	Wrap(&b, "  head: ", 2, words)
	lines := strings.Split(strings.TrimSuffix(b.String(), "\n"), "\n")
	if len(lines) != 4 || !strings.HasPrefix(lines[0], "  head: größer") || !strings.HasPrefix(lines[1], strings.Repeat(" ", 10)+"größer") {
		t.Errorf("got\n%s", b.String())
	}
	for _, line := range lines {
		if n := utf8.RuneCountInString(line); n > Width {
			t.Errorf("%d columns: %s", n, line)
		}
	}
	if got := strings.Join(strings.Fields(b.String()), " "); got != "head: "+strings.TrimSpace(words) {
		t.Errorf("words were lost: %s", got)
	}
}

func TestBytesAndSeconds(t *testing.T) {
	for n, want := range map[int64]string{0: "0 B", 999: "999 B", 1000: "1.0 kB", 9949: "9.9 kB", 9951: "10 kB", 999499: "999 kB", 999500: "1.0 MB", 4 << 30: "4.3 GB", 1 << 60: "1152922 TB"} {
		if got := Bytes(n); got != want {
			t.Errorf("%d: %q, want %q", n, got, want)
		}
	}
	for s, want := range map[float64]string{0: "0 ms", 0.000402: "0.402 ms", 0.15: "150 ms", 4.171: "4.17 s", 75: "75 s"} {
		if got := Seconds(s); got != want {
			t.Errorf("%g: %q, want %q", s, got, want)
		}
	}
}
