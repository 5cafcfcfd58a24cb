package main

import (
	"encoding/json"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"

	"steelyard/probes/catalogue"
	"steelyard/probes/mock"
)

const arcmin = math.Pi / 180 / 60

// curlewTruth is a relaxed cluster. Nothing in its data is wrong: the gas rests
// in the halo, the shapes and temperatures are calibrated, the orbits isotropic.
var curlewTruth = mock.Truth{
	Name: "Curlew", Redshift: 0.212,
	RA:             (14 + 1/60. + 2.1/3600) * math.Pi / 12,
	Dec:            (2 + 52/60. + 42/3600.) * math.Pi / 180,
	HubbleConstant: 70, OmegaMatter: 0.3,
	M200: 9e14, C200: 4.5,
}

// curlew writes density.ecsv, temperature.csv, shapes.fits, redshifts.csv and
// truth.json.
func curlew(dir string) error {
	t := curlewTruth
	stream := func(n uint64) *rand.Rand { return rand.New(rand.NewPCG(22, n)) }

	gas := mock.VikhlininGas{N0: 0.012, Rc: 120, Beta: 0.62, Alpha: 0.6, Rs: 900, Epsilon: 1.5}
	spectra := t.Spectra(mock.Gas{Electrons: gas.Electrons}, mock.Spectra{
		DensityEdges: logarithmic(0.1, 8, 24), DensityError: 0.03,
		TemperatureEdges:  []float64{0, 0.35, 0.7, 1.1, 1.6, 2.2, 2.9, 3.8, 4.9, 6.4},
		TemperatureErrors: []float64{0.03, 0.03, 0.03, 0.035, 0.04, 0.05, 0.06, 0.08, 0.12}, Skew: 0.1,
	}, stream(1))
	shapes := t.Shapes(mock.Shapes{
		Galaxies: 8000, Field: 15 * arcmin, RedshiftScale: 0.6, RedshiftScatter: 0.03, Quiet: 0.20, Noisy: 0.32,
	}, stream(2))
	motions := t.Motions(mock.Motions{Members: 180, Infalling: 12, Field: 24, Radius: 12 * arcmin, RedshiftError: 1.5e-4}, stream(3))

	type column = catalogue.OutColumn
	degrees := func(x []float64) []float64 { return rounded(scaled(x, 180/math.Pi), 6) }
	written := []error{
		catalogue.WriteECSV(filepath.Join(dir, "density.ecsv"), []column{
			{Name: "r_in", Unit: "arcmin", Values: rounded(spectra.DensityInner, 4)},
			{Name: "r_out", Unit: "arcmin", Values: rounded(spectra.DensityOuter, 4)},
			{Name: "n_e", Unit: "cm**-3", Values: rounded(spectra.Density, 8)},
			{Name: "n_e_err", Unit: "cm**-3", Values: rounded(spectra.DensityError, 8)},
		}),
		catalogue.WriteCSV(filepath.Join(dir, "temperature.csv"), []column{
			{Name: "r_in", Values: spectra.TemperatureInner}, {Name: "r_out", Values: spectra.TemperatureOuter},
			{Name: "kT", Values: rounded(spectra.Temperature, 3)},
			{Name: "kT_lo", Values: rounded(spectra.TemperatureErrorMinus, 3)}, {Name: "kT_hi", Values: rounded(spectra.TemperatureErrorPlus, 3)},
		}),
		catalogue.WriteFITS(filepath.Join(dir, "shapes.fits"), "SHAPES", []column{
			{Name: "ra", Unit: "deg", Values: degrees(shapes.RA)}, {Name: "dec", Unit: "deg", Values: degrees(shapes.Dec)},
			{Name: "e1", Values: rounded(shapes.E1, 5)}, {Name: "e2", Values: rounded(shapes.E2, 5)},
			{Name: "w", Values: rounded(shapes.Weight, 3)}, {Name: "zphot", Values: rounded(shapes.Redshift, 4)},
		}),
		catalogue.WriteCSV(filepath.Join(dir, "redshifts.csv"), []column{
			{Name: "ra", Values: degrees(motions.RA)}, {Name: "dec", Values: degrees(motions.Dec)},
			{Name: "z", Values: rounded(motions.Redshift, 6)}, {Name: "ez", Values: motions.Error},
		}),
		writeTruth(filepath.Join(dir, "truth.json"), t),
	}
	for _, err := range written {
		if err != nil {
			return err
		}
	}
	return nil
}

// writeTruth writes the halo with its mass inside the usual radii.
func writeTruth(path string, t mock.Truth) error {
	halo := t.Halo()
	type mass struct {
		Overdensity float64 `json:"overdensity"`
		Radius      float64 `json:"radius_kpc"`
		Mass        float64 `json:"mass"`
	}
	truth := struct {
		Object        string  `json:"object"`
		Redshift      float64 `json:"redshift"`
		Profile       string  `json:"profile"`
		Concentration float64 `json:"concentration_200c"`
		Masses        []mass  `json:"masses"`
	}{t.Name, t.Redshift, "nfw", t.C200, nil}
	for _, delta := range []float64{2500, 500, 200} {
		lo, hi := 1.0, 2*t.R200()
		for range 60 {
			r := (lo + hi) / 2
			if 3*halo.Mass(r) > 4*math.Pi*delta*t.CriticalDensity()*r*r*r {
				lo = r
			} else {
				hi = r
			}
		}
		truth.Masses = append(truth.Masses, mass{delta, math.Round(lo*1e3) / 1e3, rounded([]float64{halo.Mass(lo) / 1e14}, 6)[0] * 1e14})
	}
	b, err := json.MarshalIndent(truth, "", "  ")
	if err != nil {
		return err
	}
	return os.WriteFile(path, append(b, '\n'), 0o644)
}

func logarithmic(from, to float64, n int) []float64 {
	edges := make([]float64, n+1)
	for i := range edges {
		edges[i] = from * math.Pow(to/from, float64(i)/float64(n))
	}
	return edges
}

func scaled(x []float64, by float64) []float64 {
	out := make([]float64, len(x))
	for i, v := range x {
		out[i] = v * by
	}
	return out
}

// rounded rounds to decimals, as a published table would.
func rounded(x []float64, decimals int) []float64 {
	unit := math.Pow(10, float64(decimals))
	out := make([]float64, len(x))
	for i, v := range x {
		out[i] = math.Round(v*unit) / unit
	}
	return out
}
