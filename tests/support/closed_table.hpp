// SPDX-License-Identifier: Apache-2.0
// Tables of the steady neutral flux in closed features, by aspect ratio and sticking.
#pragma once

#include <array>
#include <fstream>
#include <map>
#include <sstream>
#include <string>
#include <vector>

namespace rille::tests {

/// Rows of tests/data/<name> by their first `Keys` columns, each a map from column to value.
template <std::size_t Keys>
std::map<std::array<double, Keys>, std::map<std::string, double>>
read_keyed_table(const std::string& name) {
    std::ifstream file(std::string(RILLE_TESTS) + "/data/" + name);
    std::string line;
    std::vector<std::string> header;
    std::map<std::array<double, Keys>, std::map<std::string, double>> table;
    while (std::getline(file, line)) {
        if (line.empty() || line[0] == '#') continue;
        std::stringstream cells(line);
        std::string cell;
        std::vector<std::string> words;
        while (std::getline(cells, cell, ','))
            words.push_back(cell);
        if (header.empty()) {
            header = words;
            continue;
        }
        std::map<std::string, double> row;
        std::array<double, Keys> key{};
        for (std::size_t i = 0; i < words.size(); ++i)
            if (!words[i].empty()) row[header[i]] = std::stod(words[i]);
        for (std::size_t i = 0; i < Keys; ++i)
            key[i] = std::stod(words[i]);
        table[key] = row;
    }
    return table;
}

} // namespace rille::tests
