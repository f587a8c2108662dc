// SPDX-License-Identifier: Apache-2.0
#include "engine/units.hpp"

#include <catch2/catch.hpp>

using namespace rille::engine;

namespace {

double inside(const std::string& text, Dimension dimension) {
    const QuantityText quantity = parse_quantity(text, dimension);
    INFO(text << ": " << quantity.error);
    REQUIRE(quantity.error.empty());
    return quantity.value;
}

std::string error(const std::string& text, Dimension dimension) {
    return parse_quantity(text, dimension).error;
}

} // namespace

// Oracle: definitions of the units (SI 2019 constants, 1 torr = 101325/760 Pa).
// Source: definitions.
// Tolerance: round-off, 1e-14 relative; the ion flux figure to the digits quoted.
TEST_CASE("quantities are read into inside units") {
    const auto near = [](double value) { return Approx(value).epsilon(1e-14).margin(0); };
    CHECK(inside("60 nm", Dimension::length) == 60);
    CHECK(inside("1.5um", Dimension::length) == near(1500));
    CHECK(inside("1.5 µm", Dimension::length) == near(1500));
    CHECK(inside("12 angstrom", Dimension::length) == near(1.2));
    CHECK(inside("2 min", Dimension::time) == 120);
    CHECK(inside("150 s", Dimension::time) == 150);
    CHECK(inside("50 degC", Dimension::temperature) == near(323.15));
    CHECK(inside("400 K", Dimension::temperature) == 400);
    CHECK(inside("0.3 eV", Dimension::energy) == 0.3);
    CHECK(inside("8 mTorr", Dimension::pressure) == near(8e-3 * 101325.0 / 760));
    CHECK(inside("13.56 MHz", Dimension::frequency) == near(13.56e6));
    CHECK(inside("120 V", Dimension::voltage) == 120);
    CHECK(inside("88 deg", Dimension::angle) == 88);
    CHECK(inside("70 %", Dimension::share) == near(0.7));
    CHECK(inside("3e18 /cm2/s", Dimension::flux) == near(3e4));
    CHECK(inside("1e20 /m2/s", Dimension::flux) == near(100));
    CHECK(inside("1 mA/cm2", Dimension::ion_flux) == Approx(62.415).epsilon(1e-5));
    CHECK(inside("6.241509074e15 /cm2/s", Dimension::ion_flux) ==
          Approx(inside("1 mA/cm2", Dimension::ion_flux)).epsilon(1e-9));
    CHECK(inside("5e22 /cm3", Dimension::number_density) == near(50));
    CHECK(inside("300 nm/min", Dimension::rate) == near(5));
    CHECK(inside("96.485332 kJ/mol", Dimension::energy) == Approx(1).epsilon(1e-8));
    CHECK(inside("-5 nm", Dimension::length) == -5);
    CHECK(inside("3eV", Dimension::energy) == 3); // e is not an exponent here
}

TEST_CASE("what is written for output reads back") {
    for (int d = 0; d <= static_cast<int>(Dimension::rate); ++d) {
        const auto dimension = static_cast<Dimension>(d);
        const std::string text = format_quantity(12.5, dimension);
        CHECK(inside(text, dimension) == Approx(12.5).epsilon(1e-11));
    }
    CHECK(format_quantity(60, Dimension::length) == "60 nm");
}

TEST_CASE("quantities that are not clear are refused with a way out") {
    CHECK(error("60", Dimension::length) ==
          "\"60\" has no unit; a length is due, for example 60 nm (nm, um, angstrom or mm)");
    CHECK(error("5 A", Dimension::length) ==
          "\"A\" may be ampere or angstrom: write angstrom; for example 60 nm (nm, um, angstrom "
          "or mm)");
    CHECK(error("8 mT", Dimension::pressure).find("millitesla or millitorr: write mTorr") !=
          std::string::npos);
    CHECK(error("50 C", Dimension::temperature).find("write degC") != std::string::npos);
    CHECK(error("5 degC", Dimension::temperature_step).find("absolute") != std::string::npos);
    CHECK(error("11600 K", Dimension::energy).find("written in eV") != std::string::npos);
    CHECK(error("60 s", Dimension::length).find("\"60 s\" is a time; a length is due") == 0);
    CHECK(error("60 nmm", Dimension::length).find("did you mean \"nm\"?") != std::string::npos);
    CHECK(error("4 nm#c", Dimension::length).find("a comment needs a space before #") !=
          std::string::npos);
    CHECK(error("1:30", Dimension::time).find("base 60") != std::string::npos);
    CHECK(error("010 nm", Dimension::length).find("leading zero") != std::string::npos);
    CHECK(error("1_000 nm", Dimension::length).find("without separators") != std::string::npos);
    CHECK(error("1,5 nm", Dimension::length).find("as a dot") != std::string::npos);
    CHECK(error("0x10 nm", Dimension::length).find("in decimal") != std::string::npos);
    CHECK(error(".inf", Dimension::length).find("not a finite number") != std::string::npos);
    CHECK(error("1e999 nm", Dimension::length).find("not a finite number") != std::string::npos);
    CHECK(error("abc", Dimension::length).find("\"abc\" is not a number; a length is due") == 0);
    CHECK(error("", Dimension::length).find("is not a number") != std::string::npos);
    CHECK(error("2 mA/cm2", Dimension::flux).find("neutrals carry no charge") != std::string::npos);
}
