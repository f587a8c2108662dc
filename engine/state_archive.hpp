// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/check.hpp"

#include <cstdint>
#include <cstring>
#include <deque>
#include <map>
#include <optional>
#include <string>
#include <string_view>
#include <type_traits>
#include <utility>
#include <vector>

namespace rille::engine {

// Writer and reader of a saved state. What is kept is listed once, in a function template over the
// archive, so that writing and reading cannot part. Numbers are kept bit for bit as this machine
// holds them: a state is read by the program that wrote it.

class StateWriter {
public:
    template <class T>
    void operator()(const T& value) {
        static_assert(std::is_trivially_copyable_v<T>, "needs a function of its own");
        text_.append(reinterpret_cast<const char*>(&value), sizeof value);
    }
    void operator()(const std::string& text) {
        (*this)(text.size());
        text_ += text;
    }
    template <class T>
    void operator()(const std::optional<T>& value) {
        (*this)(value.has_value());
        if (value) (*this)(*value);
    }
    template <class T>
    void operator()(const std::vector<T>& values) {
        each(values);
    }
    template <class T>
    void operator()(const std::deque<T>& values) {
        each(values);
    }
    template <class K, class T>
    void operator()(const std::map<K, T>& values) {
        (*this)(values.size());
        for (const auto& [key, value] : values) {
            (*this)(key);
            (*this)(value);
        }
    }
    const std::string& text() const { return text_; }

private:
    template <class List>
    void each(const List& values) {
        (*this)(values.size());
        for (const auto& value : values)
            (*this)(value);
    }

    std::string text_;
};

/// Throws NumericsError where the text ends early.
class StateReader {
public:
    explicit StateReader(std::string_view text) : rest_(text) {}

    template <class T>
    void operator()(T& value) {
        static_assert(std::is_trivially_copyable_v<T>, "needs a function of its own");
        std::memcpy(&value, take(sizeof value).data(), sizeof value);
    }
    void operator()(std::string& text) { text = take(count()); }
    template <class T>
    void operator()(std::optional<T>& value) {
        bool is_there = false;
        (*this)(is_there);
        value.reset();
        if (is_there) (*this)(value.emplace());
    }
    template <class T>
    void operator()(std::vector<T>& values) {
        each(values);
    }
    template <class T>
    void operator()(std::deque<T>& values) {
        each(values);
    }
    template <class K, class T>
    void operator()(std::map<K, T>& values) {
        values.clear();
        for (std::size_t n = count(); n > 0; --n) {
            K key{};
            (*this)(key);
            (*this)(values[key]);
        }
    }
    bool at_end() const { return rest_.empty(); }

private:
    template <class List>
    void each(List& values) {
        values.resize(count());
        for (auto& value : values)
            (*this)(value);
    }
    std::size_t count() {
        std::size_t n = 0;
        (*this)(n);
        if (n > rest_.size()) throw NumericsError("a saved state ends early");
        return n;
    }
    std::string_view take(std::size_t bytes) {
        if (bytes > rest_.size()) throw NumericsError("a saved state ends early");
        const std::string_view taken = rest_.substr(0, bytes);
        rest_.remove_prefix(bytes);
        return taken;
    }

    std::string_view rest_;
};

} // namespace rille::engine
