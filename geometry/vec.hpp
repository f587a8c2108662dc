// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <Imath/ImathVec.h>

namespace rille::geometry {

/// Position [nm] or direction. x and y lie in the wafer plane, z points up out of the wafer.
/// `a.dot(b)`, `a.cross(b)`, `a.length()` and `a.normalized()` come with the library type.
using Vec3 = Imath::V3d;

} // namespace rille::geometry
