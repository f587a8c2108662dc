// SPDX-License-Identifier: Apache-2.0
#include "engine/report/page.hpp"

#include "engine/caution.hpp"
#include "engine/report/page_files.hpp"
#include "engine/svg.hpp"
#include "engine/version.hpp"

#include <algorithm>
#include <fmt/format.h>
#include <glib.h>
#include <memory>
#include <regex>
#include <stdexcept>

namespace rille::engine {
namespace {

std::string page_file(const std::string& name) {
    for (const PageFile& file : page_files())
        if (file.name == name) return std::string(file.text);
    throw std::logic_error("no page file " + name);
}

std::string joined(const std::string& first, const std::vector<std::string>& names) {
    std::string text = page_file(first);
    for (const std::string& name : names)
        text += "\n" + page_file(name);
    return text;
}

/// What a content policy knows a script by: its SHA-256 in base64.
std::string policy_hash(const std::string& script) {
    const std::unique_ptr<GChecksum, void (*)(GChecksum*)> sum(g_checksum_new(G_CHECKSUM_SHA256),
                                                               &g_checksum_free);
    g_checksum_update(sum.get(), reinterpret_cast<const guchar*>(script.data()),
                      static_cast<gssize>(script.size()));
    guint8 digest[32];
    gsize length = sizeof digest;
    g_checksum_get_digest(sum.get(), digest, &length);
    const std::unique_ptr<gchar, void (*)(void*)> text(g_base64_encode(digest, length), &g_free);
    return std::string("'sha256-") + text.get() + "'";
}

/// JSON inside a script element: nothing in it may end the element.
std::string json_for_html(std::string json) {
    for (std::size_t at = json.find("</"); at != std::string::npos; at = json.find("</", at + 3))
        json.insert(at + 1, "\\");
    for (std::size_t at = json.find("<!"); at != std::string::npos; at = json.find("<!", at + 6))
        json.replace(at, 1, "\\u003c");
    return json;
}

std::string navigation(const Page& page) {
    if (page.sections.size() < 2) return "";
    std::string html = "<nav aria-label=\"Parts of this page\"><ul>\n";
    for (const PageSection& section : page.sections)
        html += "<li><a href=\"#" + section.id + "\">" +
                escaped(section.label.empty() ? section.title : section.label) + "</a></li>\n";
    return html + "</ul></nav>\n";
}

std::string section_html(const PageSection& section) {
    const std::string heading =
        "<h2 id=\"" + section.id + "-title\">" + escaped(section.title) + "</h2>";
    const std::string open =
        "<section id=\"" + section.id + "\" aria-labelledby=\"" + section.id + "-title\">\n";
    if (!section.is_folded) return open + heading + "\n" + section.html + "\n</section>\n";
    return open + "<details><summary>" + heading + "</summary>\n" + section.html +
           "\n</details>\n</section>\n";
}

std::string class_attribute(const std::string& classes) {
    return classes.empty() ? "" : " class=\"" + escaped(classes) + "\"";
}

std::string class_attribute(const DataTable::Column& column) {
    if (!column.is_number) return class_attribute(column.classes);
    return class_attribute(column.classes.empty() ? "number" : "number " + column.classes);
}

std::string head_row(const DataTable& table) {
    std::string html = "<thead><tr>";
    for (const DataTable::Column& column : table.columns)
        html +=
            "<th scope=\"col\"" + class_attribute(column) + ">" + escaped(column.label) + "</th>";
    return html + "</tr></thead>\n";
}

std::string cell_html(const DataTable::Column& column, const DataTable::Cell& cell) {
    const std::string tag = column.is_row_label ? "th" : "td";
    std::string html = "<" + tag + (column.is_row_label ? " scope=\"row\"" : "");
    html += class_attribute(column);
    if (!cell.copied.empty()) html += " data-value=\"" + escaped(cell.copied) + "\"";
    return html + ">" + (cell.html.empty() ? escaped(cell.text) : cell.html) + "</" + tag + ">";
}

} // namespace

std::string page_html(const Page& page) {
    const std::string style = joined("page.css", page.styles);
    const std::string script = joined("page.js", page.scripts);
    std::string html =
        "<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n"
        "<meta http-equiv=\"Content-Security-Policy\" content=\"default-src 'none'; "
        "style-src 'unsafe-inline'; img-src data: blob:; script-src " +
        policy_hash(script) +
        "; base-uri 'none'; form-action 'none'\">\n"
        "<meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n"
        "<link rel=\"icon\" href=\"data:,\">\n<title>" +
        escaped(page.title) + "</title>\n<style>\n" + style +
        "</style>\n</head>\n<body>\n<a class=\"skip\" href=\"#content\">To the content</a>\n"
        "<header class=\"top\"><p class=\"kind\">" +
        escaped(page.kind) + "</p><h1>" + escaped(page.title) + "</h1>";
    if (!page.subtitle.empty()) html += "<p class=\"subtitle\">" + escaped(page.subtitle) + "</p>";
    html += "</header>\n" + navigation(page) + "<main id=\"content\">\n" + page.summary + "\n";
    for (const PageSection& section : page.sections)
        html += section_html(section);
    html += "</main>\n<footer><p class=\"caution\">" + escaped(caution) + "</p><p>rille " +
            escaped(version() + (revision().empty() ? "" : " (" + revision() + ")")) +
            "</p></footer>\n<div id=\"said\" role=\"status\" aria-live=\"polite\"></div>\n";
    for (const PageData& data : page.data)
        html += "<script type=\"application/json\" id=\"" + data.id + "\">" +
                json_for_html(data.json) + "</script>\n";
    return html + "<script>" + script + "</script>\n</body>\n</html>\n";
}

std::string inline_svg(const std::string& svg, const std::string& prefix) {
    static const std::regex reference("( id=\"|url\\(#|href=\"#)");
    const std::size_t start = svg.find("<svg");
    if (start == std::string::npos) return "";
    return std::regex_replace(svg.substr(start), reference, "$1" + prefix + "-");
}

std::string figure_html(const Figure& figure) {
    std::string html = "<figure id=\"" + figure.id + "\" class=\"drawing" +
                       (figure.narrow.empty() ? "" : " two-forms") +
                       "\">\n<div class=\"frame\" style=\"" +
                       fmt::format("--least: {:.0f}px", figure.least_width) + "\">\n" +
                       inline_svg(figure.svg, figure.id) + "</div>\n";
    if (!figure.narrow.empty())
        html += "<div class=\"frame narrow\">\n" +
                inline_svg(figure.narrow, figure.id + "-narrow") + "</div>\n";
    if (!figure.slide.empty())
        html += "<template>" + inline_svg(figure.slide, figure.id + "-slide") + "</template>\n";
    return html + figure.controls + "<figcaption>" + escaped(figure.caption) +
           (figure.caption.empty() ? "" : " ") +
           "<span class=\"tools\"><button type=\"button\" data-save=\"svg\">SVG</button> "
           "<button type=\"button\" data-save=\"png\">PNG 1920 × 1080</button></span>"
           "</figcaption>\n</figure>\n";
}

std::string table_html(const DataTable& table) {
    std::string html = "<div class=\"table\" id=\"" + table.id +
                       "\">\n<div class=\"frame\"><table" + class_attribute(table.classes) + ">\n";
    if (!table.caption.empty()) html += "<caption>" + escaped(table.caption) + "</caption>\n";
    html += head_row(table) + "<tbody>\n";
    for (const auto& row : table.rows) {
        html += "<tr>";
        for (std::size_t i = 0; i < row.size() && i < table.columns.size(); ++i)
            html += cell_html(table.columns[i], row[i]);
        html += "</tr>\n";
    }
    return html +
           "</tbody>\n</table></div>\n<p class=\"tools\"><button type=\"button\" "
           "data-save=\"copy\">Copy table</button> <button type=\"button\" data-save=\"tsv\">"
           "TSV</button></p>\n</div>\n";
}

std::string escaped_lines(const std::string& text) {
    std::string html;
    for (std::size_t start = 0; start < text.size();) {
        const std::size_t end = std::min(text.find('\n', start), text.size());
        html += escaped(text.substr(start, end - start)) + (end < text.size() ? "\n" : "");
        start = end + 1;
    }
    return html;
}

std::string id_of(const std::string& name) {
    std::string id;
    for (const char c : name) {
        const bool letter = (c >= 'a' && c <= 'z') || (c >= '0' && c <= '9');
        if (letter)
            id += c;
        else if (c >= 'A' && c <= 'Z')
            id += static_cast<char>(c - 'A' + 'a');
        else if (!id.empty() && id.back() != '-')
            id += '-';
    }
    while (!id.empty() && id.back() == '-')
        id.pop_back();
    return id.empty() ? "item" : id;
}

} // namespace rille::engine
