// SPDX-License-Identifier: Apache-2.0
// Private to fluxes: the two ways of gathering behind DirectIons.
#pragma once

#include "fluxes/direct_ions.hpp"

namespace rille::fluxes {

class IonGather {
public:
    IonGather(const geometry::Domain&, const geometry::Surface&, const WantedSums&);
    virtual ~IonGather() = default;

    virtual double flux(int ion, int element) const = 0;
    virtual void visit_rows(const DirectIons::UseRows&) const = 0;
    virtual int groups() const { return 0; }
    virtual int group_of(int) const { return -1; }
    virtual int rays_per_batch() const { return 0; }
    virtual bool arrives(int /*group*/, int /*element*/, int /*batch*/, int /*k*/) const {
        return false;
    }
    virtual Launch place(const Launcher&, int /*group*/, int /*element*/, int /*batch*/,
                         int /*k*/) const {
        return {};
    }
    virtual IonSample ion(int /*group*/, int /*element*/, int /*batch*/, int /*k*/) const {
        return {};
    }

    DirectIons::Own own(int e) const {
        return {own_.data() + first_[e],
                batch_.empty() ? nullptr : batch_.data() + std::size_t(first_[e]) * 8};
    }
    void forget_own() {
        own_ = std::vector<double>(); // {} would keep the memory
        batch_ = std::vector<double>();
    }
    const std::shared_ptr<const ArcAverage>& average() const { return average_; }
    const std::vector<Vec3>& normal() const { return normal_; }

protected:
    std::shared_ptr<const ArcAverage> average_;
    std::vector<Vec3> normal_;
    std::vector<int> first_;    ///< of the sums of each element, one more at the end
    std::vector<double> own_;   ///< [first_[e] + i]
    std::vector<double> batch_; ///< [(first_[e] + i) * 8 + b], or empty
};

std::unique_ptr<IonGather> gather_extruded(const geometry::Domain&, const geometry::Surface&,
                                           const IonTables&, const WantedSums&);
std::unique_ptr<IonGather> gather_full(const geometry::Domain&, const geometry::Surface&,
                                       const geometry::RayCaster&, const IonTables&,
                                       const WantedSums&, const DirectIons::Options&);

/// Where an angle lies among ascending ones: between node and node + 1, or at an end.
struct AngleNode {
    int node = 0;
    double part = 0;
};
AngleNode angle_node(const std::vector<double>& angles, double angle);

} // namespace rille::fluxes
