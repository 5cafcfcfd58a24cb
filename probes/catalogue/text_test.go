package catalogue

import (
	"fmt"
	"slices"
	"strings"
	"testing"
)

func TestTextLayouts(t *testing.T) {
	for _, c := range []struct {
		name, content, format string
		columns               []string
		a                     []float64 // of the column "a"
		rows                  []int
	}{
		{"csv", "a,b\n1,2\n3,4\n", "csv", []string{"a", "b"}, []float64{1, 3}, []int{1, 2}},
		{"no end of line", "a,b\n1,2\n3,4", "csv", []string{"a", "b"}, []float64{1, 3}, nil},
		{"windows", "\ufeffa,b\r\n1,2\r\n3,4\r\n", "csv", []string{"a", "b"}, []float64{1, 3}, nil},
		{"comments and blanks", "# made by hand\n\n#x,y\na , \"b\"\n# a point left out\n 1 , 2\n\n3,4\n", "csv", []string{"a", "b"}, []float64{1, 3}, []int{1, 2}},
		{"quoted", "\"a\",\"b, c\"\n\"1\",\"x \"\"y\"\", z\"\n", "csv", []string{"a", "b, c"}, []float64{1}, nil},
		{"semicolons", "a;b\n1;2\n", "csv", []string{"a", "b"}, []float64{1}, nil},
		{"tabs with an empty cell", "a\tb\tc\n1\t\t2\n", "csv", []string{"a", "b", "c"}, []float64{1}, nil},
		{"tabs and a comma in a name", "a\tb, c\td\n1\t2\t3\n", "csv", []string{"a", "b, c", "d"}, []float64{1}, nil},
		{"tabs that align", "a\t\tbbb\n1\t\t2\n10\t2\n", "text", []string{"a", "bbb"}, []float64{1, 10}, nil},
		{"blanks", "  a   b \n 1.5e3\t-2\n\n  +3  4.  \n", "text", []string{"a", "b"}, []float64{1500, 3}, nil},
		{"one column", "a\n1\n2\n", "text", []string{"a"}, []float64{1, 2}, nil},
		{"names in the last comment", "# something about it\n# a b c\n1 2 3\n4 5 6\n", "text", []string{"a", "b", "c"}, []float64{1, 4}, nil},
		{"names in a comment, commas", "# a,b\n1,2\n", "csv", []string{"a", "b"}, []float64{1}, nil},
		{"names then units", "#Name      a      b\n###        Mpc    keV cm^2\nSPICA      1      2\nSPICA      2  3\n", "text", []string{"Name", "a", "b"}, []float64{1, 2}, nil},
		{"names then units of one word", "# a q\n# kpc keV\n1 2\n", "text", []string{"a", "q"}, []float64{1}, nil},
		{"quoted blanks", "a name\n1 \"two words\"\n2 x\n", "text", []string{"a", "name"}, []float64{1, 2}, nil},
	} {
		path := saved(t, "table.dat", c.content)
		h, err := Peek(path)
		if err != nil {
			t.Errorf("%s: %v", c.name, err)
			continue
		}
		var names []string
		for _, column := range h.Columns {
			names = append(names, column.Name)
		}
		if h.Format != c.format || !slices.Equal(names, c.columns) {
			t.Errorf("%s: %s with columns %q", c.name, h.Format, names)
		}
		table, err := Read(path, []Want{{Role: "a", Name: "a"}}, nil, Limits{})
		if err != nil || !slices.Equal(table.Values("a"), c.a) || c.rows != nil && !slices.Equal(table.Rows, c.rows) {
			t.Errorf("%s: %+v, %v", c.name, table, err)
		}
	}
}

func TestRefusesText(t *testing.T) {
	a := Want{Role: "a", Name: "a"}
	for _, c := range []struct {
		name, file, content string
		want                []Want
		text                string // the message behind the file's name
	}{
		{"empty", "t.csv", "", nil, ": the file is empty"},
		{"only a byte-order mark", "t.csv", "\ufeff", nil, ": the file is empty"},
		{"only comments", "t.csv", "# a\n# b\n\n", nil, ": the file holds no table"},
		{"no rows", "t.csv", "a,b\n", []Want{a}, ": the table has no rows"},
		{"no header", "t.csv", "1,2\n3,4\n", nil, ", line 1: there is no header: the first line holds numbers"},
		{"comments that fit nothing", "t.txt", "# a b\n1 2 3\n", nil, "no comment line above it names its 3 columns"},
		{"misspelt", "t.csv", "kT_lo,kT\n1,2\n", []Want{{Role: "x", Name: "kT_low"}}, `: there is no column "kT_low"; did you mean "kT_lo"? (the columns are: kT_lo, kT)`},
		{"nothing near", "t.csv", "ra,dec\n1,2\n", []Want{{Role: "x", Name: "redshift"}}, `: there is no column "redshift" (the columns are: ra, dec)`},
		{"twice", "t.csv", "a,a\n1,2\n", []Want{a}, `, column "a": two columns have this name`},
		{"ragged, short", "t.csv", "a,b\n1,2\n3\n", []Want{a}, ", row 2 (line 3): the row has 1 value, but the header names 2 columns"},
		{"ragged, long", "t.txt", "# hello\na b\n1 2\n\n3 4 5\n", []Want{a}, ", row 2 (line 5): the row has 3 values, but the header names 2 columns"},
		{"not a number", "t.csv", "a,b\n1,2\nabc,4\n", []Want{a}, `, row 2 (line 3), column "a": holds "abc", which is not a number`},
		{"empty cell", "t.csv", "a,b\n1,2\n,4\n", []Want{a}, `, row 2 (line 3), column "a": is empty; a number is expected in every row`},
		{"nan", "t.csv", "a,b\nNaN,2\n", []Want{a}, `, row 1 (line 2), column "a": holds "NaN"; a number is expected in every row`},
		{"inf", "t.csv", "a,b\n-inf,2\n", []Want{a}, `holds "-inf", which is not a number but an infinity`},
		{"too large", "t.csv", "a,b\n1e400,2\n", []Want{a}, `holds "1e400", a number that double precision cannot hold`},
		{"huge exponent", "t.csv", "a,b\n1e999999999,2\n", []Want{a}, `holds "1e999999999", a number that double precision cannot hold`},
		{"hexadecimal", "t.csv", "a,b\n0x10,2\n", []Want{a}, `holds "0x10", which is not a number`},
		{"decimal comma", "t.csv", "a;b\n1,5;2\n", []Want{a}, "write decimals with a point"},
		{"fortran", "t.csv", "a,b\n1.5D+03,2\n", []Want{a}, "write the exponent with e"},
		{"sexagesimal", "t.csv", "a,b\n14h01m02.1s,2\n", []Want{{Role: "ra", Name: "a", Unit: "deg", As: "rad"}}, "give decimal degrees"},
		{"sexagesimal, colons", "t.csv", "a,b\n-02:52:42,2\n", []Want{a}, "give decimal degrees"},
		{"units under the header", "t.csv", "a,b\nkeV,kpc\n1,2\n", []Want{a}, "if this is a line of units, begin it with #"},
		{"open quote", "t.csv", "a,b\n\"1,2\n3,4\n", []Want{a}, "row 1 (line 2): a quotation mark is not closed"},
		{"bare quote", "t.csv", "a,b\n1\"5,2\n", []Want{a}, "row 1 (line 2): a quotation mark inside a field"},
		{"open quote, blanks", "t.txt", "a b\n1 \"2\n", []Want{a}, "row 1 (line 2): a quotation mark is not closed on this line"},
		{"empty text", "t.csv", "a,b\n,4\n", []Want{{Role: "a", Name: "a", Text: true}}, `row 1 (line 2), column "a": is empty; a name is expected`},
		{"latin-1 text", "t.csv", "a,b\nM\xfcller,4\n", []Want{{Role: "a", Name: "a", Text: true}}, "which is not UTF-8 text"},
		{"no unit", "t.csv", "a,b\n1,2\n", []Want{{Role: "a", Name: "a", As: "kpc", Length: true}}, `, column "a": no unit is stated, neither in the file nor in the recipe; write it behind the name, as in column("a", "kpc")`},
		{"no unit, angle", "t.csv", "a,b\n1,2\n", []Want{{Role: "a", Name: "a", As: "rad"}}, `column("a", "deg")`},
		{"unknown unit", "t.csv", "a,b\n1,2\n", []Want{{Role: "a", Name: "a", Unit: "kpcc", As: "kpc"}}, `the unit in the recipe cannot be read: "kpcc": the unit "kpcc" is not known; did you mean "kpc"?`},
		{"wrong dimension", "t.csv", "a,b\n1,2\n", []Want{{Role: "a", Name: "a", Unit: "keV", As: "kpc", Length: true}}, "keV cannot be converted to kpc: an energy is not a length (the recipe states it)"},
		{"an angle where only a length will do", "t.csv", "a,b\n1,2\n", []Want{{Role: "a", Name: "a", Unit: "arcmin", As: "kpc"}}, "an angle is not a length"},
		{"a length where an angle is wanted", "t.csv", "a,b\n1,2\n", []Want{{Role: "a", Name: "a", Unit: "kpc", As: "rad"}}, "a length is not an angle"},
		{"a unit where none belongs", "t.csv", "a,b\n1,2\n", []Want{{Role: "a", Name: "a", Unit: "km/s"}}, "km/s cannot be converted to a number without a unit"},
		{"not FITS", "t.fits", "a,b\n1,2\n", nil, `: the name says FITS, but the file begins with "a,b\n1,2\n"`},
		{"not ECSV", "t.ecsv", "a,b\n1,2\n", nil, `: the name says ECSV, but the file does not begin with "# %ECSV 1.0"`},
		{"FITS in disguise", "t.csv", "SIMPLE  =                    T", nil, ": the name says text, but this is a FITS file"},
		{"binary", "t.dat", "abc\x00def", nil, ": this is neither a FITS file nor text (byte 4 is zero)"},
		{"gzip", "t.csv", "\x1f\x8b\x08\x00", nil, ": this is a gzip file; unpack it first"},
		{"spreadsheet", "t.csv", "PK\x03\x04aaaa", nil, "a spreadsheet; save the table as CSV"},
		{"VOTable", "t.xml", "<?xml version='1.0'?><VOTABLE>", nil, "a VOTable, which is not read yet"},
		{"machine-readable", "t.txt", "Title: x\n=====\nByte-by-byte Description of file: t\n", nil, "a byte-by-byte description, which is not read yet"},
		{"machine-readable, commented", "t.txt", "# Byte-by-byte Description of file: t\n1 2\n", nil, "a byte-by-byte description, which is not read yet"},
		{"a long line", "t.csv", "a,b\n" + strings.Repeat("1", maxLine+10) + ",2\n", []Want{a}, "of more than 1 MiB; this does not look like a table"},
		{"a long line, blanks", "t.csv", "a b\n1 " + strings.Repeat("1", maxLine+10) + "\n", []Want{a}, "of more than 1 MiB"},
		{"a long header", "t.csv", strings.Repeat("a", maxLine+10), nil, "of more than 1 MiB"},
		{"a quote that never ends", "t.csv", "a,b\n\"" + strings.Repeat("1\n", maxLine), []Want{a}, "of more than 1 MiB"},
		{"endless comments", "t.csv", strings.Repeat("# "+strings.Repeat("x", 1000)+"\n", 5000), nil, "more than 4 MiB of comments"},
	} {
		path := saved(t, c.file, c.content)
		table, err := Read(path, c.want, nil, Limits{})
		if err == nil || !strings.Contains(err.Error(), c.text) || !strings.HasPrefix(err.Error(), path) {
			t.Errorf("%s: %+v, %v; want %s", c.name, table, err, c.text)
		}
	}
}

// All that is wrong with columns and units is said at once.
func TestReportsEveryColumn(t *testing.T) {
	path := saved(t, "t.csv", "a,b\n1,2\n")
	_, err := Read(path, []Want{{Role: "x", Name: "c"}, {Role: "y", Name: "a", As: "keV"}, {Role: "z", Name: "b"}}, &Filter{Names: []string{"flag"}}, Limits{})
	if err == nil {
		t.Fatal("nothing is wrong?")
	}
	for _, part := range []string{path + `: there is no column "c"`, path + `, column "a": no unit is stated`, path + `: there is no column "flag"`} {
		if !strings.Contains(err.Error(), part) {
			t.Errorf("%q lacks %q", err, part)
		}
	}
}

func TestPathsThatAreNoFiles(t *testing.T) {
	for path, text := range map[string]string{t.TempDir(): "a folder", "/nowhere/t.csv": "there is no such file", "/dev/zero": "not a regular file"} {
		if _, err := Peek(path); err == nil || !strings.Contains(err.Error(), text) || !strings.HasPrefix(err.Error(), path) {
			t.Errorf("%s: %v", path, err)
		}
	}
}

func TestFilter(t *testing.T) {
	const table = "name,z,flag,note\nA,0.1,0,x\nB,0.5,0,\nC,,0,y\nD,0.7,1,z\nE,0.9,0,w\n"
	path := saved(t, "t.csv", table)
	keep := func(values []any) (bool, error) {
		return values[0].(float64) > 0.4 && values[1].(float64) == 0 && values[2].(string) != "w", nil
	}
	got, err := Read(path, []Want{{Role: "z", Name: "z"}, {Role: "name", Name: "name", Text: true}}, &Filter{Names: []string{"z", "flag", "note"}, Keep: keep}, Limits{})
	if err != nil || !slices.Equal(got.Values("z"), []float64{0.5}) || !slices.Equal(got.Rows, []int{2}) || got.Column("name").Text[0] != "B" {
		t.Errorf("%+v, %v", got, err)
	}
	for _, c := range []struct {
		name, content, text string
		keep                func([]any) (bool, error)
	}{
		{"keeps none", table, "none of the 5 rows passes the selection", func([]any) (bool, error) { return false, nil }},
		{"fails", table, "row 1 (line 2): cannot compare", func([]any) (bool, error) { return false, fmt.Errorf("cannot compare") }},
		{"turns into text late", "z\n" + strings.Repeat("1\n", 2*sampled) + "x\n", `row 201 (line 202), column "z": holds "x", which is not a number`, func([]any) (bool, error) { return true, nil }},
	} {
		if _, err := Read(saved(t, "t.csv", c.content), nil, &Filter{Names: []string{"z"}, Keep: c.keep}, Limits{}); err == nil || !strings.Contains(err.Error(), c.text) {
			t.Errorf("%s: %v", c.name, err)
		}
	}
}

func TestLimits(t *testing.T) {
	for _, c := range []struct {
		path   string
		limits Limits
		text   string
	}{
		{fixture("same.csv"), Limits{Rows: 11}, "more than 11 rows"},
		{fixture("same.fits"), Limits{Rows: 11}, "more than 11 rows"},
		{fixture("same.csv"), Limits{Bytes: 12*16 - 1}, "take more than 191 bytes"},
		{fixture("same.fits"), Limits{Bytes: 12*16 - 1}, "take more than 191 bytes"},
	} {
		if _, err := Read(c.path, []Want{{Role: "z", Name: "z"}}, nil, c.limits); err == nil || !strings.Contains(err.Error(), c.text) {
			t.Errorf("%s with %+v: %v", c.path, c.limits, err)
		}
	}
	for _, path := range []string{fixture("same.csv"), fixture("same.fits")} {
		if table, err := Read(path, []Want{{Role: "z", Name: "z"}}, nil, Limits{Rows: 12, Bytes: 12 * 16}); err != nil || table.Len() != 12 {
			t.Errorf("%s within its limits: %v", path, err)
		}
	}
}
