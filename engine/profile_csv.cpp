// SPDX-License-Identifier: Apache-2.0
#include "engine/profile_csv.hpp"

#include "engine/case.hpp"
#include "engine/number_text.hpp"

#include <boost/math/distributions/students_t.hpp>
#include <cmath>

namespace rille::engine {
namespace {

constexpr double seconds_per_minute = 60;
constexpr double degrees = 180 / 3.14159265358979323846;

/// Standard error of a mean from the deviations of its batches: SE^2 = sum w_b^2 / (B (B - 1)).
double standard_error(double sum_of_squares, double batches) {
    return std::sqrt(sum_of_squares / (batches * (batches - 1)));
}

/// Half-width of the 95 % interval in standard errors.
double student_factor(double batches) {
    const boost::math::students_t_distribution<double> student(batches - 1);
    return boost::math::quantile(student, 0.975);
}

/// 95 % sampling error of every element's position; empty where nothing is sampled.
std::vector<double> element_errors(const SurfaceState& state) {
    const auto batches = static_cast<double>(state.displacement.size());
    if (batches < 2) return {};
    const double factor = student_factor(batches);
    std::vector<double> errors(state.surface.size(), 0.0);
    for (const auto& batch : state.displacement)
        for (std::size_t e = 0; e < errors.size(); ++e)
            errors[e] += batch[e] * batch[e];
    for (double& error : errors)
        error = factor * standard_error(error, batches);
    return errors;
}

std::string name_at(const std::vector<std::string>& names, const std::vector<int>& index,
                    std::size_t element) {
    if (index.empty()) return "";
    const int i = index[element];
    return i >= 0 && i < static_cast<int>(names.size()) ? csv_field(names[i]) : "";
}

std::string header(const Case& c, const SurfaceState& state) {
    std::string text = c.domain.extruded() ? "x_nm,z_nm,arc_length_nm,normal_deg,length_nm,chain"
                       : c.domain.revolved()
                           ? "r_nm,z_nm,arc_length_nm,normal_deg,length_nm,area_nm2,chain"
                           : "x_nm,y_nm,z_nm,normal_x_1,normal_y_1,normal_z_1,area_nm2,chain";
    text += ",material,film";
    for (const int material : state.grown.material)
        text += ",grown_" + column_name(c.materials.at(material)) + "_nm";
    text += ",rate_nm_per_min,sampling_error_nm";
    for (const NamedField& field : state.fields)
        text += "," + column_name(field.name) + "_" + field.unit;
    return text + "\n";
}

std::string place(const Case& c, const SurfaceState& state, const std::vector<double>& arc,
                  std::size_t e) {
    const geometry::Surface& s = state.surface;
    const geometry::Vec3 p = s.centre[e], n = s.normal[e];
    std::string text = shortest(p.x);
    const auto add = [&](double value) { text += "," + shortest(value); };
    if (!c.domain.planar_contour()) add(p.y);
    add(p.z);
    if (c.domain.planar_contour()) {
        add(arc[e]);
        add(std::atan2(n.x, n.z) * degrees);
    } else {
        add(n.x);
        add(n.y);
        add(n.z);
    }
    if (c.domain.revolved()) add(s.length(static_cast<int>(e)));
    add(s.area[e]);
    return text + "," + std::to_string(s.chain.empty() ? 0 : s.chain[e]);
}

} // namespace

double sampling_error(const std::vector<double>& batch_deviation) {
    const double batches = static_cast<double>(batch_deviation.size());
    if (batches < 2) return 0;
    double sum = 0;
    for (const double w : batch_deviation)
        sum += w * w;
    return student_factor(batches) * standard_error(sum, batches);
}

std::vector<double> arc_length(const geometry::Surface& s) {
    std::vector<double> arc(s.size());
    double end = 0;
    for (std::size_t e = 0; e < s.size(); ++e) {
        // Elements of a chain are stored in walking order.
        if (e > 0 && !s.chain.empty() && s.chain[e] != s.chain[e - 1]) end = 0;
        const double length = s.length(static_cast<int>(e));
        arc[e] = end + 0.5 * length;
        end += length;
    }
    return arc;
}

std::string profile_csv(const Case& c, const SurfaceState& state) {
    std::vector<std::string> films;
    for (const auto& film : c.films)
        films.push_back(film.name);
    const std::vector<double> arc =
        c.domain.planar_contour() ? arc_length(state.surface) : std::vector<double>();
    const std::vector<double> errors = element_errors(state);
    std::string text = header(c, state);
    for (std::size_t e = 0; e < state.surface.size(); ++e) {
        text += place(c, state, arc, e);
        text += "," + name_at(c.materials, state.material, e) + "," + name_at(films, state.film, e);
        for (const auto& thickness : state.grown.thickness)
            text += "," + shortest(thickness[e]);
        text += ",";
        if (!state.rate.empty()) text += shortest(state.rate[e] * seconds_per_minute);
        text += ",";
        if (!errors.empty()) text += shortest(errors[e]);
        for (const NamedField& field : state.fields)
            text += "," + shortest(field.value[e]);
        text += "\n";
    }
    return text;
}

} // namespace rille::engine
