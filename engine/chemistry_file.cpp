// SPDX-License-Identifier: Apache-2.0
#include "engine/chemistry_file.hpp"

#include "engine/process_reader.hpp"
#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <filesystem>

namespace rille::engine {

using namespace fluxes;

namespace {

bool contains(const std::vector<std::string>& names, const std::string& name) {
    return std::find(names.begin(), names.end(), name) != names.end();
}

bool is_path(const std::string& name) {
    const std::string end = ".yaml";
    return name.find('/') != std::string::npos ||
           (name.size() > end.size() &&
            name.compare(name.size() - end.size(), end.size(), end) == 0);
}

/// The file of a chemistry; empty and a problem if there is none.
std::string find_file(const ChemistryRequest& request, Problems& problems) {
    const std::string& name = request.chemistry.name;
    if (is_path(name)) {
        const std::filesystem::path path = std::filesystem::path(request.case_folder) / name;
        if (std::filesystem::is_regular_file(path)) return path.string();
        problems.add(request.chemistry.at, request.chemistry.path,
                     fmt::format("there is no file {}", path.string()));
        return "";
    }
    const std::vector<std::string> known = chemistry_names(request.configs);
    if (contains(known, name)) return request.configs + "/chemistries/" + name + ".yaml";
    problems.add(request.chemistry.at, request.chemistry.path,
                 fmt::format("there is no chemistry {}; known: {}, or the path of a file{}",
                             quoted(name), listed(known), did_you_mean(name, known)));
    return "";
}

std::vector<std::string> read_names(const YamlNode* node, const std::vector<std::string>& known,
                                    const char* file, Problems& problems) {
    std::vector<std::string> names;
    if (!node) return names;
    if (!node->is_list()) problems.add(node->at, node->path, "a list of names is due");
    for (const YamlNode& item : node->items) {
        const std::optional<std::string> name = read_text(item, problems);
        if (!name) continue;
        if (!contains(known, *name))
            problems.add(
                item.at, item.path,
                fmt::format("{} is not in {}{}", quoted(*name), file, did_you_mean(*name, known)));
        else if (contains(names, *name))
            problems.add(item.at, item.path, quoted(*name) + " is listed twice");
        else
            names.push_back(*name);
    }
    return names;
}

/// Those of `known` that the case uses; names that are not known are problems.
std::vector<std::string> used(const std::vector<std::string>& known,
                              const std::vector<NamedUse>& uses, const char* kind,
                              const std::string& chemistry, Problems& problems) {
    for (const NamedUse& use : uses)
        if (!contains(known, use.name))
            problems.add(use.at, use.path,
                         fmt::format("the chemistry {} does not know the {} {}; it knows {}{}",
                                     chemistry, kind, quoted(use.name), listed(known),
                                     did_you_mean(use.name, known)));
    std::vector<std::string> in_use;
    for (const std::string& name : known)
        if (std::any_of(uses.begin(), uses.end(),
                        [&](const NamedUse& use) { return use.name == name; }))
            in_use.push_back(name);
    return in_use;
}

/// Largest probability with which a neutral is kept on bare sites (-1) or on those of a coverage.
double kept(const SurfaceChemistry& surface, int neutral, int coverage) {
    constexpr double room_k = 300;
    double sum = 0;
    const auto applies = [&](const SurfacePart& part) {
        if (part.kind == SurfacePart::Kind::whole) return true;
        return part.kind == SurfacePart::Kind::bare ? coverage < 0 : part.coverage == coverage;
    };
    for (const SurfaceProcess& process : surface.processes) {
        if (const auto* a = std::get_if<Adsorption>(&process))
            sum += a->neutral == neutral && coverage < 0 ? a->sticking : 0;
        if (const auto* r = std::get_if<Recombination>(&process))
            sum += r->neutral == neutral && applies(r->on) ? r->probability.at(room_k) : 0;
        if (const auto* e = std::get_if<SpontaneousEtching>(&process))
            sum += e->neutral == neutral && applies(e->on) ? e->probability.at(room_k) : 0;
        if (const auto* r = std::get_if<NeutralRemoval>(&process))
            sum += r->neutral == neutral && r->coverage == coverage ? r->probability.at(room_k) : 0;
        if (const auto* d = std::get_if<Deposition>(&process))
            sum += d->neutral == neutral && d->coverage == coverage ? d->sticking : 0;
        if (const auto* r = std::get_if<Redeposition>(&process))
            sum += r->neutral == neutral ? r->sticking : 0;
    }
    return sum;
}

void check_probabilities(const SurfaceChemistry& surface, const std::vector<std::string>& neutrals,
                         const YamlNode& node, Problems& problems) {
    for (std::size_t k = 0; k < neutrals.size(); ++k)
        for (int j = -1; j < static_cast<int>(surface.coverages.size()); ++j) {
            const double sum = kept(surface, static_cast<int>(k), j);
            if (sum > 1)
                problems.add(node.at, node.path,
                             fmt::format("the probabilities of {} on {} add up to {:.3g} at 300 K, "
                                         "more than 1",
                                         neutrals[k],
                                         j < 0 ? "bare sites" : "sites of " + surface.coverages[j],
                                         sum));
        }
}

/// A chemistry file while it is turned into a mechanism.
class Loader {
public:
    Loader(const ChemistryRequest& request, const MaterialsLibrary& library, Problems& problems)
        : request_(request), library_(library), problems_(problems) {}

    void load(const std::string& file) {
        chemistry.file = file;
        const std::size_t before = problems_.size();
        root_ = read_yaml_file(file, problems_);
        if (problems_.size() != before) return;
        read_head();
        if (!materials_) return;
        choose_species();
        read_surfaces();
        read_the_rest();
    }
    Chemistry chemistry;

private:
    void read_head() {
        MapReader map(root_, problems_);
        if (const YamlNode* format = map.required("format"))
            read_integer(*format, {1, 1}, problems_);
        if (const YamlNode* title = map.required("title"))
            chemistry.title = read_text(*title, problems_).value_or("");
        names_.ions = read_names(map.required("ions"), names_of(library_.ions), "configs/ions.yaml",
                                 problems_);
        names_.neutrals = read_names(map.required("neutrals"), names_of(library_.neutrals),
                                     "configs/neutrals.yaml", problems_);
        yields_ = map.optional("yields");
        if (yields_) MapReader(*yields_, problems_);
        by_products_ = map.optional("by_products");
        materials_ = map.required("materials");
        map.finish();
        if (by_products_) read_by_product_names();
        if (!materials_) return;
        MapReader(*materials_, problems_);
        for (const YamlNode::Member& member : materials_->members) {
            names_.materials.push_back(member.key);
            if (!library_.material(member.key))
                problems_.add(member.key_at, member.value.path,
                              fmt::format("{} is not in configs/materials.yaml{}",
                                          quoted(member.key),
                                          did_you_mean(member.key, names_of(library_.materials))));
        }
    }

    void read_by_product_names() {
        MapReader(*by_products_, problems_);
        for (const YamlNode::Member& member : by_products_->members) {
            names_.by_products.push_back(member.key);
            if (!contains(names_.neutrals, member.key))
                problems_.add(member.key_at, member.value.path,
                              fmt::format("{} is not among the neutrals: {}{}", quoted(member.key),
                                          listed(names_.neutrals),
                                          did_you_mean(member.key, names_.neutrals)));
        }
        std::vector<std::string> all;
        for (const YamlNode::Member& member : materials_->members)
            all.push_back(member.key);
        const auto given_off = by_products_in_use(*materials_, *by_products_, all);
        for (const YamlNode::Member& member : by_products_->members)
            if (!contains(given_off, member.key))
                problems_.add(member.key_at, member.value.path,
                              "no process gives it off: leaves_as names it nowhere");
    }

    /// By-products come with the materials that give them off, whatever the plasma supplies.
    void add_by_products() {
        if (!by_products_) return;
        std::vector<std::string> materials;
        for (const NamedUse& use : request_.materials)
            materials.push_back(use.name);
        in_use_ = by_products_in_use(*materials_, *by_products_, materials);
        Mechanism& m = chemistry.mechanism;
        std::vector<std::string> neutrals;
        for (const std::string& name : names_.neutrals)
            if (contains(m.neutrals, name) || contains(in_use_, name)) neutrals.push_back(name);
        m.neutrals = std::move(neutrals);
        if (in_use_.empty()) return;
        for (const std::string& name : m.neutrals)
            m.cosine_power.push_back(contains(in_use_, name) ? 1 : 0);
    }

    void choose_species() {
        const std::string& name = request_.chemistry.name;
        Mechanism& m = chemistry.mechanism;
        m.name = name;
        m.ions =
            request_.ions ? used(names_.ions, *request_.ions, "ion", name, problems_) : names_.ions;
        m.neutrals = request_.neutrals
                         ? used(names_.neutrals, *request_.neutrals, "neutral", name, problems_)
                         : names_.neutrals;
        add_by_products();
        if (m.neutrals.size() > max_species)
            problems_.add(request_.chemistry.at, request_.chemistry.path,
                          fmt::format("at most {} neutral species can be followed, {} are used",
                                      max_species, m.neutrals.size()));
        for (const NamedUse& use : request_.materials) {
            if (!materials_->find(use.name))
                problems_.add(use.at, use.path,
                              fmt::format("the chemistry {} does not know the material {}; it "
                                          "knows {}{}",
                                          name, quoted(use.name), listed(names_.materials),
                                          did_you_mean(use.name, names_.materials)));
            chemistry.materials.push_back(use.name);
        }
    }

    /// Reads one material with the given reader; nothing is added if it is not known.
    void read_surface(ProcessReader& reader, const std::string& name, Mechanism& mechanism,
                      bool in_use) {
        const YamlNode* node = materials_->find(name);
        const MaterialData* data = library_.material(name);
        if (!node || !data) return;
        IonReflection reflection = data->reflection;
        mechanism.surfaces.push_back(reader.read(*node, *data, reflection));
        check_probabilities(mechanism.surfaces.back(), mechanism.neutrals, *node, problems_);
        if (!in_use) return;
        chemistry.reflection.push_back(reflection);
        count(data->standing);
    }

    void read_surfaces() {
        ProcessReader reader(names_, library_, yields_, chemistry.mechanism, chemistry.materials,
                             problems_);
        struct Settling {
            int neutral, film;
            double sticking;
            const YamlNode* node;
        };
        std::vector<Settling> settling;
        for (const std::string& name : in_use_) {
            const YamlNode* node = by_products_->find(name);
            const ByProduct product = reader.read_by_product(*node);
            const auto& neutrals = chemistry.mechanism.neutrals;
            const auto at = std::find(neutrals.begin(), neutrals.end(), name);
            if (at != neutrals.end())
                chemistry.mechanism.cosine_power[at - neutrals.begin()] = product.cosine_power;
            if (!product.film.empty() && at != neutrals.end())
                settling.push_back({static_cast<int>(at - neutrals.begin()),
                                    reader.film_id(product.film), product.sticking, node});
        }
        // By index: films that grow are appended while their hosts are read.
        for (std::size_t i = 0; i < chemistry.materials.size(); ++i)
            read_surface(reader, std::string(chemistry.materials[i]), chemistry.mechanism, true);
        if (chemistry.mechanism.surfaces.size() == chemistry.materials.size())
            for (const Settling& s : settling)
                add_redeposition(chemistry.mechanism, s.neutral, s.film, s.sticking, *s.node,
                                 problems_);
        for (const fluxes::SurfaceChemistry& surface : chemistry.mechanism.surfaces)
            if (!settling.empty())
                check_probabilities(surface, chemistry.mechanism.neutrals,
                                    *materials_->find(surface.material), problems_);
        count(reader.counts());
        chemistry.open = reader.open();
        count(library_.common_standing);
    }

    /// Materials that the case does not use are checked all the same.
    void read_the_rest() {
        Mechanism scratch;
        scratch.ions = names_.ions;
        scratch.neutrals = names_.neutrals;
        std::vector<std::string> films;
        ProcessReader reader(names_, library_, yields_, scratch, films, problems_);
        for (const std::string& name : names_.materials)
            if (!contains(chemistry.materials, name)) read_surface(reader, name, scratch, false);
        for (const std::string& name : names_.by_products)
            if (!contains(in_use_, name)) reader.read_by_product(*by_products_->find(name));
    }

    void count(const std::map<Standing, int>& counts) {
        for (const auto& [standing, number] : counts)
            chemistry.standing[standing] += number;
    }

    const ChemistryRequest& request_;
    const MaterialsLibrary& library_;
    Problems& problems_;
    YamlNode root_;
    ChemistryNames names_;
    const YamlNode* yields_ = nullptr;
    const YamlNode* materials_ = nullptr;
    const YamlNode* by_products_ = nullptr;
    std::vector<std::string> in_use_; ///< by-products
};

} // namespace

std::vector<std::string> chemistry_names(const std::string& configs) {
    std::vector<std::string> names;
    std::error_code none;
    for (const auto& entry : std::filesystem::directory_iterator(configs + "/chemistries", none))
        if (entry.path().extension() == ".yaml") names.push_back(entry.path().stem().string());
    std::sort(names.begin(), names.end());
    return names;
}

std::optional<Chemistry> load_chemistry(const ChemistryRequest& request,
                                        const MaterialsLibrary& library, Problems& problems) {
    const std::size_t before = problems.size();
    const std::string file = find_file(request, problems);
    if (file.empty()) return std::nullopt;
    Loader loader(request, library, problems);
    loader.load(file);
    if (problems.size() != before) return std::nullopt;
    return std::move(loader.chemistry);
}

} // namespace rille::engine
