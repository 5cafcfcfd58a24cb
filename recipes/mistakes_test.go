package recipes

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// TestMistakes reads every recipe of testdata/mistakes and compares what is
// said about it with the text beside it. With STEELYARD_UPDATE=1 the texts are
// written anew; read the difference before committing it.
func TestMistakes(t *testing.T) {
	files, err := filepath.Glob("testdata/mistakes/*.hcl")
	if err != nil || len(files) < 25 {
		t.Fatalf("the gallery has %d recipes, error %v", len(files), err)
	}
	for _, file := range files {
		t.Run(strings.TrimSuffix(filepath.Base(file), ".hcl"), func(t *testing.T) {
			recipe, ds := Load(file, testProbes, nil)
			if (recipe == nil) != ds.HasErrors() {
				t.Errorf("recipe %v, errors %v", recipe, ds.HasErrors())
			}
			var b strings.Builder
			if err := ds.Text(&b); err != nil {
				t.Fatal(err)
			}
			stored := strings.TrimSuffix(file, ".hcl") + ".txt"
			if os.Getenv("STEELYARD_UPDATE") != "" {
				if err := os.WriteFile(stored, []byte(b.String()), 0o644); err != nil {
					t.Fatal(err)
				}
			}
			want, err := os.ReadFile(stored)
			if err != nil {
				t.Fatal(err)
			}
			if diff := cmp.Diff(string(want), b.String()); diff != "" {
				t.Errorf("%s (-stored +now):\n%s", stored, diff)
			}
		})
	}
}
