// SPDX-License-Identifier: Apache-2.0
#include "engine/ion_table_file.hpp"

#include "engine/csv_rows.hpp"
#include "engine/units.hpp"
#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numeric>

namespace rille::engine {

namespace {

constexpr double pi = 3.14159265358979323846;

using Cell = CsvCell;
using Row = CsvRow;

struct TableReader {
    std::string name;
    Problems& problems;
    IonTable table;
    std::vector<Row> rows;
    Location quantity_at;

    void split(const CsvRows& csv) {
        rows = csv.rows;
        for (const auto& [key, cell] : csv.header)
            read_header(key, cell.text, cell.at);
    }

    void read_header(const std::string& key, const std::string& value, const Location& at) {
        static const std::vector<std::string> known = {
            "quantity",       "species",          "mass_amu",         "charge",
            "total_flux_m2s", "angle_convention", "energy_reference", "source"};
        if (std::find(known.begin(), known.end(), key) == known.end()) {
            problems.add(at, key,
                         fmt::format("unknown header key; allowed: {}{}", listed(known),
                                     did_you_mean(key, known)));
            return;
        }
        if (key == "quantity") quantity_at = at;
        table.header[key] = value;
        check_header(key, value, at);
    }

    void check_header(const std::string& key, const std::string& value, const Location& at) {
        if (key == "energy_reference" && value != "wafer" && value != "at wafer")
            problems.add(at, key,
                         fmt::format("{}: energies must refer to the wafer", quoted(value)));
        if (key == "angle_convention" && value != "polar")
            problems.add(at, key,
                         fmt::format("{}: angles must be polar angles from the surface normal "
                                     "(polar); projected angles are another distribution",
                                     quoted(value)));
        if (key == "charge" && value != "1" && value != "+1")
            problems.add(
                at, key,
                fmt::format("{}: only singly charged ions (1) are followed", quoted(value)));
        if (key == "mass_amu" || key == "total_flux_m2s") {
            const NumberText number = split_number(value);
            if (!number.error.empty() || !number.unit.empty() || !(number.value > 0))
                problems.add(at, key, fmt::format("{}: a number above 0 is due", quoted(value)));
        }
    }

    double number(const Cell& cell) { return csv_number(cell, false, problems); }

    void edge(std::vector<double>& edges, const Cell& cell) {
        const std::size_t before = problems.size();
        const double value = number(cell);
        if (problems.size() != before) return;
        if (!edges.empty() && !(value > edges.back()))
            problems.add(cell.at, "",
                         fmt::format("{} does not exceed the edge {:.12g} before it",
                                     quoted(cell.text), edges.back()));
        else
            edges.push_back(value);
    }

    /// Drops a row of column names; true if the row count and widths make sense.
    bool columns(const std::vector<std::string>& names) {
        if (!rows.empty() && rows[0][0].text == names[0]) rows.erase(rows.begin());
        for (const Row& row : rows)
            if (row.size() != names.size()) {
                problems.add(row[0].at, "",
                             fmt::format("{} values in a row of {} ({})", row.size(), names.size(),
                                         listed(names)));
                return false;
            }
        return true;
    }

    void read_bins() {
        if (!columns({"E_lo_eV", "E_hi_eV", "weight"})) return;
        auto& edges = table.energy_edges_ev;
        for (const Row& row : rows) {
            const double low = number(row[0]);
            if (edges.empty()) {
                edges.push_back(low);
            } else if (low > edges.back()) { // a gap between bins holds nothing
                edges.push_back(low);
                table.weight.push_back({0});
            } else if (low < edges.back()) {
                problems.add(row[0].at, "",
                             fmt::format("{} lies below the upper edge {:.12g} of the bin before",
                                         quoted(row[0].text), edges.back()));
            }
            edge(edges, row[1]);
            table.weight.push_back({number(row[2])});
        }
    }

    void read_points() {
        if (!columns({"E_eV", "value"})) return;
        std::vector<double> value;
        for (const Row& row : rows) {
            edge(table.energy_edges_ev, row[0]);
            value.push_back(number(row[1]));
        }
        if (rows.size() < 2 || value.size() != table.energy_edges_ev.size()) return;
        for (std::size_t i = 0; i + 1 < value.size(); ++i) {
            const double width = table.energy_edges_ev[i + 1] - table.energy_edges_ev[i];
            table.weight.push_back({0.5 * (value[i] + value[i + 1]) * width});
        }
    }

    void read_matrix(const std::string& quantity) {
        if (rows.size() < 3) return;
        for (std::size_t c = 1; c < rows[0].size(); ++c)
            edge(table.angle_edges_deg, rows[0][c]);
        if (!table.angle_edges_deg.empty() && table.angle_edges_deg.back() > 90)
            problems.add(rows[0].back().at, "", "angles end at 90 deg");
        const std::size_t width = rows[0].size() - 1; // lower energy edge and the angle bins
        for (std::size_t r = 1; r < rows.size(); ++r) {
            edge(table.energy_edges_ev, rows[r][0]);
            const std::size_t due = r + 1 == rows.size() ? 1 : width;
            if (rows[r].size() != due) {
                problems.add(rows[r][0].at, "",
                             fmt::format("{} values in a row of {} ({})", rows[r].size(), due,
                                         due == 1 ? "the upper edge of the last energy bin"
                                                  : "energy edge and one for each angle bin"));
                continue;
            }
            if (due == 1) break;
            std::vector<double> line;
            for (std::size_t c = 1; c < width; ++c)
                line.push_back(number(rows[r][c]));
            table.weight.push_back(std::move(line));
        }
        if (problems.empty()) integrate_bins(quantity);
    }

    void integrate_bins(const std::string& quantity) {
        for (std::size_t e = 0; e < table.weight.size(); ++e)
            for (std::size_t a = 0; a < table.weight[e].size(); ++a) {
                const double energy = table.energy_edges_ev[e + 1] - table.energy_edges_ev[e];
                const double low = table.angle_edges_deg[a], high = table.angle_edges_deg[a + 1];
                const double sr = 2 * pi * (std::cos(low * pi / 180) - std::cos(high * pi / 180));
                if (quantity == "per_eV_per_sr") table.weight[e][a] *= sr * energy;
                if (quantity == "per_eV_per_deg") table.weight[e][a] *= (high - low) * energy;
            }
    }

    void read() {
        static const std::vector<std::string> quantities = {
            "flux_fraction_per_bin", "flux_per_eV", "per_bin", "per_eV_per_sr", "per_eV_per_deg"};
        const std::string quantity = table.header["quantity"];
        if (std::find(quantities.begin(), quantities.end(), quantity) == quantities.end()) {
            problems.add(quantity.empty() ? Location{name, 0, 0} : quantity_at, "quantity",
                         fmt::format("{}; one of {} is due{}",
                                     quantity.empty() ? "the header line # quantity=... is missing"
                                                      : quoted(quantity),
                                     listed(quantities), did_you_mean(quantity, quantities)));
            return;
        }
        if (quantity == "flux_fraction_per_bin")
            read_bins();
        else if (quantity == "flux_per_eV")
            read_points();
        else
            read_matrix(quantity);
        if (problems.empty() && table.weight.empty())
            problems.add({name, 0, 0}, "", "the table holds no bins");
    }

    void finish() {
        table.sum = 0;
        for (const auto& line : table.weight)
            table.sum += std::accumulate(line.begin(), line.end(), 0.0);
        if (!(table.sum > 0) || !std::isfinite(table.sum)) {
            problems.add({name, 0, 0}, "", "the values must add up to more than 0");
            return;
        }
        for (auto& line : table.weight)
            for (double& value : line)
                value /= table.sum;
        add_warnings();
    }

    void add_warnings() {
        if (std::abs(table.sum - 1) > 1e-6)
            table.warnings.push_back(
                fmt::format("{}: the flux adds up to {:.6g}; divided by that", name, table.sum));
        double last = 0, oblique = 0;
        for (const double value : table.weight.back())
            last += value;
        for (const auto& line : table.weight)
            for (std::size_t a = 0; a < table.angle_edges_deg.size() && a < line.size(); ++a)
                if (table.angle_edges_deg[a] >= 60) oblique += line[a];
        if (last > 0.01)
            table.warnings.push_back(fmt::format("{}: {:.3g} % of the ions sit in the last energy "
                                                 "bin; is the table cut off?",
                                                 name, 100 * last));
        if (oblique > 0.01)
            table.warnings.push_back(
                fmt::format("{}: {:.3g} % of the ions arrive beyond 60 deg", name, 100 * oblique));
        if (table.header["source"].empty())
            table.warnings.push_back(
                fmt::format("{}: no # source= line says where it is from", name));
    }
};

std::optional<IonTable> table_of(const CsvRows& csv, Problems& problems) {
    Problems own;
    TableReader reader{csv.name, own, {}, {}, {}};
    reader.split(csv);
    reader.read();
    if (own.empty()) reader.finish();
    for (const Problem& problem : own.sorted())
        problems.add({problem.file, problem.line, problem.column}, problem.path, problem.message);
    if (!own.empty()) return std::nullopt;
    return std::move(reader.table);
}

} // namespace

std::optional<IonTable> parse_ion_table(const std::string& text, const std::string& shown,
                                        Problems& problems) {
    return table_of(split_csv(text, shown), problems);
}

std::optional<IonTable> read_ion_table(const std::string& path, const std::string& shown,
                                       Problems& problems) {
    const std::size_t before = problems.size();
    const CsvRows csv = read_csv(path, shown, problems);
    return problems.size() == before ? table_of(csv, problems) : std::nullopt;
}

fluxes::IonDistribution distribution_of(const IonTable& table, double transverse_ev) {
    if (!table.angle_edges_deg.empty())
        return fluxes::IonDistribution::histogram(table.energy_edges_ev, table.angle_edges_deg,
                                                  table.weight);
    // Edges at equal steps of tan(theta) up to where the slowest ions with weight have all but
    // 1e-6 of theirs, with one last bin up to 90 deg.
    std::size_t first = 0;
    while (table.weight[first][0] <= 0)
        ++first;
    const auto middle = [&](std::size_t e) {
        return 0.5 * (table.energy_edges_ev[e] + table.energy_edges_ev[e + 1]);
    };
    const double slow = std::max(middle(first), 1e-6);
    const double spread = std::max(transverse_ev, 1e-9);
    const double sine = std::min(std::sqrt(spread / slow * std::log(1e6)), 0.999);
    constexpr int bins = 96;
    std::vector<double> edges;
    for (int a = 0; a <= bins; ++a) {
        // Quadratic steps: fast ions, whose spread is narrow, need fine bins near the normal.
        const double part = static_cast<double>(a) / bins;
        edges.push_back(std::atan(std::tan(std::asin(sine)) * part * part) * 180 / pi);
    }
    edges.push_back(90);
    std::vector<std::vector<double>> weight(table.weight.size());
    for (std::size_t e = 0; e < weight.size(); ++e) {
        const double reach = middle(e) / spread;
        const auto within = [&](double deg) {
            const double s = std::sin(deg * pi / 180);
            return std::expm1(-reach * s * s) / std::expm1(-reach);
        };
        for (std::size_t a = 0; a + 1 < edges.size(); ++a)
            weight[e].push_back(table.weight[e][0] * (within(edges[a + 1]) - within(edges[a])));
    }
    return fluxes::IonDistribution::histogram(table.energy_edges_ev, edges, weight);
}

} // namespace rille::engine
