// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/open_parameter.hpp"
#include "engine/yaml_values.hpp"
#include "fluxes/mechanism.hpp"

#include <map>
#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// "measured", "published", "from memory", "illustrative".
const char* standing_word(fluxes::Standing);

/// What a cited value may look like: {value: 16 eV, standing: published, source: "..."}, with the
/// condition `at` under which it holds and an `activation` energy where the process has them.
struct ParameterForm {
    std::optional<Dimension> dimension{}; ///< none: a plain number
    Range range{};
    std::optional<Dimension> at{}; ///< `at: 500 eV` is allowed
    bool at_required = false;
    bool activation = false; ///< `activation: 0.108 eV` is allowed
};

/// A cited value in inside units.
struct Parameter {
    double value = 0;
    std::optional<double> at;
    std::optional<double> activation_ev;
    fluxes::Standing standing = fluxes::Standing::illustrative;
    std::string source;
};

/// Reads cited values and counts them by standing.
class ParameterReader {
public:
    explicit ParameterReader(Problems& problems) : problems_(problems) {}
    /// Nothing and a problem if it cannot be read; nothing at all for nullptr (the reader of the
    /// map has reported the missing key, or the key may be absent).
    std::optional<Parameter> read(const YamlNode*, const ParameterForm&);
    /// The value alone, 0 if it could not be read.
    double value(const YamlNode*, const ParameterForm&, double otherwise = 0);
    const std::map<fluxes::Standing, int>& counts() const { return counts_; }
    const std::vector<OpenParameter>& open() const { return open_; }

private:
    Problems& problems_;
    std::map<fluxes::Standing, int> counts_;
    std::vector<OpenParameter> open_;
};

} // namespace rille::engine
