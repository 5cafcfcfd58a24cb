package infer

import (
	"context"
	"errors"
)

// DrawPosterior draws from a posterior by adaptive importance sampling, falling
// back to an affine-invariant ensemble. An error means that no draws could be
// made at all (no point of finite likelihood, context cancelled); draws that
// do not pass their diagnostics come with Quality.Converged false.
func DrawPosterior(ctx context.Context, p Problem, o Options) (*Sample, error) {
	return nil, errors.New("infer: being written")
}
