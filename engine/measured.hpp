// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/csv_rows.hpp"
#include "engine/problems.hpp"

#include <array>
#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// How the points of a contour file lie in the frame of the case.
struct ContourFrame {
    std::optional<double> nm_per_px; ///< given where the file holds pixels
    std::array<double, 2> origin{};  ///< the point of the feature's axis at z = 0, as in the file
    double rotation_deg = 0;         ///< turns the picture anticlockwise about the origin
    double axis_x = 0;               ///< [nm] where the feature stands
    std::string key = "measured";    ///< of the case, in messages
    bool revolved = false;           ///< r_nm stands for x_nm; pixels count from the axis
};

/// A contour traced from a micrograph, in the frame of the case.
struct MeasuredContour {
    std::string feature;                       ///< the opening's name
    std::string source;                        ///< name of the file
    std::vector<std::array<double, 2>> points; ///< (x, z) [nm], in order along the contour
    double cut_least = 0, cut_most = 0; ///< [nm] distance of the section from the feature's axis
};

/// CDs measured at one height on several sites.
struct MeasuredCd {
    std::string feature, place; ///< names of an opening and of a height of measure.cd
    double mean_nm = 0;
    double sigma_nm = 0; ///< from site to site
    int sites = 1;
    /// 95 % half-width of the mean, normal: 1.96 sigma / sqrt(sites).
    double error() const;
};

struct MeasuredData {
    std::optional<MeasuredContour> contour;
    std::vector<MeasuredCd> cds;
};

/// Points of a contour file: CSV with the columns x_nm, z_nm (z up), or x_px, y_px (y down, as
/// pictures count), at least two. What is wrong is added with its place.
std::vector<std::array<double, 2>> read_contour(const std::string& path, const ContourFrame&,
                                                Problems&);
std::vector<std::array<double, 2>> parse_contour(const std::string& text, const std::string& name,
                                                 const ContourFrame&, Problems&);

/// The same of rows that are read already; point i comes from rows[i + 1].
std::vector<std::array<double, 2>> contour_points(const CsvRows&, const ContourFrame&, Problems&);
/// A point of the file in the frame of the case.
std::array<double, 2> placed(const ContourFrame&, double x, double y, bool in_pixels);

/// Rows of a CD table: CSV with the columns cd, mean_nm, sigma_nm, sites, with `feature` before
/// them where there are several openings. Names are checked against those given.
std::vector<MeasuredCd> read_cd_table(const std::string& path,
                                      const std::vector<std::string>& features,
                                      const std::vector<std::string>& places, Problems&);
std::vector<MeasuredCd> parse_cd_table(const std::string& text, const std::string& name,
                                       const std::vector<std::string>& features,
                                       const std::vector<std::string>& places, Problems&);

} // namespace rille::engine
