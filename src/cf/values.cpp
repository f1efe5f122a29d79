// Missing data and unpacking. Where the file's attributes contradict the conventions the reading is said in a remark.
#include "values.h"

#include <fmt/format.h>

#include <cmath>
#include <cstdint>
#include <cstdlib>
#include <optional>

namespace windrow::cf {

namespace {

/// Whole-number limits of an integer type; nothing for float and double.
struct Range {
  double lowest, highest;
};
std::optional<Range> integer_range(nc_type type) {
  switch (type) {
    case NC_BYTE:
      return Range{-128, 127};
    case NC_UBYTE:
      return Range{0, 255};
    case NC_SHORT:
      return Range{-32768, 32767};
    case NC_USHORT:
      return Range{0, 65535};
    case NC_INT:
      return Range{-2147483648.0, 2147483647.0};
    case NC_UINT:
      return Range{0, 4294967295.0};
    case NC_INT64:
      return Range{-0x1p63, 0x1p63};
    case NC_UINT64:
      return Range{0, 0x1p64};
    default:
      return std::nullopt;
  }
}

/// Fill of values never written (netCDF-C documentation, "Fill Values"); none for one-byte types.
std::optional<double> default_fill(nc_type type) {
  switch (type) {
    case NC_SHORT:
      return NC_FILL_SHORT;
    case NC_USHORT:
      return NC_FILL_USHORT;
    case NC_INT:
      return NC_FILL_INT;
    case NC_UINT:
      return NC_FILL_UINT;
    case NC_FLOAT:
      return double(NC_FILL_FLOAT);
    case NC_DOUBLE:
      return NC_FILL_DOUBLE;
    case NC_INT64:
      return double(NC_FILL_INT64);
    case NC_UINT64:
      return double(NC_FILL_UINT64);
    default:
      return std::nullopt;
  }
}

nc_type with_sign(nc_type type, const std::string& is_unsigned) {
  if (is_unsigned == "true") {
    if (type == NC_BYTE) return NC_UBYTE;
    if (type == NC_SHORT) return NC_USHORT;
    if (type == NC_INT) return NC_UINT;
    if (type == NC_INT64) return NC_UINT64;
  } else if (is_unsigned == "false") {
    if (type == NC_UBYTE) return NC_BYTE;
    if (type == NC_USHORT) return NC_SHORT;
    if (type == NC_UINT) return NC_INT;
  }
  return type;
}

class AttributeReader {
 public:
  AttributeReader(const Header& header, const nc::Var& variable, Remarks& remarks)
      : header_(header), variable_(variable), remarks_(remarks) {}

  Decoding read() {
    if (nc::type_size(variable_.type) == 0 || variable_.type == NC_CHAR)
      throw Error(Failure::data, header_.path,
                  fmt::format("variable '{}' holds {} values, numbers were expected", variable_.name,
                              nc::type_name(variable_.type)));
    decoding_.type = with_sign(variable_.type, lower(variable_.text("_Unsigned")));
    read_packing();
    read_missing("_FillValue");
    read_missing("missing_value");
    if (variable_.find("_FillValue") == nullptr)
      if (const auto fill = default_fill(decoding_.type)) decoding_.missing.push_back(*fill);
    read_valid_range();
    return decoding_;
  }

 private:
  void remark(const std::string& text) { remarks_.push_back(fmt::format("variable '{}': {}", variable_.name, text)); }

  /// Numbers of an attribute; text that spells numbers is read as such and said. Empty when there are none.
  std::vector<double> numbers(const nc::Att& att) {
    if (!att.is_text()) return att.numbers;
    std::vector<double> values;
    for (const std::string& word : words(att.text)) {
      char* end = nullptr;
      const double value = std::strtod(word.c_str(), &end);
      if (*end != '\0') {
        remark(fmt::format("{} is the text '{}' and not used, a number was expected", att.name, att.text));
        return {};
      }
      values.push_back(value);
    }
    if (!values.empty()) remark(fmt::format("{} is the text '{}', read as a number", att.name, att.text));
    return values;
  }

  /// An attribute's number as the stored type holds it; nothing when it cannot hold it.
  std::optional<double> as_stored(double value, nc_type attribute_type) const {
    const auto range = integer_range(decoding_.type);
    if (!range) return decoding_.type == NC_FLOAT ? double(float(value)) : value;
    const bool reinterpreted = decoding_.type != variable_.type && attribute_type == variable_.type;
    if (reinterpreted && value < range->lowest) value += range->highest + 1;
    if (reinterpreted && value > range->highest) value -= range->highest - range->lowest + 1;
    if (std::floor(value) != value || value < range->lowest || value > range->highest) return std::nullopt;
    return value;
  }

  void read_missing(const char* name) {
    const nc::Att* att = variable_.find(name);
    if (att == nullptr) return;
    const bool wrong_type = !att->is_text() && att->type != variable_.type && att->type != decoding_.type;
    for (const double value : numbers(*att)) {
      if (std::isnan(value) && !integer_range(decoding_.type)) continue;  // NaN is missing anyway
      const auto stored = as_stored(value, att->type);
      if (!stored) {
        remark(fmt::format("{} = {:g} cannot occur among {} values and is not used", name, value,
                           nc::type_name(decoding_.type)));
        continue;
      }
      if (wrong_type)
        remark(fmt::format("{} has the type {}, the variable {}; it is read as {:g}", name, nc::type_name(att->type),
                           nc::type_name(variable_.type), *stored));
      decoding_.missing.push_back(*stored);
    }
  }

  void read_packing() {
    const nc::Att* scale = variable_.find("scale_factor");
    const nc::Att* offset = variable_.find("add_offset");
    const auto number = [&](const nc::Att* att, double otherwise) {
      if (att == nullptr) return otherwise;
      const std::vector<double> values = numbers(*att);
      if (values.size() != 1 || !std::isfinite(values[0]))
        throw Error(Failure::data, header_.path,
                    fmt::format("variable '{}': {} must be one number", variable_.name, att->name));
      return values[0];
    };
    decoding_.scale = number(scale, 1);
    decoding_.offset = number(offset, 0);
    decoding_.packed = decoding_.scale != 1 || decoding_.offset != 0;
    if (decoding_.scale == 0) remark("scale_factor is 0, so that all values are equal");
    const bool small = nc::type_size(decoding_.type) <= 2 || decoding_.type == NC_FLOAT;
    const auto is_float = [](const nc::Att* att) { return att == nullptr || att->type == NC_FLOAT; };
    decoding_.to_float = decoding_.packed && small && is_float(scale) && is_float(offset);
    if (scale != nullptr && offset != nullptr && scale->type != offset->type)
      remark(fmt::format("scale_factor is {} and add_offset {}; values are unpacked in double",
                         nc::type_name(scale->type), nc::type_name(offset->type)));
  }

  /// Sets one limit, on stored numbers or, where the attribute has the type of unpacked values, on those.
  void limit(const nc::Att& att, double value, bool low) {
    if (std::isnan(value)) return;
    const bool on_values =
        decoding_.packed && integer_range(decoding_.type) && (att.type == NC_FLOAT || att.type == NC_DOUBLE);
    if (on_values) {
      if (low || att.name != "valid_range")
        remark(fmt::format("{} has the type of unpacked values and is compared with those", att.name));
      (low ? decoding_.value_lowest : decoding_.value_highest) = decoding_.to_float ? double(float(value)) : value;
      return;
    }
    (low ? decoding_.lowest : decoding_.highest) = as_stored(value, att.type).value_or(value);
  }

  void read_valid_range() {
    const nc::Att* range = variable_.find("valid_range");
    const nc::Att* lowest = variable_.find("valid_min");
    const nc::Att* highest = variable_.find("valid_max");
    if (range != nullptr && (lowest != nullptr || highest != nullptr))
      remark("has both valid_range and valid_min or valid_max; valid_range is used");
    if (range != nullptr) {
      const std::vector<double> values = numbers(*range);
      if (values.size() == 2) {
        limit(*range, values[0], true);
        limit(*range, values[1], false);
      } else {
        remark(fmt::format("valid_range has {} numbers, 2 were expected; it is not used", values.size()));
      }
    } else {
      for (const nc::Att* att : {lowest, highest}) {
        if (att == nullptr) continue;
        const std::vector<double> values = numbers(*att);
        if (values.size() == 1) limit(*att, values[0], att == lowest);
      }
    }
    if (decoding_.lowest > decoding_.highest || decoding_.value_lowest > decoding_.value_highest) {
      remark("its valid range is empty (lower limit above the upper) and is not used");
      const Decoding plain;
      decoding_.lowest = plain.lowest;
      decoding_.highest = plain.highest;
      decoding_.value_lowest = plain.value_lowest;
      decoding_.value_highest = plain.value_highest;
    }
  }

  const Header& header_;
  const nc::Var& variable_;
  Remarks& remarks_;
  Decoding decoding_;
};

template <class Stored, class Out>
void decode_as(const Decoding& d, const std::byte* bytes, const Gather& gather, Out* out) {
  const Stored* stored = reinterpret_cast<const Stored*>(bytes);
  for (std::size_t i = 0; i < gather.source.size(); ++i) {
    const double number = static_cast<double>(stored[gather.source[i]]);
    bool present = number >= d.lowest && number <= d.highest;  // false for NaN
    for (const double missing : d.missing) present = present && number != missing;
    double value = number;
    if (d.packed) value = number * d.scale + d.offset;
    if (d.to_float) value = static_cast<double>(static_cast<float>(value));
    present = present && value >= d.value_lowest && value <= d.value_highest;
    out[gather.target[i]] = present ? static_cast<Out>(value) : std::numeric_limits<Out>::quiet_NaN();
  }
}

template <class Out>
void decode_any(const Decoding& decoding, const std::byte* stored, const Gather& gather, Out* out) {
  switch (decoding.type) {
    case NC_BYTE:
      return decode_as<std::int8_t>(decoding, stored, gather, out);
    case NC_UBYTE:
      return decode_as<std::uint8_t>(decoding, stored, gather, out);
    case NC_SHORT:
      return decode_as<std::int16_t>(decoding, stored, gather, out);
    case NC_USHORT:
      return decode_as<std::uint16_t>(decoding, stored, gather, out);
    case NC_INT:
      return decode_as<std::int32_t>(decoding, stored, gather, out);
    case NC_UINT:
      return decode_as<std::uint32_t>(decoding, stored, gather, out);
    case NC_INT64:
      return decode_as<std::int64_t>(decoding, stored, gather, out);
    case NC_UINT64:
      return decode_as<std::uint64_t>(decoding, stored, gather, out);
    case NC_FLOAT:
      return decode_as<float>(decoding, stored, gather, out);
    default:
      return decode_as<double>(decoding, stored, gather, out);
  }
}

}  // namespace

bool Decoding::double_precision() const {
  if (packed) return !to_float;
  return type == NC_DOUBLE || (integer_range(type) && nc::type_size(type) >= 4);
}

Decoding read_decoding(const Header& header, const nc::Var& variable, Remarks& remarks) {
  return AttributeReader(header, variable, remarks).read();
}

void decode(const Decoding& decoding, const std::byte* stored, const Gather& gather, double* out) {
  decode_any(decoding, stored, gather, out);
}
void decode(const Decoding& decoding, const std::byte* stored, const Gather& gather, float* out) {
  decode_any(decoding, stored, gather, out);
}

}  // namespace windrow::cf
