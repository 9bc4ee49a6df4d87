// Package coverage holds a simulation that asks whether uncertainties tell the
// truth: random takes of known content, recorded with gear whose errors are
// drawn from the uncertainties that the job states, measured by the real
// measures and put into words by the real judge.
//
// At least 10 dB above detection the true value must lie within +-U in 92 to
// 99.5 % of the takes, and the median U must not exceed 2.5 times the error
// that 95 % of the takes stay under. Near and below detection the value with
// its U, or the bound, as each take gives it, must cover the truth in 93 % and
// more.
//
// A short run is part of go test. The full one (600 takes a measure, lengths
// and sample rates of real takes among them):
//
//	go test ./analyze/internal/coverage -full -v -timeout 60m
package coverage
