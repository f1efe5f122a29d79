#include "windrow/pipeline/spool.h"

#include <fcntl.h>
#include <fmt/format.h>
#include <sys/stat.h>
#include <sys/uio.h>
#include <unistd.h>

#include <array>
#include <cerrno>
#include <cstring>

#include "windrow/base/error.h"
#include "windrow/codec/codec.h"

namespace windrow::pipeline {
namespace {

constexpr std::uint32_t kMagic = 0x31727357;  // "Wsr1"

struct Header {
  std::uint32_t magic = kMagic, crc = 0;
  std::array<std::uint8_t, 16> product{}, values{};
  std::uint32_t variable = 0, chunk = 0;
  std::uint64_t payload = 0, aux = 0;
};
static_assert(sizeof(Header) == 64, "the header is written as it stands in memory");

/// CRC over the header behind its crc field, chained with that of the body.
std::uint32_t record_crc(const Header& header, std::uint32_t body_crc) {
  std::array<std::byte, sizeof(Header) - 8 + 4> bytes{};
  std::memcpy(bytes.data(), reinterpret_cast<const char*>(&header) + 8, sizeof(Header) - 8);
  std::memcpy(bytes.data() + sizeof(Header) - 8, &body_crc, 4);
  return codec::crc32(bytes);
}

std::uint32_t body_crc(std::span<const std::byte> payload, std::span<const std::byte> aux) {
  const std::array<std::uint32_t, 2> both{codec::crc32(payload), codec::crc32(aux)};
  return codec::crc32(std::as_bytes(std::span(both)));
}

}  // namespace

Spool::Spool(std::string path) : path_(std::move(path)) {
  file_ = ::open(path_.c_str(), O_RDWR | O_CREAT | O_CLOEXEC, 0666);
  if (file_ < 0) {
    throw Error(Failure::output, path_, fmt::format("cannot be written: {}", std::strerror(errno)));
  }
  recover();
}

Spool::~Spool() {
  if (file_ >= 0) ::close(file_);
}

void Spool::recover() {
  struct stat info {};
  if (::fstat(file_, &info) != 0) throw Error(Failure::io, path_, "cannot be examined");
  const auto size = static_cast<std::uint64_t>(info.st_size);
  std::vector<std::byte> body;
  while (end_ + sizeof(Header) <= size) {
    Header header;
    read_at(end_, std::as_writable_bytes(std::span(&header, 1)));
    const std::uint64_t rest = size - end_ - sizeof(Header);
    if (header.magic != kMagic || header.payload > rest || header.aux > rest - header.payload) break;
    body.resize(header.payload + header.aux);
    read_at(end_ + sizeof(Header), body);
    const auto whole = std::span<const std::byte>(body);
    const auto crc = body_crc(whole.first(header.payload), whole.subspan(header.payload));
    if (record_crc(header, crc) != header.crc) break;
    TileId id;
    id.product.bytes = header.product;
    id.variable = header.variable;
    id.chunk = header.chunk;
    places_[id] = {end_ + sizeof(Header), header.payload, header.aux};
    end_ += sizeof(Header) + header.payload + header.aux;
  }
  if (end_ < size && ::ftruncate(file_, static_cast<off_t>(end_)) != 0) {
    throw Error(Failure::output, path_, fmt::format("cannot be written: {}", std::strerror(errno)));
  }
}

bool Spool::has(const TileId& id) const {
  const std::lock_guard lock(mutex_);
  return places_.contains(id);
}

std::size_t Spool::size() const {
  const std::lock_guard lock(mutex_);
  return places_.size();
}

void Spool::keep_for(const std::vector<codec::Digest>& products) {
  const std::lock_guard lock(mutex_);
  for (const auto& product : products) {
    const auto first = places_.lower_bound({product, 0, 0});
    if (first != places_.end() && first->first.product == product) return;
  }
  places_.clear();
  end_ = 0;
  if (::ftruncate(file_, 0) != 0) {
    throw Error(Failure::output, path_, fmt::format("cannot be written: {}", std::strerror(errno)));
  }
}

void Spool::append(const TileId& id, const codec::Digest& values, std::span<const std::byte> payload,
                   std::span<const std::byte> aux) {
  Header header;
  header.product = id.product.bytes;
  header.values = values.bytes;
  header.variable = id.variable;
  header.chunk = id.chunk;
  header.payload = payload.size();
  header.aux = aux.size();
  header.crc = record_crc(header, body_crc(payload, aux));
  std::vector<std::byte> record;
  record.reserve(sizeof header + payload.size() + aux.size());
  const auto head = std::as_bytes(std::span(&header, 1));
  for (const auto part : {head, payload, aux}) record.insert(record.end(), part.begin(), part.end());
  const std::lock_guard lock(mutex_);
  if (places_.contains(id)) return;
  std::size_t done = 0;
  while (done < record.size()) {
    const ssize_t put =
        ::pwrite(file_, record.data() + done, record.size() - done, static_cast<off_t>(end_ + done));
    if (put < 0 && errno == EINTR) continue;
    if (put < 0) {
      const int code = errno;
      // Best effort: a rest that stays is cut by the next recovery.
      [[maybe_unused]] const int cut = ::ftruncate(file_, static_cast<off_t>(end_));
      throw Error(Failure::output, path_, fmt::format("cannot be written: {}", std::strerror(code)));
    }
    done += static_cast<std::size_t>(put);
  }
  places_[id] = {end_ + sizeof header, header.payload, header.aux};
  end_ += record.size();
}

Spool::Place Spool::place_of(const TileId& id) const {
  const std::lock_guard lock(mutex_);
  const auto found = places_.find(id);
  if (found == places_.end()) throw Error(Failure::defect, path_, fmt::format("holds no chunk {}", id.chunk));
  return found->second;
}

void Spool::payload(const TileId& id, std::vector<std::byte>& out) const {
  const Place place = place_of(id);
  out.resize(place.payload);
  read_at(place.offset, out);
}

void Spool::aux(const TileId& id, std::vector<std::byte>& out) const {
  const Place place = place_of(id);
  out.resize(place.aux);
  read_at(place.offset + place.payload, out);
}

void Spool::read_at(std::uint64_t offset, std::span<std::byte> out) const {
  std::size_t done = 0;
  while (done < out.size()) {
    const ssize_t got = ::pread(file_, out.data() + done, out.size() - done, static_cast<off_t>(offset + done));
    if (got < 0 && errno == EINTR) continue;
    if (got <= 0) throw Error(Failure::io, path_, fmt::format("cannot be read: {}", std::strerror(errno)));
    done += static_cast<std::size_t>(got);
  }
}

void Spool::remove() {
  if (file_ >= 0) ::close(file_);
  file_ = -1;
  ::unlink(path_.c_str());
  places_.clear();
}

}  // namespace windrow::pipeline
