// SPDX-License-Identifier: Apache-2.0
#include "fluxes/in_plane_parts.hpp"

#include <algorithm>
#include <array>
#include <cmath>

namespace rille::fluxes {
namespace {

/// Edges of all parts, thinned to bins no coarser than those of one distribution.
std::vector<double> common_edges(const IonMixture& law) {
    std::vector<double> all;
    for (const IonDistribution& part : law.part)
        all.insert(all.end(), part.in_plane().angle.begin(), part.in_plane().angle.end());
    std::sort(all.begin(), all.end());
    all.erase(std::unique(all.begin(), all.end()), all.end());
    std::vector<double> below(all.size(), 0.0);
    for (std::size_t p = 0; p < law.part.size(); ++p)
        for (std::size_t i = 0; i < all.size(); ++i)
            below[i] += law.weight[p] * law.part[p].in_plane().share_below(all[i]);
    std::vector<double> edges = {all.front()};
    double last = 0;
    for (std::size_t i = 1; i + 1 < all.size(); ++i) {
        const double tail = std::min(last, 1 - last);
        const double widest = std::clamp(0.125 * tail, 1e-9, 1 / 256.0);
        const bool centre = all[i] == 0; // keeps mirror images apart
        if (below[i + 1] - last <= widest && !centre) continue;
        edges.push_back(all[i]);
        last = below[i];
    }
    edges.push_back(all.back());
    return edges;
}

/// Spreads the nodes of one bin of a part over the common bins that it meets: evenly in sin(phi),
/// as inside any bin, the slopes moved along.
void spread_bin(InPlane& to, const std::vector<InPlane::Node>& nodes, double a, double b,
                double weight) {
    const double whole = std::sin(b) - std::sin(a);
    const double middle = whole > 0 ? (std::cos(a) - std::cos(b)) / whole : std::tan(a);
    const auto first = std::upper_bound(to.angle.begin(), to.angle.end(), a);
    int bin = std::max(0, static_cast<int>(first - to.angle.begin()) - 1);
    for (; bin + 1 < static_cast<int>(to.angle.size()) && to.angle[bin] < b; ++bin) {
        const double low = std::max(a, to.angle[bin]), high = std::min(b, to.angle[bin + 1]);
        if (!(high > low)) continue;
        const bool all = low == a && high == b;
        const double piece = std::sin(high) - std::sin(low);
        const double part = all ? 1.0 : piece / whole;
        if (!(part > 0)) continue;
        const double shift = all ? 0.0 : (std::cos(low) - std::cos(high)) / piece - middle;
        for (InPlane::Node node : nodes) {
            node.bin = bin;
            node.weight *= weight * part;
            node.slope += shift;
            to.nodes.push_back(node);
        }
    }
}

/// A piece of the quadrature as seen in the plane: from one in-plane angle to another.
struct Piece {
    double low, high, out_of_plane, cosine, energy, weight;
};

Piece seen(const IonArc& arc) {
    constexpr double half_width = 1e-9; // of an arc that runs across the plane
    const double a = std::atan(arc.from.x / arc.from.z), b = std::atan(arc.to.x / arc.to.z);
    const double across = 0.5 * (arc.from.y + arc.to.y);
    return {std::min(a, b) - half_width,
            std::max(a, b) + half_width,
            std::asin(std::min(std::fabs(across), 1.0)),
            std::sqrt(std::max(0.0, 1 - across * across)),
            arc.energy_ev,
            arc.weight};
}

double mean_slope(double low, double high) {
    if (high - low < 1e-3) return std::tan(0.5 * (low + high));
    return std::log(std::cos(low) / std::cos(high)) / (high - low);
}

/// Edges at the shares of flux that bound the bins of any distribution.
std::vector<double> quantile_edges(const std::vector<Piece>& pieces) {
    std::vector<double> levels = tail_levels();
    std::vector<double> shares(levels.rbegin(), levels.rend());
    shares.push_back(0.5);
    for (double level : levels)
        shares.push_back(1 - level);
    std::vector<std::pair<double, double>> middle;
    double low = HUGE_VAL, high = -HUGE_VAL;
    for (const Piece& piece : pieces) {
        middle.emplace_back(0.5 * (piece.low + piece.high), piece.weight);
        low = std::min(low, piece.low);
        high = std::max(high, piece.high);
    }
    std::sort(middle.begin(), middle.end());
    std::vector<double> edges = {low};
    double below = 0;
    std::size_t next = 0;
    for (const auto& [phi, weight] : middle) {
        below += weight;
        if (next == shares.size() || below < shares[next]) continue;
        while (next < shares.size() && below >= shares[next])
            ++next;
        if (phi > edges.back() + 1e-9 && phi < high - 1e-9) edges.push_back(phi);
    }
    edges.push_back(high);
    return edges;
}

/// Sums of what falls into one bin: by angle out of the plane and by energy.
class Collector {
public:
    Collector(const std::vector<Piece>& pieces, std::size_t bins) {
        double sum = 0, squares = 0;
        low_ = HUGE_VAL;
        double top = 0;
        for (const Piece& piece : pieces) {
            sum += piece.weight * piece.out_of_plane;
            squares += piece.weight * piece.out_of_plane * piece.out_of_plane;
            low_ = std::min(low_, std::sqrt(piece.energy));
            top = std::max(top, std::sqrt(piece.energy));
        }
        const double spread = std::sqrt(std::max(0.0, squares - sum * sum));
        for (int c = 0; c + 1 < classes; ++c)
            class_edge_[c] = sum + 0.8 * (c + 1 - 0.5 * classes) * spread;
        // Even in the square root, as most yields are; no division by zero for one energy.
        scale_ = top > low_ ? groups / ((top - low_) * (1 + 1e-12)) : 0.0;
        sums_.resize(bins * classes);
    }

    /// Where the sums of a piece are within a bin.
    struct Slot {
        int which, group;
    };
    Slot slot(const Piece& piece) const {
        int which = 0;
        while (which + 1 < classes && piece.out_of_plane > class_edge_[which])
            ++which;
        const int group = static_cast<int>((std::sqrt(piece.energy) - low_) * scale_);
        return {which, std::clamp(group, 0, groups - 1)};
    }
    void add(std::size_t bin, const Slot& slot, const Piece& piece, double weight, double slope) {
        Sum& sum = sums_[bin * classes + slot.which];
        sum.weight += weight;
        sum.slope += weight * slope;
        sum.cosine += weight * piece.cosine;
        sum.share[slot.group] += weight;
        sum.energy[slot.group] += weight * piece.energy;
    }

    void finish(InPlane& plane) const {
        for (std::size_t i = 0; i < sums_.size(); ++i) {
            const Sum& sum = sums_[i];
            if (!(sum.weight > 0)) continue;
            std::vector<InPlane::EnergyShare> spectrum;
            for (int g = 0; g < groups; ++g)
                if (sum.share[g] > 0)
                    spectrum.push_back({sum.energy[g] / sum.share[g], sum.share[g] / sum.weight});
            const double slope = sum.slope / sum.weight;
            plane.nodes.push_back({static_cast<int>(i / classes), slope,
                                   sum.cosine / sum.weight / std::sqrt(1 + slope * slope),
                                   sum.weight, static_cast<int>(plane.spectra.size())});
            plane.spectra.push_back(std::move(spectrum));
        }
    }

private:
    static constexpr int classes = 5, groups = 32;
    struct Sum {
        double weight = 0, slope = 0, cosine = 0;
        std::array<double, groups> share{}, energy{};
    };
    std::array<double, classes> class_edge_{};
    double low_, scale_;
    std::vector<Sum> sums_;
};

/// Joins the light nodes of each bin that lie at about one angle out of the plane, their energies
/// in groups: the many nodes of parts that bring little cost as much as those that bring most.
class LightNodes {
public:
    explicit LightNodes(InPlane& plane) : plane_(plane) {
        double low = HUGE_VAL, high = 0;
        for (const auto& spectrum : plane.spectra)
            for (const auto& e : spectrum) {
                low = std::min(low, e.energy_ev);
                high = std::max(high, e.energy_ev);
            }
        low_ = std::sqrt(low);
        // Even in the square root, as most yields are.
        scale_ = high > low ? groups / (std::sqrt(high) - low_) : 0;
    }

    /// For nodes ordered by bin.
    void join() {
        std::vector<InPlane::Node> nodes;
        nodes.swap(plane_.nodes);
        for (auto first = nodes.begin(), last = first; first != nodes.end(); first = last) {
            double all = 0;
            for (; last != nodes.end() && last->bin == first->bin; ++last)
                all += last->weight;
            if (last - first <= few) {
                plane_.nodes.insert(plane_.nodes.end(), first, last);
                continue;
            }
            const int steps = all < small_bin ? sines / 4 : sines;
            for (auto node = first; node != last; ++node) {
                if (node->weight > light * all)
                    plane_.nodes.push_back(*node);
                else
                    add(*node, steps);
            }
            close_bin(first->bin, all);
        }
    }

private:
    static constexpr int few = 48, groups = 24, sines = 128, most_joined = 8;
    static constexpr double light = 1 / 64., small_bin = 1 / 1024.;
    struct Sum {
        double weight = 0, slope = 0, cosine = 0;
        std::array<double, groups> share{}, energy{};

        void operator+=(const Sum& other) {
            weight += other.weight;
            slope += other.slope;
            cosine += other.cosine;
            for (int g = 0; g < groups; ++g) {
                share[g] += other.share[g];
                energy[g] += other.energy[g];
            }
        }
    };

    void add(const InPlane::Node& node, int steps) {
        const double in_plane = node.cos_polar * node.cos_polar * (1 + node.slope * node.slope);
        const int step = static_cast<int>(std::sqrt(std::max(0.0, 1 - in_plane)) * steps);
        Sum& sum = sums_[std::min(step, steps - 1)];
        sum.weight += node.weight;
        sum.slope += node.weight * node.slope;
        sum.cosine += node.weight * node.cos_polar;
        for (const auto& e : plane_.spectra[node.spectrum]) {
            const int group = static_cast<int>((std::sqrt(e.energy_ev) - low_) * scale_);
            sum.share[std::clamp(group, 0, groups - 1)] += node.weight * e.share;
            sum.energy[std::clamp(group, 0, groups - 1)] += node.weight * e.share * e.energy_ev;
        }
    }

    void put(int bin, const Sum& sum) {
        if (!(sum.weight > 0)) return;
        std::vector<InPlane::EnergyShare> spectrum;
        for (int g = 0; g < groups; ++g)
            if (sum.share[g] > 0)
                spectrum.push_back({sum.energy[g] / sum.share[g], sum.share[g] / sum.weight});
        plane_.nodes.push_back({bin, sum.slope / sum.weight, sum.cosine / sum.weight, sum.weight,
                                static_cast<int>(plane_.spectra.size())});
        plane_.spectra.push_back(std::move(spectrum));
    }

    /// Neighbours that are lighter still share a node.
    void close_bin(int bin, double all) {
        Sum group;
        int joined = 0;
        for (Sum& sum : sums_) {
            const bool alone = sum.weight > light / 8 * all;
            if (alone || joined == most_joined) {
                put(bin, group);
                group = {};
                joined = 0;
            }
            group += sum;
            joined = alone ? most_joined : joined + 1;
            sum = {};
        }
        put(bin, group);
    }

    InPlane& plane_;
    double low_ = 0, scale_ = 0;
    std::array<Sum, sines> sums_;
};

} // namespace

InPlane from_mixture(const IonMixture& law) {
    InPlane plane;
    plane.angle = common_edges(law);
    for (std::size_t p = 0; p < law.part.size(); ++p) {
        const InPlane& part = law.part[p].in_plane();
        const int offset = static_cast<int>(plane.spectra.size());
        plane.spectra.insert(plane.spectra.end(), part.spectra.begin(), part.spectra.end());
        for (std::size_t first = 0, last; first < part.nodes.size(); first = last) {
            std::vector<InPlane::Node> nodes;
            for (last = first;
                 last < part.nodes.size() && part.nodes[last].bin == part.nodes[first].bin;
                 ++last) {
                nodes.push_back(part.nodes[last]);
                nodes.back().spectrum += offset;
            }
            const int bin = part.nodes[first].bin;
            spread_bin(plane, nodes, part.angle[bin], part.angle[bin + 1], law.weight[p]);
        }
    }
    std::stable_sort(plane.nodes.begin(), plane.nodes.end(),
                     [](const auto& a, const auto& b) { return a.bin < b.bin; });
    LightNodes(plane).join();
    sum_up(plane);
    return plane;
}

InPlane from_arcs(const std::vector<IonArc>& arcs) {
    std::vector<Piece> pieces;
    pieces.reserve(arcs.size());
    for (const IonArc& arc : arcs)
        pieces.push_back(seen(arc));
    InPlane plane;
    plane.angle = quantile_edges(pieces);
    Collector collector(pieces, plane.angle.size() - 1);
    std::vector<double> slope;
    for (std::size_t b = 0; b + 1 < plane.angle.size(); ++b)
        slope.push_back(mean_slope(plane.angle[b], plane.angle[b + 1]));
    for (const Piece& piece : pieces) {
        const Collector::Slot slot = collector.slot(piece);
        const double density = piece.weight / (piece.high - piece.low);
        const auto first = std::upper_bound(plane.angle.begin(), plane.angle.end(), piece.low);
        std::size_t bin = first == plane.angle.begin() ? 0 : first - plane.angle.begin() - 1;
        for (; bin + 1 < plane.angle.size() && plane.angle[bin] < piece.high; ++bin) {
            const double low = std::max(piece.low, plane.angle[bin]);
            const double high = std::min(piece.high, plane.angle[bin + 1]);
            if (!(high > low)) continue;
            const bool whole = low == plane.angle[bin] && high == plane.angle[bin + 1];
            collector.add(bin, slot, piece, density * (high - low),
                          whole ? slope[bin] : mean_slope(low, high));
        }
    }
    collector.finish(plane);
    sum_up(plane);
    return plane;
}

} // namespace rille::fluxes
