// SPDX-License-Identifier: Apache-2.0
#include "engine/study/study_sources.hpp"

#include "engine/run_record.hpp"

namespace rille::engine {
namespace {

/// Hash of the values of all points. Chained over blocks, so that no study is too long for it.
std::string values_hash(const Study& study) {
    constexpr std::size_t block = 1000;
    std::string text, hash;
    for (const StudyColumn& column : study.columns)
        text += column.path + "\n";
    for (std::size_t index = 0; index < study.points; ++index) {
        for (const StudyValue& value : study_point(study, index).values)
            text += value.text + "\t";
        text += "\n";
        if (index % block != block - 1 && index + 1 != study.points) continue;
        hash = content_hash(hash + text);
        text.clear();
    }
    return content_hash(hash + text);
}

} // namespace

StudySources study_sources(const Study& study) {
    StudySources sources;
    sources.study_yaml = study.resolved_yaml;
    sources.base_yaml = study.base.resolved_yaml;
    sources.base_inputs = study.base.inputs;
    sources.inputs = study.inputs;
    std::string all = sources.base_yaml;
    for (const InputFile& file : sources.base_inputs)
        all += "\n" + file.name + " " + content_hash(file.content);
    sources.hash = content_hash(all + "\n" + values_hash(study));
    return sources;
}

} // namespace rille::engine
