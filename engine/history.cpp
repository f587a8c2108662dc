// SPDX-License-Identifier: Apache-2.0
#include "engine/history.hpp"

#include "engine/case.hpp"
#include "engine/number_text.hpp"

namespace rille::engine {
namespace {

constexpr double seconds_per_minute = 60;

/// Headers and values are written by one walk over the columns, so that they cannot part.
class Line {
public:
    Line(bool header) : header_(header) {}

    void add(const std::string& name, const std::string& value) {
        if (!text_.empty()) text_ += ',';
        text_ += header_ ? name : csv_field(value);
    }
    void add(const std::string& name, double value) { add(name, shortest(value)); }
    void add(const std::string& name, const std::optional<double>& value) {
        add(name, value ? shortest(*value) : std::string());
    }
    void add_count(const std::string& name, std::uint64_t value) {
        add(name + "_count", std::to_string(value));
    }
    std::string text() const { return text_ + '\n'; }

private:
    bool header_;
    std::string text_;
};

void add_feature(Line& line, const Case& c, const std::string& feature, const FeatureRow& row) {
    line.add(feature + "_depth_centre_nm", row.depth_centre);
    line.add(feature + "_depth_deepest_nm", row.depth_deepest);
    std::size_t place = 0;
    for (const auto& named : c.cd_places) {
        const bool known = place < row.cd.size();
        line.add(feature + "_cd_" + column_name(named.first) + "_nm",
                 known ? row.cd[place] : std::optional<double>());
        ++place;
    }
    line.add(feature + "_mask_left_nm", row.mask_left);
}

std::string line_of(const Case& c, const HistoryRow& row, bool header) {
    Line line(header);
    line.add("time_s", row.time_s);
    line.add("step", row.step);
    line.add("step_time_s", row.step_time_s);
    line.add("time_step_s", row.time_step_s);
    line.add_count("sub_steps", row.sub_steps);
    for (std::size_t f = 0; f < c.mask.openings.size(); ++f)
        add_feature(line, c, history_name(c, f),
                    f < row.features.size() ? row.features[f] : FeatureRow());
    line.add("highest_rate_nm_per_min", row.highest_rate * seconds_per_minute);
    line.add("lowest_rate_nm_per_min", row.lowest_rate * seconds_per_minute);
    line.add_count("elements", row.elements);
    line.add_count("iterations", row.iterations);
    line.add("sticking_residual_1", row.residual);
    line.add("largest_move_cells", row.largest_move);
    line.add("redistance_shift_cells", row.redistance_shift);
    line.add_count("rays", row.rays);
    line.add_count("lost_rays", row.lost_rays);
    return line.text();
}

} // namespace

std::string history_name(const Case& c, std::size_t opening) {
    const std::string& name = c.mask.openings[opening].name;
    return name.empty() ? "opening" + std::to_string(opening + 1) : column_name(name);
}

std::string history_csv(const Case& c, const std::vector<HistoryRow>& rows) {
    std::string text = line_of(c, HistoryRow(), true);
    for (const HistoryRow& row : rows)
        text += line_of(c, row, false);
    return text;
}

} // namespace rille::engine
