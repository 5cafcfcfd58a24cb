package recipes

import (
	"fmt"
	"strings"

	"github.com/agext/levenshtein"
)

// otherWords gives the words of the language for what the same thing is called
// elsewhere, in lower case.
var otherWords = map[string]string{
	"h0": "hubble_constant", "hubble": "hubble_constant",
	"om0": "omega_matter", "omega_m": "omega_matter", "om": "omega_matter",
	"ode0": "omega_lambda", "omega_de": "omega_lambda", "omega_l": "omega_lambda", "ol": "omega_lambda",
	"tcmb": "cmb_temperature", "tcmb0": "cmb_temperature", "w": "w0",
	"z": "redshift", "center": "centre", "position": "centre", "coordinates": "centre",
	"path": "file", "filename": "file", "filter": "select", "where": "select", "cut": "select",
	"err": "error", "sigma": "error", "gals": "galaxies", "samples": "draws", "ndraws": "draws",
	"compare": "reconcile", "published": "reported", "cosmo": "cosmology", "fit": "estimate",
	"gaussian": "normal", "gauss": "normal", "flat": "uniform", "log_normal": "lognormal",
	"log_uniform": "loguniform", "halfnormal": "half_normal", "col": "column",
}

// nearest returns the name out of the list that was probably meant, or "".
// Between equally near names the earlier one wins.
func nearest(name string, list []string) string {
	plain := strings.ToLower(strings.ReplaceAll(name, "-", "_"))
	best, least := "", min(3, len(plain)/3)+1
	for _, other := range list {
		if other == otherWords[plain] {
			return other
		}
		d := levenshtein.Distance(plain, strings.ToLower(strings.ReplaceAll(other, "-", "_")), nil)
		if d < least {
			best, least = other, d
		}
	}
	return best
}

// didYouMean returns a hint naming the nearest of the list, else all of a short
// list, else "". Each name is shown as format writes it.
func didYouMean(name string, list []string, format string) string {
	if near := nearest(name, list); near != "" {
		return fmt.Sprintf("Did you mean "+format+"?", near)
	}
	if len(list) == 0 || len(list) > 16 {
		return ""
	}
	return "Possible here: " + enumerate(list, format, "or") + "."
}

// enumerate writes "a", "b" and "c".
func enumerate(list []string, format, last string) string {
	var b strings.Builder
	for i, name := range list {
		switch {
		case i == 0:
		case i == len(list)-1:
			b.WriteString(" " + last + " ")
		default:
			b.WriteString(", ")
		}
		fmt.Fprintf(&b, format, name)
	}
	return b.String()
}
