// SPDX-License-Identifier: Apache-2.0
#pragma once

namespace rille::engine::output_names {

/// What a run writes into its folder. Frames lie in their own folder as frame_0000.vtp and so on.
inline constexpr const char* resolved_case = "case.yaml";
inline constexpr const char* record = "run.json";
inline constexpr const char* history = "history.csv";
inline constexpr const char* profile = "profile.csv";
/// What each cause has removed, and its picture.
inline constexpr const char* causes = "causes.csv";
inline constexpr const char* causes_svg = "causes.svg";
inline constexpr const char* causes_png = "causes.png";
/// Arrivals and causes along the surface at chosen times: TIMEs.csv in this folder.
inline constexpr const char* arc_data = "arc_data";
inline constexpr const char* metrics = "metrics.json";
/// The same case on other grids, where grid errors are assessed.
inline constexpr const char* grids = "grids.json";
/// The measured contour against the front, where the case names one.
inline constexpr const char* comparison = "comparison.csv";
inline constexpr const char* series = "front.pvd";
inline constexpr const char* level_set = "front.vdb";
inline constexpr const char* picture_svg = "profile.svg";
inline constexpr const char* picture_png = "profile.png";
inline constexpr const char* sheath_svg = "sheath.svg";
inline constexpr const char* sheath_png = "sheath.png";
inline constexpr const char* report = "report.html";
inline constexpr const char* figures = "figures"; ///< folder; what `report --figures` writes
inline constexpr const char* sheath_csv = "sheath.csv";
inline constexpr const char* sheath_tables = "distributions"; ///< folder
/// What `rille flux` writes.
inline constexpr const char* flux_csv = "flux.csv";
inline constexpr const char* flux_json = "flux.json";
inline constexpr const char* flux_svg = "flux.svg";
inline constexpr const char* flux_png = "flux.png";
inline constexpr const char* frames = "frames";
inline constexpr const char* inputs = "inputs"; ///< copies of the files that the case names
/// Left while a run is not at its end: what `resume` takes up.
inline constexpr const char* state = "state.bin";
inline constexpr const char* all[] = {
    resolved_case, record,      history,    profile,    metrics, series,     level_set,
    picture_svg,   picture_png, sheath_svg, sheath_png, causes,  causes_svg, causes_png};

} // namespace rille::engine::output_names
