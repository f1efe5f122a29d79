// HDF5's shuffle filter: byte k of every element is brought together in plane k. Nothing here compresses.
#include <cstring>

#include "windrow/base/error.h"
#include "windrow/codec/codec.h"

#if defined(__SSE2__)
#include <emmintrin.h>
#endif

namespace windrow::codec {
namespace {

/// Elements [first, count) byte by byte: every width, and what the vector path leaves over.
void shuffle_plain(const std::byte* in, std::size_t width, std::size_t first, std::size_t count, std::byte* out) {
  for (std::size_t k = 0; k < width; ++k)
    for (std::size_t i = first; i < count; ++i) out[k * count + i] = in[i * width + k];
}

void unshuffle_plain(const std::byte* in, std::size_t width, std::size_t first, std::size_t count, std::byte* out) {
  for (std::size_t k = 0; k < width; ++k)
    for (std::size_t i = first; i < count; ++i) out[i * width + k] = in[k * count + i];
}

#if defined(__SSE2__)
/// Interleaving the lower with the upper half of W registers moves the top bit of every byte's number to the bottom,
/// a rotation by one. 16 elements of W bytes have numbers (element: 4 bits, byte: log2 W bits), so shuffling is
/// four such rotations and undoing it is log2 W of them.
template <std::size_t W>
inline void rotate_once(__m128i (&r)[W]) {
  __m128i next[W];
#pragma GCC unroll 8
  for (std::size_t k = 0; k < W / 2; ++k) {
    next[2 * k] = _mm_unpacklo_epi8(r[k], r[k + W / 2]);
    next[2 * k + 1] = _mm_unpackhi_epi8(r[k], r[k + W / 2]);
  }
#pragma GCC unroll 8
  for (std::size_t k = 0; k < W; ++k) r[k] = next[k];
}

template <std::size_t W>
std::size_t shuffle_vector(const std::byte* in, std::size_t count, std::byte* out) {
  __m128i r[W];
  std::size_t i = 0;
  for (; i + 16 <= count; i += 16) {
#pragma GCC unroll 8
    for (std::size_t k = 0; k < W; ++k) r[k] = _mm_loadu_si128(reinterpret_cast<const __m128i*>(in + i * W + 16 * k));
#pragma GCC unroll 4
    for (int round = 0; round < 4; ++round) rotate_once<W>(r);
#pragma GCC unroll 8
    for (std::size_t k = 0; k < W; ++k) _mm_storeu_si128(reinterpret_cast<__m128i*>(out + k * count + i), r[k]);
  }
  return i;
}

template <std::size_t W>
std::size_t unshuffle_vector(const std::byte* in, std::size_t count, std::byte* out) {
  constexpr int kRounds = W == 2 ? 1 : W == 4 ? 2 : 3;
  __m128i r[W];
  std::size_t i = 0;
  for (; i + 16 <= count; i += 16) {
#pragma GCC unroll 8
    for (std::size_t k = 0; k < W; ++k) r[k] = _mm_loadu_si128(reinterpret_cast<const __m128i*>(in + k * count + i));
#pragma GCC unroll 4
    for (int round = 0; round < kRounds; ++round) rotate_once<W>(r);
#pragma GCC unroll 8
    for (std::size_t k = 0; k < W; ++k) _mm_storeu_si128(reinterpret_cast<__m128i*>(out + i * W + 16 * k), r[k]);
  }
  return i;
}
#else
template <std::size_t W>
std::size_t shuffle_vector(const std::byte*, std::size_t, std::byte*) {
  return 0;
}
template <std::size_t W>
std::size_t unshuffle_vector(const std::byte*, std::size_t, std::byte*) {
  return 0;
}
#endif

std::size_t element_count(std::span<const std::byte> in, std::size_t width, std::span<std::byte> out) {
  if (width == 0 || in.size() % width != 0 || out.size() != in.size())
    throw Error(Failure::defect, "shuffle", "buffers must be of one size, a multiple of the element width");
  return in.size() / width;
}

}  // namespace

void shuffle(std::span<const std::byte> in, std::size_t width, std::span<std::byte> out) {
  const std::size_t count = element_count(in, width, out);
  std::size_t done = 0;
  if (width == 4) done = shuffle_vector<4>(in.data(), count, out.data());
  if (width == 8) done = shuffle_vector<8>(in.data(), count, out.data());
  if (width == 2) done = shuffle_vector<2>(in.data(), count, out.data());
  shuffle_plain(in.data(), width, done, count, out.data());
}

void unshuffle(std::span<const std::byte> in, std::size_t width, std::span<std::byte> out) {
  const std::size_t count = element_count(in, width, out);
  std::size_t done = 0;
  if (width == 4) done = unshuffle_vector<4>(in.data(), count, out.data());
  if (width == 8) done = unshuffle_vector<8>(in.data(), count, out.data());
  if (width == 2) done = unshuffle_vector<2>(in.data(), count, out.data());
  unshuffle_plain(in.data(), width, done, count, out.data());
}

}  // namespace windrow::codec
