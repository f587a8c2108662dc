// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <cstddef>
#include <vector>

namespace rille::fluxes {

/// Number of independent direction batches behind every sampling error.
constexpr int batches = 8;

/// Neutrals in free-molecular flow with diffuse re-emission between the elements of one surface:
/// found once, used for many species. Arrivals follow from arrival = d + A (1 - sticking) arrival,
/// fluxes relative to the open one; row sum of A plus d is 1 (elements without any path to the open
/// receive nothing).
class ExchangeOperator {
public:
    virtual ~ExchangeOperator() = default;

    virtual std::size_t size() const = 0;
    /// arrival = A emitted, both of size(); emitted and arrival must not overlap. batch = -1 uses
    /// everything, 0..7 what belongs to one batch.
    virtual void apply(int batch, const double* emitted, double* arrival) const = 0;
    /// The direct part d, of everything (batch = -1) or of one batch.
    virtual const std::vector<double>& direct(int batch = -1) const = 0;
    /// Whether batches differ: an exact operator has no sampling error.
    virtual bool sampled() const = 0;

    /// Fewer places than elements through which all exchange goes: A = from_places to_places.
    /// 0: there are none.
    virtual std::size_t places() const { return 0; }
    virtual void to_places(const double* /*emitted*/, double* /*mean*/) const {}
    virtual void from_places(const double* /*mean*/, double* /*arrival*/) const {}
    /// matrix[b * places * places + i * places + j] of to_places diag(kept[b]) from_places;
    /// kept[b][e] by elements. A null pointer stands for zeros and its block is left alone.
    virtual void between_places(const std::vector<const double*>& /*kept*/,
                                double* /*matrix*/) const {}
};

} // namespace rille::fluxes
