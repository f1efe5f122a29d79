// UTF-8 well-formedness, byte ranges as in RFC 3629 section 4.
#include "utf8.h"

namespace windrow::text {
namespace {

/// Length of the well-formed sequence at `at`, 0 when there is none.
std::size_t sequence_length(std::string_view bytes, std::size_t at) {
  const auto byte = [&](std::size_t i) -> unsigned {
    return at + i < bytes.size() ? static_cast<unsigned char>(bytes[at + i]) : 0u;
  };
  const auto tail = [&](std::size_t i) { return byte(i) >= 0x80 && byte(i) <= 0xbf; };
  const unsigned lead = byte(0), second = byte(1);
  if (lead < 0x80) return 1;
  if (lead >= 0xc2 && lead <= 0xdf) return tail(1) ? 2 : 0;
  if (lead >= 0xe0 && lead <= 0xef) {
    const bool overlong = lead == 0xe0 && second < 0xa0;
    const bool surrogate = lead == 0xed && second > 0x9f;
    return tail(1) && tail(2) && !overlong && !surrogate ? 3 : 0;
  }
  if (lead >= 0xf0 && lead <= 0xf4) {
    const bool overlong = lead == 0xf0 && second < 0x90;
    const bool beyond = lead == 0xf4 && second > 0x8f;
    return tail(1) && tail(2) && tail(3) && !overlong && !beyond ? 4 : 0;
  }
  return 0;
}

}  // namespace

std::size_t first_not_utf8(std::string_view bytes) {
  for (std::size_t at = 0; at < bytes.size();) {
    const std::size_t length = sequence_length(bytes, at);
    if (length == 0) return at;
    at += length;
  }
  return std::string_view::npos;
}

}  // namespace windrow::text
