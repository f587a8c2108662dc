// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <stdexcept>
#include <string>

namespace rille {

/// A computation left the range in which it can be trusted (exit status 4).
struct NumericsError : std::runtime_error {
    using std::runtime_error::runtime_error;
};

/// A broken assumption inside the program itself (exit status 1).
struct InternalError : std::logic_error {
    using std::logic_error::logic_error;
};

} // namespace rille

/// The one assertion of the project: stays on in every build type.
#define RILLE_CHECK(condition, message)                                                            \
    do {                                                                                           \
        if (!(condition))                                                                          \
            throw ::rille::InternalError(std::string(__FILE__) + ":" + std::to_string(__LINE__) +  \
                                         ": " #condition ": " + (message));                        \
    } while (false)
