// SPDX-License-Identifier: Apache-2.0
#include "engine/palette.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <optional>

namespace rille::engine {
namespace {

struct Entry {
    const char* colour;
    int hatch;
    /// Materials that always look so: the whole name, or part of it where the word is long.
    std::array<const char*, 8> words;
};

constexpr std::array<Entry, 8> table = {{
    {"#7a9cc6", 0, {"Si", "poly-Si", "silicon", "polysilicon"}},
    {"#cfe6f0", 1, {"SiO2", "oxide"}},
    {"#c8662a", 2, {"resist"}},
    {"#f0c75a", 3, {"Si3N4", "SiN", "nitride"}},
    {"#34343c", 4, {"carbon", "amorphous carbon"}},
    {"#6a4c8c", 5, {"W", "Al", "Cu", "TiN", "Ru", "Cr", "tungsten"}},
    {"#1f7a6d", 6, {"polymer"}},
    {"#e8a9a0", 7, {}},
}};

bool names(const std::string& material, const char* name) {
    if (!name) return false;
    const std::string word = name;
    if (material == word) return true;
    return word.size() > 4 && material.find(word) != std::string::npos;
}

double linear(int byte) {
    const double c = byte / 255.0;
    return c <= 0.04045 ? c / 12.92 : std::pow((c + 0.055) / 1.055, 2.4);
}

} // namespace

std::vector<MaterialLook> material_looks(const std::vector<std::string>& materials) {
    std::vector<std::optional<std::size_t>> choice(materials.size());
    std::array<int, 8> taken{};
    for (std::size_t m = 0; m < materials.size(); ++m)
        for (std::size_t e = 0; e < table.size() && !choice[m]; ++e)
            for (const char* word : table[e].words)
                if (names(materials[m], word) && !taken[e]) {
                    choice[m] = e;
                    ++taken[e];
                    break;
                }
    std::vector<MaterialLook> looks;
    for (auto& chosen : choice) {
        if (!chosen) { // the least used entry, from the back: common materials keep theirs
            const auto free = std::min_element(taken.rbegin(), taken.rend());
            chosen = static_cast<std::size_t>(taken.rend() - free - 1);
            ++taken[*chosen];
        }
        looks.push_back({table[*chosen].colour, table[*chosen].hatch});
    }
    return looks;
}

std::string hatch_pattern(const std::string& id, const MaterialLook& look) {
    if (look.hatch == 0) return "";
    const std::string ink = lightness(look.colour) > 50 ? "#000000" : "#ffffff";
    const auto stroke = [&](const std::string& data) {
        return "<path d=\"" + data + "\" stroke=\"" + ink +
               "\" stroke-width=\"0.8\" stroke-opacity=\"0.28\" fill=\"none\"/>";
    };
    const auto dots = [&](const std::string& centre) {
        return "<circle " + centre + " r=\"0.9\" fill=\"" + ink + "\" fill-opacity=\"0.3\"/>";
    };
    static const std::array<const char*, 8> lines = {
        "",
        "",
        "M0 10L10 0M-1 1L1 -1M9 11L11 9", // rising
        "M0 0L10 10M-1 9L1 11M9 -1L11 1", // falling
        "M0 5L10 5",                      // level
        "M0 10L10 0M0 0L10 10",           // crossed
        "M5 0L5 10",                      // upright
        "M0 2.5L5 2.5M5 7.5L10 7.5",      // broken
    };
    const std::string drawing = look.hatch == 1
                                    ? dots("cx=\"2.5\" cy=\"2.5\"") + dots("cx=\"7.5\" cy=\"7.5\"")
                                    : stroke(lines.at(look.hatch));
    return "<pattern id=\"" + id +
           "\" width=\"10\" height=\"10\" patternUnits=\"userSpaceOnUse\">" + drawing +
           "</pattern>";
}

double lightness(const std::string& colour) {
    const auto byte = [&](int at) { return std::stoi(colour.substr(at, 2), nullptr, 16); };
    const double y = 0.2126 * linear(byte(1)) + 0.7152 * linear(byte(3)) + 0.0722 * linear(byte(5));
    return y > 0.008856 ? 116 * std::cbrt(y) - 16 : 903.3 * y;
}

} // namespace rille::engine
