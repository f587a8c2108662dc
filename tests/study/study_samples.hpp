// SPDX-License-Identifier: Apache-2.0
// Study files for tests, written into a folder of their own.
#pragma once

#include "engine/problems.hpp"
#include "engine/study/study.hpp"

#include <filesystem>
#include <fstream>
#include <string>
#include <unistd.h>

namespace rille::tests {

/// A folder that is there while the test runs, with a small case in it.
class StudyFolder {
public:
    StudyFolder() {
        static int count = 0;
        path_ = std::filesystem::temp_directory_path() /
                ("rille_study_" + std::to_string(getpid()) + "_" + std::to_string(count++));
        std::filesystem::create_directories(path_);
        write("case.yaml", small_case);
    }
    ~StudyFolder() { std::filesystem::remove_all(path_); }
    StudyFolder(const StudyFolder&) = delete;
    StudyFolder& operator=(const StudyFolder&) = delete;

    std::string path(const std::string& name) const { return (path_ / name).string(); }
    void write(const std::string& name, const std::string& text) const {
        std::filesystem::create_directories((path_ / name).parent_path());
        std::ofstream(path_ / name) << text;
    }
    /// The study "format: 1, base: case.yaml" with these lines.
    engine::Study load(const std::string& lines) const {
        write("study.yaml", "format: 1\nbase: case.yaml\n" + lines);
        return engine::load_study(path("study.yaml"));
    }
    /// What is said about it; lines count from 3. The folder's own name is cut away.
    std::string problems(const std::string& lines) const {
        try {
            load(lines);
        } catch (const engine::InputError& error) {
            std::string text = error.what();
            const std::string own = path_.string() + "/";
            for (std::size_t at = text.find(own); at != std::string::npos; at = text.find(own))
                text.erase(at, own.size());
            return text;
        }
        return "";
    }

    static constexpr const char* small_case = R"(format: 1
title: small trench
symmetry: extruded
pitch: 160 nm
spacing: 4 nm
stack:
  - {name: film, material: Si, thickness: 60 nm}
  - {name: bulk, material: SiO2, thickness: semi-infinite}
mask:
  material: resist
  thickness: 60 nm
  openings: [{name: line, shape: trench, cd: 60 nm}]
plasmas:
  main:
    ion_flux: 1.1 mA/cm2
    ions: {Cl2+: 70 %, Ar+: 30 %}
    neutrals: {Cl: {flux: 3e18 /cm2/s, temperature: 400 K}}
    rf_bias: {frequency: 13.56 MHz, amplitude: 115 V}
  strip: {from: main, electron_temperature: 2 eV}
chemistry: silicon-cl2-ar
recipe:
  wafer_temperature: 50 degC
  steps: [{name: main, plasma: main, time: 4 s}]
)";

private:
    std::filesystem::path path_;
};

} // namespace rille::tests
