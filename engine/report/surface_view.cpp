// SPDX-License-Identifier: Apache-2.0
// The final surface of a `full` run for the page's viewer.
#include "engine/number_text.hpp"
#include "engine/palette.hpp"
#include "engine/report/run_parts.hpp"
#include "engine/report/surface_mesh.hpp"
#include "engine/svg.hpp"

#include <algorithm>
#include <cmath>
#include <glib.h>
#include <limits>
#include <map>
#include <memory>

namespace rille::engine {
namespace {

using nlohmann::json;

constexpr std::size_t most_vertices = 60000; ///< indices of 16 bits reach them, pages stay small

template <class T>
std::string base64(const std::vector<T>& values) {
    if (values.empty()) return "";
    const std::unique_ptr<gchar, void (*)(void*)> text(
        g_base64_encode(reinterpret_cast<const guchar*>(values.data()), values.size() * sizeof(T)),
        &g_free);
    return text.get();
}

void add_triangle(SurfaceMesh& mesh, int a, int b, int c, int material) {
    if (a == b || b == c || c == a) return;
    mesh.triangles.push_back({a, b, c});
    mesh.material.push_back(material);
}

SurfaceMesh whole_mesh(const SurfaceState& state) {
    SurfaceMesh mesh;
    mesh.vertices = state.surface.vertices;
    for (std::size_t e = 0; e < state.surface.size(); ++e) {
        const auto& q = state.surface.corners[e];
        const int material = e < state.material.size() ? state.material[e] : 0;
        add_triangle(mesh, q[0], q[1], q[2], material);
        if (q[3] != q[2]) add_triangle(mesh, q[0], q[2], q[3], material);
    }
    return mesh;
}

/// The vertices within each cube of edge `size` become one, at their mean.
SurfaceMesh clustered(const SurfaceMesh& fine, double size) {
    using Key = std::array<long, 3>;
    std::map<Key, int> places;
    std::vector<int> place(fine.vertices.size()), count;
    SurfaceMesh mesh;
    for (std::size_t v = 0; v < fine.vertices.size(); ++v) {
        const geometry::Vec3& p = fine.vertices[v];
        const Key key = {std::lround(p.x / size), std::lround(p.y / size), std::lround(p.z / size)};
        const auto found = places.emplace(key, static_cast<int>(places.size())).first;
        place[v] = found->second;
        if (place[v] == static_cast<int>(count.size())) {
            count.push_back(0);
            mesh.vertices.push_back({0, 0, 0});
        }
        ++count[place[v]];
        mesh.vertices[place[v]] += p;
    }
    for (std::size_t v = 0; v < count.size(); ++v)
        mesh.vertices[v] *= 1.0 / count[v];
    for (std::size_t t = 0; t < fine.triangles.size(); ++t) {
        const auto& corners = fine.triangles[t];
        add_triangle(mesh, place[corners[0]], place[corners[1]], place[corners[2]],
                     fine.material[t]);
    }
    mesh.edge_nm = size;
    return mesh;
}

json mesh_json(const SurfaceMesh& mesh, const Case& c) {
    geometry::Vec3 low = mesh.vertices.front(), high = low;
    for (const geometry::Vec3& p : mesh.vertices) {
        low = {std::min(low.x, p.x), std::min(low.y, p.y), std::min(low.z, p.z)};
        high = {std::max(high.x, p.x), std::max(high.y, p.y), std::max(high.z, p.z)};
    }
    const auto share = [](double value, double from, double to) {
        return static_cast<std::uint16_t>(
            to > from ? std::lround(65535 * (value - from) / (to - from)) : 0);
    };
    std::vector<std::uint16_t> vertices, triangles;
    for (const geometry::Vec3& p : mesh.vertices)
        for (const std::uint16_t q :
             {share(p.x, low.x, high.x), share(p.y, low.y, high.y), share(p.z, low.z, high.z)})
            vertices.push_back(q);
    for (const auto& triangle : mesh.triangles)
        triangles.insert(triangles.end(), triangle.begin(), triangle.end());
    std::vector<std::uint8_t> material(mesh.material.begin(), mesh.material.end());
    json looks = json::array();
    const std::vector<MaterialLook> palette = material_looks(c.materials);
    for (std::size_t m = 0; m < palette.size(); ++m) {
        const bool used = std::count(mesh.material.begin(), mesh.material.end(), int(m)) > 0;
        looks.push_back({{"name", c.materials[m]}, {"colour", palette[m].colour}, {"used", used}});
    }
    return {{"low", {low.x, low.y, low.z}},
            {"high", {high.x, high.y, high.z}},
            {"vertices", base64(vertices)},
            {"triangles", base64(triangles)},
            {"material", base64(material)},
            {"materials", looks},
            {"title", c.title}};
}

} // namespace

SurfaceMesh surface_mesh(const SurfaceState& state, double spacing, std::size_t most) {
    const SurfaceMesh whole = whole_mesh(state);
    if (whole.vertices.size() <= most) return whole;
    SurfaceMesh coarse = whole;
    for (double size = 1.5 * spacing; coarse.vertices.size() > most; size *= 1.25)
        coarse = clustered(whole, size);
    return coarse;
}

PageSection surface_section(const RunParts& p, const SurfaceState& last, Page& page) {
    PageSection section{"surface", "The surface", "", false, "Surface"};
    if (p.c.domain.planar_contour() || last.surface.size() == 0) return section;
    const SurfaceMesh mesh = surface_mesh(last, p.c.domain.spacing, most_vertices);
    page.data.push_back({"surface-mesh", mesh_json(mesh, p.c).dump()});
    page.scripts.emplace_back("surface.js");
    const std::string caption =
        std::string("The final surface of one period, seen from the gas; grey is its back. Drag or "
                    "use the arrow keys to turn it, + and - to come closer.") +
        (mesh.edge_nm > 0 ? " Drawn with triangles of about " + rounded(mesh.edge_nm) + " nm."
                          : "");
    section.html =
        "<figure class=\"drawing view3d\" id=\"surface-view\" data-mesh=\"surface-mesh\">\n"
        "<div class=\"frame\"><canvas tabindex=\"0\" role=\"img\" aria-label=\"the final surface "
        "in "
        "three dimensions; the cross-section above shows the same in words and numbers\">"
        "</canvas><p class=\"no-webgl\" hidden>This browser offers no WebGL, so the surface cannot "
        "be turned about here; the cross-section is shown instead.</p></div>\n"
        "<div class=\"slider\"><label>Cut open <input type=\"range\" class=\"cut\" min=\"0\" "
        "max=\"100\" value=\"50\" step=\"1\"></label><button type=\"button\" class=\"reset\">Start "
        "view</button><ul class=\"legend\"></ul></div>\n<figcaption>" +
        escaped(caption) +
        " <span class=\"tools\"><button type=\"button\" class=\"shot\">PNG 1920 × 1080</button>"
        "</span></figcaption>\n</figure>\n";
    return section;
}

} // namespace rille::engine
