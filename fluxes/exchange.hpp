// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/exchange_operator.hpp"
#include "geometry/domain.hpp"
#include "geometry/ray_caster.hpp"
#include "geometry/surface.hpp"

#include <cstdint>
#include <vector>

namespace rille::fluxes {

/// The exchange operator from rays, for what ExactExchange does not treat: `full`, and profiles
/// with pieces that float in the gas. Row sum of A plus d is 1 by construction, so zero sticking
/// gives flux 1 everywhere.
///
/// Where an element sees its opening under a narrow angle, half of its rays leave by the cosine law
/// and half are aimed through its opening and cross-sections below that (full and revolved); every
/// ray, whatever sent it, counts with cosine density over the density of all kinds together
/// (multiple importance sampling by the balance heuristic). Rays that end in the open make up d,
/// rays that end on elements the row of A. What the weights of a row miss or exceed in total, with
/// mean zero, goes to the element itself: that keeps the expectation of every entry.
/// Source: Veach & Guibas (1995) [from memory].
///
/// One sequence of low discrepancy runs over the rays of a batch from 256 elements in spatial
/// order, so that the rays of neighbours complete each other: the drift of particles along a deep
/// wall, which decides about its floor, is averaged over many elements.
///
/// What comes out of solve() is not linear in the rows, so that their noise leaves a bias of second
/// order: at the floor of a round hole of aspect ratio 20 (s_w 0.01, s_b 0.1) -0.4 % with 64 rays,
/// -0.2 % with 128, -0.1 % with 256 (measured, one standard error 0.13 %). It does not average out
/// over refreshes.
///
/// The batches are independent of each other: each has its own scramble of launch points and
/// directions. Elements without any path to the open (closed voids) receive nothing.
class Exchange : public ExchangeOperator {
public:
    struct Options {
        int rays_per_element = 64; ///< of both kinds together; a multiple of `batches`
        std::uint64_t seed = 1;
        std::uint64_t refresh = 0; ///< a new scramble for every refresh
    };
    Exchange(const geometry::Domain&, const geometry::Surface&, const geometry::RayCaster&,
             const Options&);

    std::size_t size() const override { return direct_.size(); }
    /// Impinging flux per element relative to the open flux, for sticking per element in [0, 1].
    /// batch = -1 uses all rays, 0..7 one batch only. `guess` may be empty (warm start otherwise).
    /// Relative residual 1e-10; throws NumericsError if that is not reached. Adds the number of
    /// Krylov iterations to *iterations if given.
    std::vector<double> solve(const std::vector<double>& sticking, int batch,
                              const std::vector<double>& guess, int* iterations = nullptr) const;
    void apply(int batch, const double* emitted, double* arrival) const override;
    bool sampled() const override { return true; }
    const std::vector<double>& direct(int batch = -1) const override {
        return batch < 0 ? direct_ : batch_direct_[batch];
    }

private:
    struct Tracing;
    void find_open();
    double row(int element, int batch, const double* emitted) const;

    int per_batch_ = 0;
    std::vector<double> direct_;
    std::vector<std::vector<double>> batch_direct_;
    std::vector<std::int32_t> target_; ///< [element][batch][ray]: elements hit, packed to the front
    std::vector<std::uint16_t> weight_; ///< likewise: root of the ray's weight over the largest
    std::vector<std::int16_t> hits_;    ///< [element][batch]: how many of them
    std::vector<std::uint8_t> open_;    ///< whether any path leads to the open
};

} // namespace rille::fluxes
