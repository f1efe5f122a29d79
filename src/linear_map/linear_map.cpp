#include "windrow/linear_map/linear_map.h"

#include <cstring>

#include "windrow/base/exact_sum.h"
#include "windrow/codec/codec.h"

namespace windrow::linear_map {
namespace {

constexpr char kMagic[8] = {'w', 'r', 'm', 'a', 'p', '0', '0', '1'};

template <typename T>
void put(std::vector<std::byte>& out, const T* data, std::size_t count) {
  const std::size_t at = out.size();
  out.resize(at + count * sizeof(T));
  if (count > 0) std::memcpy(out.data() + at, data, count * sizeof(T));
}

template <typename T>
void put_vector(std::vector<std::byte>& out, const std::vector<T>& values) {
  const std::uint64_t count = values.size();
  put(out, &count, 1);
  put(out, values.data(), values.size());
}

/// Reads from a span; every read checks what is left, so damaged lengths end the parse.
class Reader {
 public:
  explicit Reader(std::span<const std::byte> bytes) : rest_(bytes) {}
  template <typename T>
  bool get(T* data, std::size_t count) {
    if (count > rest_.size() / sizeof(T)) return false;
    if (count > 0) std::memcpy(data, rest_.data(), count * sizeof(T));
    rest_ = rest_.subspan(count * sizeof(T));
    return true;
  }
  template <typename T>
  bool get_vector(std::vector<T>& values) {
    std::uint64_t count = 0;
    if (!get(&count, 1) || count > rest_.size() / sizeof(T)) return false;
    values.resize(count);
    return get(values.data(), count);
  }
  [[nodiscard]] bool empty() const { return rest_.empty(); }

 private:
  std::span<const std::byte> rest_;
};

bool consistent(const LinearMap& map) {
  if (map.row_start.empty() || map.row_start.front() != 0 || map.row_start.back() != map.column.size()) return false;
  if (map.share.size() != map.column.size()) return false;
  for (std::size_t i = 1; i < map.row_start.size(); ++i) {
    if (map.row_start[i] < map.row_start[i - 1]) return false;
  }
  for (const auto c : map.column) {
    if (c >= map.columns) return false;
  }
  return (map.row_area.empty() || map.row_area.size() == map.rows()) &&
         (map.column_area.empty() || map.column_area.size() == map.columns);
}

}  // namespace

std::vector<double> column_overlap(const LinearMap& map) {
  // Row areas are of like size and shares at most 1, so one set of bins serves all columns.
  double largest = 0;
  for (const double area : map.row_area) largest = area > largest ? area : largest;
  const auto bins = BinnedSum::bins(largest * 2, map.rows() + 1);
  std::vector<BinnedSum> sums(map.columns, BinnedSum(bins));
  for (std::size_t row = 0; row < map.rows(); ++row) {
    for (auto k = map.row_start[row]; k < map.row_start[row + 1]; ++k) {
      const double part = map.quantity == Quantity::mean ? map.share[k] * map.row_area[row]
                                                         : map.share[k] * map.column_area[map.column[k]];
      sums[map.column[k]].add(part);
    }
  }
  std::vector<double> out(map.columns);
  for (std::size_t c = 0; c < map.columns; ++c) out[c] = sums[c].value();
  return out;
}

std::vector<std::byte> serialise(const LinearMap& map) {
  std::vector<std::byte> out;
  put(out, kMagic, sizeof kMagic);
  const auto quantity = static_cast<std::uint64_t>(map.quantity);
  const std::uint64_t columns = map.columns;
  put(out, &quantity, 1);
  put(out, &columns, 1);
  put_vector(out, map.row_start);
  put_vector(out, map.column);
  put_vector(out, map.share);
  put_vector(out, map.row_area);
  put_vector(out, map.column_area);
  put_vector(out, std::vector<char>(map.provenance.begin(), map.provenance.end()));
  const auto digest = codec::digest(out);
  put(out, digest.bytes.data(), digest.bytes.size());
  return out;
}

bool parse(std::span<const std::byte> bytes, LinearMap& map) {
  constexpr std::size_t kDigest = sizeof(codec::Digest::bytes);
  if (bytes.size() < sizeof kMagic + kDigest || std::memcmp(bytes.data(), kMagic, sizeof kMagic) != 0) return false;
  const auto body = bytes.first(bytes.size() - kDigest);
  if (std::memcmp(codec::digest(body).bytes.data(), bytes.data() + body.size(), kDigest) != 0) return false;
  Reader reader(body.subspan(sizeof kMagic));
  std::uint64_t quantity = 0, columns = 0;
  std::vector<char> provenance;
  LinearMap found;
  if (!reader.get(&quantity, 1) || quantity > 1 || !reader.get(&columns, 1) || !reader.get_vector(found.row_start) ||
      !reader.get_vector(found.column) || !reader.get_vector(found.share) || !reader.get_vector(found.row_area) ||
      !reader.get_vector(found.column_area) || !reader.get_vector(provenance) || !reader.empty()) {
    return false;
  }
  found.quantity = static_cast<Quantity>(quantity);
  found.columns = columns;
  found.provenance.assign(provenance.begin(), provenance.end());
  if (!consistent(found)) return false;
  map = std::move(found);
  return true;
}

}  // namespace windrow::linear_map
