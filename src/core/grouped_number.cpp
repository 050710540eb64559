// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/core/grouped_number.h"

#include <algorithm>

namespace deviascope {

std::string grouped(std::int64_t number) { return grouped_digits(std::to_string(number)); }

std::string grouped_digits(std::string digits) {
    const std::size_t end = std::min(digits.find('.'), digits.size());
    const std::size_t begin = digits.starts_with('-') ? 1 : 0;
    for (std::size_t place = end; place > begin + 3;) digits.insert(place -= 3, 1, ' ');
    return digits;
}

}  // namespace deviascope
