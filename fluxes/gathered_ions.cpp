// SPDX-License-Identifier: Apache-2.0
#include "fluxes/gathered_ions.hpp"

#include <algorithm>
#include <array>
#include <cmath>

namespace rille::fluxes {
namespace {

constexpr int cells = 8192;
constexpr int sines = 128, classes = 2 * sines;
constexpr double small_bin = 1 / 1024.; ///< of the flux: half of the classes will do
constexpr double light = 2e-4;          ///< of a bin: such classes join their neighbours
constexpr int most_joined = 4;

/// Of the nodes of one bin: by the sine of the angle out of the plane and the half of the bin.
class Classes {
public:
    Classes(const InPlane& plane, int bin)
        : middle_(std::tan(0.5 * (plane.angle[bin] + plane.angle[bin + 1]))) {
        const double share = plane.share[bin + 1] - plane.share[bin];
        steps_ = share < small_bin ? sines / 2 : sines;
    }
    int of(const InPlane::Node& node) const {
        const double in_plane = node.cos_polar * node.cos_polar * (1 + node.slope * node.slope);
        const int step = static_cast<int>(std::sqrt(std::max(0.0, 1 - in_plane)) * steps_);
        return 2 * std::min(step, steps_ - 1) + (node.slope > middle_ ? 1 : 0);
    }

private:
    int steps_;
    double middle_;
};

} // namespace

AngleTable::AngleTable(const AngleLaw& law) {
    constexpr double grazing = 1e-9; // laws are given their limit at 90 deg
    value_.reserve(cells + 2);
    for (int i = 0; i <= cells; ++i) {
        const double root = double(i) / cells;
        value_.push_back(angle_factor(law, std::max(1 - root * root, grazing)));
    }
    value_.push_back(value_.back()); // the end itself lies in a cell of no slope
}

double AngleTable::operator()(double cosine) const {
    const double place = cells * std::sqrt(std::max(0.0, 1 - cosine));
    const int cell = static_cast<int>(place);
    return value_[cell] + (place - cell) * (value_[cell + 1] - value_[cell]);
}

GatheredIons::GatheredIons(const InPlane& plane, const std::vector<double>& per_spectrum) {
    std::array<Ray, classes> sums{};
    const auto put = [&](Ray& sum) {
        if (sum.weight > 0)
            rays_.push_back({sum.slope / sum.weight, sum.cos_polar / sum.weight, sum.weight});
        sum = {};
    };
    const auto close_bin = [&](double all) {
        for (int half = 0; half < 2; ++half) {
            Ray group{};
            for (int step = 0, joined = 0; step < sines; ++step) {
                Ray& sum = sums[2 * step + half];
                if (sum.weight >= light * all || joined == most_joined) {
                    put(group);
                    joined = 0;
                }
                group.slope += sum.slope;
                group.cos_polar += sum.cos_polar;
                group.weight += sum.weight;
                ++joined;
                if (sum.weight >= light * all) joined = most_joined;
                sum = {};
            }
            put(group);
        }
        first_.push_back(rays_.size());
    };
    first_.push_back(0);
    auto node = plane.nodes.begin();
    for (int bin = 0; bin + 1 < static_cast<int>(plane.angle.size()); ++bin) {
        const Classes by(plane, bin);
        double all = 0;
        for (; node != plane.nodes.end() && node->bin == bin; ++node) {
            const double weight = node->weight * per_spectrum[node->spectrum];
            if (!(weight > 0)) continue;
            Ray& sum = sums[by.of(*node)];
            sum.slope += weight * node->slope;
            sum.cos_polar += weight * node->cos_polar;
            sum.weight += weight;
            all += weight;
        }
        close_bin(all);
    }
}

double GatheredIons::on_surface(std::size_t bin, double cosine, double sine,
                                const AngleTable& factor) const {
    double sum = 0;
    for (std::size_t r = first_[bin]; r < first_[bin + 1]; ++r) {
        const Ray& ray = rays_[r];
        const double received = cosine + ray.slope * sine; // (r . n) / r_z
        if (received > 0) sum += ray.weight * received * factor(received * ray.cos_polar);
    }
    return sum;
}

} // namespace rille::fluxes
