package recipes

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"unicode/utf8"

	"github.com/hashicorp/hcl/v2"
	"github.com/hashicorp/hcl/v2/hclsyntax"
)

// Bounds on what is taken for a recipe: parsing recurses as deep as a file
// nests, and a data file given by mistake must not fill the memory.
const (
	maxRecipeBytes = 1 << 18
	maxNesting     = 50  // of brackets and braces
	maxOperators   = 200 // in one expression
	maxHeredocs    = 100 // texts of several lines, which take the lexer the square of their number
)

// source is one file of a recipe.
type source struct {
	name     string // as messages and paths name it
	body     *hclsyntax.Body
	includes []*source
}

// readSource reads and parses a file. It returns nil after reporting at a file
// that is no recipe; the range is the place that names the file, if any.
func (r *report) readSource(name string, from *hcl.Range) *source {
	at := hcl.Range{Filename: name}
	refer := func(what, why, write string) *source {
		if from != nil {
			at = *from
		}
		r.add(problem{at: at, what: what, why: why, write: write})
		return nil
	}
	content, err := readBounded(name)
	var path *fs.PathError
	switch {
	case errors.Is(err, fs.ErrNotExist):
		why := ""
		if from != nil {
			why = "Files are looked for relative to the file that names them."
		}
		return refer(fmt.Sprintf("the file %s does not exist", name), why, nearestFile(name))
	case errors.As(err, &path):
		return refer(fmt.Sprintf("the file %s cannot be read: %v", name, path.Err), "", "")
	case err != nil:
		return refer(fmt.Sprintf("%s %v", name, err), "A recipe is a text file of at most 256 KiB that names its data files.", "")
	}
	content = bytes.TrimPrefix(content, []byte("\ufeff"))
	if i := badText(content); i >= 0 {
		t := newText(content)
		line, column := t.locate(i)
		return refer(fmt.Sprintf("%s is not a text file in UTF-8", name),
			fmt.Sprintf("Line %d has, at column %d, a byte that no such text has.", line, column), "A recipe names its data files; it does not hold them.")
	}
	r.file(name, content)
	if !r.shallow(name, content) {
		return nil
	}
	return &source{name: name, body: r.parse(name, content)}
}

// readBounded reads a file that must not be large.
func readBounded(name string) ([]byte, error) {
	info, err := os.Stat(name)
	if err != nil {
		return nil, err
	}
	if info.IsDir() {
		return nil, errors.New("is a folder, not a recipe")
	}
	if !info.Mode().IsRegular() {
		return nil, errors.New("is not a plain file")
	}
	f, err := os.Open(name)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	content, err := io.ReadAll(io.LimitReader(f, maxRecipeBytes+1))
	if err == nil && len(content) > maxRecipeBytes {
		err = errors.New("is too large for a recipe")
	}
	return content, err
}

// badText returns the offset of the first byte that text in UTF-8 cannot have,
// or −1.
func badText(content []byte) int {
	for i := 0; i < len(content); {
		c, n := utf8.DecodeRune(content[i:])
		if c == 0 || c == utf8.RuneError && n == 1 {
			return i
		}
		i += n
	}
	return -1
}

// shallow reports whether the parser can take the text without nesting too
// deep, and says so otherwise.
func (r *report) shallow(name string, content []byte) bool {
	at, ok := hcl.Range{Filename: name}, false
	if bytes.Count(content, []byte("<<")) <= maxHeredocs {
		tokens, _ := hclsyntax.LexConfig(content, name, hcl.InitialPos)
		at, ok = tooDeep(tokens)
	}
	if !ok {
		r.damaged, r.broken[name] = true, true
		r.add(problem{at: at, syntax: true, what: "this is nested too deep to be a recipe"})
	}
	return ok
}

// tooDeep looks for nesting beyond the bounds. Operators count up to the end of
// an expression: a comma, or a line's end outside parentheses and brackets.
func tooDeep(tokens hclsyntax.Tokens) (at hcl.Range, ok bool) {
	var open []hclsyntax.TokenType
	operators := 0
	for _, token := range tokens {
		switch token.Type {
		case hclsyntax.TokenOBrace, hclsyntax.TokenOBrack, hclsyntax.TokenOParen, hclsyntax.TokenOQuote, hclsyntax.TokenOHeredoc,
			hclsyntax.TokenTemplateInterp, hclsyntax.TokenTemplateControl:
			open = append(open, token.Type)
		case hclsyntax.TokenCBrace, hclsyntax.TokenCBrack, hclsyntax.TokenCParen, hclsyntax.TokenCQuote, hclsyntax.TokenCHeredoc,
			hclsyntax.TokenTemplateSeqEnd:
			open = open[:max(0, len(open)-1)]
			operators++ // an index or another call may follow
		case hclsyntax.TokenComma:
			operators = 0
		case hclsyntax.TokenNewline, hclsyntax.TokenComment:
			ends := len(open) == 0 || open[len(open)-1] == hclsyntax.TokenOBrace
			if ends && bytes.HasSuffix(token.Bytes, []byte{'\n'}) {
				operators = 0
			}
		case hclsyntax.TokenIdent, hclsyntax.TokenNumberLit, hclsyntax.TokenQuotedLit, hclsyntax.TokenStringLit,
			hclsyntax.TokenEqual, hclsyntax.TokenEOF:
		default:
			operators++
		}
		if len(open) > maxNesting || operators > maxOperators {
			return token.Range, false
		}
	}
	return hcl.Range{}, true
}

// realPath identifies a file however it is named.
func realPath(name string) string {
	if path, err := filepath.EvalSymlinks(name); err == nil {
		name = path
	}
	if path, err := filepath.Abs(name); err == nil {
		name = path
	}
	return name
}

// nearestFile returns a hint naming a file in the same folder that was probably
// meant.
func nearestFile(name string) string {
	folder := filepath.Dir(name)
	entries, err := os.ReadDir(folder)
	if err != nil {
		if _, err := os.Stat(folder); err != nil {
			return fmt.Sprintf("There is no folder %s.", folder)
		}
		return ""
	}
	var names []string
	for _, e := range entries[:min(len(entries), 10000)] {
		if !e.IsDir() {
			names = append(names, e.Name())
		}
	}
	if near := nearest(filepath.Base(name), names); near != "" {
		return fmt.Sprintf("Did you mean %q?", filepath.Join(filepath.Dir(name), near))
	}
	return ""
}
