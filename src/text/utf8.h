// UTF-8 well-formedness (RFC 3629): no overlong forms, no surrogates, nothing above U+10FFFF.
#pragma once
#include <cstddef>
#include <string_view>

namespace windrow::text {

/// Position of the first byte that is not part of well-formed UTF-8; npos when there is none.
std::size_t first_not_utf8(std::string_view bytes);

}  // namespace windrow::text
