package engine

import (
	"fmt"
	"strings"
	"testing"
)

func TestGraphRefusesWhatCannotRun(t *testing.T) {
	node := func(id string, inputs ...string) Node {
		n := join(id, id, inputs, nil)
		n.Where = "recipe.hcl:" + fmt.Sprint(len(id))
		return n
	}
	noRun := node("norun")
	noRun.Run = nil
	for _, c := range []struct {
		name  string
		nodes []Node
		want  []string
	}{
		{"twice", []Node{node("a"), node("a")}, []string{`recipe.hcl:1: node "a" is there twice, first at recipe.hcl:1`}},
		{"unknown input", []Node{node("a", "none")}, []string{`recipe.hcl:1: node "a" reads "none", which is not in the graph`}},
		{"no run", []Node{noRun}, []string{`needs an ID and a Run`}},
		{"no ID", []Node{node("")}, []string{`needs an ID and a Run`}},
		{"itself", []Node{node("a", "a")}, []string{`these nodes wait for each other: "a" (recipe.hcl:1) reads "a"`}},
		{"cycle", []Node{node("top", "a"), node("a", "bb"), node("bb", "ccc"), node("ccc", "a"), node("dd")},
			[]string{`these nodes wait for each other: "a" (recipe.hcl:1) reads "bb" (recipe.hcl:2) reads "ccc" (recipe.hcl:3) reads "a"`}},
		{"several", []Node{node("a", "x"), node("a", "y")}, []string{`"x"`, `"y"`, "twice"}},
	} {
		_, err := NewGraph(c.nodes)
		if err == nil {
			t.Errorf("%s: no error", c.name)
			continue
		}
		for _, part := range c.want {
			if !strings.Contains(err.Error(), part) {
				t.Errorf("%s: %v\nwant %s", c.name, err, part)
			}
		}
	}
}

// A chain of a hundred thousand must not exhaust the stack, a node that reads
// one input twice must not wait for ever.
func TestGraphOfAnyShape(t *testing.T) {
	nodes := make([]Node, 100000)
	for i := range nodes {
		nodes[i] = join(fmt.Sprint(i), "", nil, nil)
		if i+1 < len(nodes) {
			nodes[i].Inputs = []string{fmt.Sprint(i + 1)}
		}
	}
	g := mustGraph(t, nodes...)
	for place, i := range g.order {
		if i != len(nodes)-1-place {
			t.Fatalf("order is %v…", g.order[:10])
		}
	}
	if g.Node("17").ID != "17" || g.Node("none") != nil || g.Len() != len(nodes) {
		t.Error("nodes are not found")
	}
	s := openStore(t, t.TempDir())
	r := mustRun(t, mustGraph(t, join("a", "a", nil, nil), join("b", "b", []string{"a", "a"}, nil)), s, Options{})
	if out, err := r.Output(t.Context(), "b"); string(out) != "b(a)(a)" {
		t.Errorf("%q, %v", out, err)
	}
	empty := mustRun(t, mustGraph(t), s, Options{})
	if len(empty.Results()) != 0 {
		t.Error("an empty graph had results")
	}
}
