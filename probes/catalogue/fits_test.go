package catalogue

import (
	"bytes"
	"fmt"
	"os"
	"runtime"
	"strings"
	"testing"

	"steelyard/probes/units"
)

// fitsFile puts a FITS file together from cards, padded to blocks.
func fitsFile(table []string, data string) string {
	var b strings.Builder
	for _, header := range [][]string{{"SIMPLE  =                    T", "BITPIX  =                    8", "NAXIS   =                    0"}, table} {
		start := b.Len()
		for _, card := range append(header[:len(header):len(header)], "END") {
			fmt.Fprintf(&b, "%-80s", card)
		}
		b.WriteString(strings.Repeat(" ", padding(b.Len()-start)))
	}
	return b.String() + data
}

// cardsOf returns the cards of a table of doubles a and b with n rows, the
// given ones replaced.
func cardsOf(n string, replace ...string) []string {
	cards := []string{"XTENSION= 'BINTABLE'", "BITPIX  =                    8", "NAXIS   =                    2", "NAXIS1  = 16", "NAXIS2  = " + n,
		"PCOUNT  = 0", "GCOUNT  = 1", "TFIELDS = 2", "TTYPE1  = 'a'", "TFORM1  = 'D'", "TTYPE2  = 'b'", "TFORM2  = '1D'"}
	for _, r := range replace {
		for i := range cards {
			if cards[i][:8] == r[:8] {
				cards[i] = r
				r = ""
				break
			}
		}
		if r != "" {
			cards = append(cards, r)
		}
	}
	return cards
}

func TestBadFITSHeaders(t *testing.T) {
	const data = "0123456789abcdef0123456789abcdef"
	for _, c := range []struct {
		name, content, text string
	}{
		{"10^12 rows", fitsFile(cardsOf("1000000000000"), data), "the FITS header announces 1000000000000 rows of 16 bytes, but only 32 bytes follow it; the file is cut short or damaged"},
		{"10^18 rows", fitsFile(cardsOf("1000000000000000000"), data), "the FITS header announces 1000000000000000000 rows"},
		{"more than an integer", fitsFile(cardsOf("99999999999999999999999"), data), "the FITS keyword NAXIS2 is \"99999999999999999999999\", where a whole number must be"},
		{"rows of nothing", fitsFile(cardsOf("1000000000000", "NAXIS1  = 0", "TFIELDS = 0"), data), "announces 1000000000000 rows of 0 bytes"},
		{"one row too many", fitsFile(cardsOf("3"), data), "announces 3 rows of 16 bytes, but only 32 bytes follow"},
		{"negative rows", fitsFile(cardsOf("-1"), data), "NAXIS2 is -1; it cannot be negative"},
		{"no NAXIS2", fitsFile(cardsOf("2", "NAXIS2  ="), data), "NAXIS2 is missing"},
		{"text for a number", fitsFile(cardsOf("2", "TFIELDS = 'two'"), data), "TFIELDS is \"two\", where a whole number must be"},
		{"too many fields", fitsFile(cardsOf("2", "TFIELDS = 1000"), data), "cannot be above 999"},
		{"too many axes", fitsFile(cardsOf("2", "NAXIS   = 100000000000"), data), "NAXIS is 100000000000"},
		{"one axis", fitsFile(cardsOf("2", "NAXIS   = 1"), data), "two axes, not 1"},
		{"no form", fitsFile(cardsOf("2", "TFORM2  = ''"), data), "TFORM2 is \"\", which is not the form of a column"},
		{"unknown form", fitsFile(cardsOf("2", "TFORM2  = '1Z'"), data), "TFORM2 is \"1Z\""},
		{"endless form", fitsFile(cardsOf("2", "TFORM2  = '99999999999999D'"), data), "too long a column"},
		{"too wide", fitsFile(cardsOf("2", "TFORM2  = '2D'"), data), "wider than its rows of 16 bytes (TFORM2)"},
		{"too narrow", fitsFile(cardsOf("2", "TFORM2  = '1E'"), data), "take 12 bytes, its rows 16"},
		{"bad scale", fitsFile(cardsOf("2", "TSCAL1  = 'x'"), data), "TSCAL1 is \"x\", where a number must be"},
		{"scale that is not finite", fitsFile(cardsOf("2", "TZERO1  = 1E999"), data), "TZERO1"},
		{"bad null", fitsFile(cardsOf("2", "TFORM1  = 'K'", "TNULL1  = 1.5"), data), "TNULL1 is \"1.5\""},
		{"bad BITPIX", fitsFile(cardsOf("2", "BITPIX  = 7"), data), "BITPIX is 7"},
		{"compressed", fitsFile(cardsOf("2", "ZTABLE  = T"), data), "unpack it first (funpack)"},
		{"no rows", fitsFile(cardsOf("0"), ""), "the table has no rows"},
		{"cut in the header", fitsFile(cardsOf("2"), data)[:4000], "the file ends inside a FITS header"},
		{"only a primary header", fitsFile(nil, "")[:2880], "holds no binary table"},
		{"a header without an end", "SIMPLE  = T" + strings.Repeat(" ", 2880*(maxBlocks+1)), "a FITS header without an end"},
		{"an extension first", fitsFile(cardsOf("2"), data)[2880:], "lacks the primary header"},
		{"overflow", fitsFile(cardsOf("2", "TSCAL1  = 1E300", "TFORM1  = 'D'"), "\x7f\xe0\x00\x00\x00\x00\x00\x00"+data[:24]), "holds +Inf, not a finite number"},
	} {
		var before, after runtime.MemStats
		path := saved(t, "t.fits", c.content)
		runtime.ReadMemStats(&before)
		table, err := Read(path, []Want{{Role: "a", Name: "a"}}, nil, Limits{})
		runtime.ReadMemStats(&after)
		if err == nil || !strings.Contains(err.Error(), c.text) || !strings.HasPrefix(err.Error(), path) {
			t.Errorf("%s: %+v, %v; want %s", c.name, table, err, c.text)
		}
		// Nothing the header announces is allocated: the buffers of a reader are
		// 256 KiB, the longest header here 3 MB.
		if used := after.TotalAlloc - before.TotalAlloc; used > 20<<20 {
			t.Errorf("%s: %d bytes allocated", c.name, used)
		}
	}
	path := saved(t, "t.fits", fitsFile(cardsOf("2", "TUNIT1  = 'kpc     '           / radius", "TTYPE2  = 'it''s'"), data))
	h, err := Peek(path)
	if err != nil || h.Columns[0].Unit != "kpc" || h.Columns[1].Name != "it's" {
		t.Errorf("%+v, %v", h, err)
	}
}

// A long string goes on over CONTINUE cards (FITS standard 4.0, section 4.2.1.2).
func TestContinuedCards(t *testing.T) {
	h, err := readFITSHeader(strings.NewReader(fitsFile([]string{"A       = 'one &'", "CONTINUE  'two &' / remark", "CONTINUE  'three'", "COMMENT = not a value", "B       = 'x / y' / z", "C       = 1.5D3 / real"}, "")[2880:]))
	if err != nil || h["A"] != "one two three" || h["B"] != "x / y" || h["C"] != "1.5D3" {
		t.Errorf("%q, %v", h, err)
	}
	if x, err := h.real("C", 0); err != nil || x != 1500 {
		t.Errorf("1.5D3 is %v, %v", x, err)
	}
}

func FuzzFITS(f *testing.F) {
	for _, name := range []string{"types.fits", "several.fits", "ascii_table.fits"} {
		content, err := os.ReadFile(fixture(name))
		if err != nil {
			f.Fatal(err)
		}
		f.Add(content)
	}
	f.Add([]byte(fitsFile(cardsOf("2"), "0123456789abcdef0123456789abcdef")))
	f.Fuzz(func(t *testing.T, content []byte) { readWhole(t, content, "t.fits") })
}

// readWhole reads every column that can be read of a table in memory: it must
// neither panic nor give a number that is not finite.
func readWhole(t *testing.T, content []byte, path string) {
	src, err := openContent(bytes.NewReader(content), int64(len(content)), path, nil)
	if err != nil {
		return
	}
	var want []Want
	for i, c := range src.header().Columns {
		w := Want{Role: fmt.Sprint(i), Name: c.Name, Text: c.Text, Raw: i%2 == 0}
		if u, err := units.Parse(c.Unit); err == nil {
			w.As = u.String()
		}
		if _, err := resolve(src.header(), []Want{w}, nil); err == nil {
			want = append(want, w)
		}
	}
	plans, err := resolve(src.header(), want, nil)
	if err != nil {
		t.Fatal(err) // each of them could be resolved alone
	}
	table, err := gather(src, plans, nil, Limits{Rows: 1000, Bytes: 1 << 20})
	if err != nil {
		return
	}
	for _, c := range table.Columns {
		if n := len(c.Values) + len(c.Text); n != table.Len() {
			t.Fatalf("%d values for %d rows", n, table.Len())
		}
		for _, x := range c.Values {
			if x-x != 0 {
				t.Fatalf("%v came through", x)
			}
		}
	}
}
