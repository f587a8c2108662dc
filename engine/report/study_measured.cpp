// SPDX-License-Identifier: Apache-2.0
#include "engine/report/study_measured.hpp"

#include "engine/csv_rows.hpp"
#include "engine/units.hpp"
#include "engine/words.hpp"

#include <cmath>
#include <cstdlib>
#include <filesystem>

namespace rille::engine {
namespace {

using nlohmann::json;

struct Heading {
    std::string name, unit; ///< "amplitude", "V" of "amplitude [V]"
};

Heading heading_of(const std::string& text) {
    const std::size_t open = text.find('[');
    if (open == std::string::npos || text.back() != ']') return {trimmed(text), ""};
    return {trimmed(text.substr(0, open)), trimmed(text.substr(open + 1, text.size() - open - 2))};
}

bool ends_path(const std::string& end, const std::string& path) {
    if (end == path) return true;
    const std::string tail = "." + end;
    return path.size() > tail.size() &&
           path.compare(path.size() - tail.size(), tail.size(), tail) == 0;
}

/// Factor from one unit to another; nothing where no dimension has both.
std::optional<double> unit_factor(const std::string& from, const std::string& to) {
    if (from == to) return 1;
    for (int d = 0; d <= static_cast<int>(Dimension::rate); ++d) {
        const UnitDefinition *a = nullptr, *b = nullptr;
        for (const UnitDefinition& unit : units_of(static_cast<Dimension>(d))) {
            if (unit.text == from) a = &unit;
            if (unit.text == to) b = &unit;
        }
        if (a && b && a->offset == 0 && b->offset == 0) return a->factor / b->factor;
    }
    return std::nullopt;
}

/// A cell in the wanted unit; its own unit goes before that of the heading.
std::optional<double> cell_number(const std::string& cell, const std::string& heading_unit,
                                  const std::string& wanted) {
    char* end = nullptr;
    const double value = std::strtod(cell.c_str(), &end);
    if (end == cell.c_str()) return std::nullopt;
    std::string unit = trimmed(end);
    if (unit.empty()) unit = heading_unit;
    if (unit.empty() || unit == "1") return value;
    const auto factor = unit_factor(unit, wanted);
    return factor ? std::optional(value * *factor) : std::nullopt;
}

struct JoinColumn {
    std::size_t in_file = 0;
    std::string unit;
    const StudyAxis* axis = nullptr;
};

class MeasuredReader {
public:
    MeasuredReader(const StudyView& view, const json& comparison)
        : view_(view), comparison_(comparison) {}

    MeasuredRows read() {
        Problems problems;
        const std::string file = comparison_.value("file", "");
        const CsvRows csv =
            read_csv((std::filesystem::path(view_.table.folder) / file).string(), file, problems);
        if (problems.size() > 0 || csv.rows.size() < 2)
            return failed(file + " cannot be read or holds no rows");
        for (const CsvCell& cell : csv.rows[0])
            headings_.push_back(heading_of(cell.text));
        const auto value = column("value"), sigma = column("sigma"), sites = column("sites");
        if (!value) return failed(file + " has no column " + comparison_.value("value", ""));
        if (!find_joins()) return failed(file + " lacks a column that its rows are joined by");
        tolerance_ = comparison_.value("tolerance", 1e-6);
        MeasuredRows found;
        for (std::size_t i = 1; i < csv.rows.size(); ++i) {
            const CsvRow& row = csv.rows[i];
            const auto number = [&](const std::optional<std::size_t>& c, const std::string& unit) {
                return c && *c < row.size() ? cell_number(row[*c].text, headings_[*c].unit, unit)
                                            : std::nullopt;
            };
            MeasuredRow measured{fitting(row), 0, number(sigma, view_.y_unit()),
                                 number(sites, "1")};
            const auto mean = number(value, view_.y_unit());
            if (!mean || measured.rows.empty()) {
                ++found.unmatched;
                continue;
            }
            measured.value = *mean;
            found.rows.push_back(std::move(measured));
        }
        return found;
    }

private:
    static MeasuredRows failed(const std::string& problem) { return {{}, 0, problem}; }

    std::optional<std::size_t> column(const char* key) const {
        const std::string name = comparison_.value(key, "");
        for (std::size_t c = 0; c < headings_.size() && !name.empty(); ++c)
            if (headings_[c].name == name) return c;
        return std::nullopt;
    }

    bool find_joins() {
        for (const json& index : comparison_.value("join", json::array())) {
            if (!index.is_number_unsigned() || index.get<std::size_t>() >= view_.axes.size())
                return false;
            const StudyAxis& axis = view_.axes[index.get<std::size_t>()];
            const std::string& path = view_.table.columns[axis.column].path;
            std::optional<std::size_t> found;
            for (std::size_t c = 0; c < headings_.size() && !found; ++c)
                if (ends_path(headings_[c].name, path)) found = c;
            if (!found) return false;
            joins_.push_back({*found, headings_[*found].unit, &axis});
        }
        return !joins_.empty();
    }

    /// Points whose values are those of the row.
    std::vector<std::size_t> fitting(const CsvRow& row) const {
        std::vector<std::size_t> rows;
        for (std::size_t r = 0; r < view_.table.rows(); ++r) {
            bool fits = true;
            for (const JoinColumn& join : joins_)
                fits = fits && join.in_file < row.size() && agrees(row[join.in_file].text, join, r);
            if (fits) rows.push_back(r);
        }
        return rows;
    }

    bool agrees(const std::string& cell, const JoinColumn& join, std::size_t row) const {
        const StudyAxis& axis = *join.axis;
        const auto point = view_.table.number(row, axis.column);
        if (!point) return view_.table.text(row, axis.column) == cell;
        const auto wanted = cell_number(cell, join.unit, axis.unit);
        return wanted && std::fabs(*wanted - *point) <=
                             tolerance_ * std::max(std::fabs(*wanted), std::fabs(*point));
    }

    const StudyView& view_;
    const json& comparison_;
    std::vector<Heading> headings_;
    std::vector<JoinColumn> joins_;
    double tolerance_ = 1e-6;
};

} // namespace

MeasuredRows measured_rows(const StudyView& view) {
    if (!view.y || !view.manifest.is_object()) return {};
    const json comparison = view.manifest.value("comparison", json());
    if (!comparison.is_object()) return {};
    return MeasuredReader(view, comparison).read();
}

} // namespace rille::engine
