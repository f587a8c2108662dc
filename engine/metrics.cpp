// SPDX-License-Identifier: Apache-2.0
#include "engine/metrics.hpp"

#include "engine/case.hpp"
#include "engine/number_text.hpp"
#include "engine/profile_csv.hpp"

#include <algorithm>
#include <cmath>

namespace rille::engine {
namespace {

using geometry::FeatureSite;
using geometry::Measured;
using geometry::Surface;

constexpr double smallest_mask_loss_nm = 1e-6; // below this a selectivity has no meaning

/// a x + b y with the weights that belong to it.
Measured combine(double a, const Measured& x, double b, const Measured& y) {
    Measured sum;
    sum.value = a * x.value + b * y.value;
    for (const auto& [element, weight] : x.elements)
        sum.elements.emplace_back(element, a * weight);
    for (const auto& [element, weight] : y.elements)
        sum.elements.emplace_back(element, b * weight);
    return sum;
}
Measured scaled(double a, const Measured& x) {
    return combine(a, x, 0, Measured());
}
Measured shifted(Measured x, double by) {
    x.value += by;
    return x;
}

/// Everything known of one feature while its metrics are put together.
class FeatureMeasurement {
public:
    FeatureMeasurement(const Case& c, const SurfaceState& state, const geometry::Opening& opening,
                       const FeatureSite& site, std::vector<Metric>& out)
        : c_(c), state_(state), surface_(state.surface), opening_(opening), site_(site), out_(out),
          floor_(geometry::floor_of(c.domain, surface_, site)) {}

    void all() {
        depths();
        std::vector<std::pair<std::string, Place>> places(c_.cd_places.begin(), c_.cd_places.end());
        std::stable_sort(places.begin(), places.end(),
                         [](const auto& a, const auto& b) { return a.second.z > b.second.z; });
        for (const auto& [name, place] : places)
            cds(name, place);
        bow();
        angles();
        mask();
        films();
    }

private:
    void add(const std::string& name, const std::string& unit, const std::string& definition,
             const std::optional<Measured>& measured, const std::string& absent) {
        Metric metric{name, opening_.name, {}, unit, 0, definition, ""};
        if (measured) {
            metric.value = measured->value;
            metric.sampling_error = sampling_error(*measured, state_.displacement);
        } else {
            metric.note = absent;
        }
        out_.push_back(std::move(metric));
    }

    std::optional<Measured> depth_centre() const {
        if (!floor_) return {};
        return scaled(-1, floor_->centre);
    }

    void depths() {
        const char* closed = "the feature is closed";
        add("depth centre", "nm",
            "depth of the floor on the feature's axis below z = 0, the mask "
            "bottom as drawn",
            depth_centre(), closed);
        std::optional<Measured> edge, trench;
        if (floor_) {
            edge = combine(-0.5, floor_->left_edge, -0.5, floor_->right_edge);
            trench = combine(1, floor_->centre, -1, floor_->deepest);
        }
        add("depth edge", "nm",
            "mean over both sides of the depth of the floor at its foot, within "
            "10 % of the bottom CD of a wall",
            edge, closed);
        add("microtrench depth", "nm", "deepest point of the floor below the floor on the axis",
            trench, closed);
    }

    void cds(const std::string& name, const Place& place) {
        const std::string where = "at " + place.text + " (z = " + shortest(place.z) + " nm)";
        const std::string absent = "no wall on both sides at this height";
        const auto cd = geometry::cd_at(c_.domain, surface_, site_, place.z);
        add(name + " cd", "nm", "full width along x " + where, cd, absent);
        std::optional<Measured> change;
        if (cd) change = shifted(*cd, -site_.width_x);
        add(name + " cd_change", "nm",
            "CD " + where +
                " less the opening as drawn at the mask "
                "bottom, full width along x; what an opening gains the lines beside it lose",
            change, absent);
        if (c_.domain.extruded())
            add(name + " cd_loss", "nm",
                "mean over the lines left standing on both sides: width as drawn at the mask "
                "bottom less full width along x " +
                    where + "; beside a single opening the same as its cd_change",
                cd_loss(place.z), "no line with walls on both sides at this height");
        if (!site_.round) return;
        add(name + " cd y", "nm", "full width along y " + where,
            geometry::cd_y_at(c_.domain, surface_, site_, place.z), absent);
        add(name + " cd area", "nm", "2 sqrt(area / pi) of the section " + where,
            geometry::cd_area_at(c_.domain, surface_, site_, place.z), absent);
    }

    /// Width of the line as drawn between this opening and the next one to the left (side -1) or
    /// right (side 1), which may be an image beyond a side of the period, and the width of that
    /// one.
    std::optional<std::pair<double, double>> drawn_line(int side) const {
        std::optional<std::pair<double, double>> nearest;
        const double period = c_.domain.width_x(), own = side * site_.centre_x;
        for (const FeatureSite& other : feature_sites(c_))
            for (const double image : images_of(other.centre_x, period)) {
                const double line = side * image - own - 0.5 * (other.width_x + site_.width_x);
                if (line > 0 && (!nearest || line < nearest->first))
                    nearest = {line, other.width_x};
            }
        return nearest;
    }

    std::vector<double> images_of(double x, double period) const {
        if (c_.domain.sides == geometry::Sides::periodic) return {x, x - period, x + period};
        return {x, -period - x, period - x}; // mirrored at -period / 2 and period / 2
    }

    std::optional<Measured> cd_loss(double z) const {
        const auto lines = geometry::lines_at(c_.domain, surface_, site_, z);
        const auto left = drawn_line(-1), right = drawn_line(1);
        if (!lines || !left || !right) return {};
        // A neighbour that is not etched down to this height leaves one wide line.
        for (const auto& [now, drawn] :
             {std::pair(lines->left.value, *left), std::pair(lines->right.value, *right)})
            if (now > drawn.first + 0.5 * drawn.second) return {};
        return shifted(combine(-0.5, lines->left, -0.5, lines->right),
                       0.5 * (left->first + right->first));
    }

    /// The top CD place, or one cell below the mask bottom where the case names none.
    double top_z() const {
        const auto top = c_.cd_places.find("top");
        return top == c_.cd_places.end() ? -c_.domain.spacing : top->second.z;
    }

    void bow() {
        const char* absent = "no film walls";
        std::optional<Measured> widest, bow, depth;
        if (floor_ && floor_->centre.value < 0) {
            const auto found =
                geometry::widest_cd(c_.domain, surface_, site_, floor_->centre.value, 0.0);
            if (found) {
                widest = found->cd;
                depth = Measured{-found->z, {}};
                const auto top = geometry::cd_at(c_.domain, surface_, site_, top_z());
                if (top) bow = combine(1, found->cd, -1, *top);
            }
        }
        add("bow cd", "nm", "widest CD of the film walls, the mask left out", widest, absent);
        add("bow", "nm", "widest CD of the film walls, the mask left out, less the top CD", bow,
            absent);
        add("bow depth", "nm", "depth below z = 0 of the widest CD of the film walls", depth,
            absent);
    }

    void angles() {
        std::optional<geometry::SidewallAngles> found;
        if (floor_ && floor_->centre.value < 0)
            found = geometry::sidewall_angles(
                c_.domain, surface_, site_, 0.9 * floor_->centre.value, 0.1 * floor_->centre.value);
        const std::string definition = "angle of the least-squares line through the wall between "
                                       "10 % and 90 % of the depth on "
                                       "the axis; 90 deg vertical, above 90 re-entrant";
        const auto side = [&](Measured geometry::SidewallAngles::*which) {
            return found ? std::optional<Measured>((*found).*which) : std::nullopt;
        };
        const char* absent = "no walls between 10 % and 90 % of the depth";
        add("sidewall angle left", "deg", definition, side(&geometry::SidewallAngles::left),
            absent);
        add("sidewall angle right", "deg", definition, side(&geometry::SidewallAngles::right),
            absent);
    }

    void mask() {
        if (c_.mask.thickness <= 0) return;
        const double h = c_.domain.spacing;
        std::optional<Measured> undercut;
        const auto below = geometry::cd_at(c_.domain, surface_, site_, -h);
        const auto above = geometry::cd_at(c_.domain, surface_, site_, h);
        if (below && above) undercut = combine(0.5, *below, -0.5, *above);
        add("undercut", "nm",
            "half of the CD one grid spacing below the mask bottom less the CD one "
            "spacing above it",
            undercut, "no mask or no film wall at the mask bottom");
        const auto left = mask_left(c_, surface_, site_);
        add("mask left", "nm",
            "highest solid above the mask bottom beside the feature, the lower "
            "of its two sides; grown films count",
            left, "no mask beside the feature");
        add("facet angle", "deg",
            "area-weighted mean angle from horizontal of the mask's surface "
            "beside the feature between 20 and 80 deg",
            geometry::mask_facet_angle(c_.domain, surface_, site_, 0.0), "no facet");
        add("selectivity", "1", "depth centre over the thickness that the mask has lost",
            selectivity(left), "the mask has lost nothing or all, or there is no floor");
    }

    std::optional<Measured> selectivity(const std::optional<Measured>& left) const {
        const auto depth = depth_centre();
        if (!depth || !left || left->value <= 0) return {}; // the loss ends with the mask
        const double loss = c_.mask.thickness - left->value;
        if (loss < smallest_mask_loss_nm || depth->value <= 0) return {};
        // d(D / L) = dD / L - D dL / L^2, and dL is minus the change of what is left.
        Measured ratio = combine(1 / loss, *depth, depth->value / (loss * loss), *left);
        ratio.value = depth->value / loss;
        return ratio;
    }

    void films() {
        if (!floor_) return;
        for (std::size_t f = c_.substrate_first; f < c_.films.size(); ++f) {
            const geometry::Film& film = c_.films[f];
            const std::string name = film.name + " loss";
            const bool holds_floor =
                floor_->deepest.value < film.top && floor_->deepest.value >= film.bottom;
            const bool wanted =
                std::any_of(c_.targets.begin(), c_.targets.end(), [&](const Target& target) {
                    return target.metric == name || target.metric.rfind(name + " of ", 0) == 0;
                });
            if (!holds_floor && !wanted) continue;
            Measured loss = shifted(scaled(-1, floor_->deepest), film.top);
            if (loss.value < 0) loss = Measured();
            if (loss.value > film.top - film.bottom) loss = Measured{film.top - film.bottom, {}};
            add(name, "nm",
                "depth of the deepest point of the floor below the top of " + film.name +
                    ", at most its thickness",
                loss, "");
        }
    }

public:
    static std::optional<Measured> mask_left(const Case& c, const Surface& surface,
                                             const FeatureSite& site);

private:
    const Case& c_;
    const SurfaceState& state_;
    const Surface& surface_;
    const geometry::Opening& opening_;
    const FeatureSite& site_;
    std::vector<Metric>& out_;
    std::optional<geometry::Floor> floor_;
};

/// The mask beside the feature: from its edge as drawn to the edge of the next opening or the side
/// of the period, on both sides; the lower one counts.
std::optional<Measured> FeatureMeasurement::mask_left(const Case& c, const Surface& surface,
                                                      const FeatureSite& site) {
    const double edge_left = site.centre_x - 0.5 * site.width_x;
    const double edge_right = site.centre_x + 0.5 * site.width_x;
    double far_left = -c.domain.x_max(), far_right = c.domain.x_max();
    for (const FeatureSite& other : feature_sites(c)) {
        const bool same_row =
            !other.round || std::fabs(other.centre_y - site.centre_y) < 0.5 * other.width_y;
        if (!same_row) continue;
        const double right = other.centre_x + 0.5 * other.width_x;
        const double left = other.centre_x - 0.5 * other.width_x;
        if (right <= edge_left) far_left = std::max(far_left, right);
        if (left >= edge_right) far_right = std::min(far_right, left);
    }
    std::optional<Measured> lower;
    for (const auto& [from, to] :
         {std::pair(far_left, edge_left), std::pair(edge_right, far_right)}) {
        if (to - from < c.domain.spacing) continue;
        const auto top = geometry::top_between(c.domain, surface, from, to, site.centre_y);
        if (top && (!lower || top->value < lower->value)) lower = top;
    }
    if (lower && lower->value < 0) lower = Measured();
    return lower;
}

void find_clearing(const Case& c, const std::string& feature, const geometry::Floor& floor,
                   std::vector<Metrics::Clearing>& out) {
    const double highest =
        std::max({floor.centre.value, floor.left_edge.value, floor.right_edge.value});
    const double tolerance = 0.25 * c.domain.spacing;
    for (std::size_t f = c.substrate_first; f < c.films.size(); ++f) {
        const geometry::Film& film = c.films[f];
        if (!std::isfinite(film.bottom) || floor.deepest.value >= film.top) continue;
        const double left = std::clamp(highest - film.bottom, 0.0, film.top - film.bottom);
        const bool touched = highest < film.top || floor.deepest.value < film.top - tolerance;
        if (touched) out.push_back({feature, film.name, left <= tolerance, left});
    }
}

std::vector<Metric> all_metrics(const Case& c, const SurfaceState& state) {
    std::vector<Metric> metrics;
    const std::vector<FeatureSite> sites = feature_sites(c);
    for (std::size_t f = 0; f < sites.size(); ++f)
        FeatureMeasurement(c, state, c.mask.openings[f], sites[f], metrics).all();
    return metrics;
}

} // namespace

std::vector<FeatureSite> feature_sites(const Case& c) {
    std::vector<FeatureSite> sites;
    for (const geometry::Opening& opening : c.mask.openings) {
        FeatureSite site;
        site.centre_x = opening.centre_x;
        site.centre_y = opening.centre_y;
        site.width_x = opening.width_x;
        site.width_y = opening.width_y;
        site.round = opening.shape != geometry::Opening::Shape::trench;
        sites.push_back(site);
    }
    return sites;
}

double sampling_error(const Measured& measured,
                      const std::vector<std::vector<double>>& displacement) {
    std::vector<double> deviation;
    for (const auto& batch : displacement) {
        double sum = 0;
        for (const auto& [element, weight] : measured.elements)
            sum += weight * batch.at(element);
        deviation.push_back(sum);
    }
    return sampling_error(deviation);
}

Metrics measure(const Case& c, const SurfaceState& state, std::vector<StepMetrics> after,
                bool is_final) {
    Metrics result;
    result.is_final = is_final;
    result.time_s = state.time_s;
    result.metrics = all_metrics(c, state);
    const std::vector<FeatureSite> sites = feature_sites(c);
    for (std::size_t f = 0; f < sites.size(); ++f) {
        const auto floor = geometry::floor_of(c.domain, state.surface, sites[f]);
        if (floor) find_clearing(c, c.mask.openings[f].name, *floor, result.clearing);
    }
    result.comparison = compare_measured(c, state);
    for (Metric& metric : comparison_metrics(result.comparison))
        result.metrics.push_back(std::move(metric));
    result.after = std::move(after);
    result.targets = judge_targets(c, result);
    return result;
}

bool is_measured_after(const Case& c, const std::string& step) {
    return std::any_of(c.targets.begin(), c.targets.end(),
                       [&](const Target& target) { return target.after == step; });
}

StepMetrics measure_after(const Case& c, const SurfaceState& state, const std::string& step) {
    StepMetrics result{step, state.time_s, all_metrics(c, state)};
    for (Metric& metric : comparison_metrics(compare_measured(c, state)))
        result.metrics.push_back(std::move(metric));
    return result;
}

void measure_row(const Case& c, const Surface& surface, HistoryRow& row) {
    const auto value = [](const std::optional<Measured>& measured) {
        return measured ? std::optional<double>(measured->value) : std::nullopt;
    };
    row.features.clear();
    for (const FeatureSite& site : feature_sites(c)) {
        FeatureRow feature;
        if (const auto floor = geometry::floor_of(c.domain, surface, site)) {
            feature.depth_centre = -floor->centre.value;
            feature.depth_deepest = -floor->deepest.value;
        }
        for (const auto& named : c.cd_places)
            feature.cd.push_back(value(geometry::cd_at(c.domain, surface, site, named.second.z)));
        if (c.mask.thickness > 0)
            feature.mask_left = value(FeatureMeasurement::mask_left(c, surface, site));
        row.features.push_back(std::move(feature));
    }
    row.elements = static_cast<int>(surface.size());
}

} // namespace rille::engine
