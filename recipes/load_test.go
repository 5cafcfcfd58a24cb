package recipes

import (
	"os"
	"testing"
)

func TestWholeLoads(t *testing.T) {
	r, ds := Load("testdata/whole/recipe.hcl", testProbes, nil)
	ds.Text(os.Stderr)
	if r == nil {
		t.Fatal("nil")
	}
	t.Logf("%+v", r)
}
