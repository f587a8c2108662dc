// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/ion_tables.hpp"
#include "fluxes/ions.hpp"

#include <cstddef>
#include <vector>

namespace rille::fluxes {

/// An ion that arrives: where it comes from and what it weighs.
struct Arrival {
    double up = 0;     ///< component of the reverse direction along +z
    double along = 0;  ///< and along the horizontal part of the element's normal; revolved: along x
    double weight = 0; ///< share of the flux / up
    double energy = 0;
    int batch = 0;
};

/// What single ions bring by sums of tallies, as functions of the surface normal: rows over the
/// angles of the ion tables. Species that arrive alike (the mass of an ion does not matter in a
/// collisionless sheath) are a group and share directions and what these see.
class RowKernels {
public:
    /// `members`: the tallies of each sum.
    RowKernels(const IonTables&, const std::vector<std::vector<int>>& members);

    int groups() const { return static_cast<int>(groups_.size()); }
    int group_of(int ion) const { return group_of_[ion]; }
    const IonDistribution& distribution(int group) const { return groups_[group]; }

    /// Some of the sums, in places one after the other, and what groups bring by them.
    struct Term {
        int place, law, energy;
        double factor;
    };
    struct Selection {
        std::vector<int> place;               ///< [sum]; -1: not selected
        std::vector<int> sums;                ///< [place]
        std::vector<std::vector<Term>> terms; ///< [group], law after law
    };
    Selection select(const std::vector<int>& sums) const;

    /// Nodes of the angles: [from, to).
    struct Nodes {
        int from = 0, to = 0;
        int size() const { return to - from; }
    };
    /// Adds the ions of a group to rows[place * nodes.size() + k - nodes.from].
    void add(const Selection&, int group, const Arrival&, const Nodes&,
             std::vector<double>& rows) const;
    /// The same by batches on a normal of one angle, to batch[place * 8 + b].
    void add_own(const Selection&, int group, const Arrival&, double cosine, double sine,
                 std::vector<double>& batch) const;

private:
    /// An angle law times the received flux is needed at every node for every ion: linear in a
    /// table over the cosine, whose error (1e-5) is far below the sampling error.
    class CosineTable {
    public:
        static constexpr int cells = 2048;
        explicit CosineTable(const AngleLaw&);
        double operator()(double cosine) const {
            const double x = (cosine < 1.0 ? cosine : 1.0) * cells;
            const int cell = static_cast<int>(x);
            return at(cell, x - cell);
        }
        double at(int cell, double part) const {
            return value_[cell] + part * (value_[cell + 1] - value_[cell]);
        }
        bool operator==(const CosineTable& other) const { return value_ == other.value_; }

    private:
        std::vector<double> value_;
    };
    /// An energy law over the energies of one distribution: linear in a table where they are
    /// spread.
    class EnergyTable {
    public:
        EnergyTable(const EnergyLaw&, const IonDistribution&);
        double operator()(double energy) const;

    private:
        static constexpr int cells = 1024;
        EnergyLaw law_;
        double low_, high_;
        std::vector<double> value_;
    };
    /// A yield apart from its scale, for one group: tallies are multiples of kernels.
    struct Kernel {
        int group;
        std::vector<double> content;
        int law;
    };
    void join_group(const IonDistribution&, std::vector<std::vector<double>>& contents);
    int kernel_of(const Tally&);
    void add_members(int sum, const std::vector<int>& tallies, const IonTables&);

    const std::vector<double>& angles_;
    std::vector<double> cosine_, sine_; ///< of the angles
    std::vector<IonDistribution> groups_;
    std::vector<int> group_of_; ///< of each ion
    std::vector<Kernel> kernels_;
    std::vector<EnergyTable> energy_;     ///< of each kernel
    std::vector<CosineTable> law_;        ///< angle laws, each once
    std::vector<std::vector<Term>> term_; ///< [group], of all sums; place: the sum
};

} // namespace rille::fluxes
