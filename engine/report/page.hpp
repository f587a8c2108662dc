// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <string>
#include <vector>

namespace rille::engine {

/// A part of a page below its first screen.
struct PageSection {
    std::string id; ///< its anchor, one of its kind on the page: a-z, 0-9, -
    std::string title;
    std::string html;
    bool is_folded = false; ///< closed until it is asked for; open in print
    std::string label{};    ///< in the navigation; empty: the title
};

/// JSON for the page's scripts: `rille.data(id)` gives it parsed.
struct PageData {
    std::string id;
    std::string json;
};

/// A report as one HTML file that needs nothing beside it: no network, no other file.
struct Page {
    std::string kind;     ///< small line above the title: "Run", "Study"
    std::string title;    ///< text
    std::string subtitle; ///< text
    std::string summary;  ///< HTML of the first screen
    std::vector<PageSection> sections;
    std::vector<PageData> data;
    std::vector<std::string> styles;  ///< names of page files after page.css
    std::vector<std::string> scripts; ///< names of page files after page.js, in their order
};

/// The page with its styles and scripts inside, and a content policy that allows those scripts
/// alone and no request. Throws std::logic_error for a page file that there is not.
std::string page_html(const Page&);

/// A figure with its downloads: SVG, and PNG of 1920 x 1080 for a slide. The SVG itself must carry
/// title and caution, since it is what is saved.
struct Figure {
    std::string id;       ///< one of its kind on the page; also the name of the saved file
    std::string svg;      ///< a whole SVG document, as Svg::finish gives it
    std::string caption;  ///< text
    std::string narrow{}; ///< shown instead on a screen of a hand's width; empty: `svg`
    std::string slide{};  ///< what the PNG holds; empty: the drawing as it is shown
    /// Narrowest width at which the drawing can be read [px]: it is not drawn smaller, but scrolls
    /// inside its frame.
    double least_width = 300;
    std::string controls{}; ///< HTML between drawing and caption
};
std::string figure_html(const Figure&);
/// An SVG document for use within HTML: without its XML declaration, every id with the prefix, so
/// that several drawings on a page do not mix up their patterns and clips.
std::string inline_svg(const std::string& svg, const std::string& prefix);

/// A table that can be copied and saved as tab-separated text.
struct DataTable {
    std::string id;
    std::string caption; ///< text; empty for none
    struct Column {
        std::string label;         ///< text, with unit: "CD (nm)"
        bool is_number = false;    ///< set to the right
        std::string classes{};     ///< of all its cells, for style and scripts
        bool is_row_label = false; ///< names the row: a header cell
    };
    std::vector<Column> columns;
    struct Cell {
        std::string text;     ///< as shown, and as copied unless `copied` is given
        std::string copied{}; ///< full precision, for numbers
        std::string html{};   ///< shown instead of `text` if not empty
    };
    std::vector<std::vector<Cell>> rows;
    std::string classes; ///< of the table, for style and scripts
};
std::string table_html(const DataTable&);

/// Text for HTML with its line breaks kept; other control characters become spaces.
std::string escaped_lines(const std::string& text);
/// A name as part of an id: lower case letters, digits, hyphens.
std::string id_of(const std::string& name);

} // namespace rille::engine
