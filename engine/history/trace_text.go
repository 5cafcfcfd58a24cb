package history

import (
	"fmt"
	"io"
	"strings"
	"time"

	"steelyard/engine/layout"
)

// WriteText writes the trace for reading in a terminal.
func (t *Trace) WriteText(out io.Writer, zone *time.Location) error {
	var b strings.Builder
	fmt.Fprintf(&b, "%s, %s: weighing %d of %s\n", t.Object.Name, t.Name, t.Weighing.Number, Stamp(t.Weighing.Finished.In(zone)))
	if t.Stale != "" {
		layout.Wrap(&b, "", 2, t.Stale)
	}
	t.result(&b)
	for i := range t.Nodes {
		t.Nodes[i].text(&b, t.Recipe, zone)
	}
	_, err := io.WriteString(out, b.String())
	return err
}

// result writes the masses of the estimate that is traced.
func (t *Trace) result(b *strings.Builder) {
	if t.Estimate == nil {
		return
	}
	for _, m := range t.Estimate.Own {
		fmt.Fprintf(b, "  M inside %s = %s 1e%d Msun (R = %s kpc)\n", inside(m), m.Mass.Scaled(t.Unit), exponent(t.Unit), m.Radius)
	}
	for _, m := range t.Estimate.At {
		fmt.Fprintf(b, "  M(<R = %.0f kpc) = %s 1e%d Msun (%s, matched)\n", m.Radius, m.Mass.Scaled(t.Unit), exponent(t.Unit), m.At)
	}
}

// text writes one node: what it read, with which parameters, when and by what it
// was computed, and what made it run anew.
func (n *Traced) text(b *strings.Builder, recipe string, zone *time.Location) {
	fmt.Fprintf(b, "\n%s    (%s, version %s)\n", n.ID, n.Kind, n.Version)
	for _, f := range n.Files {
		fmt.Fprintf(b, "  file      %s, sha256 %s\n", f.Name, f.Digest)
	}
	var inputs, parameters []string
	for _, in := range n.Inputs {
		inputs = append(inputs, in.Name+" "+short(in.Digest))
	}
	for _, p := range n.Parameters {
		parameters = append(parameters, ownName(p.Name)+" = "+p.Value)
	}
	paragraph(b, "  reads     ", strings.Join(inputs, "; "))
	paragraph(b, "  with      ", strings.Join(parameters, "; "))
	if c := n.Computed; c != nil {
		text := fmt.Sprintf("%s in %s by steelyard %s", Stamp(c.Finished.In(zone)), layout.Seconds(c.Seconds), c.Program)
		if c.Recipe != recipe {
			text += " for " + c.Recipe
		}
		paragraph(b, "  computed  ", text)
		paragraph(b, "  says      ", strings.Join(c.Diagnostics, "; "))
		paragraph(b, "  output    ", short(n.Output)+", "+layout.Bytes(c.Bytes))
	} else {
		paragraph(b, "  output    ", short(n.Output)+"; it was trimmed from the store, and with it when and by what it was computed")
	}
	if c := n.Changed; c != nil {
		head := fmt.Sprintf("  changed   in weighing %d: ", c.In.Number)
		for _, line := range described(c.Facts) {
			layout.Wrap(b, head, 2, line)
			head = strings.Repeat(" ", len(head))
		}
	}
}

// ownName leaves off what a node's own settings are called in its key.
func ownName(parameter string) string {
	return strings.TrimPrefix(strings.TrimPrefix(parameter, "estimate."), "reported.")
}

func paragraph(b *strings.Builder, head, s string) {
	if s != "" {
		layout.Wrap(b, head, 0, s)
	}
}
