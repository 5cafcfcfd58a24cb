package dynamics

import (
	"context"
	"encoding"
	"fmt"
	"math"
	"sort"

	"steelyard/probes/estimate"
	"steelyard/probes/method"
)

// field is a catalogue while its members are being selected.
type field struct {
	task     *estimate.Task
	file     string
	galaxies []Galaxy
	settings method.Settings
	notes    []string
	warnings []string
}

func (f *field) note(format string, args ...any) {
	f.notes = append(f.notes, fmt.Sprintf(format, args...))
}
func (f *field) warn(format string, args ...any) {
	f.warnings = append(f.warnings, fmt.Sprintf(format, args...))
}
func (f *field) number(name string) float64 { return f.settings[name].Prior.A }

// reduceMembers is the reduction `members`: the verdict on every galaxy.
func reduceMembers(ctx context.Context, t *estimate.Task) (encoding.BinaryMarshaler, error) {
	table := t.Tables["galaxies"]
	settings := memberSettings(t.Blocks["members"])
	galaxies, c, err := readGalaxies(t, table, settings["centre"].Text)
	if err != nil {
		return nil, err
	}
	f := &field{task: t, file: table.File, galaxies: galaxies, settings: settings}
	f.note("%s", c.note())
	f.duplicates()
	name, window := f.settings["method"].Text, 0.0
	if name == "given" {
		err = f.given()
	} else {
		window = f.number("window")
		err = f.clean(name, window)
	}
	if err != nil {
		return nil, err
	}
	m := &Members{
		File: f.file, Method: name, Galaxies: f.galaxies, Redshift: f.mean(), Window: window,
		HasErrors: table.Column("error") != nil, Weighted: table.Column("weight") != nil,
	}
	for i := range m.Galaxies {
		m.Galaxies[i].Velocity = velocity(m.Galaxies[i].Redshift, m.Redshift)
	}
	f.frame(m)
	m.CentreRA, m.CentreDec = c.ra, c.dec
	m.Notes, m.Warnings = f.notes, f.warnings
	return m, nil
}

// frame warns when the members' mean redshift is not the object's.
func (f *field) frame(m *Members) {
	var v []float64
	for _, g := range m.Galaxies {
		if g.Member {
			v = append(v, g.Velocity)
		}
	}
	dv := velocity(m.Redshift, f.task.Object.Redshift)
	if doubt := BiweightScale(v) / math.Sqrt(float64(len(v))); math.Abs(dv) > math.Max(300, 3*doubt) {
		f.warn("the members' mean redshift %.5f lies %.0f km/s from the object's %.5f; is one of them heliocentric and the other in the frame of the CMB (up to 370 km/s apart)?",
			m.Redshift, dv, f.task.Object.Redshift)
	}
}

// memberSettings fills in the defaults of the block `members`, which a recipe
// may leave out altogether.
func memberSettings(given method.Settings) method.Settings {
	s := method.Settings{}
	for _, setting := range membersBlock.Settings {
		s[setting.Name] = setting.Default
		if v, ok := given[setting.Name]; ok && v.Set {
			s[setting.Name] = v
		}
	}
	return s
}

func (f *field) duplicates() {
	within := f.number("duplicates_within") * f.task.Cosmology.AngularDiameter(f.task.Object.Redshift)
	if n := markDuplicates(f.galaxies, within); n > 0 {
		f.warn("%s: %d of %d galaxies are listed twice and were left out (within %.2g arcsec and 1000 km/s of another one)",
			f.file, n, len(f.galaxies), f.number("duplicates_within")*180*3600/math.Pi)
	}
}

// given takes every galaxy as a member.
func (f *field) given() error {
	n := 0
	for i := range f.galaxies {
		if g := &f.galaxies[i]; g.Reason == "" {
			g.Member, g.Reason = true, "given"
			n++
		}
	}
	if n < fewest {
		return f.task.Errorf("%s: %d galaxies are too few; a velocity dispersion needs at least %d", f.file, n, fewest)
	}
	f.note("members: all %d galaxies of %s, as given", n, f.file)
	mean := f.mean()
	var rows []int
	for _, g := range f.galaxies {
		if g.Member && math.Abs(velocity(g.Redshift, mean)) > 5000 {
			rows = append(rows, g.Row)
		}
	}
	if len(rows) > 0 {
		f.warn("%s, %s: more than 5000 km/s from the mean, yet given as members", f.file, rowList(rows))
	}
	return nil
}

// mean is the biweight mean redshift of the members.
func (f *field) mean() float64 {
	var z []float64
	for _, g := range f.galaxies {
		if g.Member {
			z = append(z, g.Redshift)
		}
	}
	return BiweightLocation(z)
}

// candidate is one galaxy inside the velocity window.
type candidate struct {
	index    int     // into field.galaxies
	redshift float64 //
	radius   float64 // kpc
	velocity float64 // km/s about the current mean
	limit    float64 // km/s, for sigma-clip and caustic
	core     bool    // for caustic
	member   bool
}

// clean selects members from a whole field: the velocity window about the
// object's redshift, the group of velocities without a gap that the object
// belongs to, then the named method inside it.
func (f *field) clean(name string, window float64) error {
	gap := 1000.0
	if v := f.settings["gap"]; v.Set {
		gap = v.Prior.A
	}
	var inside []candidate
	for i := range f.galaxies {
		g := &f.galaxies[i]
		if g.Reason != "" {
			continue
		}
		v := velocity(g.Redshift, f.task.Object.Redshift)
		if math.Abs(v) > window {
			g.Reason = fmt.Sprintf("%+.0f km/s from the object, outside the window", v)
			continue
		}
		inside = append(inside, candidate{index: i, redshift: g.Redshift, radius: g.Radius, velocity: v, member: true})
	}
	if len(inside) < fewest {
		return f.task.Errorf("%s: only %d of %d galaxies lie within %.0f km/s of redshift %g; a dispersion needs at least %d: check the object's redshift and the unit of the column",
			f.file, len(inside), len(f.galaxies), window, f.task.Object.Redshift, fewest)
	}
	group := f.firstGap(inside, window, gap)
	if len(group) < fewest {
		return f.task.Errorf("%s: only %d galaxies are left about redshift %g between gaps of %.0f km/s; a dispersion needs at least %d",
			f.file, len(group), f.task.Object.Redshift, gap, fewest)
	}
	var reasons []string
	var err error
	switch name {
	case "sigma-clip":
		reasons, err = f.sigmaClip(group)
	case "caustic":
		reasons, err = f.causticMembers(group, window)
	default:
		reasons, err = f.shiftingGapper(group)
	}
	if err != nil {
		return err
	}
	for k, c := range group {
		g := &f.galaxies[c.index]
		g.Member, g.Reason, g.Limit, g.Core = c.member, reasons[k], c.limit, c.core
	}
	return nil
}

// firstGap splits the velocities wherever two neighbours lie more than gap
// apart (Katgert et al. 1996) and keeps the group that the object belongs to:
// the one nearest to its redshift among those with at least a tenth of the
// richest group's galaxies.
func (f *field) firstGap(inside []candidate, window, gap float64) []candidate {
	sort.SliceStable(inside, func(a, b int) bool { return inside[a].velocity < inside[b].velocity })
	var starts []int
	for k := range inside {
		if k == 0 || inside[k].velocity-inside[k-1].velocity > gap {
			starts = append(starts, k)
		}
	}
	starts = append(starts, len(inside))
	groups := make([][]candidate, len(starts)-1)
	richest := 0
	for i := range groups {
		groups[i] = inside[starts[i]:starts[i+1]]
		richest = max(richest, len(groups[i]))
	}
	away := func(g []candidate) float64 {
		return math.Max(0, math.Max(g[0].velocity, -g[len(g)-1].velocity))
	}
	best := -1
	for i, g := range groups {
		if 10*len(g) < richest {
			continue
		}
		if best < 0 || away(g) < away(groups[best]) {
			best = i
		}
	}
	chosen := groups[best]
	for i, g := range groups {
		if i == best {
			continue
		}
		for _, c := range g {
			f.galaxies[c.index].Reason = fmt.Sprintf("%+.0f km/s from the object, behind a gap of %.0f km/s", c.velocity, gap)
		}
		if len(g) >= fewest && 10*len(g) >= 3*len(chosen) {
			f.warn("a second group of %d galaxies lies along the line of sight at %+.0f km/s; it was left out, but may disturb the first",
				len(g), g[len(g)/2].velocity)
		}
	}
	first, last := chosen[0].velocity, chosen[len(chosen)-1].velocity
	if first+window < gap && window-last < gap {
		f.warn("no gap of %.0f km/s separates the cluster from the field: galaxies fill the window of ±%.0f km/s", gap, window)
	}
	return append([]candidate(nil), chosen...)
}

// recentre sets the velocities about the biweight mean redshift of the members
// and returns the members' velocities.
func recentre(group []candidate) []float64 {
	var z, v []float64
	for _, c := range group {
		if c.member {
			z = append(z, c.redshift)
		}
	}
	mean := BiweightLocation(z)
	for k := range group {
		group[k].velocity = velocity(group[k].redshift, mean)
		if group[k].member {
			v = append(v, group[k].velocity)
		}
	}
	return v
}

// settle repeats a selection until the members stay the same; it says so when
// they do not within 50 rounds.
func (f *field) settle(group []candidate, round func() error) error {
	const rounds = 50
	for range rounds {
		before := make([]bool, len(group))
		for k, c := range group {
			before[k] = c.member
		}
		if err := round(); err != nil {
			return err
		}
		same, members := true, 0
		for k, c := range group {
			same = same && c.member == before[k]
			if c.member {
				members++
			}
		}
		if members < fewest {
			return f.task.Errorf("%s: only %d members are left after rejecting interlopers; a dispersion needs at least %d", f.file, members, fewest)
		}
		if same {
			return nil
		}
	}
	f.warn("the list of members still changed after %d rounds of rejection", rounds)
	return nil
}
