package catalogue

import (
	"encoding/csv"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
)

func fixture(name string) string { return filepath.Join("..", "..", "testdata", "tables", name) }

// saved writes content to a file of the given name and returns its path.
func saved(t testing.TB, name, content string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), name)
	if err := os.WriteFile(path, []byte(content), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

// The wanted columns of the table that is written in every format. The recipe
// states the units, which ECSV and FITS state too.
var same = []Want{
	{Role: "number", Name: "id"},
	{Role: "name", Name: "name", Text: true},
	{Role: "ra", Name: "ra", Unit: "deg", As: "rad"},
	{Role: "dec", Name: "dec", Unit: "deg", As: "rad"},
	{Role: "radius", Name: "r", Unit: "arcmin", As: "kpc", Length: true},
	{Role: "distance", Name: "d", Unit: "Mpc", As: "kpc", Length: true},
	{Role: "temperature", Name: "kT", Unit: "keV", As: "keV"},
	{Role: "density", Name: "ne", Unit: "cm**-3", As: "cm**-3"},
	{Role: "mass", Name: "M", Unit: "10**14 Msun", As: "solMass"},
	{Role: "redshift", Name: "z"},
	{Role: "dispersion", Name: "sigma", Unit: "m/s", As: "km/s"},
}

// One table in nine writings gives the same bits: those that Python's fractions
// give for the printed decimals (testdata/tables/README.md).
func TestEveryFormatGivesTheSameDigits(t *testing.T) {
	f, err := os.Open(fixture("same_expected.csv"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	records, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	want, unit := map[string][]float64{}, map[string]string{}
	for _, rec := range records[1:] {
		x, err := strconv.ParseFloat(rec[2], 64)
		if err != nil {
			t.Fatal(err)
		}
		want[rec[0]], unit[rec[0]] = append(want[rec[0]], x), rec[1]
	}
	names := []string{"A 1", "b,2", "c;3", `d"4`, "e5", "f6", "g 7 h", "i8", "j'9", "k10", "l11", "m12"}
	for file, format := range map[string]string{
		"same.csv": "csv", "same.tsv": "csv", "same_semicolon.csv": "csv", "same.txt": "text", "same_commented.txt": "text",
		"same.ecsv": "ecsv", "same_comma.ecsv": "ecsv", "same.fits": "fits",
	} {
		if h, err := Peek(fixture(file)); err != nil || h.Format != format || len(h.Columns) != 11 || h.Columns[0].Text || !h.Columns[1].Text || h.Columns[2].Name != "ra" {
			t.Errorf("%s: header %+v, %v", file, h, err)
		}
		for _, statedBy := range []string{"recipe", "file"} {
			wants := slices.Clone(same)
			if statedBy == "file" {
				if format != "ecsv" && format != "fits" {
					continue
				}
				for i := range wants {
					wants[i].Unit = ""
				}
			}
			table, err := Read(fixture(file), wants, nil, Limits{})
			if err != nil {
				t.Errorf("%s, units from the %s: %v", file, statedBy, err)
				continue
			}
			if table.Len() != 12 || table.Rows[0] != 1 || table.Rows[11] != 12 {
				t.Errorf("%s: rows %v", file, table.Rows)
			}
			if got := table.Column("name").Text; !slices.Equal(got, names) {
				t.Errorf("%s: names %q", file, got)
			}
			for _, w := range wants {
				c := table.Column(w.Role)
				if w.Text {
					continue
				}
				if !slices.Equal(c.Values, want[w.Name]) || c.Unit != unit[w.Name] {
					t.Errorf("%s, column %s in %q: %v, want %v in %q", file, w.Name, c.Unit, c.Values, want[w.Name], unit[w.Name])
				}
			}
		}
	}
}

// Values as astropy.io.fits 5.2.1 reads them from the same file.
func TestReadsEveryFITSType(t *testing.T) {
	for name, want := range map[string][]float64{
		"B":   {0, 1, 127, 128, 255},
		"I":   {-32768, -1, 0, 1, 32767},
		"J":   {-2147483648, -1, 0, 1, 2147483647},
		"K":   {-9223372036854775808, -1, 0, 9007199254740993, 9223372036854775807},
		"E":   {0.4000000059604645, -1.500000042698307e-38, 3.3999999521443642e+38, 1.401298464324817e-45, 7.0},
		"D":   {0.1, -1.7e+308, 5e-324, 0.3333333333333333, 7.0},
		"L":   {1, 0, 1, 1, 0},
		"S8":  {-128, -1, 0, 1, 127},
		"U16": {0, 1, 32768, 32769, 65535},
		"U32": {0, 1, 2147483648, 2147483649, 4294967295},
		"U64": {0, 1, 9223372036854775808, 9223372036854775809, 18446744073709551615},
		"SC":  {10.0, 10.25, 9.75, 11.0, 0.5},
	} {
		for _, raw := range []bool{true, false} {
			table, err := Read(fixture("types.fits"), []Want{{Role: "x", Name: name, Raw: raw}}, nil, Limits{})
			if err != nil {
				t.Errorf("%s: %v", name, err)
				continue
			}
			if got := table.Values("x"); !slices.Equal(got, want) {
				t.Errorf("%s: %v, astropy reads %v", name, got, want)
			}
		}
	}
	table, err := Read(fixture("types.fits"), []Want{
		{Role: "text", Name: "A", Text: true, Blank: true},
		{Role: "as text", Name: "U64", Text: true},
		{Role: "null", Name: "NUL", Blank: true},
	}, nil, Limits{})
	if err != nil {
		t.Fatal(err)
	}
	if got := table.Column("text").Text; !slices.Equal(got, []string{"one", "two word", "", "x", "12345678"}) {
		t.Errorf("texts %q", got)
	}
	if got := table.Column("as text").Text; got[4] != "18446744073709551615" || got[0] != "0" {
		t.Errorf("whole numbers as texts %q", got)
	}
	if got := table.Values("null"); got[0] != 1 || got[1] == got[1] || got[2] != 3 {
		t.Errorf("TNULL gives %v", got)
	}
}

func TestRefusesInFITS(t *testing.T) {
	for _, c := range []struct {
		file string
		want Want
		text string
	}{
		{"types.fits", Want{Name: "VEC"}, `types.fits, column "VEC": holds arrays of 3 numbers; only one value a row is read`},
		{"types.fits", Want{Name: "VLA"}, "arrays of varying length"},
		{"types.fits", Want{Name: "C"}, "complex"},
		{"types.fits", Want{Name: "X"}, "bits"},
		{"types.fits", Want{Name: "A"}, `row 1, column "A": is a column of text; it holds "one" where a number is expected`},
		{"types.fits", Want{Name: "D", Text: true}, "a column of names is expected"},
		{"types.fits", Want{Name: "NAN"}, `row 2, column "NAN": holds NaN`},
		{"types.fits", Want{Name: "NAN", Blank: true}, `row 4, column "NAN": holds +Inf, not a finite number`},
		{"types.fits", Want{Name: "NUL"}, `row 2, column "NUL": is empty (TNULL)`},
		{"types.fits", Want{Name: "A", Text: true}, `row 3, column "A": is empty`},
		{"types.fits", Want{Name: "lom", As: "rad"}, `there is no column "lom"; did you mean "lon"?`},
		{"types.fits", Want{Name: "lon", As: "keV"}, `column "lon": deg cannot be converted to keV: an angle is not an energy (the file states it)`},
		{"types.fits", Want{Name: "lon", As: "rad", Unit: "hourangle"}, "the file states deg and the recipe hourangle; they must agree"},
		{"several.fits", Want{Name: "q"}, "table 1 (FIRST) with x, y; table 2 (SECOND) with x, z"},
		{"image.fits", Want{Name: "x"}, "holds no binary table"},
		{"ascii_table.fits", Want{Name: "a"}, "an ASCII table, which is not read"},
	} {
		c.want.Role = "x"
		table, err := Read(fixture(c.file), []Want{c.want}, nil, Limits{})
		if err == nil || !strings.Contains(err.Error(), c.text) {
			t.Errorf("%s, %+v: %v, %v; want %s", c.file, c.want, table, err, c.text)
		}
	}
}

// Of several tables the first with all the wanted columns is read.
func TestChoosesTheFITSTable(t *testing.T) {
	for _, c := range []struct {
		names []string
		x     []float64
	}{{[]string{"x"}, []float64{1, 2}}, {[]string{"x", "y"}, []float64{1, 2}}, {[]string{"x", "z"}, []float64{5, 6, 7}}} {
		var want []Want
		for _, name := range c.names {
			want = append(want, Want{Role: name, Name: name, Raw: true})
		}
		table, err := Read(fixture("several.fits"), want, nil, Limits{})
		if err != nil || !slices.Equal(table.Values("x"), c.x) {
			t.Errorf("%v: %v, %v, want %v", c.names, table, err, c.x)
		}
	}
}

// The file astropy makes of a QTable: units in its own spelling, nested meta
// with tags, texts in quotation marks, masked values, arrays.
func TestReadsECSVOfAstropy(t *testing.T) {
	table, err := Read(fixture("mixins.ecsv"), []Want{
		{Role: "r", Name: "r_in", As: "kpc", Length: true},
		{Role: "n", Name: "ne", Unit: "cm-3", As: "cm**-3"},
		{Role: "m", Name: "m", As: "solMass"},
		{Role: "s", Name: "s", As: "erg.s**-1.cm**-2.arcmin**-2"},
		{Role: "name", Name: "name", Text: true},
		{Role: "flag", Name: "b", Raw: true},
		{Role: "ra", Name: "c.ra", As: "rad"},
		{Role: "blank", Name: "mk", Blank: true},
	}, nil, Limits{})
	if err != nil {
		t.Fatal(err)
	}
	if r := table.Column("r"); r.Unit != "rad" || r.Values[0] != 0.0001454441043328608 { // 0.5 arcmin: π/21600
		t.Errorf("an angle for a length: %+v", r)
	}
	for role, want := range map[string][]float64{"n": {1e-3, 2e-3}, "m": {1.5e14, 2e14}, "s": {1, 2}, "flag": {1, 0}} {
		if got := table.Values(role); !slices.Equal(got, want) {
			t.Errorf("%s: %v, want %v", role, got, want)
		}
	}
	if got := table.Column("name").Text; !slices.Equal(got, []string{"a b", `c"d`}) {
		t.Errorf("texts %q", got)
	}
	if got := table.Values("blank"); got[0] != 1 || got[1] == got[1] {
		t.Errorf("masked %v", got)
	}
	for _, c := range []struct {
		want Want
		text string
	}{
		{Want{Name: "vec"}, "holds arrays (int64[2])"},
		{Want{Name: "mk"}, `row 2 (line 55), column "mk": is empty`},
		{Want{Name: "m", Unit: "solMass", As: "solMass"}, "the file states 1e+14 solMass and the recipe solMass; they must agree"},
	} {
		c.want.Role = "x"
		if _, err := Read(fixture("mixins.ecsv"), []Want{c.want}, nil, Limits{}); err == nil || !strings.Contains(err.Error(), c.text) {
			t.Errorf("%+v: %v, want %s", c.want, err, c.text)
		}
	}
}
