// SPDX-License-Identifier: Apache-2.0
#include "geometry/carry.hpp"
#include "geometry/element_bins.hpp"
#include "geometry/ranges.hpp"

#include <algorithm>
#include <array>
#include <cmath>

namespace rille::geometry {

namespace {

constexpr std::size_t grain = 2048;
constexpr double narrow = 1.8; ///< [mean element sizes] values are taken from within
constexpr double wide = 3.5;   ///< [mean element sizes] corrections are spread over

/// New values are weighted means of the old ones that moved next to them, images in mirror sides
/// among them. What a per-area amount then lacks or has too much is spread over the neighbourhood
/// in proportion to what lies there, so that the integral is exact and nothing turns negative.
class FullCarrier {
public:
    explicit FullCarrier(const CarryTask& task)
        : task_(task), from_(task.from), to_(task.to), size_(mean_size(task.to)), foot_(feet(task)),
          old_bins_(foot_, size_, task.period_x, task.period_y),
          new_bins_(task.to.centre, size_, task.period_x, task.period_y) {
        if (task.domain.sides == Sides::mirror) place_mirrors();
        weigh();
        measure_shares();
    }

    void run() {
        std::vector<Values> old, now;
        for (SurfaceField* f : task_.fields)
            old.push_back(std::move(f->value));
        means(old, now);
        conserve(old, now);
        for (std::size_t i = 0; i < now.size(); ++i)
            task_.fields[i]->value = std::move(now[i]);
    }

private:
    using Values = std::vector<double>;
    using Over = std::array<bool, 2>; ///< turned over along x, y

    static double mean_size(const Surface& s) {
        double sum = 0;
        for (double a : s.area)
            sum += a;
        return std::sqrt(sum / s.size());
    }
    static std::vector<Vec3> feet(const CarryTask& task) {
        std::vector<Vec3> out(task.from.size());
        for (std::size_t e = 0; e < out.size(); ++e)
            out[e] = task.moved[e] == 0 ? task.from.centre[e]
                                        : task.from.centre[e] - task.from.normal[e] * task.moved[e];
        return out;
    }

    /// A mirror side: the plane at `at` along an axis, the period above (1) or below it (-1).
    struct Mirror {
        double at;
        int inwards;
    };
    void place_mirrors() {
        const Domain& d = task_.domain;
        mirrors_[0] = {{d.x_min(), 1}, {d.x_max(), -1}};
        mirrors_[1] = {{d.y_min(), 1}, {-d.y_min(), -1}};
        for (int axis = 0; axis < 2; ++axis)
            for (const Mirror& m : mirrors_[axis])
                for (const Vec3& p : foot_)
                    overshoot_ = std::max(overshoot_, (m.at - p[axis]) * m.inwards);
    }
    static Vec3 turned(Vec3 v, const Over& over) {
        for (int axis = 0; axis < 2; ++axis)
            if (over[axis]) v[axis] = -v[axis];
        return v;
    }

    /// visit(n, displacement from p, how n is turned over) for every point of the bins and every
    /// image of one within `radius`. From an image to p is as far as from the point to the image
    /// of p.
    template <class Visit>
    void near(const ElementBins& bins, const Vec3& p, double radius, const Visit& visit) const {
        const auto along = [&](int axis, const Vec3& q, const auto& use) {
            use(q, false);
            for (const Mirror& m : mirrors_[axis]) {
                if ((q[axis] - m.at) * m.inwards > radius + overshoot_) continue;
                Vec3 image = q;
                image[axis] = 2 * m.at - q[axis];
                use(image, true);
            }
        };
        along(0, p, [&](const Vec3& q, bool over_x) {
            along(1, q, [&](const Vec3& r, bool over_y) {
                const Over over{over_x, over_y};
                bins.near(r, radius,
                          [&](int n, const Vec3& d) { visit(n, turned(d, over), over); });
            });
        });
    }

    /// By area, so that small elements, of which there are many next to each other, count for no
    /// more than they hold.
    double weight(int e, int j, const Vec3& d, const Over& over, double radius) const {
        const double facing = from_.normal[e].dot(turned(to_.normal[j], over));
        if (facing <= 0) return 0;
        const double t = 1 - d.length() / (radius * size_);
        return t <= 0 ? 0 : facing * t * t * from_.area[e] / (size_ * size_);
    }

    /// Sum of weights of each new element; `single_` where one old element alone counts.
    void weigh() {
        total_.assign(to_.size(), 0);
        single_.assign(to_.size(), -1);
        over_ranges(to_.size(), grain, [&](std::size_t first, std::size_t last) {
            for (std::size_t j = first; j < last; ++j) {
                double sum = 0;
                int same = -1;
                near(old_bins_, to_.centre[j], narrow * size_,
                     [&](int e, const Vec3& d, const Over& over) {
                         if (over == Over{} && d == Vec3(0, 0, 0) &&
                             from_.normal[e] == to_.normal[j])
                             same = e;
                         sum += weight(e, static_cast<int>(j), d, over, narrow);
                     });
                total_[j] = sum;
                if (same >= 0)
                    single_[j] = same;
                else if (!(sum > 1e-9))
                    single_[j] = old_bins_.nearest(to_.centre[j]);
            }
        });
    }

    /// New area that takes its value from each old element.
    void measure_shares() {
        share_.assign(from_.size(), 0);
        over_ranges(from_.size(), grain, [&](std::size_t first, std::size_t last) {
            for (std::size_t e = first; e < last; ++e)
                near(new_bins_, foot_[e], narrow * size_,
                     [&](int j, const Vec3& d, const Over& over) {
                         if (single_[j] < 0)
                             share_[e] += to_.area[j] *
                                          weight(static_cast<int>(e), j, d, over, narrow) /
                                          total_[j];
                     });
        });
        for (std::size_t j = 0; j < to_.size(); ++j)
            if (single_[j] >= 0) share_[single_[j]] += to_.area[j];
    }

    /// All fields in one go: looking for neighbours takes longer than summing over them.
    void means(const std::vector<Values>& old, std::vector<Values>& now) const {
        now.assign(old.size(), Values(to_.size()));
        over_ranges(to_.size(), grain, [&](std::size_t first, std::size_t last) {
            Values sums(old.size());
            for (std::size_t j = first; j < last; ++j) {
                if (single_[j] >= 0) {
                    for (std::size_t f = 0; f < old.size(); ++f)
                        now[f][j] = old[f][single_[j]];
                    continue;
                }
                std::fill(sums.begin(), sums.end(), 0.0);
                near(old_bins_, to_.centre[j], narrow * size_,
                     [&](int e, const Vec3& d, const Over& over) {
                         const double w = weight(e, static_cast<int>(j), d, over, narrow);
                         for (std::size_t f = 0; f < old.size(); ++f)
                             sums[f] += w * old[f][e];
                     });
                for (std::size_t f = 0; f < old.size(); ++f)
                    now[f][j] = sums[f] / total_[j];
            }
        });
    }

    /// Of every per-area field. What is spread goes by the size of what lies there, so that it may
    /// count less than 0.
    void conserve(const std::vector<Values>& old, std::vector<Values>& now) const {
        std::vector<std::size_t> amounts;
        for (std::size_t f = 0; f < old.size(); ++f)
            if (task_.fields[f]->carry == Carry::per_area) amounts.push_back(f);
        if (amounts.empty()) return;
        const std::size_t count = amounts.size();
        std::vector<Values> excess(count, Values(from_.size())), scale = excess;
        over_ranges(from_.size(), grain, [&](std::size_t first, std::size_t last) {
            Values sums(count);
            for (std::size_t e = first; e < last; ++e) {
                std::fill(sums.begin(), sums.end(), 0.0);
                bool any = false;
                for (std::size_t a = 0; a < count; ++a) {
                    excess[a][e] = old[amounts[a]][e] * (from_.area[e] - share_[e]);
                    any = any || excess[a][e] != 0;
                }
                if (!any) continue;
                near(new_bins_, foot_[e], wide * size_,
                     [&](int j, const Vec3& d, const Over& over) {
                         const double w =
                             weight(static_cast<int>(e), j, d, over, wide) * to_.area[j];
                         for (std::size_t a = 0; a < count; ++a)
                             sums[a] += w * std::fabs(now[amounts[a]][j]);
                     });
                for (std::size_t a = 0; a < count; ++a)
                    scale[a][e] = sums[a] > 0 ? excess[a][e] / sums[a] : 0;
            }
        });
        std::vector<Values> next;
        for (const std::size_t f : amounts)
            next.push_back(now[f]);
        over_ranges(to_.size(), grain, [&](std::size_t first, std::size_t last) {
            Values sums(count);
            for (std::size_t j = first; j < last; ++j) {
                std::fill(sums.begin(), sums.end(), 0.0);
                near(old_bins_, to_.centre[j], wide * size_,
                     [&](int e, const Vec3& d, const Over& over) {
                         const double w = weight(e, static_cast<int>(j), d, over, wide);
                         for (std::size_t a = 0; a < count; ++a)
                             sums[a] += scale[a][e] * w;
                     });
                for (std::size_t a = 0; a < count; ++a) {
                    const double here = now[amounts[a]][j];
                    if (sums[a] != 0) next[a][j] = here + sums[a] * std::fabs(here);
                }
            }
        });
        for (std::size_t a = 0; a < count; ++a) {
            for (std::size_t e = 0; e < from_.size(); ++e) // nothing near to share it with
                if (excess[a][e] != 0 && scale[a][e] == 0) {
                    const int j = new_bins_.nearest(foot_[e]);
                    next[a][j] += excess[a][e] / to_.area[j];
                }
            keep_positive(old[amounts[a]], next[a]);
            now[amounts[a]] = std::move(next[a]);
        }
    }

    /// Overshoots below zero are rare; lifting them is paid for by all in proportion.
    void keep_positive(const std::vector<double>& old, std::vector<double>& now) const {
        if (std::none_of(now.begin(), now.end(), [](double v) { return v < 0; })) return;
        if (std::any_of(old.begin(), old.end(), [](double v) { return v < 0; })) return;
        double before = 0, after = 0;
        for (std::size_t e = 0; e < old.size(); ++e)
            before += old[e] * from_.area[e];
        for (std::size_t j = 0; j < now.size(); ++j)
            after += (now[j] = std::max(now[j], 0.0)) * to_.area[j];
        if (after > 0)
            for (double& v : now)
                v *= before / after;
    }

    const CarryTask& task_;
    const Surface &from_, &to_;
    double size_;
    std::vector<Vec3> foot_;
    ElementBins old_bins_, new_bins_;
    std::array<std::vector<Mirror>, 2> mirrors_; ///< across x, y; none where the period repeats
    double overshoot_ = 0;                       ///< how far feet lie beyond mirrors [nm]
    std::vector<double> total_, share_;
    std::vector<int> single_;
};

} // namespace

void carry_full(const CarryTask& task) {
    FullCarrier(task).run();
}

} // namespace rille::geometry
