// SPDX-License-Identifier: Apache-2.0
#include "engine/case.hpp"
#include "engine/number_text.hpp"
#include "engine/output_folder.hpp"
#include "engine/vtk_files.hpp"

#include <boost/property_tree/ptree.hpp>
#include <boost/property_tree/xml_parser.hpp>
#include <cstdint>
#include <cstring>
#include <glib.h>
#include <memory>
#include <sstream>

namespace rille::engine {
namespace {

using Tree = boost::property_tree::ptree;

constexpr double seconds_per_minute = 60;

bool starts_with(const std::string& text, const std::string& start) {
    return text.compare(0, start.size(), start) == 0;
}
bool ends_with(const std::string& text, const std::string& end) {
    return text.size() >= end.size() &&
           text.compare(text.size() - end.size(), end.size(), end) == 0;
}

template <class T>
std::vector<T> decoded(const Tree& array) {
    const std::string text = array.get_value<std::string>();
    gsize size = 0;
    const std::unique_ptr<guchar, void (*)(void*)> block(g_base64_decode(text.c_str(), &size),
                                                         &g_free);
    std::uint64_t bytes = 0;
    if (size < sizeof bytes) throw std::runtime_error("an array is cut short");
    std::memcpy(&bytes, block.get(), sizeof bytes);
    if (bytes != size - sizeof bytes || bytes % sizeof(T) != 0)
        throw std::runtime_error("an array has the wrong length");
    std::vector<T> values(bytes / sizeof(T));
    if (bytes) std::memcpy(values.data(), block.get() + sizeof bytes, bytes);
    return values;
}

std::vector<geometry::Vec3> vectors(const std::vector<double>& flat) {
    std::vector<geometry::Vec3> values;
    for (std::size_t i = 0; i + 2 < flat.size(); i += 3)
        values.emplace_back(flat[i], flat[i + 1], flat[i + 2]);
    return values;
}

const Tree& named_array(const Tree& group, const std::string& name) {
    for (const auto& child : group)
        if (child.first == "DataArray" && child.second.get<std::string>("<xmlattr>.Name") == name)
            return child.second;
    throw std::runtime_error("array " + name + " is missing");
}

void read_corners(const Tree& group, geometry::Surface& s) {
    const auto connectivity = decoded<std::int64_t>(named_array(group, "connectivity"));
    const auto offsets = decoded<std::int64_t>(named_array(group, "offsets"));
    std::int64_t begin = 0;
    for (const std::int64_t end : offsets) {
        const std::int64_t n = end - begin;
        if (n < 2 || n > 4 || end > static_cast<std::int64_t>(connectivity.size()))
            throw std::runtime_error("a cell has the wrong number of corners");
        std::array<int, 4> corners{-1, -1, -1, -1};
        for (std::int64_t i = 0; i < n; ++i) {
            const std::int64_t vertex = connectivity[begin + i];
            if (vertex < 0 || vertex >= static_cast<std::int64_t>(s.vertices.size()))
                throw std::runtime_error("a cell names a point that does not exist");
            corners[i] = static_cast<int>(vertex);
        }
        if (n == 3) corners[3] = corners[2];
        s.corners.push_back(corners);
        geometry::Vec3 sum(0, 0, 0);
        for (std::int64_t i = 0; i < n; ++i)
            sum += s.vertices[corners[i]];
        s.centre.push_back(sum / static_cast<double>(n));
        begin = end;
    }
}

int material_of(const Case& c, const std::string& column) {
    for (std::size_t m = 0; m < c.materials.size(); ++m)
        if (column_name(c.materials[m]) == column) return static_cast<int>(m);
    throw std::runtime_error("grown film of a material that the case does not have: " + column);
}

void add_field(const std::string& name, std::vector<double> values, SurfaceState& state) {
    for (const char* unit : {"nm_per_min", "per_nm2_s", "deg", "nm", "1"})
        if (ends_with(name, std::string("_") + unit)) {
            const std::string bare = name.substr(0, name.size() - std::strlen(unit) - 1);
            state.fields.push_back({bare, unit, std::move(values)});
            return;
        }
    throw std::runtime_error("array " + name + " has no known unit");
}

void read_cell_array(const Case& c, const std::string& name, const Tree& array,
                     SurfaceState& state) {
    geometry::Surface& s = state.surface;
    if (name == "normal")
        s.normal = vectors(decoded<double>(array));
    else if (name == "length_nm" || name == "area_nm2")
        s.area = decoded<double>(array);
    else if (name == "chain")
        s.chain = decoded<int>(array);
    else if (name == "next")
        s.next = decoded<int>(array);
    else if (name == "previous")
        s.previous = decoded<int>(array);
    else if (name == "material")
        state.material = decoded<int>(array);
    else if (name == "film")
        state.film = decoded<int>(array);
    else if (starts_with(name, "grown_") && ends_with(name, "_nm")) {
        state.grown.material.push_back(material_of(c, name.substr(6, name.size() - 9)));
        state.grown.thickness.push_back(decoded<double>(array));
    } else if (name == "rate_nm_per_min") {
        state.rate = decoded<double>(array);
        for (double& rate : state.rate)
            rate /= seconds_per_minute;
    } else if (starts_with(name, "displacement_batch")) {
        state.displacement.push_back(decoded<double>(array));
    } else {
        add_field(name, decoded<double>(array), state);
    }
}

SurfaceState read_tree(const Case& c, const Tree& root) {
    SurfaceState state;
    const Tree& data = root.get_child("VTKFile.PolyData");
    state.time_s = named_array(data.get_child("FieldData"), "TimeValue").get_value<double>();
    const Tree& piece = data.get_child("Piece");
    state.surface.vertices =
        vectors(decoded<double>(named_array(piece.get_child("Points"), "Points")));
    read_corners(piece.get_child(c.domain.planar_contour() ? "Lines" : "Polys"), state.surface);
    for (const auto& child : piece.get_child("CellData"))
        if (child.first == "DataArray")
            read_cell_array(c, child.second.get<std::string>("<xmlattr>.Name"), child.second,
                            state);
    const std::size_t n = state.surface.size();
    if (state.surface.normal.size() != n || state.surface.area.size() != n)
        throw std::runtime_error("normals or areas do not match the cells");
    return state;
}

} // namespace

SurfaceState read_vtp(const Case& c, const std::string& path) {
    std::istringstream text(read_file(path));
    try {
        Tree root;
        boost::property_tree::read_xml(text, root);
        return read_tree(c, root);
    } catch (const std::exception& error) {
        throw OutputError(path, "cannot read the front", error.what());
    }
}

} // namespace rille::engine
