package recipes

import (
	"go/doc/comment"
	"go/parser"
	"go/token"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
)

// docExamples returns the code blocks of the package comment.
func docExamples(t *testing.T) []string {
	t.Helper()
	f, err := parser.ParseFile(token.NewFileSet(), "doc.go", nil, parser.ParseComments)
	if err != nil {
		t.Fatal(err)
	}
	var p comment.Parser
	var examples []string
	for _, b := range p.Parse(f.Doc.Text()).Content {
		if code, ok := b.(*comment.Code); ok {
			examples = append(examples, code.Text)
		}
	}
	return examples
}

// TestDocExamples reads all examples of the language reference as one recipe.
// An example that begins like a message is checked to be what is said.
func TestDocExamples(t *testing.T) {
	var recipe strings.Builder
	var message string
	examples := docExamples(t)
	for _, e := range examples {
		if strings.HasPrefix(e, "recipe.hcl:") {
			message = e
			continue
		}
		recipe.WriteString(e + "\n")
	}
	if len(examples) < 9 || message == "" {
		t.Fatalf("the reference has %d examples, and the message %q", len(examples), message)
	}

	folder := filepath.Join(t.TempDir(), "curlew")
	if err := os.Mkdir(folder, 0o755); err != nil {
		t.Fatal(err)
	}
	put := func(name, content string) {
		if err := os.WriteFile(filepath.Join(folder, name), []byte(content), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	put("recipe.hcl", recipe.String())
	put("../survey.hcl", "nuisance \"temperature_scale\" { prior = normal(1.0, 0.1) }\n")
	for _, m := range regexp.MustCompile(`file\s*= "([^"]+)"`).FindAllStringSubmatch(recipe.String(), -1) {
		put(m[1], "")
	}
	r := load(t, filepath.Join(folder, "recipe.hcl"))
	if len(r.Blocks) != 5 || len(r.Reported) != 1 || r.Reconcile == nil || len(r.Nuisances) != 2 {
		t.Errorf("the examples declare %d blocks, %d reported masses, %d nuisances", len(r.Blocks), len(r.Reported), len(r.Nuisances))
	}

	_, source, _ := strings.Cut(strings.Split(message, "\n")[1], "| ")
	put("recipe.hcl", "object \"Curlew\" {\n  redshift = 0.212\n"+source+"\n}\n"+strings.TrimPrefix(head, "\nobject \"Curlew\" { redshift = 0.212 }\n")+scaling)
	if got := strings.ReplaceAll(says(t, filepath.Join(folder, "recipe.hcl")), folder+"/", ""); got != message {
		t.Errorf("said:\n%s\nthe reference has:\n%s", got, message)
	}
}
