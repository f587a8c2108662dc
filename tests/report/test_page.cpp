// SPDX-License-Identifier: Apache-2.0
#include "engine/report/page.hpp"
#include "engine/report/page_files.hpp"
#include "engine/svg.hpp"

#include <catch2/catch.hpp>
#include <regex>

using namespace rille::engine;

namespace {

/// Whatever in a page's text would make a browser ask for something elsewhere.
std::vector<std::string> requests_in(const std::string& html) {
    static const std::regex outside("(src|href)=\"(?!#|data:|blob:)[^\"]*\"|@import|url\\((?!#)"
                                    "|import\\(|fetch\\(|XMLHttpRequest|WebSocket|sendBeacon");
    std::vector<std::string> found;
    for (std::sregex_iterator at(html.begin(), html.end(), outside), end; at != end; ++at)
        found.push_back(at->str());
    return found;
}

std::string drawing() {
    Svg svg(200, 100, "a drawing");
    svg.define("<clipPath id=\"frame\"><rect width=\"9\" height=\"9\"/></clipPath>");
    svg.raw("<g clip-path=\"url(#frame)\"><use href=\"#frame\"/></g>");
    return svg.finish();
}

Page sample() {
    Page page;
    page.kind = "Run";
    page.title = "Trench <script>alert(1)</script> & more";
    page.summary = "<p>first</p>";
    page.sections = {{"one", "One", figure_html({"fig", drawing(), "A caption"}), false},
                     {"two", "Two", "<pre>text</pre>", true}};
    page.data = {{"numbers", "{\"text\": \"</script><!-- \"}"}};
    return page;
}

} // namespace

TEST_CASE("a page needs nothing beside itself", "[page]") {
    const std::string html = page_html(sample());
    CHECK(requests_in(html).empty());
    CHECK(html.find("default-src 'none'") != std::string::npos);
    // The same search finds what a page must not have.
    CHECK(requests_in("<img src=\"http://a.invalid/x.png\">").size() == 1);
    CHECK(requests_in("<style>@import \"x.css\"; a { background: url(x.png) }</style>").size() ==
          2);
}

TEST_CASE("text in a page stays text", "[page]") {
    const std::string html = page_html(sample());
    CHECK(html.find("<script>alert") == std::string::npos);
    CHECK(html.find("Trench &lt;script&gt;") != std::string::npos);
    // The data block ends where its JSON does, and nowhere before.
    const std::size_t data = html.find("id=\"numbers\">");
    REQUIRE(data != std::string::npos);
    CHECK(html.substr(data + 13, html.find("</script>", data) - data - 13) ==
          "{\"text\": \"<\\/script>\\u003c!-- \"}");
}

TEST_CASE("drawings on a page keep their own patterns and clips", "[page]") {
    const std::string svg = inline_svg(drawing(), "a");
    CHECK(svg.rfind("<svg", 0) == 0);
    CHECK(svg.find(" id=\"a-frame\"") != std::string::npos);
    CHECK(svg.find("url(#a-frame)") != std::string::npos);
    CHECK(svg.find("href=\"#a-frame\"") != std::string::npos);
    CHECK(svg.find("#frame") == std::string::npos);
}

TEST_CASE("a table shows rounded numbers and copies whole ones", "[page]") {
    DataTable table;
    table.id = "cds";
    table.columns = {{"CD", false, "", true}, {"value (nm)", true}};
    table.rows = {{{"top"}, {"60.1", "60.1234"}}, {{"a < b"}, {"-"}}};
    const std::string html = table_html(table);
    CHECK(html.find("<th scope=\"row\">top</th>") != std::string::npos);
    CHECK(html.find("<td class=\"number\" data-value=\"60.1234\">60.1</td>") != std::string::npos);
    CHECK(html.find("a &lt; b") != std::string::npos);
}

TEST_CASE("page files are embedded and unknown ones are refused", "[page]") {
    CHECK(page_files().size() >= 2);
    Page page = sample();
    page.scripts = {"no-such.js"};
    CHECK_THROWS_AS(page_html(page), std::logic_error);
    CHECK(id_of("Top CD (nm)") == "top-cd-nm");
    CHECK(id_of("?") == "item");
}
