// SPDX-License-Identifier: Apache-2.0
#include "engine/report/study_parts.hpp"

namespace rille::engine {

PageSection effects_section(const StudyParts&) {
    return {"effects", "What matters most", "", false};
}

} // namespace rille::engine
