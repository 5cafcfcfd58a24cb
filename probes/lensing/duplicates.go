package lensing

import (
	"fmt"
	"math"
	"slices"
)

// duplicates looks for galaxies that stand in the catalogue twice. The same
// position and shape is an error, for each copy would count as a measurement.
// The same position with another shape may be a blend, and is a warning.
func (s *shapes) duplicates() ([]string, error) {
	keys := make([]uint64, len(s.rows))
	for i := range keys {
		keys[i] = positionKey(s.ra[i], s.dec[i])
	}
	slices.Sort(keys)
	repeated := map[uint64]int{} // the first row of each key that occurs twice; looked up, never ranged over
	for i := 1; i < len(keys); i++ {
		if keys[i] == keys[i-1] {
			repeated[keys[i]] = -1
		}
	}
	if len(repeated) == 0 {
		return nil, nil
	}
	together, example := 0, 0
	for i := range s.rows {
		key := positionKey(s.ra[i], s.dec[i])
		j, found := repeated[key]
		switch {
		case !found:
		case j < 0:
			repeated[key] = i
		case s.ra[i] != s.ra[j] || s.dec[i] != s.dec[j]: // two positions, one key
		case s.e1[i] == s.e1[j] && s.e2[i] == s.e2[j]:
			return nil, fmt.Errorf("%s, rows %d and %d are one galaxy: the same position and shape; keep one of each such pair", s.file, s.rows[j], s.rows[i])
		default:
			if together++; together == 1 {
				example = s.rows[i]
			}
		}
	}
	if together == 0 {
		return nil, nil
	}
	return []string{fmt.Sprintf("%s: %d galaxies stand exactly where another does, with another shape (row %d is the first): if one galaxy was measured twice its error is too small", s.file, together, example)}, nil
}

// positionKey mixes the bits of a position; equal positions have equal keys.
func positionKey(ra, dec float64) uint64 {
	k := math.Float64bits(ra)*0x9e3779b97f4a7c15 ^ math.Float64bits(dec)
	k ^= k >> 32
	k *= 0xbf58476d1ce4e5b9
	return k ^ k>>29
}
