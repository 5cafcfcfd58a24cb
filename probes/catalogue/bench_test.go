package catalogue

import (
	"math/rand/v2"
	"path/filepath"
	"testing"
)

// A shape catalogue of a million rows and six columns.
const million = 1_000_000

var shapes = []Want{
	{Role: "ra", Name: "ra", Unit: "deg", As: "rad"}, {Role: "dec", Name: "dec", Unit: "deg", As: "rad"},
	{Role: "e1", Name: "e1"}, {Role: "e2", Name: "e2"}, {Role: "weight", Name: "w"}, {Role: "redshift", Name: "z"},
}

func writeShapes(b *testing.B, name string, write func(string, []OutColumn) error) string {
	b.Helper()
	rng := rand.New(rand.NewPCG(7, 7))
	columns := make([]OutColumn, len(shapes))
	for i, w := range shapes {
		columns[i] = OutColumn{Name: w.Name, Unit: w.Unit, Values: make([]float64, million)}
		for k := range columns[i].Values {
			columns[i].Values[k] = rng.Float64()
		}
	}
	path := filepath.Join(b.TempDir(), name)
	if err := write(path, columns); err != nil {
		b.Fatal(err)
	}
	return path
}

func benchmarkRead(b *testing.B, path string, filter *Filter) {
	for b.Loop() {
		table, err := Read(path, shapes, filter, Limits{})
		if err != nil || table.Len() == 0 {
			b.Fatal(err)
		}
	}
}

func BenchmarkReadFITS(b *testing.B) {
	path := writeShapes(b, "t.fits", func(p string, c []OutColumn) error { return WriteFITS(p, "S", c) })
	b.Run("all", func(b *testing.B) { benchmarkRead(b, path, nil) })
	b.Run("selected", func(b *testing.B) {
		benchmarkRead(b, path, &Filter{Names: []string{"z", "w"}, Keep: func(v []any) (bool, error) {
			return v[0].(float64) > 0.3 && v[1].(float64) > 0, nil
		}})
	})
}

func BenchmarkReadCSV(b *testing.B)  { benchmarkRead(b, writeShapes(b, "t.csv", WriteCSV), nil) }
func BenchmarkReadECSV(b *testing.B) { benchmarkRead(b, writeShapes(b, "t.ecsv", WriteECSV), nil) }
