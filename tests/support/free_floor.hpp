// SPDX-License-Identifier: Apache-2.0
// A neutral-limited etch between vertical, inert walls, tracked by itself: the floor is a row of
// markers that move straight down, the exchange is in closed form because the cavity is convex
// (crossed strings in a trench, coaxial disks in a round hole). Derived here; it shares no code
// with the program.
#pragma once

#include <Eigen/Dense>

#include <algorithm>
#include <cmath>
#include <vector>

namespace rille::tests {

/// Lengths in widths (diameters) of the opening, rates in those of an open floor with plenty of
/// ions, times in width over that rate.
class FreeFloor {
public:
    enum class Shape { trench, hole };

    /// `sticking` of a bare floor, `plenty`: what the ions could remove over what sticks to an open
    /// floor; the depth the walls have at the start; `rings` of the floor from the middle outwards.
    FreeFloor(Shape shape, double sticking, double plenty, double depth, int rings = 40)
        : shape_(shape), sticking_(sticking), plenty_(plenty), depth_(rings + 1, depth) {
        // finer towards the wall, where the flux has a cusp
        for (int i = 0; i <= rings; ++i)
            radius_.push_back(0.5 * std::sin(0.5 * 3.14159265358979323846 * i / rings));
    }

    /// Etched volume over the area of the opening, from the mouth down.
    double mean_depth() const { return mean(depth_); }
    /// Mean speed of the floor now.
    double rate() const { return mean(speeds()); }

    /// Time until the mean depth is `wanted`, in steps of at most `step` of depth (midpoint rule).
    double etch_to(double wanted, double step = 0.01) {
        while (mean_depth() < wanted) {
            const double before = mean_depth();
            const std::vector<double> start = depth_;
            const std::vector<double> first = speeds();
            const double dt = step / first[0];
            move(start, first, 0.5 * dt);
            const std::vector<double> middle = speeds();
            move(start, middle, dt);
            const double after = mean_depth();
            if (after < wanted) {
                time_ += dt;
            } else {
                const double share = (wanted - before) / (after - before);
                move(start, middle, share * dt);
                time_ += share * dt;
                break;
            }
        }
        return time_;
    }

private:
    struct Point {
        double r = 0, z = 0; ///< z down from the mouth
    };

    /// Of what the markers hold, over the opening.
    double mean(const std::vector<double>& value) const {
        double sum = 0, all = 0;
        for (std::size_t i = 0; i + 1 < radius_.size(); ++i) {
            const double r0 = radius_[i], r1 = radius_[i + 1];
            if (shape_ == Shape::trench)
                sum += (r1 - r0) * (value[i] + value[i + 1]) / 2, all += r1 - r0;
            else // a frustum's exact moment of r
                sum += (r1 - r0) * (value[i] * (2 * r0 + r1) + value[i + 1] * (r0 + 2 * r1)) / 6,
                    all += (r1 * r1 - r0 * r0) / 2;
        }
        return sum / all;
    }

    void move(const std::vector<double>& start, const std::vector<double>& speed, double dt) {
        for (std::size_t i = 0; i < depth_.size(); ++i)
            depth_[i] = start[i] + speed[i] * dt;
    }

    /// Contour from the middle of the floor to its edge and up the wall to the mouth.
    std::vector<Point> contour() const {
        std::vector<Point> points;
        for (std::size_t i = 0; i < radius_.size(); ++i)
            points.push_back({radius_[i], depth_[i]});
        const double edge = depth_.back();
        const int count = 40 + static_cast<int>(24 * edge); // finer towards both ends
        for (int i = 1; i <= count; ++i)
            points.push_back(
                {0.5, 0.5 * edge * (1 + std::cos(3.14159265358979323846 * i / count))});
        return points;
    }

    /// What passes between what lies inwards of point i and what lies beyond point j >= i, the
    /// mouth included, for a unit of flux and radian (trench: of the right half, from both
    /// halves of what lies below).
    double passed(const Point& a, const Point& b) const {
        const double dz = a.z - b.z;
        if (shape_ == Shape::trench) return std::hypot(a.r + b.r, dz) - std::hypot(a.r - b.r, dz);
        const double apart = (a.r - b.r) * (a.r - b.r) + dz * dz; // coaxial disks, per pi
        const double sum = apart + 2 * a.r * b.r;
        return 0.5 * (sum - std::sqrt(apart * (sum + 2 * a.r * b.r)));
    }

    /// Vertical speed of the markers: of the rings between them, straight on to both ends.
    std::vector<double> speeds() const {
        const std::vector<Point> p = contour();
        const int size = static_cast<int>(p.size()) - 1, floor = radius_.size() - 1;
        Eigen::VectorXd area(size), mouth(size), cosine(size);
        Eigen::MatrixXd exchange(size, size);
        for (int i = 0; i < size; ++i) {
            const double length = std::hypot(p[i + 1].r - p[i].r, p[i + 1].z - p[i].z);
            area[i] = shape_ == Shape::trench ? 2 * length : (p[i].r + p[i + 1].r) * length;
            cosine[i] = (p[i + 1].r - p[i].r) / length;
            mouth[i] = passed(p[i + 1], p[size]) - passed(p[i], p[size]);
            for (int j = i + 1; j < size; ++j)
                exchange(i, j) = exchange(j, i) = passed(p[i + 1], p[j]) - passed(p[i], p[j]) -
                                                  passed(p[i + 1], p[j + 1]) +
                                                  passed(p[i], p[j + 1]);
        }
        for (int i = 0; i < size; ++i) {
            exchange(i, i) = 0;
            exchange(i, i) = area[i] - mouth[i] - exchange.row(i).sum();
        }
        Eigen::VectorXd flux = Eigen::VectorXd::Ones(size);
        for (int pass = 0; pass < 30; ++pass) {
            Eigen::MatrixXd matrix = -exchange;
            for (int j = 0; j < floor; ++j)
                matrix.col(j) *= 1 - sticking_ * free_sites(flux[j], cosine[j]);
            matrix.diagonal() += area;
            const Eigen::VectorXd next = matrix.partialPivLu().solve(mouth);
            const double change = (next - flux).cwiseAbs().maxCoeff();
            flux = next;
            if (change < 1e-10) break;
        }
        std::vector<double> ring(floor), middle(floor), marker(floor + 1);
        for (int i = 0; i < floor; ++i) {
            ring[i] = flux[i] * free_sites(flux[i], cosine[i]) / cosine[i];
            middle[i] = 0.5 * (p[i].r + p[i + 1].r);
        }
        for (int i = 0; i <= floor; ++i) {
            const int k = std::clamp(i, 1, floor - 1);
            const double slope = (ring[k] - ring[k - 1]) / (middle[k] - middle[k - 1]);
            marker[i] = ring[k] + slope * (radius_[i] - middle[k]);
        }
        marker[0] = ring[0]; // level in the middle
        return marker;
    }

    /// Share of the floor's sites that is free, where ions strike it at this cosine.
    double free_sites(double flux, double cosine) const {
        return plenty_ * cosine / (plenty_ * cosine + flux);
    }

    Shape shape_;
    double sticking_, plenty_, time_ = 0;
    std::vector<double> radius_, depth_;
};

} // namespace rille::tests
