// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/exchange_operator.hpp"
#include "fluxes/patches.hpp"
#include "geometry/domain.hpp"
#include "geometry/ray_caster.hpp"
#include "geometry/surface.hpp"

#include <memory>
#include <vector>

namespace rille::fluxes {

/// Exchange of an open surface: exchange[p * elements + k] is area times factor from patch p to the
/// element in place k of the walking order, or from that to the patch; extruded: nm^2 per nm.
struct PatchFactors {
    std::vector<double> exchange;
};

/// a F of an extruded surface by crossed strings pulled taut: with a and b the ends of one patch, c
/// and d those of the other, half of (string a-c + string b-d - string a-d - string b-c), exact
/// whatever stands between; a patch sees of itself what its length exceeds the string between its
/// ends by.
/// Source: Hottel & Sarofim, Radiative Transfer (1967) [from memory]; that taut strings serve in
/// any region without islands: derived here (the second derivative of a string's length by its two
/// ends vanishes unless they see each other, and its first derivatives have no jumps).
PatchFactors string_factors(const geometry::Domain&, const geometry::Surface&, const Patches&);
/// Vertices of the open part between two patches that string_factors needs to be ends of patches.
/// `order` is set to the open elements in walking order.
std::vector<int> string_ends(const geometry::Domain&, const geometry::Surface&,
                             std::vector<int>& order);

/// The exchange operator of neutrals without sampling: exact factors from elements (constant
/// emission on each) to patches, arrivals spread over the elements of a patch by parabolas that
/// keep its mean, and the direct part exact for each element. What is emitted escapes or sticks, to
/// round-off.
class ExactExchange : public ExchangeOperator {
public:
    /// material: per element, or empty; patches end where it changes. The caster only measures
    /// gaps. Throws NumericsError where the open surface touches or crosses itself, or
    /// factors do not add up to within 5 %.
    ExactExchange(const geometry::Domain&, const geometry::Surface&, const geometry::RayCaster&,
                  const std::vector<int>& material, const PatchSizes& sizes = {});

    /// Whether the surface is of the kind that this operator can treat: nothing floats in the gas.
    static bool serves(const geometry::Domain&, const geometry::Surface&);

    std::size_t size() const override { return direct_.size(); }
    void apply(int batch, const double* emitted, double* arrival) const override;
    const std::vector<double>& direct(int = -1) const override { return direct_; }
    bool sampled() const override { return false; }
    std::size_t places() const override { return patches_->size(); }
    void to_places(const double* emitted, double* mean) const override { gather(emitted, mean); }
    void from_places(const double* mean, double* arrival) const override;
    void between_places(const std::vector<const double*>& kept, double* matrix) const override;
    /// Share of what an element emits that leaves at once: of extruded elements the same as
    /// direct(), of revolved ones so only in the mean over a patch.
    const std::vector<double>& escape() const { return escape_; }

    /// Impinging flux per element relative to the open flux, for sticking per element in [0, 1].
    /// `guess` may be empty (warm start otherwise). Relative residual 1e-10; throws NumericsError
    /// if that is not reached. Adds the number of conjugate gradient steps to *iterations.
    std::vector<double> solve(const std::vector<double>& sticking,
                              const std::vector<double>& guess = {},
                              int* iterations = nullptr) const;

    const Patches& patches() const { return *patches_; }
    /// Area times factor between two patches, and of a patch to the open.
    double factor(int i, int j) const { return coarse_[i * patches_->size() + j]; }
    double mouth(int i) const { return mouth_[i]; }
    /// Largest |sum of factors + factor to the open - 1| over patches, before what is missing was
    /// laid on the diagonal: the open is found in another way than the factors.
    double closure_defect() const { return closure_defect_; }
    /// Largest difference of area times factor forth and back between two patches, over the smaller
    /// area.
    double asymmetry() const { return asymmetry_; }

private:
    void close();
    void gather(const double* emitted, double* mean) const;
    int correct(const std::vector<double>& emits, const std::vector<double>& defect,
                std::vector<double>& change) const;

    std::shared_ptr<Patches> patches_;
    std::vector<double> direct_;   ///< per element
    std::vector<double> escape_;   ///< per element
    std::vector<double> mouth_;    ///< per patch, a times
    std::vector<double> exchange_; ///< as PatchFactors
    std::vector<double> coarse_;   ///< the same between patches, symmetric
    double closure_defect_ = 0, asymmetry_ = 0;
};

} // namespace rille::fluxes
