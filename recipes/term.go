package recipes

import (
	"fmt"
	"math/big"
	"strings"

	"github.com/hashicorp/hcl/v2"
	"github.com/hashicorp/hcl/v2/hclsyntax"
	"github.com/zclconf/go-cty/cty"
)

// termKind is what a value of a recipe looks like.
type termKind uint8

const (
	badTerm       termKind = iota // reported already
	numberTerm                    // 0.3, -2, 1/1.05
	textTerm                      // "18.4 +- 0.6 arcsec"
	flagTerm                      // true
	listTerm                      // [a, b]
	callTerm                      // normal(0, 0.1)
	referenceTerm                 // nuisance.name, or a lone word
)

// term is the value of an attribute as written, before anything is known about
// what it should be.
type term struct {
	kind   termKind
	at     hcl.Range
	number *big.Rat
	text   string      // textTerm
	inside hcl.Range   // textTerm: the place between the quotes
	flag   bool        // flagTerm
	items  []term      // listTerm, and the arguments of a callTerm
	name   string      // callTerm
	nameAt hcl.Range   // callTerm
	path   []string    // referenceTerm
	pathAt []hcl.Range // referenceTerm, one each
}

// describe names a term for messages.
func (t term) describe() string {
	switch t.kind {
	case numberTerm:
		return "a number"
	case textTerm:
		return "a text"
	case flagTerm:
		return "true or false"
	case listTerm:
		return "a list"
	case callTerm:
		return t.name + "(…)"
	case referenceTerm:
		return strings.Join(t.path, ".")
	}
	return "nothing"
}

// is reports whether the term is a call of the function.
func (t term) is(function string) bool { return t.kind == callTerm && t.name == function }

// word returns a lone word without quotes, or "".
func (t term) word() string {
	if t.kind == referenceTerm && len(t.path) == 1 {
		return t.path[0]
	}
	return ""
}

// term reads an expression. What no recipe contains is reported here.
func (r *report) term(e hclsyntax.Expression) term {
	bad := term{at: e.Range()}
	refuse := func(what, write string) term {
		r.add(problem{at: e.Range(), what: what, write: write})
		return bad
	}
	switch e := e.(type) {
	case *hclsyntax.ParenthesesExpr:
		t := r.term(e.Expression)
		t.at = e.Range()
		return t
	case *hclsyntax.LiteralValueExpr:
		return r.literal(e)
	case *hclsyntax.UnaryOpExpr, *hclsyntax.BinaryOpExpr:
		return r.arithmetic(e)
	case *hclsyntax.TemplateExpr:
		return r.textTerm(e)
	case *hclsyntax.TemplateWrapExpr:
		return refuse("a text is taken as it stands: ${…} has no meaning in it", "Write the text out.")
	case *hclsyntax.ScopeTraversalExpr:
		return r.reference(e)
	case *hclsyntax.FunctionCallExpr:
		t := term{kind: callTerm, at: e.Range(), name: e.Name, nameAt: e.NameRange}
		for _, arg := range e.Args {
			t.items = append(t.items, r.term(arg))
		}
		if e.ExpandFinal {
			return refuse("a list cannot be spread over arguments", "Write the arguments out.")
		}
		return t
	case *hclsyntax.TupleConsExpr:
		t := term{kind: listTerm, at: e.Range()}
		for _, item := range e.Exprs {
			t.items = append(t.items, r.term(item))
		}
		return t
	case *hclsyntax.ObjectConsExpr:
		return refuse("no setting takes values in braces", "A block is written without the equals sign: `name { … }`.")
	case *hclsyntax.ConditionalExpr, *hclsyntax.ForExpr, *hclsyntax.SplatExpr:
		return refuse("a recipe declares, it does not compute", "Write the value out.")
	case *hclsyntax.ExprSyntaxError:
		return bad // the parser reported it
	}
	return refuse("this is not a value", "Write a number, a text in quotes, a function such as normal(0, 0.1), a reference such as nuisance.name, or a list in brackets.")
}

// written returns the text of a place, as it stands in the file.
func (r *report) written(at hcl.Range) string {
	t := r.texts[at.Filename]
	if t == nil || at.Start.Byte < 0 || at.End.Byte > len(t.content) || at.Start.Byte > at.End.Byte {
		return ""
	}
	return string(t.content[at.Start.Byte:at.End.Byte])
}

func (r *report) literal(e *hclsyntax.LiteralValueExpr) term {
	switch {
	case !e.Val.IsKnown():
		return term{at: e.SrcRange} // stands for a syntax error
	case e.Val.IsNull():
		r.add(problem{at: e.SrcRange, what: "null is not a value", write: "Leave the setting out to take its default."})
		return term{at: e.SrcRange}
	case e.Val.Type() == cty.Bool:
		return term{kind: flagTerm, at: e.SrcRange, flag: e.Val.True()}
	case e.Val.Type() == cty.Number:
		return r.number(e)
	}
	return term{at: e.SrcRange}
}

// number reads a literal as the exact decimal that stands in the file.
func (r *report) number(e *hclsyntax.LiteralValueExpr) term {
	f := e.Val.AsBigFloat()
	if !r.inRange(f, e.SrcRange) {
		return term{at: e.SrcRange}
	}
	x, ok := new(big.Rat).SetString(r.written(e.SrcRange))
	if !ok {
		x, _ = f.Rat(nil)
	}
	return term{kind: numberTerm, at: e.SrcRange, number: x}
}

// inRange reports whether a number can be held as a float64, and says so if
// not.
func (r *report) inRange(f *big.Float, at hcl.Range) bool {
	x, _ := f.Float64()
	switch {
	case f.IsInf() || x-x != 0:
		r.fail(at, "this number is too large to compute with")
	case f.Sign() != 0 && x == 0:
		r.fail(at, "this number is too small to be told from zero")
	default:
		return true
	}
	return false
}

// arithmetic multiplies and divides plain numbers, exactly. Sums are refused:
// 0.30 +- 0.02 and 6.1 +0.9 -0.8 without their quotes are sums, and not what was
// meant.
func (r *report) arithmetic(e hclsyntax.Expression) term {
	bad := term{at: e.Range()}
	refuse := func(what, write string) term {
		r.add(problem{at: e.Range(), what: what, write: write})
		return bad
	}
	const declares = "a recipe declares, it does not compare"
	switch e := e.(type) {
	case *hclsyntax.UnaryOpExpr:
		if e.Op != hclsyntax.OpNegate {
			return refuse(declares, "Write true or false.")
		}
		t := r.term(e.Val)
		switch t.kind {
		case badTerm:
			return bad
		case numberTerm:
			return term{kind: numberTerm, at: e.Range(), number: new(big.Rat).Neg(t.number)}
		}
		return refuse(fmt.Sprintf("the sign stands before %s", t.describe()), "Only numbers take a sign; in a quantity it stands inside the quotes: \"-2 arcmin\".")
	case *hclsyntax.BinaryOpExpr:
		if e.Op == hclsyntax.OpAdd || e.Op == hclsyntax.OpSubtract {
			return refuse("a recipe adds nothing up", "Write the result. If an error is meant, write it in quotes, like \"0.30 +- 0.02\".")
		}
		a, b := r.term(e.LHS), r.term(e.RHS)
		if a.kind == badTerm || b.kind == badTerm {
			return bad
		}
		if a.kind != numberTerm || b.kind != numberTerm {
			return refuse("only plain numbers can be multiplied and divided", "Write the result, with its unit in quotes.")
		}
		x := new(big.Rat)
		switch e.Op {
		case hclsyntax.OpMultiply:
			x.Mul(a.number, b.number)
		case hclsyntax.OpDivide:
			if b.number.Sign() == 0 {
				return refuse("this divides by zero", "")
			}
			x.Quo(a.number, b.number)
		default:
			return refuse(declares, "Write the value out.")
		}
		if !r.inRange(new(big.Float).SetPrec(64).SetRat(x), e.Range()) {
			return bad
		}
		return term{kind: numberTerm, at: e.Range(), number: x}
	}
	return bad
}

// textTerm reads a text without anything to be filled in.
func (r *report) textTerm(e *hclsyntax.TemplateExpr) term {
	t := term{kind: textTerm, at: e.SrcRange, inside: e.SrcRange}
	var b strings.Builder
	for i, part := range e.Parts {
		literal, ok := part.(*hclsyntax.LiteralValueExpr)
		if !ok || !literal.Val.IsKnown() || literal.Val.IsNull() || literal.Val.Type() != cty.String {
			if r.damaged {
				return term{at: e.SrcRange}
			}
			r.add(problem{at: part.Range(), what: "a text is taken as it stands: ${…} and %{…} have no meaning in it", write: "Write the text out; a literal ${ is written $${."})
			return term{at: e.SrcRange}
		}
		if i == 0 {
			t.inside.Start = literal.SrcRange.Start
		}
		t.inside.End = literal.SrcRange.End
		b.WriteString(literal.Val.AsString())
	}
	t.text = b.String()
	// The parser normalises Unicode; a file's name must stay as it is written.
	if raw := r.written(t.inside); len(e.Parts) > 0 && strings.HasPrefix(r.written(e.SrcRange), `"`) && !strings.ContainsAny(raw, `\$%`) {
		t.text = raw
	}
	return t
}

// reference reads a path of names.
func (r *report) reference(e *hclsyntax.ScopeTraversalExpr) term {
	t := term{kind: referenceTerm, at: e.SrcRange}
	for _, step := range e.Traversal {
		switch step := step.(type) {
		case hcl.TraverseRoot:
			t.path = append(t.path, step.Name)
			t.pathAt = append(t.pathAt, step.SrcRange)
		case hcl.TraverseAttr:
			t.path = append(t.path, step.Name)
			at := step.SrcRange
			if at.Start.Byte+1 < at.End.Byte { // without the dot
				at.Start.Byte++
				at.Start.Column++
			}
			t.pathAt = append(t.pathAt, at)
		default:
			r.add(problem{at: e.SrcRange, what: "a reference is names joined by dots", write: "Write it like lensing.shapes.nfw."})
			return term{at: e.SrcRange}
		}
	}
	return t
}
