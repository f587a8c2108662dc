// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <atomic>
#include <string>

namespace rille::engine {

/// A worker of a study: a process of its own that runs one point after another, so that a crash, a
/// kill or a lack of memory takes no more than one point. It reads lines and answers in lines:
///   run INDEX TRY      runs a point; answers `share INDEX SHARE` now and then, then one of
///                      `end INDEX SECONDS STATUS`, `stopped INDEX`, `lost INDEX`
///   threads N          threads to use from now on, in the middle of a point too
///   stop               stops the point at hand, with its state saved, and ends
/// The end of the input means stop: a worker does not outlive who started it by more than one
/// refresh of a run. The first answer is `ready`. Where the folder cannot be written the answer is
/// `broken MESSAGE`, and the worker ends.
///
/// Reads standard input and answers on what was standard output; whatever libraries print goes to
/// standard error. Returns its exit status. `stop` is set from outside too, by signals.
int serve_study(const std::string& folder, int threads, std::atomic<bool>& stop);

} // namespace rille::engine
