// SPDX-License-Identifier: Apache-2.0
#include "engine/yaml_reader.hpp"

#include "engine/words.hpp"

#include <fmt/format.h>
#include <yaml-cpp/eventhandler.h>
#include <yaml-cpp/yaml.h>

#include <algorithm>
#include <filesystem>
#include <fstream>
#include <map>
#include <sstream>

namespace rille::engine {

namespace {

constexpr std::size_t deepest = 32;
constexpr std::size_t most_values = 1000000;

/// Ends the parse once the document cannot be read any further; the problem is already noted.
struct Abandon {};

/// Whether the quote that opens at line, column (from 0) closes again. The parser takes the end of
/// the file for a closing quote.
bool is_closed(const std::vector<std::string>& lines, int line, int column) {
    if (line >= static_cast<int>(lines.size()) || column >= static_cast<int>(lines[line].size()))
        return true;
    const char quote = lines[line][column];
    if (quote != '"' && quote != '\'')
        return true; // a block of literal text
    std::size_t at = static_cast<std::size_t>(column) + 1;
    for (std::size_t l = line; l < lines.size(); ++l, at = 0)
        for (; at < lines[l].size(); ++at) {
            if (quote == '"' && lines[l][at] == '\\')
                ++at;
            else if (lines[l][at] == quote)
                return true;
        }
    return false;
}

/// Builds the tree from the events of the parser. Events rather than the library's own nodes,
/// because only they show duplicate keys, quotes, anchors and the place of empty values.
class TreeBuilder : public YAML::EventHandler {
public:
    TreeBuilder(std::string file, const std::vector<std::string>& lines, Problems& problems)
        : file_(std::move(file)), lines_(lines), problems_(problems) {}

    YamlNode root;
    int documents = 0;

    void OnDocumentStart(const YAML::Mark& mark) override {
        if (++documents > 1) {
            problems_.add(place(mark), "",
                          "a second document (---) in one file; write one case or "
                          "data set a file");
            throw Abandon();
        }
    }
    void OnDocumentEnd() override {}

    void OnNull(const YAML::Mark& mark, YAML::anchor_t) override {
        YamlNode node;
        node.at = place(mark);
        if (expects_value())
            node.at = open_.back().node.members.back().key_at;
        put(std::move(node), mark);
    }
    void OnAlias(const YAML::Mark& mark, YAML::anchor_t) override {
        problems_.add(place(mark), path(), "aliases (*name) are not read; write the value out");
        YamlNode node;
        node.kind = YamlNode::Kind::scalar;
        node.is_quoted = true;
        node.at = place(mark);
        put(std::move(node), mark);
    }
    void OnScalar(const YAML::Mark& mark, const std::string& tag, YAML::anchor_t,
                  const std::string& value) override {
        check_tag(mark, tag);
        if (tag == "!" && !is_closed(lines_, mark.line, mark.column)) {
            problems_.add(place(mark), path(), "a quote is not closed");
            throw Abandon();
        }
        YamlNode node;
        node.kind = YamlNode::Kind::scalar;
        node.text = value;
        node.is_quoted = tag == "!";
        node.at = place(mark);
        put(std::move(node), mark);
    }
    void OnSequenceStart(const YAML::Mark& mark, const std::string& tag, YAML::anchor_t,
                         YAML::EmitterStyle::value) override {
        open(YamlNode::Kind::list, mark, tag);
    }
    void OnSequenceEnd() override { close(); }
    void OnMapStart(const YAML::Mark& mark, const std::string& tag, YAML::anchor_t,
                    YAML::EmitterStyle::value) override {
        open(YamlNode::Kind::map, mark, tag);
    }
    void OnMapEnd() override { close(); }
    void OnAnchor(const YAML::Mark& mark, const std::string& name) override {
        if (!name.empty())
            problems_.add(place(mark), path(),
                          fmt::format("anchors (&{}) are not read; write the value out", name));
    }

private:
    struct Open {
        YamlNode node;
        bool key_given = false; ///< a map: the next value belongs to the last member
        bool dropped = false;   ///< stands in the place of a key: not kept
    };

    Location place(const YAML::Mark& mark) const { return {file_, mark.line + 1, mark.column + 1}; }

    bool expects_value() const {
        return !open_.empty() && open_.back().node.is_map() && open_.back().key_given;
    }

    std::string path() const {
        std::string text;
        for (const Open& level : open_) {
            if (level.node.is_map() && level.key_given)
                text += (text.empty() ? "" : ".") + level.node.members.back().key;
            if (level.node.is_list())
                text += fmt::format("[{}]", level.node.items.size() + 1);
        }
        return text;
    }

    void check_tag(const YAML::Mark& mark, const std::string& tag) {
        if (!tag.empty() && tag != "?" && tag != "!")
            problems_.add(place(mark), path(),
                          fmt::format("tags ({}) are not read; leave it out", tag));
    }

    void open(YamlNode::Kind kind, const YAML::Mark& mark, const std::string& tag) {
        check_tag(mark, tag);
        if (open_.size() >= deepest) {
            problems_.add(place(mark), "",
                          fmt::format("lists and maps are nested more than {} deep", deepest));
            throw Abandon();
        }
        Open level;
        level.node.kind = kind;
        level.node.at = place(mark);
        level.dropped = !open_.empty() && open_.back().node.is_map() && !open_.back().key_given;
        const bool inside_dropped = std::any_of(open_.begin(), open_.end(),
                                                [](const Open& outer) { return outer.dropped; });
        if (level.dropped && !inside_dropped)
            problems_.add(place(mark), path(), "a list or a map stands where a key is due");
        open_.push_back(std::move(level));
    }

    void close() {
        Open level = std::move(open_.back());
        open_.pop_back();
        if (level.dropped) {
            add_key("", level.node.at);
            return;
        }
        put_value(std::move(level.node));
    }

    void put(YamlNode node, const YAML::Mark& mark) {
        if (++values_ > most_values) {
            problems_.add(place(mark), "", fmt::format("more than {} values", most_values));
            throw Abandon();
        }
        if (!open_.empty() && open_.back().node.is_map() && !open_.back().key_given)
            take_key(node);
        else
            put_value(std::move(node));
    }

    void take_key(const YamlNode& node) {
        if (node.is_empty() || node.text.empty())
            problems_.add(node.at, path(), "an empty key");
        else if (node.text == "<<" && !node.is_quoted)
            problems_.add(node.at, path(), "merge keys (<<) are not read; write the values out");
        else if (const YamlNode* first = open_.back().node.find(node.text))
            problems_.add(node.at, path(),
                          fmt::format("the key {} is given twice; the first is on line {}",
                                      quoted(node.text), first_line(node.text, *first)));
        add_key(node.text, node.at);
    }

    int first_line(const std::string& key, const YamlNode& value) const {
        for (const YamlNode::Member& member : open_.back().node.members)
            if (member.key == key)
                return member.key_at.line;
        return value.at.line;
    }

    void add_key(const std::string& key, const Location& at) {
        open_.back().node.members.push_back({key, at, {}});
        open_.back().key_given = true;
    }

    void put_value(YamlNode node) {
        if (open_.empty()) {
            root = std::move(node);
            return;
        }
        Open& parent = open_.back();
        if (parent.node.is_list()) {
            parent.node.items.push_back(std::move(node));
            return;
        }
        parent.key_given = false;
        YamlNode::Member& member = parent.node.members.back();
        member.value = std::move(node);
        if (is_unusable(member))
            parent.node.members.pop_back();
    }

    /// Keys that were already reported, so that nothing is said about their values.
    bool is_unusable(const YamlNode::Member& member) {
        const auto& members = open_.back().node.members;
        const bool again = std::any_of(members.begin(), members.end() - 1,
                                       [&](const auto& m) { return m.key == member.key; });
        const std::size_t colon = member.key.find(':');
        const bool no_space =
            member.value.is_empty() && colon != std::string::npos && colon + 1 < member.key.size();
        if (no_space)
            problems_.add(member.key_at, path(),
                          fmt::format("{}: a space is missing after the colon; write \"{}: {}\"",
                                      quoted(member.key), member.key.substr(0, colon),
                                      trimmed(member.key.substr(colon + 1))));
        return again || no_space || member.key.empty() || member.key == "<<";
    }

    std::string file_;
    const std::vector<std::string>& lines_;
    Problems& problems_;
    std::vector<Open> open_;
    std::size_t values_ = 0;
};

std::vector<std::string> split_lines(const std::string& text) {
    std::vector<std::string> lines;
    std::istringstream stream(text);
    for (std::string line; std::getline(stream, line);)
        lines.push_back(line);
    return lines;
}

/// Column of the first byte that is not UTF-8, 0 if there is none.
int bad_utf8(const std::string& line) {
    for (std::size_t i = 0; i < line.size();) {
        const auto c = static_cast<unsigned char>(line[i]);
        const std::size_t more = c < 0x80                ? 0
                                 : c >= 0xc2 && c < 0xe0 ? 1
                                 : (c & 0xf0) == 0xe0    ? 2
                                 : c >= 0xf0 && c < 0xf5 ? 3
                                                         : 9;
        if (more == 9 || i + more >= line.size() + (more == 0))
            return static_cast<int>(i) + 1;
        for (std::size_t k = 1; k <= more; ++k)
            if ((static_cast<unsigned char>(line[i + k]) & 0xc0u) != 0x80u)
                return static_cast<int>(i) + 1;
        i += more + 1;
    }
    return 0;
}

/// Traps that the parser does not report, or reports in words that do not help. True if the
/// document should not be parsed.
bool report_text_traps(const std::vector<std::string>& lines, const std::string& file,
                       Problems& problems) {
    bool stop = false;
    for (std::size_t l = 0; l < lines.size(); ++l) {
        const int line = static_cast<int>(l) + 1;
        if (const int column = bad_utf8(lines[l])) {
            problems.add({file, line, column}, "", "bytes that are not UTF-8 text");
            stop = true;
        }
        const std::size_t first = lines[l].find_first_not_of(" \t\r");
        const std::size_t tab = lines[l].find('\t');
        if (first != std::string::npos && lines[l][first] != '#' && tab < first) {
            problems.add({file, line, static_cast<int>(tab) + 1}, "",
                         "a tab in the indentation; indent with spaces");
            stop = true;
        }
    }
    return stop;
}

/// "key:value" at the start of a line near a syntax error: {line, column of the key}, or {0, 0}.
Location missing_space(const std::vector<std::string>& lines, const std::string& file, int near) {
    for (int l = std::min<int>(near, static_cast<int>(lines.size())); l >= std::max(1, near - 2);
         --l) {
        const std::string& line = lines[l - 1];
        std::size_t first = line.find_first_not_of(" -");
        if (first == std::string::npos)
            continue;
        const std::size_t colon = line.find(':', first);
        const std::size_t space = line.find_first_of(" {[\"'#", first);
        if (colon != std::string::npos && colon < space && colon + 1 < line.size() &&
            colon > first && line[colon + 1] != ' ' && line[colon + 1] != '\r')
            return {file, l, static_cast<int>(first) + 1};
    }
    return {};
}

std::string plain_words(const std::string& parser_message) {
    static const std::map<std::string, std::string> words = {
        {"illegal map value", "a colon where no key can stand; is the line indented like its "
                              "neighbours? Text that holds \": \" needs quotes"},
        {"end of map not found", "keys of one map must be indented alike, and braces closed"},
        {"end of sequence not found", "items of one list must be indented alike"},
        {"end of map flow not found", "a brace { is not closed, or a comma is missing"},
        {"end of sequence flow not found", "a bracket [ is not closed, or a comma is missing"},
        {"unknown escape character: ", "unknown escape after a backslash; in single quotes "
                                       "backslashes are plain"},
    };
    const auto found = words.find(parser_message);
    return found != words.end() ? found->second : parser_message;
}

} // namespace

const YamlNode* YamlNode::find(const std::string& key) const {
    for (const Member& member : members)
        if (member.key == key)
            return &member.value;
    return nullptr;
}

YamlNode* YamlNode::find(const std::string& key) {
    return const_cast<YamlNode*>(static_cast<const YamlNode*>(this)->find(key));
}

std::string what_it_is(const YamlNode& node) {
    switch (node.kind) {
    case YamlNode::Kind::empty:
        return "nothing";
    case YamlNode::Kind::list:
        return "a list";
    case YamlNode::Kind::map:
        return "a map of keys and values";
    case YamlNode::Kind::scalar:
        break;
    }
    return quoted(node.text);
}

void set_paths(YamlNode& node, const std::string& path) {
    node.path = path;
    for (YamlNode::Member& member : node.members)
        set_paths(member.value, (path.empty() ? "" : path + ".") + member.key);
    for (std::size_t i = 0; i < node.items.size(); ++i) {
        const YamlNode* name = node.items[i].find("name");
        const bool named = name && name->is_scalar() && !name->text.empty();
        set_paths(node.items[i],
                  named ? path + "." + name->text : path + "[" + std::to_string(i + 1) + "]");
    }
}

YamlNode read_yaml_text(const std::string& text, const std::string& name, Problems& problems) {
    const bool has_bom = text.rfind("\xef\xbb\xbf", 0) == 0;
    const std::string body = has_bom ? text.substr(3) : text;
    const std::vector<std::string> lines = split_lines(body);
    if (report_text_traps(lines, name, problems))
        return {};
    TreeBuilder builder(name, lines, problems);
    try {
        std::istringstream stream(body);
        YAML::Parser parser(stream);
        while (parser.HandleNextDocument(builder)) {
        }
    } catch (const Abandon&) {
        return {};
    } catch (const YAML::Exception& error) {
        const int line = error.mark.line + 1, column = error.mark.column + 1;
        const Location slip = missing_space(lines, name, line);
        if (slip.line > 0)
            problems.add(slip, "", "a space is missing after the colon");
        else
            problems.add({name, std::max(line, 1), std::max(column, 1)}, "",
                         plain_words(error.msg));
        return {};
    }
    set_paths(builder.root, "");
    return std::move(builder.root);
}

YamlNode read_yaml_file(const std::string& path, Problems& problems, const std::string& shown) {
    const std::string name = shown.empty() ? path : shown;
    std::error_code ignored;
    std::ifstream file(path, std::ios::binary);
    if (!file || std::filesystem::is_directory(path, ignored)) {
        const bool exists = std::filesystem::exists(path, ignored);
        problems.add({name, 0, 0}, "", exists ? "cannot be read" : "no such file");
        return {};
    }
    std::ostringstream text;
    text << file.rdbuf();
    return read_yaml_text(text.str(), name, problems);
}

} // namespace rille::engine
