// SPDX-License-Identifier: Apache-2.0
#include "engine/yield_reader.hpp"

#include "engine/number_text.hpp"

#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace rille::engine {

namespace {

using namespace fluxes;

const ParameterForm plain_positive{{}, above_zero()};
const ParameterForm plain{{}, zero_or_more()};
const ParameterForm energy_form{Dimension::energy, zero_or_more()};
const ParameterForm yield_at{{}, above_zero(), Dimension::energy, true};

struct Context {
    const MaterialsLibrary& library;
    ParameterReader& parameters;
    Problems& problems;
};

/// A yield at one energy fixes the last free factor of a law.
double factor_through(const YamlNode* node, const EnergyLaw& law, const Context& c) {
    const std::optional<Parameter> point = c.parameters.read(node, yield_at);
    if (!point) return 1;
    const double y = energy_yield(law, *point->at);
    if (y > 0) return point->value / y;
    c.problems.add(node->at, node->path, "this energy is not above the threshold of the law");
    return 1;
}

/// A cited number in a unit that belongs to one law alone, and so is no dimension of its own.
double read_in_unit(const YamlNode* node, const std::string& unit, const std::string& sample,
                    const Context& c) {
    if (!node) return 1;
    YamlNode stripped = *node;
    if (YamlNode* value = stripped.find("value"); value && value->is_scalar()) {
        const NumberText number = split_number(value->text);
        if (!number.error.empty() || number.unit != unit) {
            c.problems.add(value->at, value->path,
                           fmt::format("{}; {} is due, for example {} {}", quoted(value->text),
                                       "a number in " + unit, sample, unit));
            return 1;
        }
        value->text = shortest(number.value);
    }
    return c.parameters.value(&stripped, plain_positive, 1);
}

EnergyLaw read_square_root(MapReader& map, const YamlNode& node, const Context& c) {
    SquareRootLaw law{1, c.parameters.value(map.required("threshold"), energy_form)};
    const YamlNode* amplitude = map.optional("amplitude");
    const YamlNode* through = map.optional("through");
    if ((amplitude != nullptr) == (through != nullptr))
        c.problems.add(node.at, node.path,
                       "the square root law needs either amplitude or through (the yield at an "
                       "energy)");
    else
        law.amplitude = amplitude ? read_in_unit(amplitude, "/sqrt(eV)", "0.5", c)
                                  : factor_through(through, law, c);
    return law;
}

const ElementData* read_element(const YamlNode* node, bool needs_binding, const Context& c) {
    if (!node) return nullptr;
    std::vector<std::string> names;
    for (const ElementData& e : c.library.elements)
        if (!needs_binding || e.surface_binding_ev > 0) names.push_back(e.name);
    const std::optional<std::string> name = read_word(*node, names, c.problems);
    return name ? c.library.element(*name) : nullptr;
}

struct Elements {
    const ElementData* projectile = nullptr;
    const ElementData* target = nullptr;
};

Elements read_pair(MapReader& map, const Context& c) {
    Elements pair;
    pair.projectile = read_element(map.required("projectile"), false, c);
    pair.target = read_element(map.required("target"), true, c);
    return pair;
}

EnergyLaw read_yamamura_tawara(MapReader& map, const Context& c) {
    YamamuraTawaraLaw law;
    const auto [ion, target] = read_pair(map, c);
    const YamlNode* through = map.optional("through");
    if (!ion || !target) return ConstantLaw{0};
    law = {ion->atomic_number,
           ion->mass_amu,
           target->atomic_number,
           target->mass_amu,
           target->surface_binding_ev,
           target->q,
           target->w,
           target->s};
    law.q *= factor_through(through, law, c);
    return law;
}

EnergyLaw read_bohdansky(MapReader& map, const YamlNode& node, const Context& c) {
    const auto [ion, target] = read_pair(map, c);
    const YamlNode* q = map.optional("q");
    const YamlNode* through = map.optional("through");
    if ((q != nullptr) == (through != nullptr))
        c.problems.add(node.at, node.path,
                       "the bohdansky law needs either q or through (the yield at an energy)");
    if (!ion || !target) return ConstantLaw{0};
    const CollisionPair pair{ion->atomic_number, ion->mass_amu, target->atomic_number,
                             target->mass_amu, target->surface_binding_ev};
    BohdanskyLaw law = bohdansky_law(pair, c.parameters.value(q, plain_positive, 1));
    law.q *= factor_through(through, law, c);
    return law;
}

EnergyLaw read_eckstein(MapReader& map, const Context& c) {
    EcksteinLaw law;
    law.lambda = c.parameters.value(map.required("lambda"), plain_positive, 1);
    law.q = c.parameters.value(map.required("q"), plain_positive, 1);
    law.mu = c.parameters.value(map.required("mu"), plain_positive, 1);
    law.eps_per_ev = read_in_unit(map.required("reduced_energy"), "/eV", "4.054e-6", c);
    law.threshold_ev = c.parameters.value(map.required("threshold"), energy_form);
    return law;
}

EnergyLaw read_energy_law(const YamlNode& node, const Context& c) {
    MapReader map(node, c.problems);
    EnergyLaw law = ConstantLaw{0};
    if (const YamlNode* word = map.required("law")) {
        const std::string name =
            read_word(*word,
                      {"square root", "yamamura-tawara", "bohdansky", "eckstein", "constant"},
                      c.problems)
                .value_or("");
        if (name.empty()) return law;
        if (name == "square root")
            law = read_square_root(map, node, c);
        else if (name == "yamamura-tawara")
            law = read_yamamura_tawara(map, c);
        else if (name == "bohdansky")
            law = read_bohdansky(map, node, c);
        else if (name == "eckstein")
            law = read_eckstein(map, c);
        else
            law = ConstantLaw{c.parameters.value(map.required("yield"), plain)};
    }
    map.finish();
    return law;
}

AngleLaw read_angle_law(const YamlNode& node, const Context& c) {
    MapReader map(node, c.problems);
    AngleLaw law = FlatAngle{};
    const ParameterForm angle{Dimension::angle, {0, 90, false, true}};
    if (const YamlNode* word = map.required("law")) {
        const std::string name =
            read_word(*word, {"flat", "plateau then cosine", "plateau then line", "peaked"},
                      c.problems)
                .value_or("");
        if (name.empty()) return law;
        if (name == "plateau then cosine")
            law = PlateauCosine{c.parameters.value(map.required("plateau"), angle)};
        else if (name == "plateau then line")
            law = PlateauLinear{c.parameters.value(map.required("plateau"), angle)};
        else if (name == "peaked") {
            const double f = c.parameters.value(map.required("exponent"), {{}, {0, 15, true}}, 2);
            law = YamamuraAngle(f, c.parameters.value(map.required("peak"), angle, 65));
        }
    }
    map.finish();
    return law;
}

bool is_known(const std::string& ion, const YamlNode& at, const std::vector<std::string>& known,
              Problems& problems) {
    if (std::find(known.begin(), known.end(), ion) != known.end()) return true;
    problems.add(at.at, at.path,
                 fmt::format("{} is not among the ions of this chemistry ({}){}", quoted(ion),
                             listed(known), did_you_mean(ion, known)));
    return false;
}

struct Numbers {
    std::vector<double>& out;
    void operator()(const SquareRootLaw& l) const { add({l.amplitude, l.threshold_ev}); }
    void operator()(const YamamuraTawaraLaw& l) const {
        add({l.z1, l.m1, l.z2, l.m2, l.us_ev, l.q, l.w, l.s});
    }
    void operator()(const BohdanskyLaw& l) const { add({l.q, l.etf_ev, l.threshold_ev}); }
    void operator()(const EcksteinLaw& l) const {
        add({l.lambda, l.q, l.mu, l.eps_per_ev, l.threshold_ev});
    }
    void operator()(const ConstantLaw& l) const { add({l.value}); }
    void operator()(const LinearLaw& l) const { add({l.per_ev}); }
    void operator()(const FlatAngle&) const {}
    void operator()(const PlateauCosine& l) const { add({l.plateau_deg}); }
    void operator()(const PlateauLinear& l) const { add({l.plateau_deg}); }
    void operator()(const YamamuraAngle& l) const { add({l.f, l.optimum_deg}); }
    void add(std::initializer_list<double> values) const { out.insert(out.end(), values); }
};

} // namespace

std::optional<YieldFunction> read_yield(const YamlNode& node, const MaterialsLibrary& library,
                                        ParameterReader& parameters, Problems& problems) {
    const std::size_t before = problems.size();
    const Context c{library, parameters, problems};
    MapReader map(node, problems);
    YieldFunction yield;
    if (const YamlNode* energy = map.required("energy")) yield.energy = read_energy_law(*energy, c);
    if (const YamlNode* angle = map.required("angle")) yield.angle = read_angle_law(*angle, c);
    map.finish();
    if (problems.size() != before) return std::nullopt;
    return yield;
}

std::vector<IonShare> read_ions(const YamlNode& node, const std::vector<std::string>& known,
                                ParameterReader& parameters, Problems& problems) {
    std::vector<IonShare> ions;
    if (node.is_scalar() && node.text == "all") {
        for (const std::string& ion : known)
            ions.push_back({ion});
    } else if (node.is_list()) {
        for (const YamlNode& item : node.items)
            if (const std::optional<std::string> ion = read_text(item, problems);
                ion && is_known(*ion, item, known, problems))
                ions.push_back({*ion});
    } else if (node.is_map()) {
        for (const YamlNode::Member& member : node.members) {
            if (!is_known(member.key, member.value, known, problems)) continue;
            MapReader map(member.value, problems);
            IonShare share{member.key};
            share.times = parameters.value(map.optional("times"), plain, 1);
            share.atoms = parameters.value(map.optional("atoms"), {{}, {1, 20}}, 1);
            map.finish();
            ions.push_back(share);
        }
    } else {
        problems.add(node.at, node.path,
                     fmt::format("{} stands where \"all\", a list of ions or a map of ions is due",
                                 what_it_is(node)));
    }
    return ions;
}

YieldFunction for_ion(const YieldFunction& yield, const IonShare& share) {
    YieldFunction own = share.atoms == 1 ? yield : shared_by_atoms(yield, share.atoms);
    own.scale *= share.times;
    return own;
}

std::vector<double> numbers_of(const YieldFunction& yield) {
    std::vector<double> numbers{static_cast<double>(yield.energy.index()),
                                static_cast<double>(yield.angle.index()), yield.scale};
    std::visit(Numbers{numbers}, yield.energy);
    std::visit(Numbers{numbers}, yield.angle);
    return numbers;
}

} // namespace rille::engine
