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
				return c.fail(e.SrcRange, "this number is too large to compute with", "Write it smaller; numbers end at 1.8e308.")
			}
			return expression{kind: numberExpression, at: e.SrcRange, number: func(row) (float64, error) { return x, nil }}
		}
		return c.fail(e.SrcRange, "true, false and null are not understood in a condition", "Write flag == 1 or flag == 0, or !(…) for the opposite.")
	case *hclsyntax.TemplateExpr:
		text, ok := plainTemplate(e)
		if !ok {
			return c.fail(e.SrcRange, "a text is taken as it stands: ${…} has no meaning in it", "Write the text out.")
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
		return c.fail(e.NameRange, fmt.Sprintf("a condition has no function %s", e.Name), "There is only column('name'), for a column whose name is not a single word.")
	case *hclsyntax.UnaryOpExpr:
		return c.unary(e)
	case *hclsyntax.BinaryOpExpr:
		return c.binary(e)
	}
	return c.fail(e.Range(), "this is not understood in a condition", operators)
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
		return c.fail(e.SrcRange, fmt.Sprintf("a sign stands before a number, and this is %s", x.describe()), "Write it before a number or the name of a column.")
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
				return c.fail(x.at, fmt.Sprintf("numbers can be computed with, and this is %s", x.describe()), "Write a number without quotes, or the name of a column.")
			}
		}
		return expression{kind: numberExpression, at: e.SrcRange, number: calculate(a.number, b.number, f)}
	}
	holds, ok := comparisons[e.Op]
	if !ok {
		return c.fail(e.SrcRange, "this is not understood in a condition", operators)
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
		return c.fail(text.at, fmt.Sprintf("a text is compared with a column, and beside it stands %s", column.describe()), "Write the name of the column alone on the other side.")
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
	limitFor := quantity{column: column.column, text: text.text, value: q}
	for _, named := range c.columns {
		if named.Name == name && named.Unit != "" {
			u, err := units.Parse(named.Unit)
			if err != nil {
				return c.fail(text.at, fmt.Sprintf("the unit of %s is too long to compare with", name), "")
			}
			limitFor.unit, limitFor.apart = named.Unit, apart(u, q.Unit)
			if !limitFor.apart && !units.SameDimension(u, q.Unit) {
				return c.fail(text.at, fmt.Sprintf("%s is in %s, and this is %s", name, named.Unit, withArticle(q.Unit.Describe())), fmt.Sprintf("Write a quantity in %s, or in a unit of the same kind.", named.Unit))
			}
		}
	}
	c.p.quantities = append(c.p.quantities, limitFor)
	limit := number(func(r row) (float64, error) { return r.quantities[k], nil })
	left, right := column.number, limit
	if a.kind == textExpression {
		left, right = limit, column.number
	}
	return expression{kind: conditionExpression, at: e.SrcRange, condition: compare(left, right, holds)}
}
