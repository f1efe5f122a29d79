// The ledger: the record beside a product. Plain data here; JSON in ledger.cpp. Holds nothing that depends on threads,
// parts, host or clock.
#pragma once
#include <cstdint>
#include <string>
#include <utility>
#include <vector>

namespace windrow::report {

struct InputRecord {
  std::string path;    ///< as seen from the job file
  std::string digest;  ///< XXH3-128, hex
  std::int64_t bytes = 0;
};

/// Integrals over the mesh in source units times steradians, summed over the steps.
struct BalanceLine {
  std::string period;  ///< "1981-01" or "all"
  double source = 0, product = 0, below = 0, filled = 0;
  double relative = 0; ///< largest |source - product - below| / integral of |source| of a step of the period
};

struct Balance {
  std::string statement;          ///< what is measured, in words
  bool kept = true;               ///< the method keeps integrals: the residual is to be rounding
  BalanceLine all;
  std::vector<BalanceLine> months;
  double stored_relative = 0;     ///< largest relative difference of a step when the stored float32 values are summed
  bool stored = false;            ///< stored line exists (regridding only)
};

struct StationRecord {
  std::string id, outcome;        ///< "level", "level and shape", or why it was left out
};

struct Ledger {
  int format = 1;
  std::string version;            ///< of windrow
  std::string product, field, run, family, forcing, mesh, product_version;
  std::int64_t product_bytes = 0;
  std::string product_digest;     ///< of the file's bytes
  std::vector<std::pair<std::string, std::string>> key;       ///< what the product depends on: name, digest
  std::vector<std::pair<std::string, std::string>> settings;
  std::vector<std::pair<std::string, std::string>> libraries;
  std::vector<InputRecord> inputs;
  std::string linear_map;         ///< provenance line with closure figures
  Balance balance;
  std::vector<std::pair<std::string, double>> cover;          ///< mean, least, cells without, ...
  std::vector<std::pair<std::string, std::int64_t>> counts;
  std::vector<StationRecord> stations;
  std::vector<std::pair<std::string, std::string>> notices;
  double minimum = 0, maximum = 0;
  std::vector<std::string> cautions;
};

std::string to_json(const Ledger& ledger);
/// Error(data) names the file when the text is no ledger.
Ledger parse_ledger(const std::string& text, const std::string& path);

/// The cautions that stand in every product, ledger and report.
const std::vector<std::string>& cautions();

}  // namespace windrow::report
