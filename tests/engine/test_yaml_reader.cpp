// SPDX-License-Identifier: Apache-2.0
#include "engine/words.hpp"
#include "engine/yaml_reader.hpp"
#include "engine/yaml_values.hpp"

#include <catch2/catch.hpp>

#include <algorithm>

using namespace rille::engine;

namespace {

std::string report_of(const Problems& problems) {
    std::string text;
    for (const Problem& problem : problems.sorted())
        text += (text.empty() ? "" : "\n") + describe(problem);
    return text;
}

std::string problems_of(const std::string& yaml) {
    Problems problems;
    read_yaml_text(yaml, "f.yaml", problems);
    return report_of(problems);
}

} // namespace

TEST_CASE("a document keeps the place and the path of every value") {
    Problems problems;
    const YamlNode root = read_yaml_text(
        "a: 1\nlist:\n  - {name: x, cd: 5 nm}\n  - 7\nn:\nq: \"8\"\n", "f.yaml", problems);
    REQUIRE(problems.empty());
    const YamlNode& cd = *root.find("list")->items[0].find("cd");
    CHECK(cd.path == "list.x.cd");
    CHECK(cd.at.line == 3);
    CHECK(cd.at.column == 19);
    CHECK(root.find("list")->items[1].path == "list[2]");
    CHECK(root.find("n")->is_empty());
    CHECK(root.find("n")->at.line == 5); // not at the next key
    CHECK(root.find("q")->is_quoted);
    CHECK_FALSE(cd.is_quoted);
}

TEST_CASE("every trap of YAML has its own message") {
    CHECK(problems_of("a: 1\nb: 2\na: 3\n") ==
          "f.yaml:3:1: the key \"a\" is given twice; the first is on line 1");
    CHECK(problems_of("m: {x:5 nm}\n") ==
          "f.yaml:1:5: m: \"x:5 nm\": a space is missing after the colon; write \"x: 5 nm\"");
    CHECK(problems_of("a: 1\npitch:160 nm\nb: 2\n") ==
          "f.yaml:2:1: a space is missing after the colon");
    CHECK(problems_of("pitch:160 nm\nb: 2\n") == "f.yaml:1:1: a space is missing after the colon");
    CHECK(problems_of("a:\n\tb: 1\n") ==
          "f.yaml:2:1: a tab in the indentation; indent with spaces");
    CHECK(problems_of("a: &x 1\nb: *x\n") ==
          "f.yaml:1:4: a: anchors (&x) are not read; write the value out\n"
          "f.yaml:2:4: b: aliases (*name) are not read; write the value out");
    CHECK(problems_of("a: {<<: {c: 1}, b: 2}\n") ==
          "f.yaml:1:5: a: merge keys (<<) are not read; write the values out");
    CHECK(problems_of("a: !!int 3\n") ==
          "f.yaml:1:4: a: tags (tag:yaml.org,2002:int) are not read; leave it out");
    CHECK(problems_of("a: 1\n---\nb: 2\n") ==
          "f.yaml:2:1: a second document (---) in one file; write one case or data set a file");
    CHECK(problems_of("a: " + std::string(20000, '[')).find("nested more than 32 deep") !=
          std::string::npos);
    CHECK(problems_of("a: " + std::string(20000, '[')).size() < 300);
    CHECK(problems_of("a: \xff\n") == "f.yaml:1:4: bytes that are not UTF-8 text");
    CHECK(problems_of("[a, b]: 1\n").find("where a key is due") != std::string::npos);
    CHECK(problems_of("a: {b: 1\n").find("a brace { is not closed") != std::string::npos);
    CHECK(problems_of("a: \"b\n") == "f.yaml:1:4: a: a quote is not closed");
    CHECK(problems_of("a: 'it''s'\nb: \"c \\\" d\"\n").empty());
    CHECK(problems_of("title: a: b\n").find("needs quotes") != std::string::npos);
    CHECK(problems_of("a: 1\n").empty());
}

TEST_CASE("several problems are reported in one go, in the order of the file") {
    const std::string report = problems_of("a: 1\na: 2\nm: {x:5 nm}\nb: 1\nb: 2\n");
    CHECK(std::count(report.begin(), report.end(), '\n') == 2);
    CHECK(report.find(":2:1") < report.find(":3:5"));
    CHECK(report.find(":3:5") < report.find(":5:1"));
}

TEST_CASE("files that cannot be read are input errors") {
    Problems problems;
    read_yaml_file("/no/such/file.yaml", problems);
    read_yaml_file("/tmp", problems, "folder");
    CHECK(report_of(problems) ==
          "/no/such/file.yaml: no such file\nfolder: is a folder; a file is due");
}

TEST_CASE("values: traps of plain text, truth, integers and words") {
    Problems problems;
    const YamlNode root = read_yaml_text(
        "no: NO\nquoted: \"NO\"\nempty:\ntime: 1:30\noctal: 010\nnan: .nan\non: on\nlist: [1]\n"
        "half: 1.5\nbig: 1e300\nword: extrudet\nsix: 6\n",
        "f.yaml", problems);
    REQUIRE(problems.empty());
    const auto says = [&](auto read, const char* key) {
        Problems found;
        read(*root.find(key), found);
        return report_of(found);
    };
    const auto text = [](const YamlNode& n, Problems& p) { read_text(n, p); };
    const auto number = [](const YamlNode& n, Problems& p) { read_number(n, {}, p); };
    const auto integer = [](const YamlNode& n, Problems& p) { read_integer(n, {1, 5}, p); };
    const auto truth = [](const YamlNode& n, Problems& p) { read_truth(n, p); };
    const auto word = [](const YamlNode& n, Problems& p) { read_word(n, {"extruded", "full"}, p); };
    CHECK(says(text, "no") ==
          "f.yaml:1:5: no: NO reads as false in YAML; put it in quotes if it is meant as text");
    CHECK(says(text, "quoted").empty());
    CHECK(says(text, "empty") == "f.yaml:3:1: empty: has no value; text is due");
    CHECK(says(number, "time") ==
          "f.yaml:4:7: time: \"1:30\" reads as a number to base 60 in YAML: "
          "write it with a unit, for example 90 s; a number is due");
    CHECK(says(number, "octal") == "f.yaml:5:8: octal: \"010\" has a leading zero (octal to YAML): "
                                   "write it without; a number is due");
    CHECK(says(number, "nan") ==
          "f.yaml:6:6: nan: \".nan\" is not a finite number; a number is due");
    CHECK(says(truth, "on") == "f.yaml:7:5: on: \"on\" is not read as a truth value; write true");
    CHECK(says(truth, "six") == "f.yaml:12:6: six: \"6\" stands where true or false is due");
    CHECK(says(number, "list") == "f.yaml:8:7: list: a list stands where a number is due");
    CHECK(says(integer, "half") == "f.yaml:9:7: half: \"1.5\" is not a whole number");
    CHECK(says(integer, "six") ==
          "f.yaml:12:6: six: \"6\" is out of range; allowed is at least 1 and at most 5");
    CHECK(says(word, "word") == "f.yaml:11:7: word: \"extrudet\" is not known here; allowed: "
                                "extruded or full; did you mean \"extruded\"?");
}

TEST_CASE("a map reader reports missing and unknown keys") {
    Problems problems;
    const YamlNode root = read_yaml_text("m: {thicknes: 3 nm}\n", "f.yaml", problems);
    MapReader map(*root.find("m"), problems);
    CHECK(map.required("thickness") == nullptr);
    map.finish();
    CHECK(report_of(problems) ==
          "f.yaml:1:4: m: the key \"thickness\" is missing\n"
          "f.yaml:1:5: m.thicknes: unknown key; did you mean \"thickness\"?");
}

TEST_CASE("suggestions are close words only") {
    CHECK(edit_distance("pithc", "pitch") == 1);
    CHECK(closest("Thickness", {"thickness"}) == "thickness");
    CHECK(closest("pressure", {"thickness", "cd"}).empty());
    CHECK(closest("cs", {"cd", "space"}) == "cd");
}
