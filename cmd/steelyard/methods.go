package main

import (
	"encoding/json"
	"fmt"
	"strconv"
	"strings"
	"unicode/utf8"

	"github.com/spf13/cobra"

	"steelyard/engine/assemble"
	"steelyard/probes/method"
)

func methodsCommand(o *options) *cobra.Command {
	return &cobra.Command{
		Use:     "methods [NAME]",
		Short:   "The estimators: equation, published source, assumptions, inputs, defaults",
		Long:    "Lists the estimators, or describes one of them: what it computes, from which data, by whose paper,\nand every setting with its default. NAME is a method (backward) or probe/method (xray/backward).",
		Example: "  steelyard methods\n  steelyard methods tangential-shear",
		Args:    cobra.MaximumNArgs(1),
		RunE: func(_ *cobra.Command, args []string) error {
			name := ""
			if len(args) > 0 {
				name = args[0]
			}
			return o.methods(name)
		},
	}
}

// described is a method with its probe, as methods --json prints it.
type described struct {
	Probe string `json:"probe"`
	method.Declaration
}

func (o *options) methods(name string) error {
	var found, all []described
	for _, p := range assemble.Probes() {
		for _, m := range p.Declare().Methods {
			d := described{p.Name, m}
			all = append(all, d)
			if m.Name == name || p.Name+"/"+m.Name == name {
				found = append(found, d)
			}
		}
	}
	if name == "" {
		return o.listMethods(all)
	}
	if len(found) == 0 {
		var names []string
		for _, d := range all {
			names = append(names, d.Name)
		}
		return &exit{exitWrong, fmt.Errorf("there is no method %q; there are %s", name, strings.Join(names, ", "))}
	}
	for i, d := range found {
		if o.json {
			if err := json.NewEncoder(o.out).Encode(d); err != nil {
				return &exit{exitFailed, err}
			}
			continue
		}
		if i > 0 {
			fmt.Fprintln(o.out)
		}
		o.describeMethod(d)
	}
	return nil
}

func (o *options) listMethods(all []described) error {
	if o.json {
		for _, d := range all {
			if err := json.NewEncoder(o.out).Encode(d); err != nil {
				return &exit{exitFailed, err}
			}
		}
		return nil
	}
	for _, d := range all {
		fmt.Fprintf(o.out, "%-9s %-20s %s\n", d.Probe, d.Name, d.Summary)
	}
	fmt.Fprintf(o.out, "\nsteelyard methods NAME describes one of them.\n")
	return nil
}

func (o *options) describeMethod(d described) {
	fmt.Fprintf(o.out, "%s/%s (version %d)\n", d.Probe, d.Name, d.Version)
	o.paragraph("  ", d.Summary)
	fmt.Fprintf(o.out, "\nEquation\n")
	for _, line := range strings.Split(strings.TrimSpace(d.Equation), "\n") {
		fmt.Fprintf(o.out, "  %s\n", line)
	}
	o.list("From", d.Sources)
	var data []string
	for _, set := range d.Data {
		data = append(data, strings.Join(set, " and "))
	}
	o.list("Needs one of these data", data)
	fmt.Fprintf(o.out, "\nSettings\n")
	for _, s := range d.Settings {
		fmt.Fprintf(o.out, "  %s: %s\n", s.Name, form(s))
		text := s.Doc
		if s.Source != "" {
			text += " (" + s.Source + ")"
		}
		o.paragraph("      ", text)
	}
	o.list("Cautions", d.Cautions)
	if d.Measured != "" {
		o.list("Measured", []string{d.Measured})
	}
}

// form says what a setting takes and what holds without it.
func form(s method.Setting) string {
	text := map[method.Kind]string{
		method.Number: "a number, a prior or a nuisance", method.Exact: "a number", method.Measured: "a value with its error",
		method.Integer: "a whole number", method.Span: "two values, lower and upper", method.List: "values in rising order",
		method.Flag: "true or false", method.Text: "text", method.Overdensity: "an overdensity",
	}[s.Kind]
	if s.Kind == method.Choice || s.Kind == method.Choices {
		text = strings.Join(s.Choices, " | ")
		if s.Kind == method.Choices {
			text = "a list of " + text
		}
	}
	if s.Unit != "" {
		text += " in " + s.Unit
	}
	if len(s.Relation) > 0 {
		text += `, or relation("` + strings.Join(s.Relation, `" | "`) + `")`
	}
	switch {
	case s.Required:
		text += "; required"
	case s.Default.Set:
		text += "; default " + defaultOf(s)
	}
	return text
}

func defaultOf(s method.Setting) string {
	v := s.Default
	switch {
	case s.Kind == method.Flag:
		return strconv.FormatBool(v.Flag)
	case v.Relation != "":
		return `relation("` + v.Relation + `")`
	case v.Text != "":
		return v.Text
	case v.List != nil:
		return strings.Join(v.List, ", ")
	case v.Numbers != nil:
		return strings.Trim(fmt.Sprint(v.Numbers), "[]")
	}
	return v.Prior.String()
}

func (o *options) list(title string, items []string) {
	if len(items) == 0 {
		return
	}
	fmt.Fprintf(o.out, "\n%s\n", title)
	for _, item := range items {
		o.paragraph("  ", item)
	}
}

// paragraph writes text in lines of at most 100 columns.
func (o *options) paragraph(indent, text string) {
	line := indent
	for i, word := range strings.Fields(text) {
		if i > 0 && utf8.RuneCountInString(line)+1+utf8.RuneCountInString(word) > 100 {
			fmt.Fprintln(o.out, line)
			line = indent + word
			continue
		}
		if i > 0 {
			line += " "
		}
		line += word
	}
	fmt.Fprintln(o.out, line)
}
