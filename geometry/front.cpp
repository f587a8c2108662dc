// SPDX-License-Identifier: Apache-2.0
#include "geometry/front.hpp"

#include "geometry/band.hpp"
#include "geometry/band_topology.hpp"
#include "geometry/check.hpp"

#include <algorithm>
#include <cmath>
#include <cstring>
#include <istream>
#include <ostream>
#include <utility>

namespace rille::geometry {

struct Front::State {
    Band band;
    ColumnIndex index;
};

namespace {

constexpr char file_mark[8] = {'r', 'f', 'r', 'o', 'n', 't', '0', '1'};

template <class T>
void put(std::ostream& out, const T* values, std::size_t count) {
    out.write(reinterpret_cast<const char*>(values),
              static_cast<std::streamsize>(count * sizeof(T)));
}

template <class T>
void get(std::istream& in, T* values, std::size_t count) {
    in.read(reinterpret_cast<char*>(values), static_cast<std::streamsize>(count * sizeof(T)));
    if (!in) throw NumericsError("a saved front ends early");
}

} // namespace

Front::Front(const Domain& domain, const std::function<double(const Vec3&)>& signed_distance,
             double z_low, double z_high)
    : state_(std::make_unique<State>()) {
    RILLE_CHECK(domain.spacing > 0 && domain.cells_x > 0 && domain.cells_y > 0, "empty domain");
    const double h = domain.spacing, reach = band_half_width * h;
    Band& band = state_->band;
    band.domain = domain;
    const int k_low = static_cast<int>(std::floor((z_low - reach) / h)) - 1;
    const int k_high = static_cast<int>(std::ceil((z_high + reach) / h)) + 1;
    for (int k = k_low; k <= k_high; ++k)
        for (int j = 0; j < domain.cells_y; ++j)
            for (int i = 0; i < domain.cells_x; ++i) {
                const double phi = signed_distance(domain.node(i, j, k));
                if (!(std::fabs(phi) <= reach)) continue;
                band.cells.push_back({i, j, k});
                band.phi.push_back(phi);
            }
    connect(band);
    state_->index.build(band);
}

Front::Front(Band&& band) : state_(std::make_unique<State>()) {
    state_->band = std::move(band);
    connect(state_->band);
    state_->index.build(state_->band);
}

Front::Front(const Front& other) : state_(std::make_unique<State>(*other.state_)) {}
Front::Front(Front&&) noexcept = default;
Front& Front::operator=(const Front& other) {
    if (this != &other) state_ = std::make_unique<State>(*other.state_);
    return *this;
}
Front& Front::operator=(Front&&) noexcept = default;
Front::~Front() = default;

const Domain& Front::domain() const {
    return state_->band.domain;
}
const Band& Front::band() const {
    return state_->band;
}
Band& Front::band() {
    return state_->band;
}

double Front::distance(const Vec3& p) const {
    const Band& band = state_->band;
    const Domain& d = band.domain;
    const double u[3] = {(p.x - d.x_min()) / d.spacing - 0.5,
                         d.planar_contour() ? 0.0 : (p.y - d.y_min()) / d.spacing - 0.5,
                         p.z / d.spacing - 0.5};
    int low[3];
    double part[3];
    for (int a = 0; a < 3; ++a) {
        low[a] = static_cast<int>(std::floor(u[a]));
        part[a] = u[a] - low[a];
    }
    double sum = 0;
    for (int corner = 0; corner < 8; ++corner) {
        double weight = 1;
        for (int a = 0; a < 3; ++a)
            weight *= (corner >> a & 1) ? part[a] : 1 - part[a];
        if (weight == 0) continue;
        const int i = fold_index(low[0] + (corner & 1), d.cells_x, d.sides);
        const int j =
            d.planar_contour() ? 0 : fold_index(low[1] + (corner >> 1 & 1), d.cells_y, d.sides);
        sum += weight * state_->index.phi(band, i, j, low[2] + (corner >> 2 & 1));
    }
    return sum;
}

void Front::rebuild() {
    retopologise(state_->band, 2);
    state_->index.build(state_->band);
}

std::size_t Front::memory_bytes() const {
    const Band& band = state_->band;
    return sizeof(State) + band.cells.capacity() * sizeof(Band::Cell) +
           band.phi.capacity() * sizeof(double) +
           band.neighbour.capacity() * sizeof(band.neighbour[0]) + state_->index.memory_bytes();
}

void Front::save(std::ostream& out) const {
    const Band& band = state_->band;
    const Domain& d = band.domain;
    const std::int32_t shape[4] = {static_cast<std::int32_t>(d.symmetry),
                                   static_cast<std::int32_t>(d.sides), d.cells_x, d.cells_y};
    const std::uint64_t count = band.size();
    put(out, file_mark, sizeof file_mark);
    put(out, shape, 4);
    put(out, &d.spacing, 1);
    put(out, &count, 1);
    put(out, band.cells.data(), band.size());
    put(out, band.phi.data(), band.size());
}

Front Front::load(std::istream& in) {
    char mark[sizeof file_mark];
    get(in, mark, sizeof mark);
    if (std::memcmp(mark, file_mark, sizeof mark) != 0)
        throw NumericsError("this is not a saved front of this version");
    Band band;
    std::int32_t shape[4];
    std::uint64_t count = 0;
    get(in, shape, 4);
    get(in, &band.domain.spacing, 1);
    get(in, &count, 1);
    band.domain.symmetry = static_cast<Symmetry>(shape[0]);
    band.domain.sides = static_cast<Sides>(shape[1]);
    band.domain.cells_x = shape[2];
    band.domain.cells_y = shape[3];
    band.cells.resize(count);
    band.phi.resize(count);
    get(in, band.cells.data(), count);
    get(in, band.phi.data(), count);
    return Front(std::move(band));
}

} // namespace rille::geometry
