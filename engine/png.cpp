// SPDX-License-Identifier: Apache-2.0
#include "engine/output_folder.hpp"
#include "engine/picture.hpp"

#include <cairo.h>
#include <cmath>
#include <librsvg/rsvg.h>
#include <memory>

namespace rille::engine {
namespace {

struct Release {
    void operator()(RsvgHandle* handle) const { g_object_unref(handle); }
    void operator()(cairo_surface_t* surface) const { cairo_surface_destroy(surface); }
    void operator()(cairo_t* context) const { cairo_destroy(context); }
    void operator()(GError* error) const { g_error_free(error); }
};
template <class T>
using Owned = std::unique_ptr<T, Release>;

cairo_status_t append(void* target, const unsigned char* data, unsigned int length) {
    static_cast<std::string*>(target)->append(reinterpret_cast<const char*>(data), length);
    return CAIRO_STATUS_SUCCESS;
}

void check(bool fine, const GError* error, const char* otherwise) {
    if (!fine)
        throw OutputError("picture", "cannot draw the page", error ? error->message : otherwise);
}

} // namespace

std::string png_of(const std::string& svg, double scale) {
    GError* raw_error = nullptr;
    const Owned<RsvgHandle> handle(rsvg_handle_new_from_data(
        reinterpret_cast<const guint8*>(svg.data()), svg.size(), &raw_error));
    Owned<GError> error(raw_error);
    check(handle != nullptr, error.get(), "not an SVG page");
    gdouble width = 0, height = 0;
    check(rsvg_handle_get_intrinsic_size_in_pixels(handle.get(), &width, &height), nullptr,
          "the page has no size");
    const int columns = static_cast<int>(std::lround(width * scale));
    const int rows = static_cast<int>(std::lround(height * scale));
    const Owned<cairo_surface_t> image(
        cairo_image_surface_create(CAIRO_FORMAT_RGB24, columns, rows));
    {
        const Owned<cairo_t> context(cairo_create(image.get()));
        const RsvgRectangle page{0, 0, static_cast<double>(columns), static_cast<double>(rows)};
        raw_error = nullptr;
        const bool drawn =
            rsvg_handle_render_document(handle.get(), context.get(), &page, &raw_error);
        error.reset(raw_error);
        check(drawn, error.get(), "drawing failed");
    }
    std::string bytes;
    const cairo_status_t status = cairo_surface_write_to_png_stream(image.get(), append, &bytes);
    check(status == CAIRO_STATUS_SUCCESS, nullptr, cairo_status_to_string(status));
    return bytes;
}

} // namespace rille::engine
