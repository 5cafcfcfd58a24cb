package recipes

import (
	"math"
	"testing"
)

func TestParseAngle(t *testing.T) {
	for _, c := range []struct {
		text  string
		hours bool
		want  float64 // degrees, by hand
	}{
		{"14h01m02.1s", true, 15 * (14 + 1/60. + 2.1/3600)},
		{"14h01m", true, 210.25},
		{"14h", true, 210},
		{"14:01:02.1", true, 210.25875},
		{"14 01 02.1", true, 210.25875},
		{"210.25875", true, 210.25875},
		{"210.25875 deg", true, 210.25875},
		{"210.25875deg", true, 210.25875},
		{"210d15m31.5s", true, 210.25875},
		{"+02d52m42s", false, 2 + 52/60. + 42/3600.},
		{"-00d10m30s", false, -(10/60. + 30/3600.)}, // the sign of zero degrees
		{"−00:10:30", false, -0.175},                // a minus sign for a hyphen
		{"-00 10 30", false, -0.175},
		{"+2°52′42″", false, 2 + 52/60. + 42/3600.},
		{"2°52'42\"", false, 2 + 52/60. + 42/3600.},
		{"-2.87", false, -2.87},
		{"90", false, 90},
	} {
		x, err := parseAngle(c.text, c.hours)
		if err != nil {
			t.Errorf("%s: %v", c.text, err)
			continue
		}
		if got, _ := x.Float64(); math.Abs(got-c.want) > 1e-13 {
			t.Errorf("%s: %.15g°, want %.15g°", c.text, got, c.want)
		}
	}
	for _, text := range []string{"", "14h60m00s", "14:01:60", "2d-3m", "14h01", "1e2", "NaN", "12 30", "1234", "3 arcmin", "14h01m02.1s E"} {
		if x, err := parseAngle(text, true); err == nil {
			t.Errorf("%q was read as %v", text, x)
		}
	}
	if _, err := parseAngle("02h52m42s", false); err == nil {
		t.Error("a declination in hours was read")
	}
}
