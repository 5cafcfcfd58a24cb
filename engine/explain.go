package engine

import (
	"fmt"
	"strconv"
	"strings"

	"steelyard/cache"
)

// Change is a fact in a node's key that is not what it was. From or To is ""
// when the fact is new or gone.
type Change struct {
	Fact     string // "version", "file density.ecsv", "output of lensing.shapes", "concentration"
	From, To string
}

func (c Change) String() string {
	switch {
	case c.From == "":
		return fmt.Sprintf("%s is new: %s", c.Fact, c.To)
	case c.To == "":
		return fmt.Sprintf("%s is gone: %s", c.Fact, c.From)
	}
	return fmt.Sprintf("%s: %s → %s", c.Fact, c.From, c.To)
}

// Changes compares the keys of two records: why the second was computed although
// the first was there.
func Changes(before, after *cache.Record) []Change {
	var changes []Change
	old, now := factsOf(before), factsOf(after)
	values := make(map[string]string, len(now))
	for _, f := range now {
		values[f.name] = f.value
	}
	had := make(map[string]bool, len(old))
	for _, f := range old {
		had[f.name] = true
		if value := values[f.name]; value != f.value {
			changes = append(changes, Change{f.name, f.value, value})
		}
	}
	for _, f := range now {
		if !had[f.name] {
			changes = append(changes, Change{f.name, "", f.value})
		}
	}
	if len(changes) == 0 && before.Transcript != after.Transcript {
		changes = append(changes, Change{"order of the facts", "as before", "another"})
	}
	return changes
}

type fact struct{ name, value string }

// factsOf reads a record's transcript, with the names of inputs and files that
// the transcript leaves out. A name that occurs again is numbered.
func factsOf(r *cache.Record) []fact {
	var facts []fact
	seen := map[string]int{}
	add := func(name, value string) {
		seen[name]++
		if n := seen[name]; n > 1 {
			name = fmt.Sprintf("%s (%d)", name, n)
		}
		facts = append(facts, fact{name, value})
	}
	inputs, files := 0, 0
	for line := range strings.Lines(r.Transcript) {
		name, value, _ := strings.Cut(strings.TrimSuffix(line, "\n"), " ")
		if text, err := strconv.Unquote(value); err == nil {
			value = text
		}
		switch name {
		case "steelyard":
			add("layout of keys", value)
		case "param":
			add(splitParam(value))
		case "input":
			if inputs < len(r.Inputs) {
				add("output of "+r.Inputs[inputs].Node, shortDigest(value))
				inputs++
			}
		case "file":
			if files < len(r.Files) {
				add("file "+r.Files[files].Path, shortDigest(value))
				files++
			}
		default:
			add(name, value)
		}
	}
	return facts
}

// splitParam takes what stands before the first space or equals sign for the
// name of a parameter.
func splitParam(p string) (name, value string) {
	i := strings.IndexAny(p, " =")
	if i <= 0 {
		return p, "set"
	}
	return p[:i], strings.TrimLeft(p[i:], " =")
}

func shortDigest(hex string) string {
	if len(hex) > 12 {
		return hex[:12]
	}
	return hex
}
