// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <compare>

namespace rillstrand {

/// Distance along the cable, from the instrument. Never a GroundDistance: slack and coils
/// part the two by tens of metres, and the compiler cannot tell two doubles apart.
class FibreDistance {
public:
    static constexpr FibreDistance from_metres(double m) { return FibreDistance{m}; }
    constexpr double metres() const { return m_metres; }
    friend constexpr auto operator<=>(FibreDistance, FibreDistance) = default;

private:
    explicit constexpr FibreDistance(double m) : m_metres{m} {}
    double m_metres;
};

/// Distance over the ground along the line on which the cable lies, from the line's first vertex.
class GroundDistance {
public:
    static constexpr GroundDistance from_metres(double m) { return GroundDistance{m}; }
    constexpr double metres() const { return m_metres; }
    friend constexpr auto operator<=>(GroundDistance, GroundDistance) = default;

private:
    explicit constexpr GroundDistance(double m) : m_metres{m} {}
    double m_metres;
};

/// A difference of two temperatures, in kelvin.
class KelvinDelta {
public:
    static constexpr KelvinDelta from_K(double value_K) { return KelvinDelta{value_K}; }
    constexpr double K() const { return m_K; }
    friend constexpr auto operator<=>(KelvinDelta, KelvinDelta) = default;

private:
    explicit constexpr KelvinDelta(double value_K) : m_K{value_K} {}
    double m_K;
};

/// A temperature on the Celsius scale; two of them differ by a KelvinDelta.
class Celsius {
public:
    static constexpr Celsius from_degC(double value_degC) { return Celsius{value_degC}; }
    constexpr double degC() const { return m_degC; }
    constexpr double kelvin() const { return m_degC + 273.15; }
    friend constexpr auto operator<=>(Celsius, Celsius) = default;
    friend constexpr KelvinDelta operator-(Celsius a, Celsius b) {
        return KelvinDelta::from_K(a.m_degC - b.m_degC);
    }

private:
    explicit constexpr Celsius(double value_degC) : m_degC{value_degC} {}
    double m_degC;
};

} // namespace rillstrand
