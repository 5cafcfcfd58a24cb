package infer

import "steelyard/probes/prior"

// Free is one parameter to be drawn.
type Free struct {
	Name  string
	Unit  string
	Prior prior.Prior // not exact
}

// Problem is a posterior: independent priors times a likelihood.
type Problem struct {
	Free []Free
	// Likelihood returns a function of the physical parameter values, in the
	// order of Free, that gives the natural log likelihood: math.Inf(-1) where
	// the model is impossible, never NaN. Each call to Likelihood yields a
	// function with scratch space of its own, used by one goroutine.
	Likelihood func() func(theta []float64) float64
}

// Sample is a set of equally weighted draws from a Problem's posterior.
type Sample struct {
	Values   [][]float64 // Values[i][j]: draw i of parameter j, physical
	Best     []float64   // the visited point of highest likelihood
	BestLog  float64     // its log likelihood
	Quality  Quality     // Chi2, Dof and PValue are left to the caller
	Warnings []string
}
