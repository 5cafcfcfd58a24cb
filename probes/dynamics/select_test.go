package dynamics

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"steelyard/probes/catalogue"
	"steelyard/probes/estimate"
	"steelyard/probes/method"
	"steelyard/probes/mock"
)

// galaxies is a table with one galaxy a row: kpc east and north of the centre,
// and km/s in the frame of the invented cluster.
func galaxies(rows [][3]float64) *catalogue.Table {
	c := &mock.MotionCatalogue{}
	distance := invented.AngularDiameter(invented.Redshift)
	for _, r := range rows {
		// Small angles: exact enough for what the tests ask.
		c.Dec = append(c.Dec, invented.Dec+r[1]/distance)
		c.RA = append(c.RA, invented.RA+r[0]/distance/math.Cos(invented.Dec))
		c.Redshift = append(c.Redshift, invented.Redshift+(1+invented.Redshift)*r[2]/299792.458)
		c.Error = append(c.Error, 1e-4)
	}
	return tableOf(c)
}

// clump is n galaxies of normal velocities, one stream for each seed.
func clump(n int, mean, sigma, extent float64, seed uint64) [][3]float64 {
	rng := rand.New(rand.NewPCG(seed, 7))
	rows := make([][3]float64, n)
	for i := range rows {
		rows[i] = [3]float64{extent * rng.NormFloat64(), extent * rng.NormFloat64(), mean + sigma*rng.NormFloat64()}
	}
	return rows
}

func verdicts(m *Members) string {
	var b strings.Builder
	for _, g := range m.Galaxies {
		if g.Member {
			b.WriteByte('m')
		} else {
			b.WriteByte('.')
		}
	}
	return b.String()
}

// Galaxies far from the body in velocity are rejected by both methods, those in
// it are kept, and every galaxy has a reason.
func TestFarGalaxiesAreRejected(t *testing.T) {
	rows := clump(60, 0, 700, 500, 1)
	for i := range rows {
		rows[i][2] = math.Max(-1500, math.Min(1500, rows[i][2]))
	}
	rows = append(rows, [3]float64{100, 0, 4200}, [3]float64{-300, 200, -3900}, [3]float64{800, 0, 9000}, [3]float64{50, 50, -20000})
	for _, name := range []string{"sigma-clip", "shifting-gapper"} {
		m, err := reduced(t, weighing(t, invented, galaxies(rows), name))
		if err != nil {
			t.Fatal(err)
		}
		if got, want := verdicts(m), strings.Repeat("m", 60)+"...."; got != want {
			t.Errorf("%s: members %s, want %s", name, got, want)
		}
		for _, g := range m.Galaxies {
			if g.Reason == "" {
				t.Errorf("%s: row %d has no reason", name, g.Row)
			}
		}
	}
}

// A velocity that is unremarkable in the centre is an interloper far out, where
// the dispersion is smaller: σ(R) and not one σ is what clips.
func TestClippingFollowsTheRadius(t *testing.T) {
	var rows [][3]float64
	for i, v := range []float64{-1900, -1500, -1200, -900, -700, -500, -350, -200, -100, 0, 100, 200, 350, 500, 700, 900, 1200, 1500} {
		angle := float64(i)
		rows = append(rows, [3]float64{400 * math.Cos(angle), 400 * math.Sin(angle), v})
	}
	inner, outer := [3]float64{200, 0, 2150}, [3]float64{6000, 0, 2150}
	m, err := reduced(t, weighing(t, invented, galaxies(append(rows, inner, outer)), "sigma-clip"))
	if err != nil {
		t.Fatal(err)
	}
	if got, want := verdicts(m), strings.Repeat("m", 19)+"."; got != want {
		t.Errorf("members %s, want %s (%s; %s)", got, want, m.Galaxies[18].Reason, m.Galaxies[19].Reason)
	}
}

// The shifting gapper of a brute-force reading of Fadda et al. 1996, each bin
// sorted anew, gives the same members.
func TestShiftingGapperAgainstBruteForce(t *testing.T) {
	const gap, width, enough = 500, 600, 15
	for seed := range uint64(20) {
		rng := rand.New(rand.NewPCG(seed, 3))
		rows := clump(80, 0, 800, 700, seed)
		for range 40 {
			rows = append(rows, [3]float64{3000 * (rng.Float64() - 0.5), 3000 * (rng.Float64() - 0.5), 10000 * (rng.Float64() - 0.5)})
		}
		group := make([]candidate, len(rows))
		for k, r := range rows {
			group[k] = candidate{index: k, radius: math.Hypot(r[0], r[1]), velocity: r[2], member: k%11 != 0}
		}
		sortByRadius(group)
		out := map[int]bool{}
		for _, k := range gapped(group, func(int) float64 { return gap }, width, enough) {
			out[k] = true
		}
		for k, c := range group {
			if !c.member {
				continue
			}
			want := !joinedToMean(nearestInRadius(group, k, width, enough), c.velocity, gap)
			if out[k] != want {
				t.Fatalf("seed %d: galaxy at %.0f kpc, %.0f km/s: rejected %v, want %v", seed, c.radius, c.velocity, out[k], want)
			}
		}
	}
}

func sortByRadius(group []candidate) {
	for i := range group {
		for j := i; j > 0 && group[j].radius < group[j-1].radius; j-- {
			group[j], group[j-1] = group[j-1], group[j]
		}
	}
}

// nearestInRadius returns the velocities of the members within half a width of
// member k in radius, and of the next nearest until there are enough.
func nearestInRadius(group []candidate, k int, width float64, enough int) []float64 {
	var v []float64
	taken := make([]bool, len(group))
	for len(v) < len(group) {
		best := -1
		for j, c := range group {
			d := math.Abs(c.radius - group[k].radius)
			if !c.member || taken[j] || (d > width/2 && len(v) >= enough) {
				continue
			}
			if best < 0 || d < math.Abs(group[best].radius-group[k].radius) {
				best = j
			}
		}
		if best < 0 {
			break
		}
		taken[best] = true
		v = append(v, group[best].velocity)
	}
	return v
}

// joinedToMean walks from zero towards v in steps of at most gap.
func joinedToMean(velocities []float64, v, gap float64) bool {
	s := sorted(velocities)
	if v < 0 {
		for i := range s {
			s[i] = -s[i]
		}
		s = sorted(s)
		v = -v
	}
	last := 0.0
	for _, x := range s {
		if x < 0 {
			continue
		}
		if x-last > gap {
			return false
		}
		if x >= v {
			return true
		}
		last = x
	}
	return false
}

// Where the field is too dense for gaps, the list says so.
func TestDenseFieldIsSaid(t *testing.T) {
	c := invented.Motions(mock.Motions{Members: 300, Field: 250, Radius: within(invented, 1)}, rand.New(rand.NewPCG(4, 4)))
	task := weighing(t, invented, tableOf(c), "shifting-gapper")
	task.Blocks["members"]["gap"] = method.Exactly(1000)
	m, err := reduced(t, task)
	if err != nil {
		t.Fatal(err)
	}
	if !warned(m.Warnings, "no gap cuts it off") {
		t.Errorf("warnings %q", m.Warnings)
	}
	if m, err = reduced(t, weighing(t, invented, tableOf(c), "sigma-clip")); err != nil {
		t.Fatal(err)
	}
	if warned(m.Warnings, "no gap cuts it off") {
		t.Errorf("warnings %q", m.Warnings)
	}
}

// 1000, 881 and 529 km/s for 6, 15 and 100 galaxies, by hand.
func TestDensityGap(t *testing.T) {
	near(t, "gap of 6", densityGap(6), 1000, 1e-12)
	near(t, "gap of 15", densityGap(15), 880.6, 1e-3)
	near(t, "gap of 100", densityGap(100), 529.0, 1e-3)
	near(t, "gap of 2", densityGap(2), 1000, 1e-12)
}

// The cluster's redshift picks the group, not the number of galaxies.
func TestNearerGroupIsChosen(t *testing.T) {
	rows := append(clump(30, 200, 250, 300, 4), clump(60, 3900, 250, 300, 5)...)
	m, err := reduced(t, weighing(t, invented, galaxies(rows), "shifting-gapper"))
	if err != nil {
		t.Fatal(err)
	}
	if got, want := verdicts(m), strings.Repeat("m", 30)+strings.Repeat(".", 60); got != want {
		t.Errorf("members %s", got)
	}
	if !warned(m.Warnings, "second group of 60 galaxies") {
		t.Errorf("the second group is not mentioned: %q", m.Warnings)
	}
}

func TestTwoClumpsInOneGroupAreSeen(t *testing.T) {
	rows := append(clump(40, -900, 350, 300, 6), clump(40, 1100, 350, 300, 7)...)
	task := weighing(t, invented, galaxies(rows), "given")
	if _, err := reduced(t, task); err != nil {
		t.Fatal(err)
	}
	d, err := weigh(t, task, dispersionScaling, nil)
	if err != nil {
		t.Fatal(err)
	}
	if !warned(d.Warnings, "two clumps along the line of sight") || !warned(d.Warnings, "should not be trusted") {
		t.Errorf("warnings: %q", d.Warnings)
	}
}

func warned(list []string, words string) bool {
	for _, w := range list {
		if strings.Contains(w, words) {
			return true
		}
	}
	return false
}

func TestDuplicatesAreLeftOut(t *testing.T) {
	rows := clump(40, 0, 700, 500, 8)
	rows = append(rows, rows[3], [3]float64{rows[5][0], rows[5][1], rows[5][2] + 50}, [3]float64{rows[7][0], rows[7][1], rows[7][2] + 30000})
	table := galaxies(rows)
	table.Values("error")[41] = 5e-5 // a better redshift of the same galaxy
	m, err := reduced(t, weighing(t, invented, table, "given"))
	if err != nil {
		t.Fatal(err)
	}
	want := []byte(strings.Repeat("m", 43))
	want[40], want[5] = '.', '.'
	if got := verdicts(m); got != string(want) {
		t.Errorf("members %s, want %s", got, want)
	}
	if r := m.Galaxies[5].Reason; r != "duplicate of row 42" {
		t.Errorf("reason %q", r)
	}
	if !warned(m.Warnings, "2 of 43 galaxies are listed twice") {
		t.Errorf("warnings %q", m.Warnings)
	}
}

func TestBadCatalogues(t *testing.T) {
	good := func() *catalogue.Table { return galaxies(clump(30, 0, 700, 500, 9)) }
	for _, c := range []struct {
		name, want string
		table      func() *catalogue.Table
	}{
		{"velocities instead of redshifts", "rows 1, 2, 3, 4, 5 and 25 more: the redshift is above 20; a velocity in km/s", func() *catalogue.Table {
			t := good()
			for i := range t.Values("redshift") {
				t.Values("redshift")[i] *= 299792.458
			}
			return t
		}},
		{"error in km/s", "row 4: the redshift error is 1 or more", func() *catalogue.Table { t := good(); t.Values("error")[3] = 60; return t }},
		{"negative error", "row 2: the redshift error is negative", func() *catalogue.Table { t := good(); t.Values("error")[1] = -1e-4; return t }},
		{"degrees read as radians", "declination lies beyond", func() *catalogue.Table { t := good(); t.Values("dec")[0] = 23; return t }},
		{"another part of the sky", "no galaxy lies within 10 deg", func() *catalogue.Table {
			t := good()
			for i := range t.Values("ra") {
				t.Values("ra")[i] += 1
			}
			return t
		}},
		{"three galaxies", "3 galaxies are too few", func() *catalogue.Table { return galaxies(clump(3, 0, 700, 500, 9)) }},
		{"another redshift", "only 0 of 30 galaxies lie within 5000 km/s of redshift 0.1", func() *catalogue.Table {
			t := good()
			for i := range t.Values("redshift") {
				t.Values("redshift")[i] += 0.3
			}
			return t
		}},
	} {
		_, err := reduced(t, weighing(t, invented, c.table(), "shifting-gapper"))
		if err == nil || !strings.Contains(err.Error(), c.want) || !strings.Contains(err.Error(), "dynamics.test.one") {
			t.Errorf("%s: %v, want %q", c.name, err, c.want)
		}
	}
	task := weighing(t, invented, good(), "given")
	task.Object.HasCentre = false
	if _, err := reduced(t, task); err == nil || !strings.Contains(err.Error(), "centre = sky") {
		t.Errorf("no centre: %v", err)
	}
	same := galaxies(clump(30, 0, 0, 500, 9))
	task = weighing(t, invented, same, "given")
	if _, err := reduced(t, task); err != nil {
		t.Fatal(err)
	}
	if _, err := weigh(t, task, dispersionScaling, nil); err == nil || !strings.Contains(err.Error(), "all the same") {
		t.Errorf("equal velocities: %v", err)
	}
}

// The centre is that of the object, the brightest galaxy, or the densest point.
func TestCentre(t *testing.T) {
	rows := clump(40, 0, 700, 600, 9)
	for _, r := range clump(25, 200, 500, 60, 10) {
		rows = append(rows, [3]float64{r[0] + 1200, r[1] - 500, r[2]})
	}
	table := galaxies(rows)
	magnitude := make([]float64, len(rows))
	for i := range magnitude {
		magnitude[i] = 18 + float64(i%7)
	}
	magnitude[17] = 15
	far := append([]float64(nil), rows[17][:]...)
	table.Columns = append(table.Columns, catalogue.Column{Name: "magnitude", Values: magnitude})
	for _, c := range []struct {
		choice      string
		east, north float64
		within      float64
	}{{"given", 0, 0, 1e-6}, {"brightest", far[0], far[1], 5}, {"densest", 1200, -500, 120}} {
		task := weighing(t, invented, table, "given")
		task.Blocks["members"]["centre"] = method.Word(c.choice)
		if c.choice != "given" {
			task.Object.HasCentre = false
		}
		m, err := reduced(t, task)
		if err != nil {
			t.Fatal(err)
		}
		east, north := offset(invented.RA, invented.Dec, m.CentreRA, m.CentreDec)
		d := invented.AngularDiameter(invented.Redshift)
		if off := math.Hypot(east*d-c.east, north*d-c.north); !(off <= c.within) {
			t.Errorf("%s: the centre lies %.0f kpc from where it should be", c.choice, off)
		}
		if !warned(m.Notes, "centre: the") {
			t.Errorf("%s: the choice is not said: %q", c.choice, m.Notes)
		}
	}
	task := weighing(t, invented, galaxies(rows), "given")
	task.Blocks["members"]["centre"] = method.Word("brightest")
	if _, err := reduced(t, task); err == nil || !strings.Contains(err.Error(), "needs a column `magnitude`") {
		t.Errorf("%v", err)
	}
}

// Redshifts in another frame than the object's are noticed.
func TestFrames(t *testing.T) {
	rows := clump(100, 370, 700, 500, 9)
	m, err := reduced(t, weighing(t, invented, galaxies(rows), "given"))
	if err != nil {
		t.Fatal(err)
	}
	if !warned(m.Warnings, "frame of the CMB") {
		t.Errorf("warnings %q", m.Warnings)
	}
}

// The list does not depend on the order of the file.
func TestOrderOfRowsDoesNotMatter(t *testing.T) {
	c := invented.Motions(mock.Motions{Members: 150, Field: 40, Radius: within(invented, 1.5)}, rand.New(rand.NewPCG(5, 6)))
	for _, name := range []string{"sigma-clip", "shifting-gapper"} {
		forward := tableOf(c)
		m, err := reduced(t, weighing(t, invented, forward, name))
		if err != nil {
			t.Fatal(err)
		}
		backward := tableOf(c)
		n := backward.Len()
		for k := range backward.Columns {
			v := append([]float64(nil), backward.Columns[k].Values...)
			for i := range v {
				backward.Columns[k].Values[i] = v[n-1-i]
			}
		}
		b, err := reduced(t, weighing(t, invented, backward, name))
		if err != nil {
			t.Fatal(err)
		}
		for i, g := range m.Galaxies {
			if h := b.Galaxies[n-1-i]; g.Member != h.Member {
				t.Fatalf("%s: row %d is a member in one order only", name, g.Row)
			}
		}
	}
}

func fieldOf5000(b *testing.B) *catalogue.Table {
	b.Helper()
	return tableOf(invented.Motions(mock.Motions{Members: 2500, Field: 2500, Radius: within(invented, 2)}, rand.New(rand.NewPCG(1, 1))))
}

func BenchmarkReduce5000(b *testing.B) {
	table := fieldOf5000(b)
	for _, name := range []string{"given", "sigma-clip", "shifting-gapper", "caustic"} {
		b.Run(name, func(b *testing.B) {
			for b.Loop() {
				task := weighing(b, invented, table, name)
				m, err := reduceMembers(context.Background(), task)
				if err != nil {
					b.Fatal(err)
				}
				if _, err := m.MarshalBinary(); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkEstimate(b *testing.B) {
	for _, n := range []int{100, 1000, 5000} {
		table := tableOf(invented.Motions(mock.Motions{Members: n, Radius: within(invented, 1)}, rand.New(rand.NewPCG(1, 1))))
		task := weighing(b, invented, table, "given")
		task.Sampling.Draws = 4000
		if _, err := reduced(b, task); err != nil {
			b.Fatal(err)
		}
		for _, m := range []estimate.Method{dispersionScaling, virial} {
			b.Run(fmt.Sprintf("%s-%d", m.Name, n), func(b *testing.B) {
				for b.Loop() {
					if _, err := weigh(b, task, m, method.Settings{}); err != nil {
						b.Fatal(err)
					}
				}
			})
		}
	}
}
