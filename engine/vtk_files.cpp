// SPDX-License-Identifier: Apache-2.0
#include "engine/vtk_files.hpp"

#include "engine/case.hpp"
#include "engine/number_text.hpp"

#include <cstdint>
#include <cstring>
#include <glib.h>
#include <memory>

namespace rille::engine {
namespace {

constexpr double seconds_per_minute = 60;

template <class T>
struct TypeName;
template <>
struct TypeName<double> {
    static constexpr const char* text = "Float64";
};
template <>
struct TypeName<std::int64_t> {
    static constexpr const char* text = "Int64";
};
template <>
struct TypeName<int> {
    static constexpr const char* text = "Int32";
};

/// One block: the count of bytes as a 64-bit number, then the bytes, encoded together.
template <class T>
std::string encoded(const std::vector<T>& values) {
    const std::uint64_t bytes = values.size() * sizeof(T);
    std::vector<guchar> block(sizeof bytes + bytes);
    std::memcpy(block.data(), &bytes, sizeof bytes);
    if (bytes) std::memcpy(block.data() + sizeof bytes, values.data(), bytes);
    const std::unique_ptr<gchar, void (*)(void*)> text(g_base64_encode(block.data(), block.size()),
                                                       &g_free);
    return text.get();
}

template <class T>
std::string array(const std::string& name, const std::vector<T>& values, int components = 1) {
    return "<DataArray type=\"" + std::string(TypeName<T>::text) + "\" Name=\"" + name +
           "\" NumberOfComponents=\"" + std::to_string(components) + "\" format=\"binary\">" +
           encoded(values) + "</DataArray>\n";
}

std::string vectors(const std::string& name, const std::vector<geometry::Vec3>& values) {
    std::vector<double> flat;
    flat.reserve(3 * values.size());
    for (const geometry::Vec3& v : values)
        flat.insert(flat.end(), {v.x, v.y, v.z});
    return array(name, flat, 3);
}

int corner_count(const std::array<int, 4>& corners) {
    if (corners[2] < 0) return 2;
    return corners[3] == corners[2] ? 3 : 4;
}

std::string cells(const geometry::Surface& s) {
    std::vector<std::int64_t> connectivity, offsets;
    for (const auto& corners : s.corners) {
        connectivity.insert(connectivity.end(), corners.begin(),
                            corners.begin() + corner_count(corners));
        offsets.push_back(static_cast<std::int64_t>(connectivity.size()));
    }
    return array("connectivity", connectivity) + array("offsets", offsets);
}

std::string cell_data(const Case& c, const SurfaceState& state) {
    const geometry::Surface& s = state.surface;
    std::string text = vectors("normal", s.normal);
    text += array(c.domain.extruded() ? "length_nm" : "area_nm2", s.area);
    if (!s.chain.empty()) text += array("chain", s.chain);
    if (!s.next.empty()) text += array("next", s.next) + array("previous", s.previous);
    if (!state.material.empty()) text += array("material", state.material);
    if (!state.film.empty()) text += array("film", state.film);
    for (std::size_t f = 0; f < state.grown.material.size(); ++f)
        text += array("grown_" + column_name(c.materials.at(state.grown.material[f])) + "_nm",
                      state.grown.thickness[f]);
    if (!state.rate.empty()) {
        std::vector<double> per_minute = state.rate;
        for (double& rate : per_minute)
            rate *= seconds_per_minute;
        text += array("rate_nm_per_min", per_minute);
    }
    for (const NamedField& field : state.fields)
        text += array(column_name(field.name) + "_" + field.unit, field.value);
    for (std::size_t b = 0; b < state.displacement.size(); ++b)
        text += array("displacement_batch" + std::to_string(b) + "_nm", state.displacement[b]);
    return text;
}

} // namespace

std::string vtp_text(const Case& c, const SurfaceState& state) {
    const geometry::Surface& s = state.surface;
    const std::string count = std::to_string(s.size());
    const bool lines = c.domain.planar_contour();
    const std::string kind = lines ? "Lines" : "Polys";
    std::string text = "<?xml version=\"1.0\"?>\n"
                       "<VTKFile type=\"PolyData\" version=\"1.0\" byte_order=\"LittleEndian\" "
                       "header_type=\"UInt64\">\n<PolyData>\n<FieldData>\n"
                       "<DataArray type=\"Float64\" Name=\"TimeValue\" NumberOfTuples=\"1\" "
                       "format=\"ascii\">" +
                       shortest(state.time_s) + "</DataArray>\n</FieldData>\n";
    text += "<Piece NumberOfPoints=\"" + std::to_string(s.vertices.size()) +
            "\" NumberOfVerts=\"0\" NumberOfLines=\"" + (lines ? count : "0") +
            "\" NumberOfStrips=\"0\" NumberOfPolys=\"" + (lines ? "0" : count) + "\">\n";
    text += "<Points>\n" + vectors("Points", s.vertices) + "</Points>\n";
    text += "<" + kind + ">\n" + cells(s) + "</" + kind + ">\n";
    text += "<CellData>\n" + cell_data(c, state) + "</CellData>\n";
    return text + "</Piece>\n</PolyData>\n</VTKFile>\n";
}

std::string pvd_text(const std::vector<SeriesEntry>& entries) {
    std::string text = "<?xml version=\"1.0\"?>\n<VTKFile type=\"Collection\" version=\"1.0\" "
                       "byte_order=\"LittleEndian\">\n<Collection>\n";
    for (const SeriesEntry& entry : entries)
        text += "<DataSet timestep=\"" + shortest(entry.time_s) +
                "\" group=\"\" part=\"0\" file=\"" + entry.file + "\"/>\n";
    return text + "</Collection>\n</VTKFile>\n";
}

} // namespace rille::engine
