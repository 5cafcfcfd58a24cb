package recipes

import (
	"fmt"
	"strings"

	"github.com/hashicorp/hcl/v2"
	"github.com/hashicorp/hcl/v2/hclsyntax"
)

// predicate compiles a `select`; nil after reporting what is wrong with it.
func (l *loader) predicate(t term, columns []Column) *Predicate {
	text, ok := l.plainText(t, "select")
	if !ok {
		return nil
	}
	if strings.TrimSpace(text) == "" {
		l.add(problem{at: t.at, what: "the condition is empty", write: "Write it like select = \"zphot > 0.4 && flag == 0\", or leave it out to keep every row."})
		return nil
	}
	c := &compiler{loader: l, t: t, columns: columns, p: &Predicate{text: text}}
	e := c.parse()
	if e == nil {
		return nil
	}
	x := c.compile(e)
	if x.kind == noExpression {
		return nil
	}
	if x.kind != conditionExpression {
		c.fail(e.Range(), fmt.Sprintf("select is a condition, and this is %s", x.describe()), "Compare it with something, like zphot > 0.4 or flag == 0.")
		return nil
	}
	if len(c.p.names) == 0 {
		c.fail(e.Range(), "this condition names no column", "Write it like zphot > 0.4 && flag == 0.")
		return nil
	}
	c.p.test = x.condition
	if len(c.p.Quantities()) > 0 {
		return c.p
	}
	bound, err := c.p.Bind(nil)
	if err != nil {
		l.fail(t.at, "%v", err)
		return nil
	}
	return bound
}

// operators says what a condition is made of.
const operators = "A condition is made of columns, numbers, comparisons (== != < <= > >=), + - * /, && || ! and parentheses."

// compiler compiles one condition.
type compiler struct {
	*loader
	t       term
	columns []Column
	p       *Predicate
	offsets []int // place in the file of every byte of the text; nil when unknown
}

// fail reports a mistake at its place inside the text.
func (c *compiler) fail(at hcl.Range, what, write string) expression {
	c.add(problem{at: c.place(at), what: what, write: write})
	return expression{}
}

// place turns a place in the text into one in the file.
func (c *compiler) place(at hcl.Range) hcl.Range {
	from, to := at.Start.Byte, at.End.Byte
	if c.offsets == nil || from < 0 || to >= len(c.offsets) || from > to {
		return c.t.at
	}
	t := c.texts[c.t.at.Filename]
	if from == to && to+1 < len(c.offsets) {
		to++
	}
	return hcl.Range{Filename: c.t.at.Filename, Start: t.place(c.offsets[from]), End: t.place(c.offsets[to])}
}

// parse parses the text of the condition as an expression of HCL; nil after
// reporting why it cannot be.
func (c *compiler) parse() hclsyntax.Expression {
	c.offsets = offsetsOf(c.written(c.t.inside), c.t.text, c.t.inside.Start.Byte)
	source, ok := doubleQuoted(c.p.text)
	if !ok {
		c.fail(hcl.Range{}, "a text in this condition is not closed, or mixes both kinds of quotes", "Write a text inside a condition in single quotes: type == 'late'.")
		return nil
	}
	tokens, _ := hclsyntax.LexExpression([]byte(source), "", hcl.InitialPos)
	if at, ok := tooDeep(tokens); !ok {
		c.fail(at, "this condition is too long to be read", "Write it shorter, or mark the rows in a column of their own.")
		return nil
	}
	if c.badWords(tokens) {
		return nil
	}
	e, diags := hclsyntax.ParseExpression([]byte(source), "", hcl.InitialPos)
	for _, d := range diags {
		if d.Severity != hcl.DiagError {
			continue
		}
		what, _, write := plainly(d, source)
		if !strings.HasPrefix(write, "Write 0.") {
			write = operators
		}
		if strings.HasPrefix(d.Summary, "Extra characters") {
			what = "this was not expected here"
		}
		at := hcl.Range{}
		if d.Subject != nil {
			at = *d.Subject
		}
		c.fail(at, what, write)
		return nil
	}
	return e
}

// badWords reports spellings of operators that other languages have.
func (c *compiler) badWords(tokens hclsyntax.Tokens) (found bool) {
	instead := map[string]string{"and": "&&", "AND": "&&", "or": "||", "OR": "||", "not": "!", "NOT": "!", "=": "==", "&": "&&", "|": "||", "^": "", "~": "!", "<>": "!=", "=>": ">=", "%": "", "≤": "<=", "≥": ">=", "≠": "!=", "−": "-", "×": "*"}
	for i, token := range tokens {
		text := string(token.Bytes)
		operator, known := instead[text]
		if text == "<" && i+1 < len(tokens) && string(tokens[i+1].Bytes) == ">" {
			operator, known = "!=", true
			token.Range.End = tokens[i+1].Range.End
			text = "<>"
		}
		if text == "*" && i+1 < len(tokens) && string(tokens[i+1].Bytes) == "*" {
			operator, known = "", true
			token.Range.End = tokens[i+1].Range.End
			text = "**"
		}
		if !known || token.Type == hclsyntax.TokenQuotedLit {
			continue
		}
		found = true
		if operator == "" {
			c.fail(token.Range, fmt.Sprintf("%s is not understood in a condition", text), "Write the product or the power out.")
			continue
		}
		c.fail(token.Range, fmt.Sprintf("%s is written %s", text, operator), fmt.Sprintf("Write %s instead of %s.", operator, text))
	}
	return found
}

// doubleQuoted turns texts in single quotes, which stand without a backslash
// inside a text of HCL, into texts in double quotes of the same length.
func doubleQuoted(text string) (string, bool) {
	b := []byte(text)
	var open byte
	for i := 0; i < len(b); i++ {
		switch {
		case open == 0 && (b[i] == '\'' || b[i] == '"'):
			open = b[i]
			b[i] = '"'
		case open == '\'' && (b[i] == '"' || b[i] == '\\' || (b[i] == '$' || b[i] == '%') && i+1 < len(b) && b[i+1] == '{'):
			return "", false
		case open == '"' && b[i] == '\\':
			i++
		case open != 0 && b[i] == open:
			open = 0
			b[i] = '"'
		}
	}
	return string(b), open == 0
}

// offsetsOf returns for every byte of a text, and for its end, where it stands
// in the file, given the text as written there; nil when that cannot be told.
func offsetsOf(raw, text string, start int) []int {
	var offsets []int
	i := 0
	for j := 0; j < len(text); j++ {
		if i >= len(raw) {
			return nil
		}
		offsets = append(offsets, start+i)
		switch {
		case raw[i] == text[j] && raw[i] != '\\':
			i++
			if strings.HasPrefix(raw[i-1:], "$${") && strings.HasPrefix(text[j:], "${") || strings.HasPrefix(raw[i-1:], "%%{") && strings.HasPrefix(text[j:], "%{") {
				i++
			}
		case raw[i] == '\\' && i+1 < len(raw) && (raw[i+1] == text[j] || strings.ContainsRune("ntr", rune(raw[i+1]))):
			i += 2
		default:
			return nil
		}
	}
	if i != len(raw) {
		return nil
	}
	return append(offsets, start+i)
}
