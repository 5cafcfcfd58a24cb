package history

import (
	"errors"
	"fmt"
	"slices"
	"strconv"
	"time"

	"steelyard/cache"
)

// ErrNone is returned when a recipe was never weighed, as far as the store
// knows.
var ErrNone = errors.New("the store knows no weighing of it")

// List gives the weighings of a recipe in the order of their time. Of several
// that found the same one after the other, it gives the first.
func List(store *cache.Store, recipe string) ([]cache.Weighing, error) {
	list, err := store.History(recipe)
	if err != nil {
		return nil, err
	}
	slices.SortStableFunc(list, func(a, b cache.Weighing) int { return a.Finished.Compare(b.Finished) })
	return slices.CompactFunc(list, func(a, b cache.Weighing) bool { return a.Body == b.Body }), nil
}

// Find gives the weighing that a number or a date means, in a list as List gives
// it; a date means the last weighing up to the end of that day or minute, in the
// time zone given.
func Find(list []cache.Weighing, which string, zone *time.Location) (int, error) {
	if len(list) == 0 {
		return 0, ErrNone
	}
	if number, err := strconv.ParseUint(which, 10, 64); err == nil {
		i := slices.IndexFunc(list, func(w cache.Weighing) bool { return w.Number == number })
		if i < 0 {
			return 0, fmt.Errorf("there is no weighing %d; %s", number, known(list, zone))
		}
		return i, nil
	}
	end, err := endOf(which, zone)
	if err != nil {
		return 0, err
	}
	for i := len(list) - 1; i >= 0; i-- {
		if list[i].Finished.Before(end) {
			return i, nil
		}
	}
	return 0, fmt.Errorf("nothing was weighed up to %s; %s", which, known(list, zone))
}

func known(list []cache.Weighing, zone *time.Location) string {
	first, last := list[0], list[len(list)-1]
	if len(list) == 1 {
		return fmt.Sprintf("the only one is %d, of %s", first.Number, Stamp(first.Finished.In(zone)))
	}
	return fmt.Sprintf("the first is %d, of %s, the last %d, of %s",
		first.Number, Stamp(first.Finished.In(zone)), last.Number, Stamp(last.Finished.In(zone)))
}

// dateForms are the ways to write a date, and how long what they name lasts.
var dateForms = []struct {
	form  string
	lasts time.Duration
}{
	{"2006-01-02T15:04", time.Minute},
	{"2006-01-02 15:04", time.Minute},
	{"2006-01-02T15:04:05", time.Second},
	{"2006-01-02 15:04:05", time.Second},
	{time.RFC3339, time.Second},
}

// endOf is the first instant after what a date names.
func endOf(date string, zone *time.Location) (time.Time, error) {
	if day, err := time.ParseInLocation(time.DateOnly, date, zone); err == nil {
		return day.AddDate(0, 0, 1), nil
	}
	for _, f := range dateForms {
		if t, err := time.ParseInLocation(f.form, date, zone); err == nil {
			return t.Add(f.lasts), nil
		}
	}
	return time.Time{}, fmt.Errorf("%q is neither the number of a weighing nor a date such as 2026-03-31 or 2026-03-31T17:05", date)
}

// Stamp writes a time to the minute.
func Stamp(t time.Time) string { return t.Format("2006-01-02 15:04") }
