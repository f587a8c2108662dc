// SPDX-License-Identifier: Apache-2.0
#include "geometry/band.hpp"
#include "geometry/band_topology.hpp"
#include "geometry/front.hpp"

#include <openvdb/io/File.h>
#include <openvdb/openvdb.h>
#include <openvdb/tools/SignedFloodFill.h>

#include <mutex>

namespace rille::geometry {

void Front::write_vdb(const std::string& path) const {
    static std::once_flag once;
    std::call_once(once, [] { openvdb::initialize(); });
    const Band& band = this->band();
    const Domain& d = band.domain;
    const float background = static_cast<float>(band_half_width * d.spacing);
    auto grid = openvdb::FloatGrid::create(background);
    grid->setName("front");
    grid->setGridClass(openvdb::GRID_LEVEL_SET);
    auto transform = openvdb::math::Transform::createLinearTransform(d.spacing);
    const Vec3 origin = d.node(0, 0, 0);
    transform->postTranslate(openvdb::Vec3d(origin.x, origin.y, origin.z));
    grid->setTransform(transform);
    auto accessor = grid->getAccessor();
    for (std::size_t c = 0; c < band.size(); ++c) {
        const Band::Cell& cell = band.cells[c];
        accessor.setValue(openvdb::Coord(cell.i, cell.j, cell.k), static_cast<float>(band.phi[c]));
    }
    openvdb::tools::signedFloodFill(grid->tree());
    openvdb::io::File file(path);
    file.setCompression(openvdb::io::COMPRESS_ZIP | openvdb::io::COMPRESS_ACTIVE_MASK);
    file.write({grid});
    file.close();
}

} // namespace rille::geometry
