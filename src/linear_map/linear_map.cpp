#include "windrow/linear_map/linear_map.h"

#include <cstring>

#include "windrow/base/byte_record.h"
#include "windrow/base/exact_sum.h"
#include "windrow/codec/codec.h"

namespace windrow::linear_map {
namespace {

constexpr char kMagic[8] = {'w', 'r', 'm', 'a', 'p', '0', '0', '2'};

template <typename T>
void put_vector(std::vector<std::byte>& out, const std::vector<T>& values) {
  const std::uint64_t count = values.size();
  put_values(out, &count, 1);
  put_values(out, values.data(), values.size());
}

template <typename T>
bool get_vector(RecordReader& reader, std::vector<T>& values) {
  std::uint64_t count = 0;
  if (!reader.get(&count, 1) || count > reader.rest().size() / sizeof(T)) return false;
  values.resize(count);
  return reader.get(values.data(), count);
}

bool consistent(const LinearMap& map) {
  if (map.row_start.empty() || map.row_start.front() != 0 || map.row_start.back() != map.column.size()) return false;
  if (map.share.size() != map.column.size() || map.value_columns > map.columns) return false;
  if (!map.cover.empty() && map.cover.size() != map.column.size()) return false;
  if (!map.factor.empty() && map.factor.size() != map.column.size()) return false;
  for (std::size_t i = 1; i < map.row_start.size(); ++i) {
    if (map.row_start[i] < map.row_start[i - 1]) return false;
  }
  for (const auto c : map.column) {
    if (c >= map.columns) return false;
  }
  return (map.row_area.empty() || map.row_area.size() == map.rows()) &&
         (map.column_area.empty() || map.column_area.size() == map.value_columns);
}

}  // namespace

std::vector<double> column_overlap(const LinearMap& map) {
  const std::vector<double>& share = map.cover.empty() ? map.share : map.cover;
  // Row areas are of like size and shares at most 1, so one set of bins serves all columns.
  double largest = 0;
  for (const double area : map.row_area) largest = area > largest ? area : largest;
  const auto bins = BinnedSum::bins(largest * 2, map.rows() + 1);
  std::vector<BinnedSum> sums(map.columns, BinnedSum(bins));
  for (std::size_t row = 0; row < map.rows(); ++row) {
    for (auto k = map.row_start[row]; k < map.row_start[row + 1]; ++k) {
      const std::size_t c = map.column[k];
      const double whole = map.quantity == Quantity::mean ? map.row_area[row] : map.column_area[c % map.value_columns];
      sums[c].add(share[k] * whole);
    }
  }
  std::vector<double> out(map.columns);
  for (std::size_t c = 0; c < map.columns; ++c) out[c] = sums[c].value();
  return out;
}

std::vector<std::byte> serialise(const LinearMap& map) {
  std::vector<std::byte> out;
  put_values(out, kMagic, sizeof kMagic);
  const auto quantity = static_cast<std::uint64_t>(map.quantity);
  const std::uint64_t columns = map.columns, value_columns = map.value_columns;
  put_values(out, &quantity, 1);
  put_values(out, &columns, 1);
  put_values(out, &value_columns, 1);
  put_vector(out, map.row_start);
  put_vector(out, map.column);
  put_vector(out, map.share);
  put_vector(out, map.cover);
  put_vector(out, map.factor);
  put_vector(out, map.row_area);
  put_vector(out, map.column_area);
  put_vector(out, std::vector<char>(map.provenance.begin(), map.provenance.end()));
  const auto digest = codec::digest(out);
  put_values(out, digest.bytes.data(), digest.bytes.size());
  return out;
}

bool parse(std::span<const std::byte> bytes, LinearMap& map) {
  constexpr std::size_t kDigest = sizeof(codec::Digest::bytes);
  if (bytes.size() < sizeof kMagic + kDigest || std::memcmp(bytes.data(), kMagic, sizeof kMagic) != 0) return false;
  const auto body = bytes.first(bytes.size() - kDigest);
  if (std::memcmp(codec::digest(body).bytes.data(), bytes.data() + body.size(), kDigest) != 0) return false;
  RecordReader reader(body.subspan(sizeof kMagic));
  std::uint64_t quantity = 0, columns = 0, value_columns = 0;
  std::vector<char> provenance;
  LinearMap found;
  if (!reader.get(&quantity, 1) || quantity > 1 || !reader.get(&columns, 1) ||
      !reader.get(&value_columns, 1) || !get_vector(reader, found.row_start) || !get_vector(reader, found.column) ||
      !get_vector(reader, found.share) || !get_vector(reader, found.cover) || !get_vector(reader, found.factor) ||
      !get_vector(reader, found.row_area) || !get_vector(reader, found.column_area) ||
      !get_vector(reader, provenance) || !reader.rest().empty()) {
    return false;
  }
  found.quantity = static_cast<Quantity>(quantity);
  found.columns = columns;
  found.value_columns = value_columns;
  found.provenance.assign(provenance.begin(), provenance.end());
  if (!consistent(found)) return false;
  map = std::move(found);
  return true;
}

}  // namespace windrow::linear_map
