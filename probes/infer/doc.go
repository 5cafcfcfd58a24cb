// Package infer draws from posteriors and holds what is drawn.
//
// # Where to start
//
// A Problem is a list of Free parameters with their priors and a log likelihood.
// DrawPosterior turns it into a Sample of equally weighted draws with a Quality
// that says how far to trust them. An estimator lays its sample out as Draws:
// parameters, shared nuisances and ln M(<r) on the radii of Grid. Draws encode
// themselves (MarshalBinary), interpolate their masses (LnMassAt) and find the
// radius of a mean density (RadiusAt); Percentiles and ChiSquareP are the two
// summaries every estimate needs.
//
// # How a posterior is drawn
//
// Everything happens in prior scores, in which the prior is a unit normal
// (package prior). Each step has a file of its own:
//
//	starts.go     points spread evenly over the prior
//	climb.go      from the promising and the remote of them to the top
//	curvature.go  the normal distribution that fits there
//	modes.go      how many climbs are enough
//	mixture.go    the proposal: t distributions, stretched copies, and the prior
//	fit.go        moving the mixture towards the posterior
//	adapt.go      rounds of proposing and fitting
//	pareto.go     the tail of the weights
//	resample.go   equally weighted draws and what they are worth
//	ensemble.go   the fallback, judged by diagnostics.go
//
// The mixture is adapted on proposals of its own (adaptive multiple importance
// sampling, Cornuet et al. 2012; population Monte Carlo, Cappé et al. 2008), then
// frozen; draws and evidence come from the frozen mixture alone.
//
// # What Converged means
//
// For the sampler "importance": the tail shape k̂ of the weights is at most 0.7
// and the proposals are worth at least a tenth of their number. For "ensemble":
// split R̂ is below 1.01 and the bulk and tail effective sizes are at least 400
// for every parameter. Anything else comes back with Converged false and a
// warning in words. No diagnostic can see a mode that no start, climb or
// prior-shaped proposal came near.
//
// # Repeatability
//
// The same Problem, Stream and number of draws give the same bits for any number
// of Workers. Work is cut into chunks of constant size, chunk i draws from
// generator i, and results are folded in index order. A likelihood must be a
// function of its argument alone.
package infer
