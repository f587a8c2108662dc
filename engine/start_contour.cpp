// SPDX-License-Identifier: Apache-2.0
#include "engine/start_contour.hpp"

#include "engine/csv_rows.hpp"
#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace rille::engine {
namespace {

constexpr double deg = 3.14159265358979323846 / 180;
constexpr double joined_cells = 1e-6; ///< points this near are the same
constexpr double level_cells = 1;     ///< an end this far from its side is continued level
constexpr std::size_t traced = 30;    ///< contours of fewer points are drawn by hand

using geometry::Domain;
using geometry::Polyline;
using Point = std::array<double, 2>;

/// Lines with the place in the file of every point.
struct PlacedLines {
    std::vector<Polyline> lines;
    std::vector<std::vector<Location>> at;
};

/// First columns of a profile that a run has left.
std::vector<std::string> profile_columns(bool revolved) {
    return {
        revolved ? "r_nm" : "x_nm", "z_nm", "arc_length_nm", "normal_deg", "length_nm", "chain"};
}

bool is_profile(const CsvRows& csv, bool revolved) {
    const auto names = profile_columns(revolved);
    if (csv.rows.empty() || csv.rows[0].size() < names.size()) return false;
    for (std::size_t c = 0; c < names.size(); ++c)
        if (csv.rows[0][c].text != names[c]) return false;
    return true;
}

class StartReader {
public:
    StartReader(const CsvRows& csv, const ContourFrame& frame, const Domain& domain,
                std::vector<std::string>& warnings, Problems& problems)
        : csv_(csv), frame_(frame), domain_(domain), warnings_(warnings), problems_(problems),
          left_(domain.x_min()), right_(domain.x_min() + domain.width_x()), h_(domain.spacing) {}

    StartContour read() {
        StartContour contour;
        contour.source = csv_.name;
        const std::size_t before = problems_.size();
        if (is_profile(csv_, frame_.revolved))
            read_profile();
        else
            read_points();
        if (problems_.size() == before) check_place();
        if (problems_.size() == before) join_sides();
        if (problems_.size() == before) check_crossing();
        if (problems_.size() != before) return contour;
        const double margin = 4 * h_;
        contour.low = HUGE_VAL;
        contour.high = -HUGE_VAL;
        for (const Polyline& line : found_.lines)
            for (const Point& p : line) {
                contour.low = std::min(contour.low, p[1] - margin);
                contour.high = std::max(contour.high, p[1] + margin);
            }
        contour.lines = std::move(found_.lines);
        return contour;
    }

private:
    void wrong(const Location& at, const std::string& what) { problems_.add(at, "", what); }
    static double apart(const Point& a, const Point& b) {
        return std::hypot(a[0] - b[0], a[1] - b[1]);
    }
    static std::string text(const Point& p) {
        return fmt::format("({:.4g}, {:.4g}) nm", p[0], p[1]);
    }

    void read_points() {
        const auto points = contour_points(csv_, frame_, problems_);
        if (points.empty()) return;
        found_.lines.emplace_back();
        found_.at.emplace_back();
        for (std::size_t i = 0; i < points.size(); ++i) {
            const Location& at = csv_.rows[i + 1][0].at;
            Polyline& line = found_.lines.back();
            if (!line.empty() && apart(line.back(), points[i]) <= joined_cells * h_) continue;
            line.push_back(points[i]);
            found_.at.back().push_back(at);
        }
        find_gaps();
    }

    /// A step far longer than the others of a traced contour.
    void find_gaps() {
        const Polyline& line = found_.lines.front();
        if (line.size() < traced) return;
        std::vector<double> steps;
        for (std::size_t i = 0; i + 1 < line.size(); ++i)
            steps.push_back(apart(line[i], line[i + 1]));
        std::vector<double> sorted = steps;
        std::sort(sorted.begin(), sorted.end());
        const double usual = sorted[sorted.size() * 9 / 10];
        for (std::size_t i = 0; i < steps.size(); ++i)
            if (steps[i] > 10 * usual && steps[i] > 5 * h_)
                wrong(
                    found_.at.front()[i + 1],
                    fmt::format("an open gap of {:.4g} nm from {} to {}; the points are {:.3g} nm "
                                "apart as a rule. A straight piece needs points on it",
                                steps[i], text(line[i]), text(line[i + 1]), usual));
    }

    /// Middles, lengths and normals of the elements give their ends.
    void read_profile() {
        struct Element {
            Point start, end;
            int chain;
            Location at;
        };
        std::vector<Element> elements;
        const std::size_t before = problems_.size();
        for (std::size_t r = 1; r < csv_.rows.size(); ++r) {
            const CsvRow& row = csv_.rows[r];
            const std::size_t chain = frame_.revolved ? 6 : 5;
            if (row.size() <= chain) {
                wrong(row[0].at, fmt::format("{} values in a row of a profile", row.size()));
                continue;
            }
            double v[5];
            for (int c = 0; c < 5; ++c)
                v[c] = csv_number(row[c], true, problems_);
            const double along_x = std::cos(v[3] * deg), along_z = -std::sin(v[3] * deg);
            const double half = 0.5 * v[4];
            const auto at = [&](double s) {
                return placed(frame_, v[0] + s * along_x, v[1] + s * along_z, false);
            };
            elements.push_back({at(-half), at(half),
                                static_cast<int>(csv_number(row[chain], true, problems_)),
                                row[0].at});
        }
        if (frame_.nm_per_px) wrong(csv_.rows[0][0].at, "the points are in nm: leave scale out");
        if (elements.size() < 2) wrong({csv_.name, 0, 0}, "holds fewer than two elements");
        if (problems_.size() != before) return;
        for (std::size_t e = 0; e < elements.size(); ++e) {
            const Element& now = elements[e];
            const bool goes_on = e > 0 && elements[e - 1].chain == now.chain &&
                                 joins(elements[e - 1].end, now.start, now.at);
            if (!goes_on) {
                found_.lines.push_back({now.start});
                found_.at.push_back({now.at});
            }
            found_.lines.back().push_back(now.end);
            found_.at.back().push_back(now.at);
        }
        close_voids();
        note_films();
    }

    /// Whether a chain goes on here; not where it leaves one side and comes in at the other.
    bool joins(const Point& end, const Point& start, const Location& at) {
        const double gap = apart(end, start), period = right_ - left_;
        if (gap <= 1e-3 * h_) return true;
        const bool across = domain_.sides == geometry::Sides::periodic &&
                            std::fabs(std::fabs(start[0] - end[0]) - period) <= 1e-3 * h_;
        if (!across)
            wrong(at, fmt::format("an open gap of {:.4g} nm from {} to {}", gap, text(end),
                                  text(start)));
        return false;
    }
    void close_voids() {
        for (Polyline& line : found_.lines)
            if (line.size() > 2 && apart(line.front(), line.back()) <= 1e-3 * h_)
                line.back() = line.front();
    }
    void note_films() {
        const CsvRow& names = csv_.rows[0];
        for (std::size_t c = 0; c < names.size(); ++c) {
            if (names[c].text.rfind("grown_", 0) != 0) continue;
            bool any = false;
            for (std::size_t r = 1; r < csv_.rows.size(); ++r)
                any = any || (c < csv_.rows[r].size() && csv_.rows[r][c].text != "0");
            if (any)
                warnings_.push_back(fmt::format(
                    "start: the profile in {} carries a film ({}), which is taken for what the "
                    "stack holds there",
                    csv_.name, names[c].text));
        }
    }

    void check_place() {
        for (std::size_t l = 0; l < found_.lines.size(); ++l)
            for (std::size_t i = 0; i < found_.lines[l].size(); ++i) {
                const Point& p = found_.lines[l][i];
                if (p[0] >= left_ - level_cells * h_ && p[0] <= right_ + level_cells * h_) continue;
                wrong(found_.at[l][i],
                      fmt::format("the point {} lies outside the period from {:.4g} to {:.4g} nm; "
                                  "scale and origin?",
                                  text(p), left_, right_));
                return;
            }
    }

    /// Lines from side to side must come to the sides; where a trace stops short they are continued
    /// level, and where it goes beyond they are cut.
    void join_sides() {
        Polyline& first = found_.lines.front();
        const auto& at = found_.at.front();
        const Point start = first.front(), end = first.back();
        const bool closed = start == end && first.size() > 2;
        if (closed) {
            wrong(at.front(), "the contour is closed; it must run from one side of the period to "
                              "the other");
            return;
        }
        if (start[0] > end[0]) {
            wrong(
                at.front(),
                fmt::format("the contour runs from right ({:.4g} nm) to left ({:.4g} nm), so that "
                            "the gas lies on its right; turn the order of the rows round",
                            start[0], end[0]));
            return;
        }
        for (std::size_t l = 0; l < found_.lines.size(); ++l) {
            Polyline& line = found_.lines[l];
            if (line.front() == line.back() && line.size() > 2) continue; // a void
            bring_to_side(l, true);
            bring_to_side(l, false);
        }
        const double step = std::fabs(first.front()[1] - found_.lines.front().back()[1]);
        if (domain_.sides == geometry::Sides::periodic && found_.lines.size() == 1 &&
            step > level_cells * h_)
            wrong(at.back(), fmt::format("an open gap across the side of the period: the contour "
                                         "begins at z = {:.4g} nm and ends at {:.4g} nm",
                                         first.front()[1], first.back()[1]));
    }
    void bring_to_side(std::size_t l, bool is_start) {
        Polyline& line = found_.lines[l];
        auto& places = found_.at[l];
        Point& end = is_start ? line.front() : line.back();
        const Location at = is_start ? places.front() : places.back();
        const double side = std::fabs(end[0] - left_) < std::fabs(end[0] - right_) ? left_ : right_;
        const double short_of = std::fabs(end[0] - side);
        const bool beyond = end[0] < left_ || end[0] > right_;
        if (short_of <= 1e-3 * h_ || (beyond && short_of <= level_cells * h_)) {
            end[0] = side;
            return;
        }
        if (short_of > level_cells * h_) {
            wrong(at, fmt::format("the contour does not span the period: it {} at x = {:.4g} nm, "
                                  "{:.4g} nm from the side at {:.4g} nm",
                                  is_start ? "begins" : "ends", end[0], short_of, side));
            return;
        }
        const Point level{side, end[1]};
        line.insert(is_start ? line.begin() : line.end(), level);
        places.insert(is_start ? places.begin() : places.end(), at);
    }

    void check_crossing() {
        const auto crossing = geometry::find_crossing(found_.lines);
        if (!crossing) return;
        const auto place = [&](std::size_t line, std::size_t piece) {
            const auto& at = found_.at[line];
            return at[std::min(piece, at.size() - 1)];
        };
        const Location other = place(crossing->line, crossing->piece);
        wrong(place(crossing->other_line, crossing->other_piece),
              fmt::format("the contour crosses itself at {}: the piece that starts here meets the "
                          "one of line {}",
                          text({crossing->x, crossing->z}), other.line));
    }

    const CsvRows& csv_;
    const ContourFrame& frame_;
    const Domain& domain_;
    std::vector<std::string>& warnings_;
    Problems& problems_;
    double left_, right_, h_;
    PlacedLines found_;
};

} // namespace

std::function<double(const geometry::Vec3&)> start_distance(const Domain& domain,
                                                            const StartContour& contour) {
    return geometry::polyline_distance(domain, contour.lines, 5 * domain.spacing);
}

StartContour read_start(const std::string& path, const ContourFrame& frame, const Domain& domain,
                        std::vector<std::string>& warnings, Problems& problems) {
    const std::size_t before = problems.size();
    const CsvRows csv = read_csv(path, path, problems);
    if (problems.size() != before) return {};
    return StartReader(csv, frame, domain, warnings, problems).read();
}

} // namespace rille::engine
