// SPDX-License-Identifier: Apache-2.0
#include "engine/yaml_reader.hpp"

#include "engine/words.hpp"
#include "engine/yaml_text.hpp"

#include <fmt/format.h>
#include <yaml-cpp/eventhandler.h>
#include <yaml-cpp/yaml.h>

#include <algorithm>
#include <filesystem>
#include <fstream>
#include <sstream>

namespace rille::engine {

namespace {

constexpr std::size_t deepest = 32;
constexpr std::size_t most_values = 1000000;

/// Ends the parse once the document cannot be read any further; the problem is already noted.
struct Abandon {};

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
        if (expects_value()) node.at = open_.back().node.members.back().key_at;
        put(std::move(node), mark);
    }
    void OnAlias(const YAML::Mark& mark, YAML::anchor_t) override {
        if (!expects_value() || open_.back().node.members.back().key != "<<") // said already
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
            if (level.node.is_list()) text += fmt::format("[{}]", level.node.items.size() + 1);
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
            if (member.key == key) return member.key_at.line;
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
        if (is_unusable(member)) parent.node.members.pop_back();
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
        const bool is_lost = no_space || member.key == "<<";
        open_.back().node.is_damaged = open_.back().node.is_damaged || is_lost;
        return again || is_lost || member.key.empty();
    }

    std::string file_;
    const std::vector<std::string>& lines_;
    Problems& problems_;
    std::vector<Open> open_;
    std::size_t values_ = 0;
};

} // namespace

const YamlNode* YamlNode::find(const std::string& key) const {
    for (const Member& member : members)
        if (member.key == key) return &member.value;
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
    if (report_text_traps(lines, name, problems)) return {};
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
        if (const auto slip = likely_slip(lines, name, line))
            problems.add({slip->file, slip->line, slip->column}, "", slip->message);
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
        const bool is_folder = std::filesystem::is_directory(path, ignored);
        const bool exists = std::filesystem::exists(path, ignored);
        problems.add({name, 0, 0}, "",
                     is_folder ? "is a folder; a file is due"
                     : exists  ? "cannot be read"
                               : "no such file");
        return {};
    }
    std::ostringstream text;
    text << file.rdbuf();
    return read_yaml_text(text.str(), name, problems);
}

} // namespace rille::engine
