package cache

import (
	"bytes"
	"encoding/hex"
	"math"
	"reflect"
	"testing"
	"time"

	"pgregory.net/rapid"
)

// sample is a record with something in every field.
func sample() *Record {
	return &Record{
		Name:        Name{"curlew/recipe.hcl", "lensing.shapes.nfw"},
		Kind:        "lensing/tangential-shear",
		Version:     3,
		Transcript:  "steelyard key 1\nkind \"lensing/tangential-shear\"\n",
		Inputs:      []Input{{"lensing.shapes", DigestOf([]byte("in"))}},
		Files:       []File{{"shapes.fits", DigestOf([]byte("file"))}},
		Output:      DigestOf([]byte("out")),
		Size:        3,
		Program:     "v1.2.3",
		Seconds:     1.25,
		Diagnostics: []string{"effective draws 3800", ""},
		Finished:    time.Date(2031, 5, 6, 7, 8, 9, 10, time.UTC),
	}
}

// The bytes of a record are a promise to stores on disk: when this test fails,
// raise recordFormat.
func TestRecordFormatIsPinned(t *testing.T) {
	const want = "75e202bc9b086970"
	if got := hex.EncodeToString(checksum(nil, nil, sample().Encode())[:8]); got != want {
		t.Errorf("encoded record hashes to %s, want %s", got, want)
	}
}

func TestRecordsSurviveEncoding(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		digest := rapid.Custom(func(t *rapid.T) Digest { return DigestOf([]byte(rapid.String().Draw(t, "digest"))) })
		r := &Record{
			Name:        Name{rapid.String().Draw(t, "recipe"), rapid.String().Draw(t, "node")},
			Kind:        rapid.String().Draw(t, "kind"),
			Version:     rapid.Int().Draw(t, "version"),
			Transcript:  rapid.String().Draw(t, "transcript"),
			Output:      digest.Draw(t, "output"),
			Size:        rapid.Int64().Draw(t, "size"),
			Program:     rapid.String().Draw(t, "program"),
			Seconds:     rapid.Float64().Draw(t, "seconds"),
			Diagnostics: rapid.SliceOfN(rapid.String(), 0, 3).Draw(t, "diagnostics"),
			Finished:    time.Unix(rapid.Int64Range(-1e11, 1e11).Draw(t, "finished"), rapid.Int64Range(0, 999999999).Draw(t, "ns")).UTC(),
		}
		for range rapid.IntRange(0, 3).Draw(t, "inputs") {
			r.Inputs = append(r.Inputs, Input{rapid.String().Draw(t, "input"), digest.Draw(t, "input digest")})
			r.Files = append(r.Files, File{rapid.String().Draw(t, "file"), digest.Draw(t, "file digest")})
		}
		if len(r.Diagnostics) == 0 {
			r.Diagnostics = nil
		}
		got, err := DecodeRecord(r.Encode())
		if err != nil || !reflect.DeepEqual(got, r) {
			t.Fatalf("%v\ngot  %+v\nwant %+v", err, got, r)
		}
	})
}

// Every cut, every lengthening and an unknown format are refused.
func TestDecodeRefusesOtherBytes(t *testing.T) {
	whole := sample().Encode()
	for n := range whole {
		if _, err := DecodeRecord(whole[:n]); err == nil {
			t.Errorf("%d of %d bytes were taken for a record", n, len(whole))
		}
	}
	if _, err := DecodeRecord(append(bytes.Clone(whole), 0)); err == nil {
		t.Error("a byte too many was not noticed")
	}
	whole[0]++
	if _, err := DecodeRecord(whole); err == nil {
		t.Error("another format was not noticed")
	}
}

// A length that promises more than there is must not be believed.
func TestDecodeAllocatesNoMoreThanItIsGiven(t *testing.T) {
	b := append([]byte{recordFormat}, bytes.Repeat([]byte{0xff}, 64)...)
	if n := testing.AllocsPerRun(10, func() { DecodeRecord(b) }); n > 10 {
		t.Errorf("%v allocations for nonsense", n)
	}
}

func FuzzDecodeRecord(f *testing.F) {
	f.Add(sample().Encode())
	f.Add((&Record{}).Encode())
	f.Add((&Record{Seconds: math.Inf(1), Version: -1, Diagnostics: make([]string, 5)}).Encode())
	f.Add([]byte{recordFormat, 0xff, 0xff, 0xff, 0xff})
	f.Fuzz(func(t *testing.T, b []byte) {
		r, err := DecodeRecord(b)
		if err != nil {
			return
		}
		if again := r.Encode(); !bytes.Equal(again, b) {
			t.Fatalf("decoded and encoded again:\n%x\nwas\n%x", again, b)
		}
	})
}

func FuzzDecodeWeighing(f *testing.F) {
	key := putInt(putString(nil, "curlew"), 7)
	f.Add(key, (&Weighing{Program: "v1", Finished: time.Unix(1, 2), Size: 9}).encode())
	f.Add([]byte{}, []byte{historyFormat})
	f.Fuzz(func(t *testing.T, key, value []byte) {
		w, err := decodeWeighing(key, value)
		if err == nil && !bytes.Equal(w.encode(), value) {
			t.Fatalf("decoded and encoded again: %x, was %x", w.encode(), value)
		}
	})
}

// A seal holds a value to its bucket, its key and its bytes.
func TestSealsAreBroken(t *testing.T) {
	bucket, key, value := []byte("records"), []byte("key"), []byte("value")
	sealed := seal(bucket, key, value)
	got, err := unseal(bucket, key, sealed)
	if err != nil || !bytes.Equal(got, value) {
		t.Fatalf("%q, %v", got, err)
	}
	for i := range sealed {
		for bit := range 8 {
			bad := bytes.Clone(sealed)
			bad[i] ^= 1 << bit
			if _, err := unseal(bucket, key, bad); err == nil {
				t.Fatalf("bit %d of byte %d changed unnoticed", bit, i)
			}
		}
	}
	for name, args := range map[string][2][]byte{
		"bucket": {[]byte("outputs"), key}, "key": {bucket, []byte("kez")}, "border": {[]byte("recordsk"), []byte("ey")},
	} {
		if _, err := unseal(args[0], args[1], sealed); err == nil {
			t.Errorf("another %s was not noticed", name)
		}
	}
}
