// From stored numbers to values: missing data, valid range, packing. CF 1.13 sections 2.5.1 and 8.1.
#pragma once
#include <cstddef>
#include <limits>
#include <string>
#include <vector>

#include "header.h"

namespace windrow::cf {

/// How the stored numbers of one variable become values. Missing data are judged on the stored (packed) number, before
/// scaling; NaN is always missing. Without _FillValue the library's default fill of the type counts as missing (not for
/// one-byte types, whose every number may be data).
struct Decoding {
  nc_type type = NC_FLOAT;      ///< as stored, with _Unsigned applied (NC_SHORT -> NC_USHORT)
  std::vector<double> missing;  ///< stored numbers that stand for missing
  double lowest = -std::numeric_limits<double>::infinity();  ///< stored numbers outside are missing
  double highest = std::numeric_limits<double>::infinity();
  bool packed = false;
  double scale = 1, offset = 0;                                    ///< value = stored * scale + offset, in double
  bool to_float = false;                                           ///< the value is then rounded to float
  double value_lowest = -std::numeric_limits<double>::infinity();  ///< unpacked values outside are missing
  double value_highest = std::numeric_limits<double>::infinity();
  [[nodiscard]] bool double_precision() const;  ///< values carry more than float32 does
};

/// Reads the attributes; attributes of the wrong type are used where that makes sense, and said in `remarks`.
Decoding read_decoding(const Header& header, const nc::Var& variable, Remarks& remarks);

/// out[target[i]] = value of the stored number at position source[i] of `stored`; NaN where missing.
struct Gather {
  std::vector<std::size_t> source, target;
};
void decode(const Decoding& decoding, const std::byte* stored, const Gather& gather, double* out);
void decode(const Decoding& decoding, const std::byte* stored, const Gather& gather, float* out);

}  // namespace windrow::cf
