package recipes

import (
	"errors"
	"fmt"
	"slices"
	"strings"

	"github.com/hashicorp/hcl/v2"
	"github.com/hashicorp/hcl/v2/hclsyntax"
	"github.com/zclconf/go-cty/cty"

	"steelyard/probes/units"
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
	if len(c.p.Quantities()) == 0 {
		bound, err := c.p.Bind(func(string) string { return "" })
		if err != nil {
			l.add(problem{at: t.at, what: "the quantities of this condition do not fit its columns", why: sentence(strings.TrimPrefix(err.Error(), "select: "))})
			return nil
		}
		return bound
	}
	return c.p
}

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
		what, _, _ := c.plainly(d)
		if strings.HasPrefix(d.Summary, "Extra characters") {
			what = "this was not expected here"
		}
		at := hcl.Range{}
		if d.Subject != nil {
			at = *d.Subject
		}
		c.fail(at, what, "A condition is made of columns, numbers, comparisons (== != < <= > >=), + - * /, && || ! and parentheses.")
		return nil
	}
	return e
}

// badWords reports spellings of operators that other languages have.
func (c *compiler) badWords(tokens hclsyntax.Tokens) (found bool) {
	instead := map[string]string{"and": "&&", "AND": "&&", "or": "||", "OR": "||", "not": "!", "NOT": "!", "=": "==", "&": "&&", "|": "||", "^": "", "~": "!", "<>": "!=", "%": ""}
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

// expressionKind is what a part of a condition yields.
type expressionKind uint8

const (
	noExpression expressionKind = iota // reported already
	numberExpression
	textExpression
	columnExpression // numbers or texts: the file decides
	conditionExpression
)

// expression is a compiled part of a condition.
type expression struct {
	kind      expressionKind
	at        hcl.Range
	number    number    // numbers, and columns taken as such
	condition condition // conditions
	column    int       // columns: index into the names
	text      string    // texts
}

func (x expression) describe() string {
	switch x.kind {
	case numberExpression:
		return "a number"
	case textExpression:
		return "a text"
	case columnExpression:
		return "a column"
	case conditionExpression:
		return "a condition"
	}
	return "nothing"
}

// numeric reports whether the expression can be computed with.
func (x expression) numeric() bool { return x.kind == numberExpression || x.kind == columnExpression }

// compile compiles one expression.
func (c *compiler) compile(e hclsyntax.Expression) expression {
	switch e := e.(type) {
	case *hclsyntax.ParenthesesExpr:
		x := c.compile(e.Expression)
		x.at = e.Range()
		return x
	case *hclsyntax.LiteralValueExpr:
		if e.Val.IsKnown() && !e.Val.IsNull() && e.Val.Type() == cty.Number {
			x, _ := e.Val.AsBigFloat().Float64()
			if x-x != 0 {
				return c.fail(e.SrcRange, "this number is too large to compute with", "")
			}
			return expression{kind: numberExpression, at: e.SrcRange, number: func(row) (float64, error) { return x, nil }}
		}
		return c.fail(e.SrcRange, "true, false and null are not understood in a condition", "Write flag == 1 or flag == 0, or !(…) for the opposite.")
	case *hclsyntax.TemplateExpr:
		text, ok := plainTemplate(e)
		if !ok {
			return c.fail(e.SrcRange, "a text is taken as it stands: ${…} has no meaning in it", "")
		}
		return expression{kind: textExpression, at: e.SrcRange, text: text}
	case *hclsyntax.ScopeTraversalExpr:
		return c.variable(e)
	case *hclsyntax.FunctionCallExpr:
		if e.Name == "column" && len(e.Args) == 1 && !e.ExpandFinal {
			if x := c.compile(e.Args[0]); x.kind == textExpression && x.text != "" {
				return c.columnNamed(x.text, e.Range())
			}
		}
		return c.fail(e.NameRange, fmt.Sprintf("a condition has no function %s", e.Name), "The one there is, column('name'), gives a column whose name is not a single word.")
	case *hclsyntax.UnaryOpExpr:
		return c.unary(e)
	case *hclsyntax.BinaryOpExpr:
		return c.binary(e)
	}
	return c.fail(e.Range(), "this is not understood in a condition", "A condition is made of columns, numbers, comparisons (== != < <= > >=), + - * /, && || ! and parentheses.")
}

// plainTemplate returns the text of a template without anything to be filled
// in.
func plainTemplate(e *hclsyntax.TemplateExpr) (string, bool) {
	text := ""
	for _, part := range e.Parts {
		literal, ok := part.(*hclsyntax.LiteralValueExpr)
		if !ok || !literal.Val.IsKnown() || literal.Val.IsNull() || literal.Val.Type() != cty.String {
			return "", false
		}
		text += literal.Val.AsString()
	}
	return text, true
}

// variable reads the name of a column.
func (c *compiler) variable(e *hclsyntax.ScopeTraversalExpr) expression {
	name := e.Traversal.RootName()
	if len(e.Traversal) > 1 {
		return c.fail(e.SrcRange, "a column is named by a single word", "Write column('name') for a name with dots or brackets in it.")
	}
	if i := strings.IndexByte(name, '-'); i >= 0 {
		parts := strings.Split(name, "-")
		return c.fail(e.SrcRange, fmt.Sprintf("%s reads as one name", name), fmt.Sprintf("Write %s for the difference, with spaces around the sign, or column('%s') for a column of that name.", strings.Join(parts, " - "), name))
	}
	return c.columnNamed(name, e.SrcRange)
}

func (c *compiler) columnNamed(name string, at hcl.Range) expression {
	i := slices.Index(c.p.names, name)
	if i < 0 {
		i = len(c.p.names)
		c.p.names = append(c.p.names, name)
	}
	return expression{kind: columnExpression, at: at, column: i, number: columnNumber(i, name)}
}

func (c *compiler) unary(e *hclsyntax.UnaryOpExpr) expression {
	x := c.compile(e.Val)
	switch {
	case x.kind == noExpression:
		return x
	case e.Op == hclsyntax.OpLogicalNot:
		if x.kind != conditionExpression {
			return c.fail(e.SrcRange, fmt.Sprintf("! negates a condition, and this is %s", x.describe()), "Write flag == 0, or !(flag == 1).")
		}
		return expression{kind: conditionExpression, at: e.SrcRange, condition: opposite(x.condition)}
	case !x.numeric():
		return c.fail(e.SrcRange, fmt.Sprintf("a sign stands before a number, and this is %s", x.describe()), "")
	}
	return expression{kind: numberExpression, at: e.SrcRange, number: negate(x.number)}
}

var calculations = map[*hclsyntax.Operation]func(x, y float64) float64{
	hclsyntax.OpAdd:      func(x, y float64) float64 { return x + y },
	hclsyntax.OpSubtract: func(x, y float64) float64 { return x - y },
	hclsyntax.OpMultiply: func(x, y float64) float64 { return x * y },
	hclsyntax.OpDivide:   func(x, y float64) float64 { return x / y },
}

var comparisons = map[*hclsyntax.Operation]func(x, y float64) bool{
	hclsyntax.OpEqual:              func(x, y float64) bool { return x == y },
	hclsyntax.OpNotEqual:           func(x, y float64) bool { return x != y },
	hclsyntax.OpLessThan:           func(x, y float64) bool { return x < y },
	hclsyntax.OpLessThanOrEqual:    func(x, y float64) bool { return x <= y },
	hclsyntax.OpGreaterThan:        func(x, y float64) bool { return x > y },
	hclsyntax.OpGreaterThanOrEqual: func(x, y float64) bool { return x >= y },
}

func (c *compiler) binary(e *hclsyntax.BinaryOpExpr) expression {
	a, b := c.compile(e.LHS), c.compile(e.RHS)
	if a.kind == noExpression || b.kind == noExpression {
		return expression{}
	}
	if e.Op == hclsyntax.OpLogicalAnd || e.Op == hclsyntax.OpLogicalOr {
		for _, x := range []expression{a, b} {
			if x.kind != conditionExpression {
				return c.fail(x.at, fmt.Sprintf("&& and || join conditions, and this is %s", x.describe()), "Compare it with something, like flag == 1.")
			}
		}
		join := both
		if e.Op == hclsyntax.OpLogicalOr {
			join = either
		}
		return expression{kind: conditionExpression, at: e.SrcRange, condition: join(a.condition, b.condition)}
	}
	if f, ok := calculations[e.Op]; ok {
		for _, x := range []expression{a, b} {
			if !x.numeric() {
				return c.fail(x.at, fmt.Sprintf("numbers can be computed with, and this is %s", x.describe()), "")
			}
		}
		return expression{kind: numberExpression, at: e.SrcRange, number: calculate(a.number, b.number, f)}
	}
	holds, ok := comparisons[e.Op]
	if !ok {
		return c.fail(e.SrcRange, "this is not understood in a condition", "")
	}
	for _, x := range []expression{a, b} {
		if x.kind == conditionExpression {
			return c.fail(e.SrcRange, "a condition cannot be compared", "Write 0.3 < z && z < 0.5 for a range, and !(…) for the opposite.")
		}
	}
	if a.kind == textExpression || b.kind == textExpression {
		return c.compareText(e, a, b, holds)
	}
	x := expression{kind: conditionExpression, at: e.SrcRange, condition: compare(a.number, b.number, holds)}
	equality := e.Op == hclsyntax.OpEqual || e.Op == hclsyntax.OpNotEqual
	if equality && a.kind == columnExpression && b.kind == columnExpression {
		x.condition = columnsEqual(a.column, b.column, c.p.names[a.column], c.p.names[b.column], e.Op == hclsyntax.OpEqual)
	}
	return x
}

// compareText compares a column with a text, or with the quantity that a text
// states.
func (c *compiler) compareText(e *hclsyntax.BinaryOpExpr, a, b expression, holds func(x, y float64) bool) expression {
	column, text := a, b
	if a.kind == textExpression {
		column, text = b, a
	}
	if column.kind != columnExpression {
		return c.fail(text.at, fmt.Sprintf("a text is compared with a column, and beside it stands %s", column.describe()), "")
	}
	name := c.p.names[column.column]
	if e.Op == hclsyntax.OpEqual || e.Op == hclsyntax.OpNotEqual {
		return expression{kind: conditionExpression, at: e.SrcRange, condition: columnText(column.column, name, text.text, e.Op == hclsyntax.OpEqual)}
	}
	q, err := units.ParseQuantity(text.text)
	switch {
	case err != nil:
		reason := err.Error()
		var inner *units.Error
		if errors.As(err, &inner) {
			reason = inner.Reason
		}
		c.add(problem{at: c.place(text.at), what: "only a number or a quantity can be larger or smaller", why: sentence(reason), write: "Write a quantity like '2 Mpc'."})
		return expression{}
	case q.Plus != nil:
		return c.fail(text.at, "a limit has no error", "Write the value alone.")
	case !q.HasUnit:
		return c.fail(text.at, "this number stands in quotes", fmt.Sprintf("Write %s without quotes, or with its unit.", text.text))
	}
	k := len(c.p.quantities)
	known := ""
	for _, named := range c.columns {
		if named.Name == name {
			known = named.Unit
		}
	}
	c.p.quantities = append(c.p.quantities, quantity{column: column.column, text: text.text, value: q, unit: known})
	limit := number(func(r row) (float64, error) { return r.quantities[k], nil })
	left, right := column.number, limit
	if a.kind == textExpression {
		left, right = limit, column.number
	}
	return expression{kind: conditionExpression, at: e.SrcRange, condition: compare(left, right, holds)}
}
