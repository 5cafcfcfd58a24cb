package main

import (
	"bytes"
	"math"
	"os"
	"path/filepath"
	"testing"

	"steelyard/probes/catalogue"
)

// The data of the example are what the program that invents them writes. Another
// processor may round the last digit of an invented number otherwise, so numbers
// may differ by one unit of the last decimal written.
func TestExampleIsWhatIsInvented(t *testing.T) {
	dir, committed := t.TempDir(), "../../recipes/examples/curlew"
	if err := curlew(dir); err != nil {
		t.Fatal(err)
	}
	for file, columns := range map[string]map[string]float64{
		"density.ecsv":    {"r_in": 1e-4, "r_out": 1e-4, "n_e": 1e-8, "n_e_err": 1e-8},
		"temperature.csv": {"r_in": 0, "r_out": 0, "kT": 1e-3, "kT_lo": 1e-3, "kT_hi": 1e-3},
		"shapes.fits":     {"ra": 1e-6, "dec": 1e-6, "e1": 1e-5, "e2": 1e-5, "w": 1e-3, "zphot": 1e-4},
		"redshifts.csv":   {"ra": 1e-6, "dec": 1e-6, "z": 1e-6, "ez": 0},
	} {
		for column, unit := range columns {
			want := read(t, filepath.Join(committed, file), column)
			got := read(t, filepath.Join(dir, file), column)
			if len(got) != len(want) {
				t.Fatalf("%s: %d rows are invented, %d are there", file, len(got), len(want))
			}
			for i := range want {
				if math.Abs(got[i]-want[i]) > 1.01*unit {
					t.Fatalf("%s, row %d, %s: invented %v, there is %v", file, i+1, column, got[i], want[i])
				}
			}
		}
	}
	want, err := os.ReadFile(filepath.Join(committed, "truth.json"))
	if err != nil {
		t.Fatal(err)
	}
	if got, err := os.ReadFile(filepath.Join(dir, "truth.json")); err != nil || !bytes.Equal(got, want) {
		t.Errorf("the truth differs: %s (%v)", got, err)
	}
}

func read(t *testing.T, path, column string) []float64 {
	t.Helper()
	table, err := catalogue.Read(path, []catalogue.Want{{Role: "x", Name: column, Raw: true}}, nil, catalogue.Limits{})
	if err != nil {
		t.Fatal(err)
	}
	return table.Values("x")
}
