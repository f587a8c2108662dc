// SPDX-License-Identifier: Apache-2.0
#include "engine/content_cache.hpp"

#include "engine/run_record.hpp"

#include <cstdlib>
#include <cstring>
#include <filesystem>
#include <fstream>
#include <sstream>
#include <unistd.h>

namespace rille::engine {

namespace {

std::string bytes_of(const std::vector<double>& values) {
    return std::string(reinterpret_cast<const char*>(values.data()),
                       values.size() * sizeof(double));
}

} // namespace

ContentCache ContentCache::of_user() {
    for (const auto& [variable, below] :
         {std::pair<const char*, const char*>{"XDG_CACHE_HOME", ""}, {"HOME", ".cache"}}) {
        const char* base = std::getenv(variable);
        if (base && *base == '/')
            return ContentCache((std::filesystem::path(base) / below / "rille").string());
    }
    return ContentCache("");
}

std::string ContentCache::path_of(const std::vector<double>& content) const {
    return (std::filesystem::path(folder_) / (content_hash(bytes_of(content)) + ".bin")).string();
}

// A file holds the hash of its values, then the values.
std::optional<std::vector<double>> ContentCache::find(const std::vector<double>& content) const {
    if (folder_.empty()) return std::nullopt;
    std::ifstream file(path_of(content), std::ios::binary);
    std::ostringstream text;
    if (!file || !(text << file.rdbuf())) return std::nullopt;
    const std::string whole = text.str();
    constexpr std::size_t hash_length = 64;
    if (whole.size() < hash_length || (whole.size() - hash_length) % sizeof(double) != 0)
        return std::nullopt;
    const std::string values = whole.substr(hash_length);
    if (content_hash(values) != whole.substr(0, hash_length)) return std::nullopt;
    std::vector<double> result(values.size() / sizeof(double));
    std::memcpy(result.data(), values.data(), values.size());
    return result;
}

void ContentCache::keep(const std::vector<double>& content,
                        const std::vector<double>& values) const {
    if (folder_.empty()) return;
    std::error_code failed;
    std::filesystem::create_directories(folder_, failed);
    const std::string path = path_of(content);
    const std::string temporary = path + "." + std::to_string(getpid());
    const std::string bytes = bytes_of(values);
    {
        std::ofstream file(temporary, std::ios::binary);
        file << content_hash(bytes) << bytes;
        if (!file.flush()) failed = std::make_error_code(std::errc::io_error);
    }
    if (!failed) std::filesystem::rename(temporary, path, failed);
    if (failed) std::filesystem::remove(temporary, failed);
}

} // namespace rille::engine
