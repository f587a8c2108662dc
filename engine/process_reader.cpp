// SPDX-License-Identifier: Apache-2.0
#include "engine/process_reader.hpp"

#include "engine/reflection_reader.hpp"
#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>

namespace rille::engine {

using namespace fluxes;

namespace {

int index_of(const std::vector<std::string>& names, const std::string& name) {
    const auto found = std::find(names.begin(), names.end(), name);
    return found == names.end() ? -1 : static_cast<int>(found - names.begin());
}

const ParameterForm probability_form{{}, {0, 1}, Dimension::temperature, false, true};
const ParameterForm sticking_form{{}, {0, 1}};
const ParameterForm count_form{{}, above_zero()};
const ParameterForm power_form{{}, {0.5, 10}};

} // namespace

/// One entry of a list of processes while it is read.
struct ProcessReader::Process {
    const YamlNode& node;
    MapReader map;
    SurfaceChemistry& surface;

    void add(SurfaceProcess process) { surface.processes.push_back(std::move(process)); }
};

ProcessReader::ProcessReader(const ChemistryNames& names, const MaterialsLibrary& library,
                             const YamlNode* named_yields, Mechanism& mechanism,
                             std::vector<std::string>& run_materials, Problems& problems)
    : names_(names), library_(library), named_yields_(named_yields), mechanism_(mechanism),
      run_materials_(run_materials), problems_(problems), parameters_(problems) {}

SurfaceChemistry ProcessReader::read(const YamlNode& node, const MaterialData& material,
                                     IonReflection& reflection) {
    SurfaceChemistry surface;
    surface.material = material.name;
    surface.density = material.density;
    starts_.clear();
    MapReader map(node, problems_);
    if (const YamlNode* adsorbates = map.optional("adsorbates")) {
        if (!adsorbates->is_list())
            problems_.add(adsorbates->at, adsorbates->path, "a list of names is due");
        for (const YamlNode& item : adsorbates->items)
            surface.coverages.push_back(read_text(item, problems_).value_or(""));
        if (surface.coverages.size() > max_species)
            problems_.add(adsorbates->at, adsorbates->path,
                          fmt::format("at most {} adsorbates are allowed", max_species));
    }
    if (const YamlNode* own = map.optional("ion_reflection"))
        reflection = read_reflection(*own, reflection, parameters_, problems_);
    if (const YamlNode* processes = map.required("processes")) {
        if (!processes->is_list())
            problems_.add(processes->at, processes->path, "a list of processes is due");
        for (const YamlNode& item : processes->items)
            read_process(item, surface);
    }
    map.finish();
    return surface;
}

void ProcessReader::read_process(const YamlNode& node, SurfaceChemistry& surface) {
    using Reader = void (ProcessReader::*)(Process&);
    static const std::vector<std::pair<std::string, Reader>> kinds = {
        {"adsorption", &ProcessReader::read_adsorption},
        {"ion adsorption", &ProcessReader::read_ion_adsorption},
        {"desorption", &ProcessReader::read_desorption},
        {"recombination", &ProcessReader::read_recombination},
        {"ion-enhanced etching", &ProcessReader::read_ion_enhanced_etching},
        {"physical sputtering", &ProcessReader::read_physical_sputtering},
        {"spontaneous etching", &ProcessReader::read_spontaneous_etching},
        {"thermal etching", &ProcessReader::read_thermal_etching},
        {"ion removal", &ProcessReader::read_ion_removal},
        {"neutral removal", &ProcessReader::read_neutral_removal},
        {"deposition", &ProcessReader::read_deposition}};
    Process process{node, MapReader(node, problems_), surface};
    std::vector<std::string> words;
    for (const auto& [word, reader] : kinds)
        words.push_back(word);
    const YamlNode* kind = process.map.required("kind");
    const std::optional<std::string> word =
        kind ? read_word(*kind, words, problems_) : std::nullopt;
    if (!word) return;
    (this->*kinds[index_of(words, *word)].second)(process);
    process.map.finish();
}

int ProcessReader::adsorbate(Process& p) {
    const YamlNode* node = p.map.required("adsorbate");
    const std::optional<std::string> name =
        node ? read_word(*node, p.surface.coverages, problems_) : std::nullopt;
    return name ? index_of(p.surface.coverages, *name) : 0;
}

int ProcessReader::neutral(Process& p, bool& in_use) {
    const YamlNode* node = p.map.required("neutral");
    const std::optional<std::string> name =
        node ? read_word(*node, names_.neutrals, problems_) : std::nullopt;
    const int index = name ? index_of(mechanism_.neutrals, *name) : -1;
    in_use = index >= 0;
    return index;
}

SurfacePart ProcessReader::part(Process& p) {
    const YamlNode* node = p.map.required("on");
    if (!node) return {};
    std::vector<std::string> words{"whole surface", "bare sites"};
    for (const std::string& coverage : p.surface.coverages)
        words.push_back("sites of " + coverage);
    const std::optional<std::string> word = read_word(*node, words, problems_);
    const int index = word ? index_of(words, *word) : 0;
    if (index == 0) return {SurfacePart::Kind::whole, -1};
    if (index == 1) return {SurfacePart::Kind::bare, -1};
    return {SurfacePart::Kind::covered, index - 2};
}

Arrhenius ProcessReader::arrhenius(const YamlNode* node, const ParameterForm& form) {
    const std::optional<Parameter> p = parameters_.read(node, form);
    Arrhenius a;
    if (!p) return a;
    a.value = p->value;
    a.activation_ev = p->activation_ev.value_or(0);
    if (p->at) a.reference_k = *p->at;
    return a;
}

/// Either a flux from the covered surface, or a frequency per adsorbed atom and the sites.
Arrhenius ProcessReader::surface_flux(Process& p) {
    const YamlNode* flux = p.map.optional("flux");
    const YamlNode* frequency = p.map.optional("frequency");
    const YamlNode* sites = p.map.optional("sites");
    if ((flux != nullptr) == (frequency != nullptr) || (frequency != nullptr) != (sites != nullptr))
        problems_.add(p.node.at, p.node.path,
                      "needs either flux (from a covered surface), or frequency and sites");
    if (flux)
        return arrhenius(flux,
                         {Dimension::flux, zero_or_more(), Dimension::temperature, false, true});
    Arrhenius a = arrhenius(
        frequency, {Dimension::frequency, zero_or_more(), Dimension::temperature, false, true});
    a.value *= parameters_.value(sites, {Dimension::site_density, above_zero()});
    return a;
}

YieldFunction ProcessReader::named_yield(const YamlNode& node) {
    std::vector<std::string> names;
    if (named_yields_)
        for (const YamlNode::Member& member : named_yields_->members)
            names.push_back(member.key);
    const std::optional<std::string> name = read_word(node, names, problems_);
    if (!name) return {};
    const auto found = yields_.find(*name);
    if (found != yields_.end()) return found->second;
    const YieldFunction yield =
        read_yield(*named_yields_->find(*name), library_, parameters_, problems_)
            .value_or(YieldFunction{});
    yields_[*name] = yield;
    return yield;
}

Tallies ProcessReader::yield_tallies(Process& p) {
    const YamlNode* node = p.map.required("yield");
    const YamlNode* ions = p.map.required("ions");
    if (!node) return {};
    if (node->is_scalar()) return tallies(ions, named_yield(*node));
    return tallies(ions,
                   read_yield(*node, library_, parameters_, problems_).value_or(YieldFunction{}));
}

Tallies ProcessReader::tallies(const YamlNode* node, const YieldFunction& yield) {
    Tallies indices;
    if (!node) return indices;
    for (const IonShare& share : read_ions(*node, names_.ions, parameters_, problems_)) {
        if (share.atoms > 1 && std::holds_alternative<YamamuraTawaraLaw>(yield.energy)) {
            problems_.add(node->at, node->path,
                          "the yamamura-tawara law is for ions of one atom; leave out atoms");
            continue;
        }
        const int ion = index_of(mechanism_.ions, share.ion);
        if (ion < 0 || share.times == 0) continue;
        const YieldFunction own = for_ion(yield, share);
        std::vector<double> key = numbers_of(own);
        key.push_back(ion);
        const auto [place, is_new] =
            tally_of_.emplace(std::move(key), static_cast<int>(mechanism_.tallies.size()));
        if (is_new) mechanism_.tallies.push_back({ion, own});
        indices.push_back(place->second);
    }
    return indices;
}

/// A by-product by name, one for each unit, or a map of several with a cited amount each.
Leavings ProcessReader::leavings(Process& p) {
    Leavings leavings;
    const YamlNode* node = p.map.optional("leaves_as");
    if (!node) return leavings;
    if (names_.by_products.empty()) {
        problems_.add(node->at, node->path,
                      "the file has no section by_products that says what may leave");
        return leavings;
    }
    const auto add = [&](const std::string& name, double per_unit) {
        const int index = index_of(mechanism_.neutrals, name);
        if (index >= 0 && per_unit > 0) leavings.push_back({index, per_unit});
    };
    if (!node->is_map()) {
        if (const auto name = read_word(*node, names_.by_products, problems_)) add(*name, 1);
        return leavings;
    }
    if (node->members.empty())
        problems_.add(node->at, node->path, "a by-product, or a map of by-products is due");
    for (const YamlNode::Member& member : node->members) {
        const double per_unit = parameters_.value(&member.value, count_form);
        if (index_of(names_.by_products, member.key) >= 0)
            add(member.key, per_unit);
        else
            problems_.add(member.key_at, member.value.path,
                          fmt::format("{} is not among by_products: {}{}", quoted(member.key),
                                      listed(names_.by_products),
                                      did_you_mean(member.key, names_.by_products)));
    }
    return leavings;
}

ByProduct ProcessReader::read_by_product(const YamlNode& node) {
    ByProduct product;
    MapReader map(node, problems_);
    product.cosine_power = parameters_.value(map.optional("cosine_power"), power_form, 1);
    const YamlNode* film = map.optional("film");
    const YamlNode* sticking = map.optional("sticking");
    if (node.is_map() && (film == nullptr) != (sticking == nullptr))
        problems_.add(node.at, node.path,
                      "needs both film and sticking, or neither: what does not stick builds up no "
                      "film");
    product.sticking = parameters_.value(sticking, sticking_form);
    if (film) product.film = read_word(*film, names_.materials, problems_).value_or("");
    map.finish();
    return product;
}

IonAssistance ProcessReader::assistance(Process& p) {
    IonAssistance result;
    const YamlNode* node = p.map.optional("ion_assistance");
    if (!node) return result;
    MapReader map(*node, problems_);
    const double doubles =
        parameters_.value(map.required("doubles_at"), {Dimension::ion_flux, above_zero()});
    result.tallies = tallies(map.required("ions"), {ConstantLaw{1}, FlatAngle{}, 1});
    if (doubles > 0) result.eta = 1 / doubles;
    map.finish();
    return result;
}

int ProcessReader::film_id(const std::string& film) {
    const int known = index_of(run_materials_, film);
    if (known >= 0) return known;
    run_materials_.push_back(film);
    return static_cast<int>(run_materials_.size()) - 1;
}

void ProcessReader::read_adsorption(Process& p) {
    bool in_use = false;
    Adsorption a;
    a.neutral = neutral(p, in_use);
    a.coverage = adsorbate(p);
    a.sticking = parameters_.value(p.map.required("sticking"), sticking_form);
    a.atoms = parameters_.value(p.map.optional("atoms"), count_form, 1);
    a.assistance = assistance(p);
    if (a.sticking > 0) starts_.insert(a.coverage);
    if (in_use) p.add(a);
}

void ProcessReader::read_ion_adsorption(Process& p) {
    IonAdsorption a;
    a.coverage = adsorbate(p);
    const double sticking = parameters_.value(p.map.required("sticking"), sticking_form);
    a.tallies = tallies(p.map.required("ions"), {ConstantLaw{sticking}, FlatAngle{}, 1});
    if (!a.tallies.empty()) p.add(a);
}

void ProcessReader::read_desorption(Process& p) {
    const int coverage = adsorbate(p);
    p.add(Desorption{coverage, surface_flux(p)});
}

void ProcessReader::read_recombination(Process& p) {
    bool in_use = false;
    Recombination r;
    r.neutral = neutral(p, in_use);
    r.probability = arrhenius(p.map.required("probability"), probability_form);
    r.on = part(p);
    if (in_use) p.add(r);
}

void ProcessReader::read_ion_enhanced_etching(Process& p) {
    IonEnhancedEtching e;
    e.coverage = adsorbate(p);
    e.atoms = parameters_.value(p.map.required("atoms_per_unit"), count_form, 1);
    e.tallies = yield_tallies(p);
    e.leaves = leavings(p);
    if (!e.tallies.empty()) p.add(e);
}

void ProcessReader::read_physical_sputtering(Process& p) {
    PhysicalSputtering s;
    s.on = part(p);
    s.tallies = yield_tallies(p);
    s.leaves = leavings(p);
    if (!s.tallies.empty()) p.add(s);
}

void ProcessReader::read_spontaneous_etching(Process& p) {
    bool in_use = false;
    SpontaneousEtching s;
    s.neutral = neutral(p, in_use);
    s.probability = arrhenius(p.map.required("probability"), probability_form);
    s.atoms = parameters_.value(p.map.required("atoms_per_unit"), count_form, 1);
    s.on = part(p);
    s.leaves = leavings(p);
    if (in_use) p.add(s);
}

void ProcessReader::read_thermal_etching(Process& p) {
    ThermalEtching e;
    e.coverage = adsorbate(p);
    e.flux = surface_flux(p);
    e.atoms = parameters_.value(p.map.required("atoms_per_unit"), count_form, 1);
    e.leaves = leavings(p);
    p.add(e);
}

void ProcessReader::read_ion_removal(Process& p) {
    IonRemoval r;
    r.coverage = adsorbate(p);
    r.tallies = yield_tallies(p);
    r.leaves = leavings(p);
    if (!r.tallies.empty()) p.add(r);
}

void ProcessReader::read_neutral_removal(Process& p) {
    bool in_use = false;
    NeutralRemoval r;
    r.coverage = adsorbate(p);
    r.neutral = neutral(p, in_use);
    r.probability = arrhenius(p.map.required("probability"), probability_form);
    r.atoms = parameters_.value(p.map.optional("atoms"), count_form, 1);
    if (in_use) p.add(r);
}

void ProcessReader::read_deposition(Process& p) {
    bool in_use = false;
    Deposition d;
    d.neutral = neutral(p, in_use);
    d.sticking = parameters_.value(p.map.required("sticking"), sticking_form);
    d.assistance = assistance(p);
    const YamlNode* film = p.map.required("film");
    const std::string name = film ? read_word(*film, names_.materials, problems_).value_or("") : "";
    if (p.node.find("on") || name == p.surface.material) {
        if (part(p).kind != SurfacePart::Kind::whole || name != p.surface.material)
            problems_.add(p.node.at, p.node.path,
                          "a film grows on the sites of its adsorbate; on the whole surface only "
                          "where the material is the film itself");
    } else {
        d.coverage = adsorbate(p);
        if (!starts_.count(d.coverage))
            problems_.add(p.node.at, p.node.path,
                          "a film needs an adsorption of its adsorbate first, written above it");
    }
    if (!in_use || name.empty()) return;
    d.film_material = film_id(name);
    if (const MaterialData* data = library_.material(name)) d.film_density = data->density;
    p.add(d);
}

} // namespace rille::engine
