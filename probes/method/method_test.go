package method

import (
	"slices"
	"testing"

	"steelyard/probes/prior"
)

// Settings that differ in anything must have different transcripts, for the
// transcript decides whether a stored result is reused.
func TestTranscriptTellsSettingsApart(t *testing.T) {
	must := func(p prior.Prior, err error) prior.Prior {
		if err != nil {
			t.Fatal(err)
		}
		return p
	}
	values := []Value{
		{},
		{Set: true},
		Exactly(1),
		Exactly(1.0000000000000002),
		{Set: true, Prior: must(prior.Normal(1, 2))},
		{Set: true, Prior: must(prior.LogNormal(1, 2))},
		{Set: true, Prior: must(prior.Uniform(1, 2))},
		{Set: true, Prior: prior.Exact(1), Unit: "rad"},
		{Set: true, Nuisance: "a"},
		{Set: true, Relation: "a"},
		{Set: true, Text: "a"},
		{Set: true, Text: `a" unit "rad`},
		{Set: true, Text: "a", Unit: "rad"},
		{Set: true, Flag: true},
		Words("a", "b"),
		Words("a b"),
		{Set: true, Numbers: []float64{1, 2}},
		{Set: true, Numbers: []float64{12}},
	}
	seen := map[string]int{}
	for i, v := range values {
		lines := Settings{"x": v}.Transcript()
		key := ""
		for _, line := range lines {
			key += line + "\n"
		}
		if j, ok := seen[key]; ok {
			t.Errorf("values %d and %d have the transcript %q", i, j, key)
		}
		seen[key] = i
	}
}

func TestTranscriptIsSortedAndLeavesOutWhatIsNotSet(t *testing.T) {
	got := Settings{"b": Exactly(2), "a": Word("x"), "c": {}}.Transcript()
	want := []string{`a = exact(0, 0, 0) text "x"`, `b = exact(2, 0, 0)`}
	if !slices.Equal(got, want) {
		t.Errorf("%q, want %q", got, want)
	}
}

// Negative zero is zero: it compares equal, so it must hash equal.
func TestNegativeZero(t *testing.T) {
	zero := 0.0
	if got := Digits(-zero); got != "0" {
		t.Errorf("%q", got)
	}
	if got := Digits(zero * -1); got != "0" {
		t.Errorf("%q", got)
	}
}
