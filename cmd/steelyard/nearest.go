package main

import (
	"strings"

	"github.com/agext/levenshtein"
)

// nearest gives the name out of the list that was probably meant, or "". Between
// equally near names the earlier one wins.
func nearest(name string, list []string) string {
	best, least := "", min(4, 1+len(name)/3)
	for _, other := range list {
		if d := levenshtein.Distance(strings.ToLower(name), strings.ToLower(other), nil); d < least {
			best, least = other, d
		}
	}
	return best
}
