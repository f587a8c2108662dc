// SPDX-License-Identifier: Apache-2.0
// Private to geometry: on which side of a ray vertices lie.
#pragma once

#ifdef __SSE2__
#include <emmintrin.h>
#endif

namespace rille::geometry {

/// x and z of a point or direction.
using Pair [[gnu::vector_size(16)]] = double;

/// Bit k: vertex k lies on the right of the ray through o along d; side: its cross product with d.
/// `count` is even, x and z aligned to 16 bytes. Both ways give the same bits.
template <int count>
inline unsigned vertices_on_right(const double* x, const double* z, const Pair& o, const Pair& d,
                                  double positive, double* side) {
    unsigned right = 0;
#ifdef __SSE2__
    const __m128d ox = _mm_set1_pd(o[0]), oz = _mm_set1_pd(o[1]);
    const __m128d dx = _mm_set1_pd(d[0]), dz = _mm_set1_pd(d[1]), limit = _mm_set1_pd(positive);
    for (int k = 0; k < count; k += 2) {
        const __m128d along = _mm_mul_pd(dx, _mm_sub_pd(_mm_load_pd(z + k), oz));
        const __m128d across = _mm_mul_pd(dz, _mm_sub_pd(_mm_load_pd(x + k), ox));
        const __m128d s = _mm_sub_pd(along, across);
        _mm_store_pd(side + k, s);
        right |= static_cast<unsigned>(_mm_movemask_pd(_mm_cmplt_pd(s, limit))) << k;
    }
#else
    for (int k = 0; k < count; ++k) {
        side[k] = d[0] * (z[k] - o[1]) - d[1] * (x[k] - o[0]);
        right |= static_cast<unsigned>(side[k] < positive) << k;
    }
#endif
    return right;
}

} // namespace rille::geometry
