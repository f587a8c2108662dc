// SPDX-License-Identifier: Apache-2.0
#include "engine/study/sampling_plans.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <cmath>
#include <cstdio>
#include <filesystem>
#include <fstream>
#include <sstream>
#include <unistd.h>

using namespace rille::engine;

namespace {

/// What the reference library prints for these lines; scipy.stats.qmc is `q`, numpy `np`.
std::vector<double> reference(const std::string& lines) {
    const std::filesystem::path script = std::filesystem::temp_directory_path() /
                                         ("rille_reference_" + std::to_string(getpid()) + ".py");
    std::ofstream(script) << "import numpy as np\nimport scipy.stats.qmc as q\n" << lines << "\n";
    std::FILE* pipe = popen(("/usr/bin/python3 " + script.string()).c_str(), "r");
    REQUIRE(pipe != nullptr);
    std::string text;
    char part[4096];
    while (const std::size_t got = std::fread(part, 1, sizeof part, pipe))
        text.append(part, got);
    REQUIRE(pclose(pipe) == 0);
    std::filesystem::remove(script);
    std::istringstream stream(text);
    std::vector<double> values;
    for (double value = 0; stream >> value;)
        values.push_back(value);
    return values;
}

std::string as_list(const std::vector<std::vector<double>>& points) {
    std::ostringstream text;
    text.precision(17);
    text << "[";
    for (const auto& point : points) {
        text << "[";
        for (const double x : point)
            text << x << ",";
        text << "],";
    }
    text << "]";
    return text.str();
}

std::vector<std::vector<double>> latin(std::size_t d, std::size_t n, std::uint64_t seed) {
    std::vector<std::vector<double>> points;
    for (std::size_t i = 0; i < n; ++i)
        points.push_back(latin_hypercube_point(d, n, seed, i));
    return points;
}

} // namespace

TEST_CASE("Sobol points are those of the reference library") {
    // Oracle: scipy.stats.qmc.Sobol(scramble = False), dimensions 1, 6 and 40.
    // Source: computed; both use the direction numbers of Joe and Kuo (2008).
    // Tolerance: 2^-30, the digits of the reference.
    for (const int d : {1, 6, 40}) {
        const auto exact = reference("for p in q.Sobol(d=" + std::to_string(d) +
                                     ",scramble=False).random(256): print(*p)");
        REQUIRE(exact.size() == static_cast<std::size_t>(256 * d));
        double worst = 0, shifted = 0;
        for (int i = 0; i < 256; ++i) {
            const auto point = sobol_point(d, i), next = sobol_point(d, i + 1);
            for (int k = 0; k < d; ++k) {
                worst = std::max(worst, std::abs(point[k] - exact[i * d + k]));
                shifted = std::max(shifted, std::abs(next[k] - exact[i * d + k]));
            }
        }
        CHECK(worst < std::pow(2.0, -30));
        CHECK(shifted > 0.4); // the neighbour in the sequence does not pass
    }
    const auto far = sobol_point(3, 999999);
    const auto exact = reference("s=q.Sobol(d=3,scramble=False)\ns.fast_forward(999999)\n"
                                 "print(*s.random(1)[0])");
    for (int k = 0; k < 3; ++k)
        CHECK(far[k] == Approx(exact[k]).margin(1e-9));
}

TEST_CASE("a Latin hypercube meets each part of each axis once") {
    // Oracle: the definition: floor(n x) is a permutation of 0 .. n - 1 along each axis; the place
    // within the part is uniform. Source: McKay, Beckman and Conover (1979). Tolerance: none; the
    // mean place within 4 standard errors.
    for (const std::size_t n : {1, 2, 7, 64, 1000}) {
        const auto points = latin(5, n, 3);
        double mean = 0;
        for (int k = 0; k < 5; ++k) {
            std::vector<int> met(n, 0);
            for (const auto& point : points) {
                const double place = point[k] * static_cast<double>(n);
                REQUIRE((place >= 0 && place < static_cast<double>(n)));
                ++met[static_cast<std::size_t>(place)];
                mean += (place - std::floor(place)) / (5.0 * static_cast<double>(n));
            }
            CHECK(std::all_of(met.begin(), met.end(), [](int count) { return count == 1; }));
        }
        CHECK(std::abs(mean - 0.5) < 4 / std::sqrt(12 * 5.0 * static_cast<double>(n)));
    }
    CHECK(latin(5, 64, 3) == latin(5, 64, 3));
    CHECK(latin(5, 64, 3) != latin(5, 64, 4));
}

TEST_CASE("Latin hypercubes are as even as those of the reference library") {
    // Oracle: centred L2 discrepancy of 40 hypercubes of 64 points in 4 dimensions by
    // scipy.stats.qmc against 40 of ours, and of points on a line of the cube (what a permutation
    // shared by the axes would give). Source: computed. Tolerance: means within 4 standard errors.
    std::string lists;
    for (int s = 0; s < 40; ++s)
        lists += as_list(latin(4, 64, 100 + s)) + ",";
    const auto values = reference(
        "print(*[q.discrepancy(np.array(p)) for p in [" + lists +
        "]])\n"
        "print(*[q.discrepancy(q.LatinHypercube(d=4,seed=s).random(64)) for s in range(40)])\n"
        "x=(np.arange(64)+0.5)/64\nprint(q.discrepancy(np.array([x,x,x,x]).T))");
    REQUIRE(values.size() == 81);
    const auto moments = [&](int first) {
        double mean = 0, squares = 0;
        for (int i = 0; i < 40; ++i)
            mean += values[first + i] / 40;
        for (int i = 0; i < 40; ++i)
            squares += std::pow(values[first + i] - mean, 2) / (39.0 * 40.0);
        return std::pair(mean, squares);
    };
    const auto [ours, our_error] = moments(0);
    const auto [theirs, their_error] = moments(40);
    const double allowed = 4 * std::sqrt(our_error + their_error);
    CHECK(std::abs(ours - theirs) < allowed);
    CHECK(std::abs(values[80] - theirs) > allowed);
}
