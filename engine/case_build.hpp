// SPDX-License-Identifier: Apache-2.0
#pragma once

// Parts of the case loader, used by case_file.cpp and the reader of studies: each turns checked
// entries into a part of the case and adds what is wrong between values. Parts that were reported
// already are skipped.

#include "engine/case.hpp"
#include "engine/entry.hpp"

#include <string>
#include <vector>

namespace rille::engine {

/// Puts a value at a path of the document, which goes through keys and, in lists, through the
/// `name` of the item; maps that may be left out are made on the way. Problems with it are placed
/// where the value was written.
void set_value(YamlNode& root, const std::string& path, YamlNode value, Problems&);
/// Applies "key.path=value" to the document.
void apply_overrides(YamlNode& root, const std::vector<std::string>& overrides, Problems&);

/// What a document of a case says.
struct BuiltCase {
    Case result;
    Entry root; ///< checked, defaults filled in
};
/// The case of a document whose overrides are applied; paths of files start in `folder`. Every
/// problem is added; then parts of the case are missing. `with_arrivals` false: everything but what
/// the ions do on their way through the sheath, which takes the time.
BuiltCase build_case(YamlNode node, const std::string& name, const std::string& folder,
                     bool with_arrivals, Problems&);
/// Replaces `from: NAME` in plasmas by a copy of that plasma, with the keys given on top.
void copy_plasmas(YamlNode& root, Problems&);
/// Whether the value under this key of a plasma is the path of a file.
bool names_a_file(const std::string& key);
/// Makes the paths of files absolute: they are relative to the folder of the case.
void absolute_files(YamlNode& root, const std::string& folder);

/// Reads every file that the case names into `inputs` and puts the names of the copies in place of
/// the paths.
void keep_inputs(Entry& root, Case&);

/// Index of a material in the run's list, added if it is new; 0 for a name already reported.
int material_index(Case&, const Entry& name);

void build_domain(const Entry& root, Case&, Problems&);
void build_stack(const Entry& root, Case&, Problems&);
void build_mask(const Entry& root, Case&, Problems&);
void build_plasmas(const Entry& root, Case&, Problems&);
/// Part of build_plasmas: rf_bias, pulse and ion_energies of one plasma.
void build_bias(const Entry& plasma_entry, Case&, Plasma&, Problems&);
void build_recipe(const Entry& root, Case&, Problems&);
/// Heights of the CD; where the case names none, three in the first film, which are also written
/// into `root`.
void build_measure(Entry& root, Case&, Problems&);
void build_targets(const Entry& root, Case&, Problems&);
/// Contour and CD table to compare with; after build_measure.
void build_measured(const Entry& root, Case&, Problems&);
/// The mechanism for the materials, ions and neutrals of the case; masses of the ions.
void build_chemistry(const Entry& root, const std::string& folder, Case&, Problems&);
/// What reaches the wafer, once species have masses: fluxes of neutrals that were given by density,
/// and the ions through the sheath. A sheath outside what can be computed is a problem.
void build_arrivals(const Entry& root, Case&, Problems&);

/// Number of cells along x near `asked` spacing [nm] for which a whole number of cells fits into
/// the width along y as well; 0 if there is none within 20 %.
int common_cells(double width_x, double width_y, double asked);

/// Film of that name with a bounded thickness or not; -1 if there is none.
int film_index(const Case&, const std::string& name);
std::vector<std::string> film_names(const Case&);
std::vector<std::string> opening_names(const Case&);

} // namespace rille::engine
