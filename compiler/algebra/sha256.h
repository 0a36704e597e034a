// SHA-256 of bytes: names the exact source and machine file that a result was made from.
// Federal Information Processing Standards Publication 180-4, "Secure Hash Standard".
#pragma once

#include <string>
#include <string_view>

namespace isinglass {

/// The digest as 64 lower-case hexadecimal digits.
std::string sha256(std::string_view bytes);

}  // namespace isinglass
