// The append-only file of finished tiles: it is the journal as well. Products are assembled from it.
#pragma once
#include <compare>
#include <cstddef>
#include <cstdint>
#include <map>
#include <mutex>
#include <span>
#include <string>
#include <vector>

#include "windrow/codec/digest.h"

namespace windrow::pipeline {

/// Which chunk of which product: `product` is the digest of the product's key, so that tiles of other settings or
/// inputs are never taken for it.
struct TileId {
  codec::Digest product;
  std::uint32_t variable = 0, chunk = 0;
  auto operator<=>(const TileId&) const = default;
};

/// Record: 64-byte header {magic, CRC-32 of all that follows, product, digest of the uncompressed values, variable,
/// chunk, payload length, aux length}, payload (the chunk as it goes to disk), aux (the tile's statistics).
/// Thread-safe. No sync per tile: what a crash loses is made again.
class Spool {
 public:
  /// Opens or creates; reads what is there and cuts at the first bad record. Error(output) or Error(io).
  explicit Spool(std::string path);
  ~Spool();
  Spool(const Spool&) = delete;
  Spool& operator=(const Spool&) = delete;

  [[nodiscard]] bool has(const TileId& id) const;
  [[nodiscard]] std::size_t size() const;
  /// Forgets all tiles and empties the file unless it holds a tile of one of these products: what was left by a job with
  /// other settings or inputs is of no use.
  void keep_for(const std::vector<codec::Digest>& products);
  /// A tile that is there already is left alone. Error(output) when the disk is full: the spool stays valid.
  void append(const TileId& id, const codec::Digest& values, std::span<const std::byte> payload,
              std::span<const std::byte> aux);
  /// Error(io) when the record cannot be read; Error(defect) when there is none.
  void payload(const TileId& id, std::vector<std::byte>& out) const;
  void aux(const TileId& id, std::vector<std::byte>& out) const;
  void remove();  ///< closes and deletes the file

 private:
  struct Place {
    std::uint64_t offset = 0, payload = 0, aux = 0;
  };
  void recover();
  [[nodiscard]] Place place_of(const TileId& id) const;
  void read_at(std::uint64_t offset, std::span<std::byte> out) const;

  std::string path_;
  int file_ = -1;
  std::uint64_t end_ = 0;
  mutable std::mutex mutex_;
  std::map<TileId, Place> places_;
};

}  // namespace windrow::pipeline
