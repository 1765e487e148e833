// Probabilities behind sampling plans: binomial, hypergeometric, non-central t.
#pragma once

#include <cstdint>

namespace coilassay {

/// P(at most c nonconforming among n) when each is nonconforming with this probability.
double binomial_at_most(std::uint64_t c, std::uint64_t n, double fraction);

/// The same for n drawn from a lot of N that holds D nonconforming units.
double hypergeometric_at_most(std::uint64_t c, std::uint64_t n, std::uint64_t nonconforming, std::uint64_t lot_size);

/// P(accept) of a single-limit variables plan, s method: P(T > k sqrt(n)) for a non-central t with n - 1 degrees of freedom
/// and non-centrality sqrt(n) z(1 - fraction).
double variables_acceptance(std::uint64_t n, double k, double fraction);

/// Units that must all conform to show with this confidence that at least this fraction of the lot conforms: the least n
/// with P(none among n | too many) <= 1 - confidence. Binomial without a lot size; for a lot of N, hypergeometric with the
/// least number of nonconforming units that breaks the claim.
std::uint64_t claim_size(double confidence, double reliability);
std::uint64_t claim_size_of_lot(double confidence, double reliability, std::uint64_t lot_size);

/// Fraction nonconforming beyond one limit, estimated without bias from the index Q = (limit - mean)/s of n values: the
/// form 2 of MIL-STD-414. With Q = k it is the acceptability constant M.
double estimated_fraction_beyond(double index, std::uint64_t n);

}  // namespace coilassay
