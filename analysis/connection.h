// One impedance out of the ports of an analyser.
#pragma once

#include <cstddef>
#include <optional>

#include "acquire/capture.h"
#include "acquire/fixture_set.h"
#include "analysis/fixture_relation.h"
#include "base/result.h"

namespace coilassay {

struct ConnectionRequest {
  Connection connection = Connection::reflect;
  std::optional<std::size_t> port;         // reflect: counted from 1
  /// Series and shunt: two-ports between the analyser and the part, port 1 of each file on the analyser's side; removed.
  std::optional<Sweep> at_port_1, at_port_2;
};

/// The part as a sweep of one port.
///
/// reflect: the impedance into that port, the others ending in their references where the file holds S. series: from S21,
/// Z = 2 sqrt(R1 R2)/S21 - R1 - R2; shunt: 1/Z = (2 sqrt(R1 R2)/S21 - R1 - R2)/(R1 R2). The references R are the file's.
/// Two-ports are removed before. as_read stays what it was for reflect. Otherwise it becomes "S21", with the reference
/// R1 + R2 (series) or R1 R2/(R1 + R2) (shunt): an error e of S21 then is (Z + R)²/R e of Z, twice that of a reflection.
///
/// @return usage: a port that is not there; series or shunt with one port; several ports and nothing said; a two-port file
///         that check_two_port() refuses
Result<Sweep> one_port_of(const Sweep& sweep, const ConnectionRequest& request);

/// usage, with the option as the place: another number of ports, or frequencies that do not cover the sweep's.
Result<void> check_two_port(const Sweep& sweep, const Sweep& file, const char* option);

/// S of a two-port file at any frequency inside its own, by interpolation; usage when it is outside.
Result<TwoPort> two_port_at(const Sweep& file, double frequency_hz);

}  // namespace coilassay
