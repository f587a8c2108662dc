// SPDX-License-Identifier: Apache-2.0
// Reads a numeric CSV of tests/data: '#' lines, one header line, rows of numbers.
#pragma once

#include <fstream>
#include <map>
#include <sstream>
#include <stdexcept>
#include <string>
#include <vector>

namespace rille::tests {

/// One map from column name to value per row.
inline std::vector<std::map<std::string, double>> csv_table(const std::string& name) {
    std::ifstream file(std::string(RILLE_TESTS) + "/data/" + name);
    if (!file) throw std::runtime_error("no test data " + name);
    std::vector<std::string> header;
    std::vector<std::map<std::string, double>> rows;
    for (std::string line; std::getline(file, line);) {
        if (line.empty() || line[0] == '#') continue;
        std::istringstream cells(line);
        std::vector<std::string> values;
        for (std::string cell; std::getline(cells, cell, ',');)
            values.push_back(cell);
        if (header.empty()) {
            header = values;
            continue;
        }
        std::map<std::string, double> row;
        for (std::size_t i = 0; i < header.size() && i < values.size(); ++i)
            row[header[i]] = std::stod(values[i]);
        rows.push_back(row);
    }
    return rows;
}

} // namespace rille::tests
