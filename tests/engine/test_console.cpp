// SPDX-License-Identifier: Apache-2.0
#include "engine/caution.hpp"
#include "engine/console.hpp"
#include "tests/engine/output_samples.hpp"

#include <catch2/catch.hpp>
#include <sstream>

using namespace rille::engine;

TEST_CASE("console: a bar on a terminal, with time left") {
    std::ostringstream out;
    double now = 0;
    Progress progress(out, Progress::Style::bar, [&] { return now; });
    now = 30;
    progress.update({0.25, 12.5, "main", 51.25});
    CHECK(out.str() ==
          "\r[######..................]  25 %  main 12.5 s  depth 51.2 nm  left 1 min 30 s\x1b[K");
    now = 30.05;
    const std::string before = out.str();
    progress.update({0.26, 12.6, "main", 51.3}); // too soon
    CHECK(out.str() == before);
    progress.note("warning: a void has closed off"); // wipes the bar; the next update draws it anew
    progress.update({0.26, 12.6, "main", 51.3});
    CHECK(out.str().find("\r\x1b[Kwarning: a void has closed off\n\r[######") != std::string::npos);
    progress.finish();
    CHECK(out.str().find(" 26 %") != std::string::npos);
    CHECK(out.str().back() == '\n');
}

TEST_CASE("console: plain lines elsewhere, nothing when quiet") {
    std::ostringstream lines, quiet;
    double now = 0;
    Progress plain(lines, Progress::Style::lines, [&] { return now; });
    Progress silent(quiet, Progress::Style::quiet, [&] { return now; });
    for (now = 0; now < 25; now += 1) {
        plain.update({now / 25, now, "main", {}});
        silent.update({now / 25, now, "main", {}});
    }
    plain.note("warning: said at once");
    silent.note("warning: said at once");
    plain.finish();
    silent.finish();
    CHECK(lines.str().find("\nwarning: said at once\n") != std::string::npos);
    const std::string text = lines.str();
    CHECK(std::count(text.begin(), text.end(), '\n') == 5); // 0, 10, 20 s, the warning, the end
    CHECK(text.find('\r') == std::string::npos);
    CHECK(quiet.str().empty());
    CHECK(duration_text(59.4) == "59 s");
    CHECK(duration_text(125) == "2 min 05 s");
    CHECK(duration_text(7800) == "2 h 10 min");
}

TEST_CASE("console: the closing words hold the warnings, the standing and the caution") {
    Case c = rille::tests::trench_case();
    c.warnings = {"charging is not modelled"};
    RunRecord record;
    record.steps = {{"main", 0, 61.5, "reached stop at trench"}};
    Metrics metrics;
    metrics.metrics = {{"bottom cd", "trench", 58.2, "nm", 0.3, "", ""}};
    const std::string text = closing_text(c, record, metrics, "out/run");
    for (const char* part : {"58.2 ± 0.3 nm", "charging is not modelled", "2 illustrative",
                             "out/run", "main: 0.00 to 61.50 s, reached stop at trench", caution})
        CHECK(text.find(part) != std::string::npos);
}
