// Port parameters into impedances.
#pragma once

#include <complex>
#include <optional>
#include <vector>

namespace coilassay {

/// Kind of port parameter: scattering, impedance, admittance, hybrid and inverse hybrid (two ports only).
enum class PortParameter { s, z, y, h, g };

/// Impedance matrix in ohm, row by row, from a ports x ports matrix of another kind.
///
/// S with real reference resistances r: Z = sqrt(r) (1 - S)^-1 (1 + S) sqrt(r); Y: Z = Y^-1; H and G by their definitions
/// v1 = h11 i1 + h12 v2, i2 = h21 i1 + h22 v2 and i1 = g11 v1 + g12 i2, v2 = g21 v1 + g22 i2.
///
/// @param normalised  Z, Y, H, G are relative to the first reference (Touchstone 1.x)
/// @return std::nullopt where no impedance matrix exists (an open port seen by S, a short seen by Y)
std::optional<std::vector<std::complex<double>>> to_impedance(PortParameter kind, std::vector<std::complex<double>> values,
                                                              const std::vector<double>& reference_ohm, bool normalised);

/// Inverse by elimination with row exchange; std::nullopt for a singular matrix.
std::optional<std::vector<std::complex<double>>> inverse(std::vector<std::complex<double>> matrix, std::size_t size);

}  // namespace coilassay
