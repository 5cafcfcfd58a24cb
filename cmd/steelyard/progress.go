package main

import (
	"fmt"
	"io"
	"os"
	"slices"
	"strings"
	"time"

	"golang.org/x/term"

	"steelyard/cache"
	"steelyard/engine"
	"steelyard/engine/history"
)

// display shows what a run is doing: one line that is written over on a
// terminal, a line for each node that was computed elsewhere.
type display struct {
	out     io.Writer
	live    bool
	quiet   bool
	running []started
	shown   time.Time
	states  map[string]engine.State // of the nodes that are done
	length  int                     // of the live line
	told    map[string]bool         // warnings shown
}

func (o *options) progress() *display {
	d := &display{out: o.err, quiet: o.quiet, states: map[string]engine.State{}, told: map[string]bool{}}
	if f, ok := o.err.(*os.File); ok {
		d.live = term.IsTerminal(int(f.Fd()))
	}
	return d
}

// started is a node that runs now.
type started struct {
	id       string
	at       time.Time
	expected float64 // seconds, 0 when it was never computed before
}

// event takes one event of a run.
func (d *display) event(e engine.Event) {
	switch e.Type {
	case engine.Started:
		d.running = append(d.running, started{e.Node, time.Now(), e.Expected})
	case engine.Finished:
		if d.states[e.Node] != engine.Computed { // it was, in an earlier round
			d.states[e.Node] = e.State
		}
		for i, r := range d.running {
			if r.id == e.Node {
				d.running = append(d.running[:i:i], d.running[i+1:]...)
				break
			}
		}
		if !d.live && !d.quiet && e.State == engine.Computed {
			fmt.Fprintf(d.out, "computed %s in %.2f s\n", e.Node, e.Seconds)
		}
	case engine.Warning:
		d.told[e.Text] = true
		d.clear()
		fmt.Fprintf(d.out, "steelyard: warning: %s\n", e.Text)
	}
	if d.live && !d.quiet && (e.Type == engine.Started || e.Type == engine.Finished || time.Since(d.shown) > 100*time.Millisecond) {
		d.draw(e)
	}
}

func (d *display) draw(e engine.Event) {
	d.shown = time.Now()
	line := fmt.Sprintf("%d of %d nodes", e.Finished, e.Total)
	var names []string
	for _, r := range d.running {
		name := r.id
		if left := r.expected - time.Since(r.at).Seconds(); left >= 1 {
			name += fmt.Sprintf(" (%.0f s left)", left)
		}
		names = append(names, name)
	}
	if len(names) > 0 {
		line += ": " + strings.Join(names, ", ")
	}
	width := 100
	if f, ok := d.out.(*os.File); ok {
		if w, _, err := term.GetSize(int(f.Fd())); err == nil && w > 10 {
			width = w - 1
		}
	}
	if len(line) > width {
		line = line[:width]
	}
	fmt.Fprintf(d.out, "\r%s%s", line, strings.Repeat(" ", max(0, d.length-len(line))))
	d.length = len(line)
}

// clear removes the live line.
func (d *display) clear() {
	if d.length > 0 {
		fmt.Fprintf(d.out, "\r%s\r", strings.Repeat(" ", d.length))
		d.length = 0
	}
}

// untold gives the warnings that were not shown while they came about.
func (d *display) untold(warnings []string) []string {
	return slices.DeleteFunc(warnings, func(w string) bool { return d.told[w] })
}

// close ends the display with a count of what became of the nodes.
func (d *display) close() {
	d.clear()
	if d.quiet {
		return
	}
	counts := map[engine.State]int{}
	for _, s := range d.states {
		counts[s]++
	}
	var parts []string
	for _, s := range []engine.State{engine.Computed, engine.Reused, engine.Failed, engine.Blocked} {
		if n := counts[s]; n > 0 {
			parts = append(parts, fmt.Sprintf("%d %s", n, s))
		}
	}
	if len(parts) > 0 {
		fmt.Fprintf(d.out, "nodes: %s\n", strings.Join(parts, ", "))
	}
}

// recorded says under which number the weighing is in the history.
func (d *display) recorded(entry cache.Weighing, fresh bool) {
	switch {
	case d.quiet:
	case !fresh:
		fmt.Fprintf(d.out, "nothing new since weighing %d of %s\n", entry.Number, history.Stamp(entry.Finished.In(time.Local)))
	case entry.Number == 1:
		fmt.Fprintf(d.out, "recorded as weighing 1\n")
	default:
		fmt.Fprintf(d.out, "recorded as weighing %d: steelyard since tells what changed\n", entry.Number)
	}
}
