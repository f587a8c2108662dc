// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/mechanism.hpp"

#include <cstddef>
#include <map>
#include <string>
#include <vector>

namespace rille::engine {

/// point.json: how a point ended.
struct PointRecord {
    std::size_t point = 0; ///< index from 0
    std::string name;      ///< "0001"
    std::string status;    ///< one of study_names::done ... killed
    int exit_status = 0;   ///< what `rille run` would have returned
    std::string failure;   ///< why it failed or was killed
    std::vector<std::string> values;
    double seconds = 0; ///< computing time, parts before a stop included
    int tries = 1;
    std::vector<std::string> warnings;
    std::map<fluxes::Standing, int> standing; ///< parameters of each standing; empty: not known
    std::string host, cpu_features_hash;
};

std::string point_record_text(const PointRecord&);
/// Throws OutputError (with `path`) for a text that is none.
PointRecord read_point_record(const std::string& text, const std::string& path);

/// Status of a finished point of a study's folder. Throws OutputError.
std::string point_status(const std::string& study_folder, const std::string& point);

} // namespace rille::engine
