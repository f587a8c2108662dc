// SPDX-License-Identifier: Apache-2.0
#pragma once

namespace rille::engine::study_names {

/// What a study leaves in its folder.
inline constexpr const char* study = "study.yaml";          ///< as understood; runs again from here
inline constexpr const char* base = "base";                 ///< folder of the base case
inline constexpr const char* base_case = "base/case.yaml";  ///< with its files in base/inputs
inline constexpr const char* inputs = "inputs";             ///< tables that the study names
inline constexpr const char* manifest = "study.json";       ///< what the study is, and whose
inline constexpr const char* points = "points";             ///< one folder a point: points/0001
inline constexpr const char* point_record = "point.json";   ///< in the folder of a point
inline constexpr const char* results = "results.csv";       ///< one row a point
inline constexpr const char* effects_json = "effects.json"; ///< main effects, sensitivities, fits
inline constexpr const char* effects_csv = "effects.csv";
inline constexpr const char* measured = "measured.csv"; ///< measured rows beside their points
inline constexpr const char* answer_svg = "answer.svg"; ///< the curve that was asked for
inline constexpr const char* answer_png = "answer.png";
inline constexpr const char* report = "report.html";
inline constexpr const char* slurm = "slurm"; ///< folder of job scripts, logs and job numbers
inline constexpr const char* all_files[] = {
    study, manifest, results, effects_json, effects_csv, measured, answer_svg, answer_png, report};
inline constexpr const char* all_folders[] = {base, inputs, points, slurm};

/// How a point ended.
inline constexpr const char* done = "done";
inline constexpr const char* not_cleared = "not cleared"; ///< a result; the time is a lower bound
inline constexpr const char* clogged = "clogged";         ///< a result: an opening closed or filled
inline constexpr const char* failed = "failed";           ///< numerics, or input bad at this point
inline constexpr const char* killed = "killed";   ///< its process ended each time that it was tried
inline constexpr const char* missing = "missing"; ///< never finished; has no row

} // namespace rille::engine::study_names
