package catalogue

import (
	"os"
	"testing"
)

func FuzzText(f *testing.F) {
	for _, name := range []string{"same.csv", "same.tsv", "same.txt", "same_commented.txt", "same_semicolon.csv", "same.ecsv", "same_comma.ecsv", "mixins.ecsv"} {
		content, err := os.ReadFile(fixture(name))
		if err != nil {
			f.Fatal(err)
		}
		f.Add(content)
	}
	f.Add([]byte("#Name a b\n### kpc keV cm^2\nX 1 2\n"))
	f.Add([]byte("a,b\n\"1\",\"x \"\"y\"\"\"\n"))
	f.Add([]byte("# %ECSV 1.0\n# ---\n# datatype:\n# - {name: a, datatype: float64}\na\n1\n"))
	f.Fuzz(func(t *testing.T, content []byte) { readWhole(t, content, "t.txt") })
}
