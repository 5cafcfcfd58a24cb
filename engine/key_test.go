package engine

import (
	"strings"
	"testing"

	"pgregory.net/rapid"

	"steelyard/cache"
)

// The transcript is what keys are made of. When this test fails, everybody's
// stored results are computed again: raise keyFormat, and be sure of it.
func TestTranscriptIsPinned(t *testing.T) {
	n := &Node{
		ID: "lensing.shapes.nfw", Kind: "lensing/tangential-shear", Version: 3,
		Params: []string{"halo = nfw", "mean = 0x3fe0000000000000", "name = \"odd\nname\""},
		Inputs: []string{"a", "b"}, Files: []string{"shapes.fits"}, Where: "recipe.hcl:12",
	}
	const want = `steelyard key 1
kind "lensing/tangential-shear"
version 3
arithmetic "test 0123"
param "halo = nfw"
param "mean = 0x3fe0000000000000"
param "name = \"odd\nname\""
input 2c26b46b68ffc68ff99b453c1d30413413422d706483bfa0f98a5e886266e7ae
input fcde2b2edba56bf408601fb721fe9b5c338d10ee429ea04fae5511b68fbf8fb9
file baa5a0964d3320fbc0c6a922140453c8513ea24ab8fd0577034804a967248096
`
	got := transcript(n, "test 0123", []cache.Digest{cache.DigestOf([]byte("foo")), cache.DigestOf([]byte("bar"))}, []cache.Digest{cache.DigestOf([]byte("baz"))})
	if got != want {
		t.Errorf("transcript is\n%swant\n%s", got, want)
	}
	// SHA-256 of the text above, by sha256sum.
	if key := cache.KeyOf(got).String(); key != "9b567e7e21265dc3e8f9abcd4b3d45de717d18f1159b32e8df0952a7740a2780" {
		t.Errorf("key %s", key)
	}
}

// Neither ID, place nor file name enters the key; everything else does.
func TestWhatEntersTheKey(t *testing.T) {
	digests := func(s ...string) (d []cache.Digest) {
		for _, x := range s {
			d = append(d, cache.DigestOf([]byte(x)))
		}
		return d
	}
	base := Node{Kind: "k", Version: 1, Params: []string{"p"}}
	key := func(n Node, arithmetic string, inputs, files []cache.Digest) string {
		return transcript(&n, arithmetic, inputs, files)
	}
	one := key(base, "a", digests("1", "2"), digests("f"))
	same := base
	same.ID, same.Where, same.Files, same.Inputs = "other", "elsewhere:1", []string{"x"}, []string{"y", "z"}
	if key(same, "a", digests("1", "2"), digests("f")) != one {
		t.Error("a name entered the key")
	}
	version, kind, param, unset := base, base, base, base
	version.Version, kind.Kind, param.Params, unset.Params = 2, "l", []string{"q"}, nil
	for name, other := range map[string]string{
		"version":    key(version, "a", digests("1", "2"), digests("f")),
		"kind":       key(kind, "a", digests("1", "2"), digests("f")),
		"param":      key(param, "a", digests("1", "2"), digests("f")),
		"unset":      key(unset, "a", digests("1", "2"), digests("f")),
		"arithmetic": key(base, "b", digests("1", "2"), digests("f")),
		"input":      key(base, "a", digests("1", "3"), digests("f")),
		"order":      key(base, "a", digests("2", "1"), digests("f")),
		"file":       key(base, "a", digests("1", "2"), digests("g")),
		"role":       key(base, "a", digests("1"), digests("2", "f")),
		"none":       key(base, "a", nil, nil),
	} {
		if other == one {
			t.Errorf("%s did not enter the key", name)
		}
	}
}

// Two nodes with different facts never have one transcript, whatever quotes,
// line ends or keywords the facts contain.
func TestTranscriptIsUnambiguous(t *testing.T) {
	text := rapid.OneOf(rapid.String(), rapid.SampledFrom([]string{"", "a", "a\nparam \"b\"", "a\"\nparam \"b", "\"", "\\", "\\n", "\n", "input ", "\xff"}))
	facts := rapid.Custom(func(t *rapid.T) Node {
		return Node{Kind: text.Draw(t, "kind"), Version: rapid.IntRange(0, 2).Draw(t, "version"), Params: rapid.SliceOfN(text, 0, 3).Draw(t, "params")}
	})
	rapid.Check(t, func(t *rapid.T) {
		a, b := facts.Draw(t, "a"), facts.Draw(t, "b")
		same := a.Kind == b.Kind && a.Version == b.Version && strings.Join(a.Params, "\x00") == strings.Join(b.Params, "\x00") && len(a.Params) == len(b.Params)
		if (transcript(&a, "", nil, nil) == transcript(&b, "", nil, nil)) != same {
			t.Fatalf("%+v and %+v: the same %v", a, b, same)
		}
	})
}

func TestArithmetic(t *testing.T) {
	a := Arithmetic()
	if a != Arithmetic() || len(strings.Fields(a)) != 2 || len(strings.Fields(a)[1]) != 16 {
		t.Errorf("fingerprint %q", a)
	}
}

func BenchmarkTranscript(b *testing.B) {
	n := &Node{Kind: "lensing/tangential-shear", Version: 3, Params: make([]string, 20)}
	for i := range n.Params {
		n.Params[i] = "concentration = lognormal 0x4012000000000000 0x3fd3333333333333"
	}
	inputs := make([]cache.Digest, 3)
	for b.Loop() {
		cache.KeyOf(transcript(n, Arithmetic(), inputs, nil))
	}
}
