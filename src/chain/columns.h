// SPDX-License-Identifier: GPL-2.0-or-later
// ensemble -> CHAIN -> summary (private): lists of things as columns of a file
#pragma once

#include <cstddef>
#include <span>
#include <vector>

namespace deviascope {

/// One field of every item.
template <class Item, class Value>
std::vector<Value> column_of(const std::vector<Item>& items, Value Item::*field) {
    std::vector<Value> column;
    column.reserve(items.size());
    for (const Item& item : items) column.push_back(item.*field);
    return column;
}

/// Sets one field of every item; as many values as items.
template <class Item, class Value>
void set_column(std::vector<Item>& items,
                Value Item::*field,
                const std::vector<Value>& column) {
    for (std::size_t place = 0; place < items.size(); ++place)
        items[place].*field = column[place];
}

/// As a writer takes it; for numbers, where a list of texts is another thing.
template <class Value, class Allocator>
std::span<const Value> all_of(const std::vector<Value, Allocator>& values) {
    return values;
}

}  // namespace deviascope
