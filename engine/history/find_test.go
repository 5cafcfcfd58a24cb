package history

import (
	"strings"
	"testing"
	"time"

	"steelyard/cache"
)

func at(t *testing.T, s string) time.Time {
	t.Helper()
	x, err := time.Parse(time.DateTime, s)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// Weighings are found by number and by date; a date means the last one up to its
// end, in the time zone of who asks.
func TestFind(t *testing.T) {
	list := []cache.Weighing{
		{Number: 1, Finished: at(t, "2026-03-30 09:00:00")},
		{Number: 4, Finished: at(t, "2026-03-31 17:05:30")},
		{Number: 2, Finished: at(t, "2026-03-31 23:30:00")}, // taken over from another store
	}
	east := time.FixedZone("east", 2*3600)
	for _, c := range []struct {
		which string
		zone  *time.Location
		want  uint64 // 0: an error
		say   string
	}{
		{"1", time.UTC, 1, ""},
		{"2", time.UTC, 2, ""},
		{"3", time.UTC, 0, "there is no weighing 3; the first is 1, of 2026-03-30 09:00, the last 2"},
		{"2026-03-30", time.UTC, 1, ""},
		{"2026-03-31", time.UTC, 2, ""},
		{"2026-03-31", east, 4, ""}, // where 23:30 is of the next day
		{"2026-03-31T17:05", time.UTC, 4, ""},
		{"2026-03-31 17:05", time.UTC, 4, ""},
		{"2026-03-31T17:04", time.UTC, 1, ""},
		{"2026-03-31 17:05:29", time.UTC, 1, ""},
		{"2026-03-31T19:05:30+02:00", time.UTC, 4, ""},
		{"2030-01-01", time.UTC, 2, ""},
		{"2026-03-29", time.UTC, 0, "nothing was weighed up to 2026-03-29; the first is 1"},
		{"yesterday", time.UTC, 0, "neither the number of a weighing nor a date such as"},
		{"-1", time.UTC, 0, "neither the number"},
	} {
		i, err := Find(list, c.which, c.zone)
		switch {
		case c.want == 0 && (err == nil || !strings.Contains(err.Error(), c.say)):
			t.Errorf("%s: %v, want an error saying %q", c.which, err, c.say)
		case c.want != 0 && (err != nil || list[i].Number != c.want):
			t.Errorf("%s in %v: %d, %v, want %d", c.which, c.zone, list[i].Number, err, c.want)
		}
	}
	if _, err := Find(nil, "1", time.UTC); err != ErrNone {
		t.Errorf("in an empty list: %v", err)
	}
	if _, err := Find(list[:1], "9", time.UTC); err == nil || !strings.Contains(err.Error(), "the only one is 1") {
		t.Errorf("in a list of one: %v", err)
	}
}
