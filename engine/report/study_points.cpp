// SPDX-License-Identifier: Apache-2.0
#include "engine/report/study_parts.hpp"
#include "engine/study/study_names.hpp"
#include "engine/svg.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>
#include <map>

namespace rille::engine {
namespace {

using nlohmann::json;
using Role = StudyTableColumn::Role;

constexpr std::size_t most_profiles = 300, most_failures = 200;

const char* role_word(Role role) {
    switch (role) {
    case Role::point:
        return "point";
    case Role::status:
        return "status";
    case Role::input:
        return "input";
    case Role::metric:
        return "metric";
    case Role::error:
        return "error";
    case Role::target:
        return "target";
    case Role::failure:
        return "failure";
    case Role::seconds:
        return "seconds";
    default:
        return "other";
    }
}

std::string column_label(const StudyView& view, std::size_t column) {
    const StudyTableColumn& c = view.table.columns[column];
    std::string label = c.label;
    if (c.role == Role::metric) return view.metric_name(column);
    if (c.role == Role::error) return view.metric_name(column) + " error";
    if (c.role == Role::target) return "target: " + view.metric_name(column);
    std::replace(label.begin(), label.end(), c.role == Role::input ? '.' : '_', ' ');
    return label;
}

json column_json(const StudyView& view, std::size_t column) {
    const StudyTableColumn& c = view.table.columns[column];
    json out = {
        {"name", c.name}, {"label", column_label(view, column)}, {"role", role_word(c.role)}};
    if (!c.unit.empty() && c.unit != "1") out["unit"] = c.unit;
    if (c.role == Role::metric) {
        const auto error = view.table.error_of(column);
        if (error) out["error"] = *error;
    }
    const bool shown = c.role == Role::point || c.role == Role::status || c.role == Role::input ||
                       c.role == Role::target || c.role == Role::seconds || column == view.y;
    if (shown) out["shown"] = true;
    return out;
}

/// A number as JSON, with the digits that it has in the file.
void add_number(std::string& out, std::string_view text, const std::optional<double>& number) {
    if (!number || !std::isfinite(*number)) {
        out += "null";
        return;
    }
    const std::size_t first = text[0] == '-' ? 1 : 0;
    const bool is_json = first < text.size() && text[first] >= '0' && text[first] <= '9' &&
                         (text[first] != '0' || text.size() == first + 1 ||
                          text[first + 1] == '.' || text[first + 1] == 'e') &&
                         text.back() != '.';
    out += is_json ? std::string(text) : json(*number).dump();
}

/// One column: numbers as a list, words as a list of words and an index into it for each row.
std::string cells_json(const StudyTable& table, std::size_t column) {
    const Role role = table.columns[column].role;
    bool numbers = role != Role::point && role != Role::failure;
    for (std::size_t row = 0; row < table.rows() && numbers; ++row)
        numbers = table.text(row, column).empty() || table.number(row, column);
    std::string out = "[";
    if (numbers) {
        for (std::size_t row = 0; row < table.rows(); ++row) {
            if (row) out += ',';
            add_number(out, table.text(row, column), table.number(row, column));
        }
        return out + "]";
    }
    std::map<std::string, std::size_t, std::less<>> index;
    json words = json::array();
    for (std::size_t row = 0; row < table.rows(); ++row) {
        const std::string_view text = table.text(row, column);
        auto found = index.find(text);
        if (found == index.end()) {
            found = index.emplace(std::string(text), words.size()).first;
            words.push_back(std::string(text));
        }
        out += (row ? "," : "") + std::to_string(found->second);
    }
    return "{\"words\":" + words.dump(-1, ' ', false, json::error_handler_t::replace) +
           ",\"at\":" + out + "]}";
}

std::string status_options(const StudyView& view) {
    const std::pair<const char*, std::size_t> all[] = {
        {study_names::done, view.counts.done},
        {study_names::not_cleared, view.counts.not_cleared},
        {study_names::clogged, view.counts.clogged},
        {study_names::failed, view.counts.failed},
        {study_names::killed, view.counts.killed}};
    std::string html = "<option value=\"\">all</option>";
    for (const auto& [word, count] : all)
        if (count > 0) html += fmt::format("<option value=\"{0}\">{0} ({1})</option>", word, count);
    return html;
}

} // namespace

std::string points_json(const StudyView& view) {
    const StudyTable& table = view.table;
    json columns = json::array();
    std::string cells;
    for (std::size_t c = 0; c < table.columns.size(); ++c) {
        columns.push_back(column_json(view, c));
        cells += (c ? "," : "") + cells_json(table, c);
    }
    return "{\"rows\":" + std::to_string(table.rows()) +
           ",\"y\":" + (view.y ? std::to_string(*view.y) : "null") +
           ",\"columns\":" + columns.dump(-1, ' ', false, json::error_handler_t::replace) +
           ",\"cells\":[" + cells + "]}";
}

PageSection points_section(const StudyParts& p, Page& page) {
    PageSection section{"points", "All points", "", false};
    if (p.view.table.rows() == 0) return section;
    std::size_t stride = 1;
    json profiles = {{"outlines", p.shelf.json_of(most_profiles, stride)},
                     {"stride", stride},
                     {"folder", std::string(study_names::points) + "/"}};
    page.data.push_back({"study-points", points_json(p.view)});
    page.data.push_back({"study-profiles", profiles.dump()});
    section.html =
        "<div class=\"points\" id=\"points-table\">\n<p class=\"filters screen-only\"><label>Show "
        "rows with <input type=\"search\" class=\"words\" size=\"24\" autocomplete=\"off\" "
        "aria-describedby=\"points-help\"></label> <label>status <select class=\"status\">" +
        status_options(p.view) +
        "</select></label> <span class=\"count\" role=\"status\"></span></p>\n"
        "<details class=\"columns screen-only\"><summary>Columns</summary><div></div></details>\n"
        "<p class=\"soft screen-only\" id=\"points-help\">Words to be found anywhere in a row, or "
        "a "
        "column with a bound: <code>amplitude&gt;300</code>. A column's name sorts by it. A "
        "point's "
        "name shows its profile and all of its values.</p>\n"
        "<div class=\"window\" "
        "tabindex=\"-1\"><table><thead></thead><tbody></tbody></table></div>\n"
        "<p class=\"tools\"><button type=\"button\" class=\"copy\">Copy table</button> <button "
        "type=\"button\" class=\"tsv\">TSV</button> <a href=\"" +
        std::string(study_names::results) +
        "\">results.csv</a></p>\n</div>\n<noscript><p>Without scripts the points are in the file "
        "results.csv beside this page.</p></noscript>\n";
    if (stride > 1)
        section.html += fmt::format(
            "<p class=\"soft\">Profiles of every {}th point are in this page; those of the others "
            "are in their folders, which are linked where a point is shown.</p>\n",
            stride);
    return section;
}

PageSection failures_section(const StudyParts& p) {
    const StudyView& view = p.view;
    PageSection section{"failures", "Points without a result", "", false};
    DataTable table;
    table.id = "failures-table";
    table.columns = {{"point", false, "", true}, {"status"}};
    for (const StudyAxis& axis : view.axes)
        if (!axis.is_linked)
            table.columns.push_back(
                {axis.title + (axis.unit.empty() ? "" : " (" + axis.unit + ")"), axis.has_numbers});
    table.columns.push_back({"reason"});
    const auto reason = view.table.find(Role::failure);
    std::size_t count = 0;
    for (std::size_t row = 0; row < view.table.rows(); ++row) {
        if (view.has_result(row) || ++count > most_failures) continue;
        std::vector<DataTable::Cell> cells;
        DataTable::Cell name{view.point(row)};
        name.html = "<button type=\"button\" class=\"choose\" data-point=\"" + std::to_string(row) +
                    "\">" + escaped(view.point(row)) + "</button>";
        cells.push_back(name);
        cells.push_back({view.status(row)});
        for (const StudyAxis& axis : view.axes)
            if (!axis.is_linked)
                cells.push_back(
                    {axis.labels[axis.level[row]], std::string(view.table.text(row, axis.column))});
        cells.push_back({reason ? std::string(view.table.text(row, *reason)) : ""});
        table.rows.push_back(cells);
    }
    if (count == 0) return section;
    section.html = table_html(table);
    if (count > most_failures)
        section.html +=
            fmt::format("<p>{} more are in the table above.</p>\n", count - most_failures);
    return section;
}

} // namespace rille::engine
