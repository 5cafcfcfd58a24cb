package catalogue

import (
	"bytes"
	"io"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"github.com/astrogo/fitsio"
)

var out = []OutColumn{
	{Name: "id", Values: []float64{1, -2, 9007199254740992}, Integer: true},
	{Name: "it's, a \"name\"", Text: []string{"a b", "c,d", "e'f\"g"}},
	{Name: "ra", Unit: "deg", Values: []float64{0.1, -1.0 / 3, 359.9999999}},
	{Name: "M", Unit: "10**14solMass", Values: []float64{1e-300, 6.02e23, 5e-324}},
}

func writers() map[string]func(path string, columns []OutColumn) error {
	return map[string]func(path string, columns []OutColumn) error{
		"t.csv": WriteCSV, "t.ecsv": WriteECSV,
		"t.fits": func(path string, columns []OutColumn) error { return WriteFITS(path, "SHAPES", columns) },
	}
}

// What is written is read back with the same bits and units, and writing again
// gives the same bytes.
func TestWritersRoundTrip(t *testing.T) {
	for name, write := range writers() {
		path := filepath.Join(t.TempDir(), name)
		var before []byte
		for range 2 {
			if err := write(path, out); err != nil {
				t.Fatal(err)
			}
			content, err := os.ReadFile(path)
			if err != nil {
				t.Fatal(err)
			}
			if before != nil && !bytes.Equal(before, content) {
				t.Errorf("%s: other bytes the second time", name)
			}
			before = content
		}
		var want []Want
		for _, c := range out {
			want = append(want, Want{Role: c.Name, Name: c.Name, Text: c.Text != nil, Raw: true})
		}
		table, err := Read(path, want, nil, Limits{})
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		h, err := Peek(path)
		if err != nil {
			t.Fatal(err)
		}
		for i, c := range out {
			if got := table.Column(c.Name); !slices.Equal(got.Values, c.Values) || !slices.Equal(got.Text, c.Text) {
				t.Errorf("%s, %s: %v", name, c.Name, got)
			}
			if unit := h.Columns[i].Unit; unit != c.Unit && name != "t.csv" {
				t.Errorf("%s, %s: unit %q", name, c.Name, unit)
			}
		}
		if files, err := os.ReadDir(filepath.Dir(path)); err != nil || len(files) != 1 {
			t.Errorf("%s: left behind %v (%v)", name, files, err)
		}
	}
}

func TestWritersRefuse(t *testing.T) {
	for name, write := range writers() {
		path := filepath.Join(t.TempDir(), name)
		if err := os.WriteFile(path, []byte("old"), 0o644); err != nil {
			t.Fatal(err)
		}
		for text, columns := range map[string][]OutColumn{
			"no columns":           nil,
			"the first column 1":   {{Name: "a", Values: []float64{1}}, {Name: "b", Values: []float64{1, 2}}},
			"are named":            {{Name: "a", Values: []float64{1}}, {Name: "a", Values: []float64{1}}},
			"row 2 of column":      {{Name: "a", Values: []float64{1, math.NaN()}}},
			"cannot be written":    {{Name: "a", Values: []float64{1.5}, Integer: true}},
			"not plain text":       {{Name: "a", Text: []string{"x\ny"}}},
			"is \"#x\"":            {{Name: "a", Text: []string{"#x"}}},
			"not known":            {{Name: "a", Unit: "blorp", Values: []float64{1}}},
			"column name \"\"":     {{Name: "", Values: []float64{1}}},
			"both numbers and tex": {{Name: "a", Values: []float64{1}, Text: []string{"x"}}},
		} {
			if err := write(path, columns); err == nil || !strings.Contains(err.Error(), text) {
				t.Errorf("%s: %v, want %s", name, err, text)
			}
		}
		if content, err := os.ReadFile(path); err != nil || string(content) != "old" {
			t.Errorf("%s: the old file is now %q (%v)", name, content, err)
		}
	}
}

// A FITS reader by others reads the same numbers from a file written here, and
// from the one astropy wrote.
func TestAgreesWithFitsio(t *testing.T) {
	path := filepath.Join(t.TempDir(), "t.fits")
	if err := WriteFITS(path, "SHAPES", out); err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		path    string
		numbers []string
	}{{path, []string{"ra", "M"}}, {fixture("same.fits"), []string{"ra", "dec", "r", "d", "kT", "ne", "M", "z", "sigma"}}} {
		content, err := os.ReadFile(c.path)
		if err != nil {
			t.Fatal(err)
		}
		f, err := fitsio.Open(io.Reader(bytes.NewReader(content)))
		if err != nil {
			t.Fatal(err)
		}
		table := f.HDU(1).(*fitsio.Table)
		rows, err := table.Read(0, table.NumRows())
		if err != nil {
			t.Fatal(err)
		}
		theirs := map[string][]float64{}
		for rows.Next() {
			row := map[string]any{}
			for _, name := range c.numbers {
				row[name] = float64(0)
			}
			if err := rows.Scan(&row); err != nil {
				t.Fatal(err)
			}
			for _, name := range c.numbers {
				theirs[name] = append(theirs[name], row[name].(float64))
			}
		}
		for _, name := range c.numbers {
			ours, err := Read(c.path, []Want{{Role: "x", Name: name, Raw: true}}, nil, Limits{})
			if err != nil || !slices.Equal(ours.Values("x"), theirs[name]) {
				t.Errorf("%s, %s: fitsio reads %v, we read %+v (%v)", c.path, name, theirs[name], ours, err)
			}
		}
	}
}
